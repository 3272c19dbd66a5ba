"""The grade table: every row against its own limits and against the rules of designation."""

import math
import re
from collections import Counter

import pytest
from numpy.testing import assert_allclose

from midradius.thermo import equilibrium as boundaries
from midradius.thermo import steel as bounds
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import (
    GradeRow,
    all_grades,
    families,
    find,
    grade,
    limits,
    row,
    rows,
)

ROWS = pytest.mark.parametrize("item", rows(), ids=lambda item: item.name)
SAE = tuple(item for item in rows() if item.standard.startswith("SAE"))
EN = tuple(item for item in rows() if not item.standard.startswith("SAE"))

FAMILIES = (
    "carbon",
    "Mn",
    "resulphurised",
    "Mo",
    "CrMo",
    "NiMo",
    "NiCr",
    "NiCrMo",
    "Cr",
    "CrV",
    "boron",
    "bearing",
    "spring",
    "tool",
    "case-hardening",
    "cast",
    "microalloyed",
)

# EN 10027-1, from memory: mean content times this, rounded, is the number in the designation
FACTORS = {"Cr": 4.0, "Mn": 4.0, "Ni": 4.0, "Si": 4.0, "Mo": 10.0, "V": 10.0, "S": 100.0}


def test_the_table_holds_the_common_steels() -> None:
    assert len(all_grades()) >= 85
    assert len({steel.name for steel in all_grades()}) == len(all_grades())


@pytest.mark.parametrize(
    ("family", "least"),
    [
        ("carbon", 40),
        ("Mn", 6),
        ("resulphurised", 4),
        ("Cr", 15),
        ("CrMo", 12),
        ("NiCrMo", 20),
        ("CrV", 3),
        ("boron", 8),
        ("bearing", 4),
        ("spring", 8),
        ("cast", 4),
        ("microalloyed", 3),
    ],
)
def test_every_family_of_common_steels_is_there(family: str, least: int) -> None:
    assert len([item for item in find(family=family) if item.own_aim]) >= least


@ROWS
def test_the_aim_lies_within_the_limits(item: GradeRow) -> None:
    elements = [limit.element for limit in item.limits]
    assert len(set(elements)) == len(elements)
    assert {"C", "Mn", "P", "S"} <= set(elements)
    for limit in item.limits:
        assert 0.0 <= limit.low < limit.high
        assert limit.low <= getattr(item.steel.composition, limit.element) <= limit.high


@ROWS
def test_an_aim_that_no_limit_asks_for_is_zero_but_for_silicon(item: GradeRow) -> None:
    limited = {limit.element: limit for limit in item.limits}
    for element, amount in item.steel.composition.as_dict().items():
        asked = element in limited and limited[element].low > 0.0
        assert asked or amount == 0.0 or element in ("Si", "P", "S")


@ROWS
def test_every_grade_can_be_computed(item: GradeRow) -> None:
    composition = item.steel.composition
    assert bounds.check(composition) == []
    eq = boundaries.equilibrium(composition)
    assert all(math.isfinite(value) for value in (eq.ae1, eq.ae3, eq.eutectoid_carbon_pct))
    assert 920.0 < eq.ae1 < 1060.0  # K
    assert math.isfinite(eq.acm) == (eq.eutectoid_carbon_pct < composition.C)


@ROWS
def test_a_name_that_stands_for_a_row_stands_for_no_other(item: GradeRow) -> None:
    for name in (item.name, item.number, *item.also):
        assert row(name) is item


def test_no_name_or_number_occurs_twice() -> None:
    count = Counter(
        name.casefold() for item in rows() for name in (item.name, item.number, *item.also)
    )
    assert [name for name, n in count.items() if n > 1] == []


@ROWS
def test_every_row_says_where_it_is_from(item: GradeRow) -> None:
    assert item.standard
    assert item.steel.status in ("read", "remembered")
    assert item.family == item.families[0]


def test_no_row_stands_in_a_family_of_a_misspelt_name() -> None:
    assert sorted(families()) == sorted(FAMILIES)


@pytest.mark.parametrize("item", SAE, ids=lambda item: item.name)
def test_an_sae_number_names_carbon_within_the_limits(item: GradeRow) -> None:
    # SAE J402, from memory: the digits after the first two are hundredths of a percent
    digits = item.name.removesuffix("H").replace("B", "")[2:]
    low, high = limits(item.name)["C"]
    assert low <= int(digits) / 100.0 <= high


