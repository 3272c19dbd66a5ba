"""Requirements in the case file: read, written, refused.

What is wrong with them all together stands in ``bad/needs.toml``.
"""

import tomllib
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from midradius.study import casefile, casekeys, schema, starter
from midradius.study.case import Need
from midradius.study.caseneed import amount
from midradius.thermo.errors import InputFault

CASE = """
[steel]
grade = "42CrMo4"
[section]
form = "round"
diameter = "300 mm"
[[route]]
stage = "soak"
at = "860 degC"
time = "4 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
until = "core below 150 degC"
[output]
positions = ["core", { name = "key way", depth = "7 mm" }]
"""


def read(*lines: str) -> Need:
    (need,) = casefile.loads("\n".join([CASE, "[[need]]", *lines])).needs
    return need


def faults(*lines: str) -> list[str]:
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads("\n".join([CASE, *lines]), Path("shaft.toml"))
    return [str(fault) for fault in caught.value.faults]


def test_a_requirement_keeps_the_unit_it_was_written_in() -> None:
    asked = ('position = "mid-radius"', 'quantity = "hardness"', 'at_least = "28 HRC"')
    need = read(*asked)
    assert need == Need("mid-radius", "hardness", "HRC", at_least=28.0)
    assert need.text == "hardness at mid-radius: at least 28 HRC"


@pytest.mark.parametrize(
    ("lines", "text"),
    [
        (
            ('position = "key way"', 'quantity = "tensile"', 'between = ["900 MPa", "1100 N/mm2"]'),
            "tensile at key way: between 900 MPa and 1100 MPa",
        ),
        (
            ('position = "12 mm below surface"', 'quantity = "ferrite"', 'at_most = "5 %"'),
            "ferrite at 12 mm below surface: at most 5 %",
        ),
        (
            ('position = "everywhere"', 'quantity = "hardness"', 'at_most = "320 HBW"'),
            "hardness everywhere: at most 320 HB",
        ),
        (
            ('quantity = "hardened depth"', 'to = "50 HRC"', 'at_least = "8 mm"'),
            "hardened depth to 50 HRC: at least 8 mm",
        ),
        (
            ('quantity = "hardened depth"', 'to = "50 % martensite"', 'at_least = "0.3 in"'),
            "hardened depth to 50 % martensite: at least 0.3 in",
        ),
        (
            ('position = "core"', 'quantity = "cementite film"', 'at_most = "0.3 \u00b5m"'),
            "cementite film at core: at most 0.3 um",
        ),
        (('quantity = "grain"', 'at_least = "ASTM 5"'), "grain everywhere: at least ASTM 5"),
        (
            ('position = "core"', 'quantity = "yield"', 'at_least = "90 ksi"'),
            "yield at core: at least 90 ksi",
        ),
    ],
)
def test_every_quantity_is_read_and_said_in_words(lines: tuple[str, ...], text: str) -> None:
    assert read(*lines).text == text


def test_the_places_of_requirements_are_watched_beside_the_output_positions() -> None:
    text = CASE + '[[need]]\nposition = "surface"\nquantity = "hardness"\nat_least = "50 HRC"\n'
    text += '[[need]]\nposition = "core"\nquantity = "hardness"\nat_most = "300 HV"\n'
    text += '[[need]]\nposition = "everywhere"\nquantity = "hardness"\nat_most = "600 HV"\n'
    assert list(casefile.loads(text).watched) == ["core", "key way", "surface"]


def test_one_bracket_too_few_is_answered_with_the_cure() -> None:
    assert faults("[need]", 'quantity = "grain"', 'at_least = "ASTM 5"') == [
        'shaft.toml, line 19: need = { quantity = "grain", at_least = "ASTM 5" }, '
        "but must be written as [[need]].\n  Two brackets: there may be several."
    ]


def test_the_same_requirement_twice_is_refused() -> None:
    grain = ("[[need]]", 'quantity = "grain"', 'at_least = "ASTM 5"')
    (fault,) = faults(*grain, *grain)
    assert "line 22: need[1]" in fault and "asked once" in fault


