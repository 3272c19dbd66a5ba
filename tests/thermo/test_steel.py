"""Composition bounds and the grade table."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from midradius.thermo.errors import InputFault
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.steel import ELEMENTS, HARD_BOUNDS, Composition, check, outside, range_notes


def test_every_shipped_grade_can_be_computed() -> None:
    assert len(all_grades()) >= 24
    for steel in all_grades():
        assert check(steel.composition) == []
        seen = [note for note in range_notes(steel.composition) if note.quantity != "S"]
        assert seen == []  # resulphurised grades carry their note
        assert steel.composition.Si > 0.0


def test_a_grade_is_found_whatever_the_case_and_the_spaces() -> None:
    assert grade("42crmo4") == grade("42 CrMo 4") == grade("1.7225") == grade("42CrMo4")
    assert grade("AISI 4140") == grade("4140") == grade("g41400")
    assert grade("18 crnimo 7-6").name == "18CrNiMo7-6"


def test_42crmo4_lies_inside_the_range_of_its_standard() -> None:
    # EN ISO 683-2, 1.7225, from memory: C .38-.45, Mn .60-.90, Cr .90-1.20, Mo .15-.30, Si <= .40
    c = grade("42CrMo4").composition
    assert 0.38 <= c.C <= 0.45
    assert 0.60 <= c.Mn <= 0.90
    assert 0.90 <= c.Cr <= 1.20
    assert 0.15 <= c.Mo <= 0.30
    assert 0.0 < c.Si <= 0.40


def test_an_unknown_grade_names_its_neighbours() -> None:
    with pytest.raises(InputFault) as caught:
        grade("42CrMo5")
    assert str(caught.value) == (
        'grade = "42CrMo5", but must be a grade of the shipped table. '
        "Nearest: 42CrMo4, G42CrMo4, 42CrMoS4. Or give a composition in mass percent."
    )
    with pytest.raises(InputFault, match="grades is near. Families: carbon, Mn"):
        grade("xyzzy")


def test_all_faults_of_a_composition_come_together() -> None:
    faults = check(Composition(C=0.01, Mn=7.0, Cr=math.nan, Si=-0.1))
    assert [fault.quantity for fault in faults] == [
        "composition.C",
        "composition.Mn",
        "composition.Si",
        "composition.Cr",
    ]
    assert str(faults[1]) == (
        "composition.Mn = 7 %, but must be 0 to 3 % by mass. "
        "The models hold for plain carbon and low-alloy steels only."
    )


def test_a_composition_without_iron_is_refused() -> None:
    quantities = [fault.quantity for fault in check(Composition(C=0.4, Mn=60.0, Cr=40.0))]
    assert "sum of composition" in quantities


def test_a_high_alloy_steel_is_refused_even_if_each_element_passes() -> None:
    faults = check(Composition(C=0.3, Cr=4.0, Ni=5.0))
    assert [fault.quantity for fault in faults] == ["Mn + Si + Cr + Ni + Mo"]


@given(st.sampled_from(ELEMENTS), st.floats(allow_nan=True, allow_infinity=True))
def test_an_amount_is_refused_exactly_outside_its_bounds(element: str, amount: float) -> None:
    low, high = HARD_BOUNDS[element]
    faults = check(Composition(**{"C": 0.4, element: amount}))
    named = [fault for fault in faults if fault.quantity == f"composition.{element}"]
    assert (not named) == (low <= amount <= high)


def test_niobium_is_noted_because_no_model_sees_it() -> None:
    notes = range_notes(Composition(C=0.3, Nb=0.08))
    assert [note.quantity for note in notes] == ["Nb"]


def test_a_model_range_gives_a_note_with_the_printed_range() -> None:
    notes = outside(Composition(C=0.9, Mn=0.5), model="X", limits={"C": (0.1, 0.6), "Mn": (0, 2)})
    assert [str(note) for note in notes] == ["X: C = 0.9 %, source holds for 0.1 to 0.6 %"]