@pytest.mark.parametrize("item", SAE, ids=lambda item: item.name)
def test_a_uns_number_repeats_the_sae_number(item: GradeRow) -> None:
    # ASTM E527, from memory: G and H take the SAE number, the fifth digit is 1 for boron
    # and 6 for electric furnace steel
    digits = item.name.removesuffix("H").replace("B", "")
    last = "1" if "B" in item.name else "6" if item.name == "9310" else "0"
    if item.name == "52100":
        assert item.number == "G52986"
    else:
        assert item.number == ("H" if item.name.endswith("H") else "G") + digits + last


@pytest.mark.parametrize("item", EN, ids=lambda item: item.name)
def test_a_material_number_has_the_form_of_en_10027_2(item: GradeRow) -> None:
    assert re.fullmatch(r"1\.\d{4}", item.number)


@pytest.mark.parametrize("item", EN, ids=lambda item: item.name)
def test_an_en_designation_says_what_the_limits_say(item: GradeRow) -> None:
    found = re.fullmatch(r"G?C?f?(\d+)((?:[A-Z][a-z]?)*?)(\d*(?:-\d+)*)[EUSW]?", item.name)
    assert found
    stated = limits(item.name)
    assert stated["C"][0] <= int(found[1]) / 100.0 <= stated["C"][1]
    numbers = [int(text) for text in found[3].split("-") if text]
    elements = re.findall(r"[A-Z][a-z]?", found[2]) if numbers else []
    for element, number in zip(elements, numbers, strict=False):
        low, high = stated[element]
        mean = FACTORS[element] * (low + high) / 2.0
        assert_allclose(mean, number, rtol=0.0, atol=0.85)  # rounded, some up from .2
    for element in elements[: len(numbers)]:
        assert grade(item.name).composition.as_dict()[element] > 0.0


# From memory, element by element: SAE J404 and J1268, EN ISO 683
@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("4140", {"C": (0.38, 0.43), "Mn": (0.75, 1.00), "Cr": (0.80, 1.10), "Mo": (0.15, 0.25)}),
        ("4140H", {"C": (0.37, 0.44), "Mn": (0.65, 1.10), "Cr": (0.75, 1.20), "Mo": (0.15, 0.25)}),
        ("4340", {"Mn": (0.60, 0.80), "Ni": (1.65, 2.00), "Cr": (0.70, 0.90), "Mo": (0.20, 0.30)}),
        ("8620", {"C": (0.18, 0.23), "Ni": (0.40, 0.70), "Cr": (0.40, 0.60), "Mo": (0.15, 0.25)}),
        ("5160", {"C": (0.56, 0.64), "Mn": (0.75, 1.00), "Cr": (0.70, 0.90)}),
        ("1045", {"C": (0.43, 0.50), "Mn": (0.60, 0.90), "P": (0.0, 0.030), "S": (0.0, 0.050)}),
        ("1.7225", {"C": (0.38, 0.45), "Mn": (0.60, 0.90), "Cr": (0.90, 1.20), "Mo": (0.15, 0.30)}),
        ("1.6582", {"C": (0.30, 0.38), "Cr": (1.30, 1.70), "Ni": (1.30, 1.70), "Mo": (0.15, 0.30)}),
        ("1.3505", {"C": (0.93, 1.05), "Mn": (0.25, 0.45), "Cr": (1.35, 1.60), "S": (0.0, 0.015)}),
        ("1.1191", {"C": (0.42, 0.50), "Mn": (0.50, 0.80), "Cr": (0.0, 0.40)}),
    ],
)
def test_known_limits_are_in_the_table(name: str, expected: dict[str, tuple[float, float]]) -> None:
    found = limits(name)
    assert {element: found[element] for element in expected} == expected


def test_an_h_steel_has_limits_of_its_own_and_the_aim_of_the_plain_grade() -> None:
    assert grade("4140H") == grade("4140")
    assert limits("4140H") != limits("4140")
    assert row("H41400").name == "4140H"
    assert not row("4140H").own_aim


