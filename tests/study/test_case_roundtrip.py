"""Case to TOML text to case is the identity, to the last digit, and the schema agrees."""

import json
import re
import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from midradius.fem.furnace import furnace_medium, furnace_names
from midradius.fem.media import medium, names
from midradius.study import casefile, casekeys, schema, starter
from midradius.study.case import (
    TRADE_TERMS,
    Case,
    Form,
    Grid,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
    Until,
    position,
)
from midradius.study.caseoutput import spans_of
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import all_grades
from midradius.thermo.steel import Composition, Steel

MESHES = Path(__file__).resolve().parents[2] / "meshes"
SHIPPED = sorted(path for path in MESHES.glob("*.toml") if "[section]" in path.read_text("utf-8"))
FOLDER = Path(__file__).parent / "bad"
FILM = Path("film_good.csv")  # beside the case
SOAK_COLDEST = 1200.0  # K, above the Ae1 of every steel here

floats = st.floats
times = floats(0.1, 2.0e6)
grains = floats(0.0, 10.0).map(lambda grain: round(grain, 3))
line_texts = st.text(
    st.characters(blacklist_categories=("C", "Zl", "Zp")), min_size=1, max_size=40
).filter(lambda text: text.strip())
steels = st.one_of(
    st.sampled_from(all_grades()),
    st.builds(
        lambda **amounts: Steel(
            casekeys.OWN_COMPOSITION, Composition(**amounts), "the case file", "given"
        ),
        C=floats(0.1, 1.2),
        Mn=floats(0.0, 1.5),
        Cr=floats(0.0, 1.5),
        Mo=floats(0.0, 0.5),
    ),
)


@st.composite
def uses(draw: st.DrawFn) -> MediumUse:
    if draw(st.booleans()):
        return MediumUse(film_file=FOLDER / FILM, bath=draw(floats(260.0, 400.0)))
    known = medium(draw(st.sampled_from(names())))
    if known.bath_default is not None and draw(st.booleans()):
        return MediumUse(known.name)
    hottest = min(known.bath_max, SOAK_COLDEST - 1.0)
    return MediumUse(known.name, bath=draw(floats(known.bath_min, hottest)))


@st.composite
def sections(draw: st.DrawFn) -> SectionInput:
    form: Form = draw(st.sampled_from(list(casekeys.DIMENSIONS)))
    size = {name: draw(floats(0.5e-3, 4.0)) for name in casekeys.DIMENSIONS[form]}
    size["emissivity"] = draw(st.just(0.8) | floats(0.05, 1.0))
    if "bore" in size:
        size["outside"] = size["bore"] + draw(floats(1.1e-3, 2.0))
        return SectionInput(form=form, bore_medium=draw(st.none() | uses()), **size)
    if form == "round" and draw(st.booleans()):
        size["length"] = draw(floats(0.5e-3, 10.0))
    return SectionInput(form=form, **size)


@st.composite
def places(draw: st.DrawFn, section: SectionInput) -> list[PositionInput]:
    terms = [
        term for term in TRADE_TERMS if term != "mid-radius" or section.form in ("round", "ball")
    ]
    found = [position(term) for term in draw(st.lists(st.sampled_from(terms), unique=True))]
    own = draw(st.lists(line_texts.map(str.strip), unique=True, max_size=3))
    for name in own:
        if name in TRADE_TERMS:
            continue
        if draw(st.booleans()):
            found.append(PositionInput(name, "depth", depth=draw(floats(0.0, 0.2e-3))))
        else:
            at = tuple(draw(floats(low, high)) for _, low, high in spans_of(section))
            found.append(PositionInput(name, "coordinates", coordinates=at))
    if not found or draw(st.booleans()):
        depth = draw(st.integers(0, 200))
        found.append(position(f"{depth} um below surface"))
    return found


@st.composite
def heats(draw: st.DrawFn, soak: Stage, wanted: list[PositionInput]) -> list[Stage]:
    found: list[Stage] = []
    fit = [known for known in map(furnace_medium, furnace_names()) if known.hottest > soak.at]
    fit = [known for known in fit if known.coldest < soak.at]
    for number in range(draw(st.integers(0, 2)) if fit else 0):
        known = draw(st.sampled_from(fit))
        furnace = draw(floats(max(known.coldest, 900.0), known.hottest))
        place = draw(st.none() | st.sampled_from(wanted))
        until = place and Until(place.name, draw(floats(450.0, 890.0)), "above")
        found.append(
            Stage(
                "heat",
                at=furnace,
                time=draw(times) if until is None else draw(st.none() | times),
                medium=MediumUse(known.name),
                until=until,
                start=draw(floats(260.0, 440.0)) if number == 0 else None,
                ramp=draw(st.none() | floats(1e-3, 9.0)),
            )
        )
    return found


