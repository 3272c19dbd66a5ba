"""What the soak leaves."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo.austenite import astm_of, grown_intercept, intercept_of, soak
from midradius.thermo.equilibrium import CEMENTITE_CARBON_PCT, equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.steel import Composition, Steel

ZERO = 273.15
TABLE = Path(__file__).parents[1] / "published" / "grain_growth.csv"
CARD = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))


@pytest.mark.parametrize("row", CARD, ids=[r["soak_degC"] for r in CARD])
def test_the_grain_of_100cr6_grows_as_on_the_makers_card(row: dict[str, str]) -> None:
    # the card states no time: an hour
    steel = grade(row["steel"]).composition
    ours = astm_of(grown_intercept(steel, float(row["soak_degC"]) + ZERO, 3600.0))
    tolerance = float(row["tolerance_astm"])
    assert float(row["low_astm"]) - tolerance <= ours <= float(row["high_astm"]) + tolerance


def test_grain_numbers_have_the_intercepts_of_e112() -> None:
    # ASTM E112 (from memory): 80, 56.6, 40, 28.3, 20, 14.1 micrometre for 4 to 9
    ours = [1e6 * intercept_of(number) for number in (4, 5, 6, 7, 8, 9)]
    assert_allclose(ours, [80.0, 56.6, 40.0, 28.3, 20.0, 14.1], rtol=0.0, atol=0.05)


@given(st.floats(-3.0, 14.0))
def test_a_grain_number_comes_back_from_its_intercept(number: float) -> None:
    assert_allclose(astm_of(intercept_of(number)), number, rtol=0.0, atol=1e-9)


def test_above_ae3_everything_dissolves() -> None:
    state = soak(grade("42CrMo4"), 860.0 + ZERO, 7200.0)
    assert state.regime == "full"
    assert (state.ferrite, state.cementite, state.carbon_pct) == (0.0, 0.0, 0.41)
    assert state.composition == grade("42CrMo4").composition
    assert state.notes == ()


def test_a_given_grain_is_kept() -> None:
    state = soak(grade("42CrMo4"), 860.0 + ZERO, 7200.0, grain_astm=7.0)
    assert state.grain_astm == 7.0
    assert_allclose(state.grain_mean_intercept, 28.3e-6, rtol=3e-3, atol=0.0)


def test_between_ae1_and_ae3_ferrite_stays_and_carbon_gathers() -> None:
    # iron-carbon at 750 degC: austenite 0.603 %, ferrite 0.0167 % (independent table)
    state = soak(Steel("plain", Composition(C=0.3), "", "given"), 750.0 + ZERO, 3600.0)
    assert state.regime == "intercritical"
    assert_allclose(state.carbon_pct, 0.603, rtol=0.0, atol=1e-3)
    assert_allclose(state.ferrite, (0.603 - 0.3) / (0.603 - 0.0167), rtol=0.0, atol=2e-3)


def test_plain_steel_below_acm_keeps_the_cementite_of_the_lever_rule() -> None:
    # iron-carbon at 800 degC: austenite 0.948 % beside cementite (independent table)
    state = soak(Steel("plain", Composition(C=1.2), "", "given"), 800.0 + ZERO, 3600.0)
    assert state.regime == "below Acm"
    assert_allclose(state.carbon_pct, 0.948, rtol=0.0, atol=1e-3)
    assert_allclose(state.cementite, (1.2 - 0.948) / (6.69 - 0.948), rtol=0.0, atol=5e-4)


def test_ball_bearing_steel_keeps_the_carbide_that_practice_finds() -> None:
    # 845 degC, 20 to 40 min: 4 to 8 % carbide, 0.55 to 0.65 % C in solution (from memory)
    state = soak(grade("100Cr6"), 845.0 + ZERO, 1800.0)
    assert 0.55 <= state.carbon_pct <= 0.65
    assert 0.04 <= state.cementite <= 0.08
    assert 0.9 < state.composition.Cr < grade("100Cr6").composition.Cr
    assert [note.quantity for note in state.notes] == ["soak"]  # grain growth, 845 < 850 degC


def test_carbide_left_above_acm_is_not_called_below_acm() -> None:
    state = soak(grade("100Cr6"), 900.0 + ZERO, 1800.0)
    assert state.regime == "undissolved carbide"
    assert state.cementite > 0.0
    assert soak(grade("100Cr6"), 1000.0 + ZERO, 1800.0).regime == "full"


def test_a_long_soak_of_chromium_steel_is_noted_as_outside_practice() -> None:
    notes = soak(grade("100Cr6"), 860.0 + ZERO, 8 * 3600.0).notes
    assert [str(note) for note in notes] == [
        "dissolved carbon of chromium steel (estimate): soak time = 480 min, "
        "source holds for 20 to 60 min"
    ]


@pytest.mark.parametrize("steel", all_grades(), ids=lambda steel: steel.name)
def test_every_soak_conserves_carbon(steel: Steel) -> None:
    eq = equilibrium(steel.composition)
    for temp in np.linspace(eq.ae1 + 0.5, 1400.0, 40):
        state = soak(steel, float(temp), 3600.0)
        austenite = 1.0 - state.ferrite - state.cementite
        total = state.ferrite * float(eq.ferrite_solubility(temp))
        total += state.cementite * CEMENTITE_CARBON_PCT + austenite * state.carbon_pct
        assert_allclose(total, steel.composition.C, rtol=0.0, atol=1e-9)
        assert 0.0 <= state.ferrite < 1.0
        assert 0.0 <= state.cementite < 0.2


def test_a_soak_below_ae1_has_nothing_to_transform() -> None:
    with pytest.raises(InputFault) as caught:
        soak(grade("42CrMo4"), 700.0 + ZERO, 3600.0)
    assert str(caught.value) == (
        "soak temperature = 700 degC, but must be above Ae1 of 42CrMo4, 725 degC. "
        "At or below Ae1 there is no austenite and nothing to transform: raise the soak."
    )


@pytest.mark.parametrize(
    ("temp", "time", "grain", "quantity"),
    [
        (float("nan"), 3600.0, None, "soak temperature"),
        (1700.0, 3600.0, None, "soak temperature"),
        (1150.0, 0.0, None, "soak time"),
        (1150.0, float("inf"), None, "soak time"),
        (1150.0, 3600.0, 20.0, "austenite grain"),
    ],
)
def test_a_soak_that_makes_no_sense_is_refused(
    temp: float, time: float, grain: float | None, quantity: str
) -> None:
    with pytest.raises(InputFault) as caught:
        soak(grade("42CrMo4"), temp, time, grain)
    assert caught.value.quantity == quantity
