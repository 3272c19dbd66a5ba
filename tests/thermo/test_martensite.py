"""What must hold of martensite whatever the steel."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import martensite
from midradius.thermo.steel import Composition

CARBON = st.floats(0.05, 1.5)
TEMP = st.floats(100.0, 1200.0)


@given(carbon=CARBON, one=TEMP, other=TEMP)
def test_colder_never_means_less_martensite(carbon: float, one: float, other: float) -> None:
    steel = Composition(C=carbon, Mn=0.8, Cr=1.0)
    start, rate = martensite.start(steel, carbon), martensite.rate(steel, carbon)
    warm, cold = max(one, other), min(one, other)
    more = martensite.fraction(cold, start=start, rate=rate)
    less = martensite.fraction(warm, start=start, rate=rate)
    assert 0.0 <= less <= more <= 1.0


@given(carbon=CARBON)
def test_there_is_no_martensite_at_its_start(carbon: float) -> None:
    steel = Composition(C=carbon)
    start = martensite.start(steel, carbon)
    assert martensite.fraction(start, start=start, rate=martensite.rate(steel, carbon)) == 0.0


def test_carbon_lowers_the_start_and_the_rate() -> None:
    carbon = np.linspace(0.0, 1.5, 31)
    steel = Composition(C=0.4, Mn=0.8)
    assert np.all(np.diff(martensite.start(steel, carbon)) < 0.0)
    assert np.all(np.diff(martensite.rate(steel, carbon)) < 0.0)
    assert np.all(martensite.rate(steel, carbon) > 0.0)


@given(carbon=CARBON)
def test_the_coefficients_give_the_start_and_rate_in_plain_numbers(carbon: float) -> None:
    steel = Composition(C=carbon, Mn=0.7, Si=0.3, Cr=1.0, Ni=1.5, Mo=0.2)
    for coefficients, function in (
        (martensite.start_coefficients, martensite.start),
        (martensite.rate_coefficients, martensite.rate),
    ):
        base, amplitude, exponent = coefficients(steel)
        plain = base - amplitude * (1.0 - np.exp(-exponent * carbon))
        assert_allclose(function(steel, carbon), plain, rtol=1e-12, atol=0.0)


def test_a_start_outside_the_range_of_the_formula_is_noted() -> None:
    assert [n.quantity for n in martensite.range_notes(Composition(C=0.4, Si=2.5))] == ["Si"]
    assert martensite.range_notes(Composition(C=0.4)) == ()