@st.composite
def cases(draw: st.DrawFn) -> Case:
    section = draw(sections())
    wanted = draw(places(section))
    soak = Stage("soak", at=draw(floats(SOAK_COLDEST, 1490.0)), time=draw(times))
    stages = [*draw(heats(soak, wanted)), soak]
    for kind in draw(st.lists(st.sampled_from(["transfer", "quench", "hold"]), min_size=1)):
        until = None
        if kind != "transfer" and draw(st.booleans()):
            place = draw(st.sampled_from(wanted))
            until = Until(place.name, draw(floats(850.0, SOAK_COLDEST - 1.0)))
        zones = draw(st.lists(st.sampled_from(section.zones), unique=True))
        stages.append(
            Stage(
                kind,
                time=draw(times) if until is None else draw(st.none() | times),
                medium=draw(uses().filter(lambda use: use.name != "insulated")),
                until=until,
                faces={zone: draw(uses()) for zone in zones},
            )
        )
    field_times = draw(st.lists(floats(0.0, 2.0e6), unique=True, max_size=4).map(sorted))
    n_field = 24 if field_times else draw(st.integers(2, 1000))
    counts = st.integers(4, 900)
    grids = st.one_of(st.just(()), st.tuples(*[counts] * section.n_dim))
    for _ in range(draw(st.integers(0, 2))):
        stages.append(Stage("temper", at=draw(floats(330.0, 900.0)), time=draw(times)))
    return Case(
        title=draw(line_texts),
        steel=SteelInput(
            draw(steels), draw(st.none() | floats(0.0, 10.0).map(lambda g: round(g, 3)))
        ),
        section=section,
        route=tuple(stages),
        outputs=Outputs(tuple(wanted), tuple(field_times), n_field),
        grid=Grid(draw(grids), draw(floats(0.01, 20.0))),
        path=FOLDER / "case.toml",
    )


SLOW = settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])


@SLOW
@given(cases())
def test_a_case_written_and_read_is_the_same_case_to_the_last_digit(case: Case) -> None:
    text = casefile.dumps(case)
    read = casefile.loads(text, case.path)
    assert read == case
    assert casefile.dumps(read) == text


@SLOW
@given(cases())
def test_every_case_that_the_reader_takes_fits_the_schema(case: Case) -> None:
    assert fits(tomllib.loads(casefile.dumps(case)), schema.document())


@pytest.mark.parametrize("path", SHIPPED, ids=lambda path: path.stem)
def test_every_shipped_case_fits_the_schema_and_survives_the_way_there_and_back(
    path: Path,
) -> None:
    text = path.read_text(encoding="utf-8")
    assert fits(tomllib.loads(text), schema.document())
    case = casefile.read(path)
    assert casefile.loads(casefile.dumps(case), path) == case


@pytest.mark.parametrize("form", list(casekeys.DIMENSIONS))
def test_the_starter_of_each_form_is_a_good_case_and_fits_the_schema(form: Form) -> None:
    text = starter.text(form)
    case = casefile.loads(text)
    assert case.section.form == form
    assert case.title.endswith(", Hallgrund Forge")
    assert fits(tomllib.loads(text), schema.document())
    assert casefile.loads(casefile.dumps(case)) == case


@pytest.mark.parametrize("form", list(casekeys.DIMENSIONS))
def test_every_remark_of_a_starter_that_is_a_key_can_be_used(form: Form) -> None:
    lines = starter.text(form).splitlines()
    for number, line in enumerate(lines):
        offered = re.match(r"# ((?:length|bore_medium|time|austenite_grain) = .*)", line)
        if offered:
            casefile.loads("\n".join([*lines[:number], offered[1], *lines[number + 1 :]]))
    own = re.search(r"# (composition = .*)", "\n".join(lines))
    assert own
    casefile.loads(starter.text(form).replace('grade = "42CrMo4"', own[1]))


def test_every_medium_that_a_starter_names_is_in_the_catalogue() -> None:
    remark = re.search(r"# Other media: (.*?);", starter.text(), re.DOTALL)
    assert remark
    offered = re.findall(r'"([^"]*)"', remark[1])
    assert len(offered) == 5
    assert set(offered) <= set(names())


def test_a_starter_of_an_unknown_form_is_refused_with_the_nearest() -> None:
    with pytest.raises(InputFault) as caught:
        starter.text("rond")
    assert str(caught.value) == (
        'form = "rond", but must be "slab", "round", "tube", "ball", "bar" or "ring". '
        'Write "round" if that is meant.'
    )