@pytest.mark.parametrize(
    "item", [item for item in rows() if not item.own_aim], ids=lambda item: item.name
)
def test_an_h_steel_allows_at_least_what_its_plain_grade_does(item: GradeRow) -> None:
    assert item.standard == "SAE J1268"
    wide = limits(item.name)
    for element, (low, high) in limits(item.steel.name).items():
        assert wide[element][0] <= low
        assert wide[element][1] >= high


def test_h_limits_that_nobody_remembers_are_not_made_up() -> None:
    with pytest.raises(InputFault, match='grade = "8615H"'):
        limits("8615H")


def test_equivalent_grades_of_two_standards_stay_two_steels() -> None:
    assert grade("4140") != grade("42CrMo4")
    assert grade("52100") != grade("100Cr6")
    assert grade("8620") != grade("20NiCrMo2-2")


@pytest.mark.parametrize(
    ("written", "name"),
    [
        ("  1.7225 ", "42CrMo4"),
        ("W.-Nr. 1.7225", "42CrMo4"),
        ("42CrMo4+QT", "42CrMo4"),
        ("SAE-AISI 4140", "4140"),
        ("AISI 4140H", "4140"),
        ("UNS G43400", "4340"),
        ("ck 45", "C45E"),
        ("50CrV4", "51CrV4"),
        ("15b35", "15B35H"),
        ("100 crmnsi 6 4", "100CrMnSi6-4"),
    ],
)
def test_a_grade_is_found_as_drawings_write_it(written: str, name: str) -> None:
    assert grade(written).name == name


def test_the_nearest_grades_are_three_different_steels() -> None:
    with pytest.raises(InputFault) as caught:
        grade("4l40")
    assert caught.value.remedy.startswith("Nearest: 4340, 4140, ")
    with pytest.raises(InputFault, match="Nearest: 8615, 8655, 8650"):
        grade("8615H")


def test_a_grade_that_is_near_no_other_names_the_families() -> None:
    with pytest.raises(InputFault) as caught:
        grade("xyzzy")
    assert str(caught.value).startswith(
        'grade = "xyzzy", but must be a grade of the shipped table. '
        f"None of its {len(rows())} grades is near. Families: carbon, Mn, "
    )
    assert str(caught.value).endswith("Or give a composition in mass percent.")


def test_filters_narrow_each_other() -> None:
    assert find() == rows()
    cr_mo = find(family="crmo")
    assert {item.name for item in cr_mo} >= {"4130", "4140", "42CrMo4", "G42CrMo4", "100CrMo7"}
    medium = find(family="CrMo", carbon=(0.38, 0.45))
    assert {item.name for item in medium} >= {"4140", "4140H", "42CrMo4"}
    assert {"4130", "50CrMo4"}.isdisjoint(item.name for item in medium)
    assert [item.name for item in find(family="CrMo", carbon=(0.38, 0.45), text="1.72")] == [
        "42CrMo4",
        "42CrMoS4",
        "G42CrMo4",
    ]
    assert find(text="no such steel") == ()


def test_text_finds_standards_and_former_names() -> None:
    assert {item.name for item in find(text="j404")} >= {"4140", "5160"}
    assert all(item.standard == "EN 10293" for item in find(text="EN 10293"))
    assert [item.name for item in find(text="ck45")] == ["C45E"]


def test_a_filter_that_cannot_be_meant_is_refused() -> None:
    with pytest.raises(InputFault, match='family = "molybdenum", but must be one of carbon, Mn'):
        find(family="molybdenum")
    with pytest.raises(InputFault, match=r"carbon = 0.5 to 0.4 %, but must be from the lower"):
        find(carbon=(0.5, 0.4))


def test_what_no_model_sees_is_noted_for_the_grades_that_have_it() -> None:
    noted = {
        item.name: {note.quantity for note in bounds.range_notes(item.steel.composition)}
        for item in rows()
    }
    assert {name for name, what in noted.items() if what == {"S"}} == {
        item.name for item in find(family="resulphurised")
    }
    assert all(what in (set(), {"S"}) for what in noted.values())


def test_only_nickel_takes_a_grade_out_of_the_shifts_of_the_boundaries() -> None:
    for item in rows():
        notes = boundaries.range_notes(item.steel.composition)
        assert {note.quantity for note in notes} <= {"Ni"}