def test_a_place_that_the_section_has_not_is_refused() -> None:
    text = CASE.replace('form = "round"\ndiameter', 'form = "slab"\nthickness')
    text += '[[need]]\nposition = "mid-radius"\nquantity = "hardness"\nat_least = "28 HRC"'
    with pytest.raises(casefile.CaseFaults, match="Only a round and a ball have a mid-radius"):
        casefile.loads(text)


@pytest.mark.parametrize(
    ("text", "quantity", "remedy"),
    [
        ("28", "hardness", 'Add the unit, for example "28 HRC".'),
        ("28,5 HRC", "hardness", 'Write "28.5 HRC": the decimal sign is a point.'),
        ("28 HRc", "hardness", 'Write "HRC" if that is meant.'),
        ("19 HRC", "hardness", "Rockwell C ends there: below 20 HRC ask in HB or HV."),
        ("700 HB", "hardness", "Brinell ends there: above 617 HB ask in HRC or HV."),
        ("3000 MPa", "tensile", "Strength follows from hardness between these ends only."),
        ("5", "grain", 'Add the unit, for example "ASTM 5".'),
        ("28 HRC", "ferrite", ""),
        ("-5 %", "ferrite", ""),
        ("nan HV", "hardness", ""),
    ],
)
def test_a_limit_that_cannot_be_judged_is_refused(text: str, quantity: str, remedy: str) -> None:
    with pytest.raises(InputFault) as caught:
        amount(text, quantity)
    assert caught.value.remedy == remedy


def needs() -> st.SearchStrategy[Need]:
    def of(quantity: str) -> st.SearchStrategy[Need]:
        units = casekeys.NEED_UNITS[quantity]
        ends = {unit: span for unit, span in units.items()}
        if quantity == casekeys.DEPTH:
            ends = {"mm": (0.0, 150.0), "in": (0.0, 5.9)}
        places = ["core", "key way", "everywhere", "12 mm below surface"]
        if quantity == casekeys.DEPTH:
            places = ["everywhere"]
        to = st.just((None, ""))
        if quantity == casekeys.DEPTH:
            to = st.tuples(st.floats(1.0, 99.0), st.just(casekeys.OF_MARTENSITE)) | st.tuples(
                st.floats(20.0, 68.0), st.just("HRC")
            )

        def limited(unit: str) -> st.SearchStrategy[Need]:
            limit = st.floats(*ends[unit])
            pairs = st.one_of(
                st.tuples(limit, st.none()),
                st.tuples(st.none(), limit),
                st.tuples(limit, limit).map(sorted).filter(lambda pair: pair[0] < pair[1]),
            )
            return st.builds(
                lambda place, pair, to: Need(
                    place, quantity, unit, pair[0], pair[1], to=to[0], to_unit=to[1]
                ),
                st.sampled_from(places),
                pairs,
                to,
            )

        return st.sampled_from(list(ends)).flatmap(limited)

    return st.sampled_from(casekeys.QUANTITIES).flatmap(of)


@settings(max_examples=150, deadline=None)
@given(st.lists(needs(), max_size=4, unique=True))
def test_requirements_written_and_read_are_the_same_to_the_last_digit(asked: list[Need]) -> None:
    case = replace(casefile.loads(CASE), needs=tuple(asked))
    assert casefile.loads(casefile.dumps(case)) == case


def test_the_requirement_that_the_starter_offers_can_be_used() -> None:
    for form in casekeys.DIMENSIONS:
        lines = starter.text(form).splitlines()
        first = lines.index("# [[need]]")
        offered = [line.removeprefix("# ") for line in lines[first : first + 4]]
        case = casefile.loads("\n".join([*lines[:first], *offered, *lines[first + 4 :]]))
        assert [need.at_least for need in case.needs] == [28.0]


def test_the_schema_knows_every_quantity_and_key() -> None:
    item = schema.document()["properties"]["need"]["items"]
    assert item["properties"]["quantity"]["enum"] == list(casekeys.QUANTITIES)
    for one in item["oneOf"]:
        assert set(one["properties"]) <= set(casekeys.NEED)
    assert tomllib.loads(starter.text())  # the remark is TOML all the same