BAD_SHAPES = [
    ('diameter = "180 mm"', 'diameter = "180"'),
    ('diameter = "180 mm"', 'diameter = "180 degC"'),
    ('diameter = "180 mm"', 'diameter = "1,5 mm"'),
    ('diameter = "180 mm"', "diameter = 180"),
    ('diameter = "180 mm"', 'thickness = "180 mm"'),
    ('grade = "42CrMo4"', 'grad = "42CrMo4"'),
    ('grade = "42CrMo4"', 'grade = "42CrMo4"\ncomposition = { C = 0.4 }'),
    ('grade = "42CrMo4"', "composition = { Mn = 0.4 }"),
    ('grade = "42CrMo4"', "composition = { C = 4.0 }"),
    ('"core below 150 degC"', '"core below 150"'),
    ('"core below 150 degC"', '"core above 150 degC"'),
    ('"mid-radius"', '"midradius"'),
    ('"mid-radius"', '{ name = "a" }'),
    ('stage = "quench"', 'stage = "temper"'),
    ('stage = "temper"', 'stage = "hold"'),
    ('at = "600 degC"\n', ""),
    ('at = "600 degC"', 'at = "600"'),
    ('at = "600 degC"', 'at = "600 degC"\nuntil = "core below 150 degC"'),
    ('time = "3 h"', 'time = "3 hours"'),
    ('time = "3 h"', 'time = "3 h"\nmedium = "still air"'),
    ("fields = 24", "fields = 1"),
    ("fields = 24", 'fields = 24\ntimes = ["1 s"]'),
    ('accuracy = "0.5 K"', 'accuracy = "0.5 degC"'),
    ('title = "', 'titel = "'),
]


@pytest.mark.parametrize(("good", "bad"), BAD_SHAPES)
def test_a_wrong_shape_is_marked_by_the_schema_and_by_the_reader(good: str, bad: str) -> None:
    assert good in starter.text()
    text = starter.text().replace(good, bad)
    assert not fits(tomllib.loads(text), schema.document())
    with pytest.raises(casefile.CaseFaults):
        casefile.loads(text)


def test_the_schema_is_json_and_its_references_lead_somewhere() -> None:
    text = json.dumps(schema.document())
    references = set(re.findall(r'"#/definitions/([^"]*)"', text))
    assert references == set(schema.document()["definitions"])


def fits(value: object, rule: dict[str, Any]) -> bool:
    """Whether a value fits the keywords of JSON Schema draft 7 that our schema uses."""
    root = schema.document()

    def fit(value: Any, rule: dict[str, Any]) -> bool:
        unknown = set(rule) - set(checks) - {"$schema", "title", "description", "examples"}
        assert not unknown - {"definitions"}, unknown
        return all(check(value, rule[word], rule) for word, check in checks.items() if word in rule)

    def typed(value: Any, name: str, _: Any) -> bool:
        kinds = {"object": dict, "array": list, "string": str, "integer": int}
        number = isinstance(value, int | float) and not isinstance(value, bool)
        if name == "number":
            return number
        return isinstance(value, kinds[name]) and (name != "integer" or number)

    def closed(value: Any, others: Any, rule: dict[str, Any]) -> bool:
        if not isinstance(value, dict):
            return True
        beyond = set(value) - set(rule["properties"])
        return all(others is not False and fit(value[name], others) for name in beyond)

    checks = {
        "type": typed,
        "const": lambda v, want, _: v == want,
        "enum": lambda v, want, _: v in want,
        "pattern": lambda v, want, _: not isinstance(v, str) or re.search(want, v),
        "minLength": lambda v, want, _: not isinstance(v, str) or len(v) >= want,
        "maxLength": lambda v, want, _: not isinstance(v, str) or len(v) <= want,
        "minimum": lambda v, want, _: isinstance(v, str) or v >= want,
        "maximum": lambda v, want, _: isinstance(v, str) or v <= want,
        "minItems": lambda v, want, _: not isinstance(v, list) or len(v) >= want,
        "maxItems": lambda v, want, _: not isinstance(v, list) or len(v) <= want,
        "items": lambda v, want, _: not isinstance(v, list) or all(fit(x, want) for x in v),
        "required": lambda v, want, _: not isinstance(v, dict) or set(want) <= set(v),
        "properties": lambda v, want, _: (
            not isinstance(v, dict) or all(fit(v[name], want[name]) for name in set(v) & set(want))
        ),
        "additionalProperties": closed,
        "anyOf": lambda v, want, _: any(fit(v, one) for one in want),
        "oneOf": lambda v, want, _: sum(fit(v, one) for one in want) == 1,
        "not": lambda v, want, _: not fit(v, want),
        "$ref": lambda v, want, _: fit(v, root["definitions"][want.rpartition("/")[2]]),
    }
    return fit(value, rule)
