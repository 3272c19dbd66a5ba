"""Measured isothermal curves: what is fitted, and growth along a path by additivity."""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from midradius.thermo import kinetics as kin
from midradius.thermo.assemble import initial_state, steel_tables
from midradius.thermo.austenite import soak
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import Tables, advance_node
from midradius.thermo.measuredrates import Held, avrami, clock, martensite, product
from midradius.thermo.ratechoice import Kinetics, Measured, MeasuredProduct
from midradius.thermo.steel import Composition, Steel

STEEL = Steel("plain", Composition(C=0.76, Mn=0.7), "a test", "given")
LOW, HIGH = 773.15, 973.15
NEVER = tuple(
    MeasuredProduct(name, (LOW, HIGH), (1e12, 1e12), (2.0, 2.0))
    for name in ("ferrite", "bainite", "cementite")
)


def law(temp: float) -> float:
    """A C curve that straight logarithms between its knots describe exactly [s]."""
    return float(np.exp(np.interp(temp, [LOW, 853.15, HIGH], np.log([30.0, 2.0, 400.0]))))


def measured(exponent: float) -> MeasuredProduct:
    """What an observer of the law writes down: 1 and 99 % at seven temperatures."""

    def when(temp: float, share: float) -> float:
        return law(temp) * float(-np.log1p(-share)) ** (1.0 / exponent)

    temps = (LOW, 813.15, 853.15, 883.15, 913.15, 943.15, HIGH)
    return product(
        "pearlite", [Held(t, (when(t, 0.01), when(t, 0.99)), (0.01, 0.99)) for t in temps]
    )


def tables(exponent: float) -> Tables:
    left = soak(STEEL, 1123.15, 1800.0, grain_astm=7.0)
    chosen = Kinetics(measured=Measured("made.csv", (measured(exponent), *NEVER)))
    return steel_tables(STEEL, left, chosen=chosen)


@pytest.mark.parametrize("exponent", [1.0, 2.5, 4.0])
@pytest.mark.parametrize("rate", [0.5, 3.0, 12.0])
def test_constant_cooling_rates_give_the_exact_additive_growth(
    exponent: float, rate: float
) -> None:
    left = soak(STEEL, 1123.15, 1800.0, grain_astm=7.0)
    state = initial_state(left, STEEL.composition.C, 1123.15, 1)[0]
    made, scale = tables(exponent), np.ones(kin.N_SCALE)
    path = np.arange(HIGH, LOW - 0.5, -0.5)
    advance_node(state, 1123.15, HIGH, 0.0, scale, made)
    for above, below in zip(path[:-1], path[1:], strict=True):
        advance_node(state, above, below, 0.5 / rate, scale, made)
    # isokinetic: X = 1 - exp(-K^n) with K the integral of dt / tau, exact for any path
    spent = quad(lambda t: 1.0 / law(t), LOW, HIGH, points=[853.15], epsabs=1e-10)[0] / rate
    assert_allclose(state[kin.PEARLITE], -np.expm1(-(spent**exponent)), rtol=1e-3, atol=1e-5)


def test_a_measurement_acts_only_between_its_temperatures() -> None:
    rate, _ = clock(measured(2.0), np.array([LOW - 1.0, LOW, 853.15, HIGH, HIGH + 1.0]))
    assert_allclose(rate, [0.0, 1.0 / 30.0, 0.5, 1.0 / 400.0, 0.0], rtol=1e-9, atol=0.0)


def test_two_points_are_met_exactly() -> None:
    tau, exponent = avrami(Held(900.0, (3.0, 40.0), (0.01, 0.99)))
    share = -np.expm1(-((np.array([3.0, 40.0]) / tau) ** exponent))
    assert_allclose(share, [0.01, 0.99], rtol=1e-12, atol=0.0)


def test_more_points_are_met_by_least_squares() -> None:
    # x = ln t on y = ln(-ln(1 - X)): the line of numpy's own polynomial fit
    time, share = np.array([2.0, 5.0, 7.0, 16.0]), np.array([0.02, 0.3, 0.6, 0.97])
    slope, offset = np.polyfit(np.log(-np.log1p(-share)), np.log(time), 1)
    tau, exponent = avrami(Held(900.0, tuple(time), tuple(share)))
    assert_allclose([tau, exponent], [np.exp(offset), 1.0 / slope], rtol=1e-12, atol=0.0)


def test_points_that_do_not_rise_together_are_refused() -> None:
    with pytest.raises(InputFault, match="a larger fraction after a longer time"):
        avrami(Held(900.0, (3.0, 40.0), (0.5, 0.2)))


def test_martensite_rows_give_start_and_rate() -> None:
    share = {t: 1.0 - float(np.exp(-0.011 * (500.0 - t))) for t in (480.0, 440.0, 400.0)}
    assert_allclose(martensite(share), (500.0, 0.011), rtol=1e-9, atol=0.0)
    assert_allclose(martensite({500.0: 0.0, **share}), (500.0, 0.011), rtol=1e-9, atol=0.0)
    assert martensite({500.0: 0.0}) == (500.0, None)
    assert martensite({}) == (None, None)


def test_a_measured_start_is_that_of_the_tables() -> None:
    left = soak(STEEL, 1123.15, 1800.0, grain_astm=7.0)
    chosen = Kinetics(measured=Measured("made.csv", (), (), 510.0, 0.02))
    made = steel_tables(STEEL, left, chosen=chosen)
    for (base, fall, power), wanted in ((made.start[0], 510.0), (made.rate[0], 0.02)):
        assert_allclose(
            base - fall * -np.expm1(-power * left.carbon_pct), wanted, rtol=1e-9, atol=0
        )
