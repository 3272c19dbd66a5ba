"""Martensite that tempers itself: the kernel's sum against exact ones, and what it takes off."""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from midradius.thermo import autotemper
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import initial_state, steel_tables
from midradius.thermo.austenite import soak
from midradius.thermo.grades import grade
from midradius.thermo.kinetics import advance_node
from midradius.thermo.martensite import rate, start
from midradius.thermo.tempering import SPIES_HOLD, Temper, equivalent_temp, martensite_hv

STEEL = grade("4130")
LEFT = soak(STEEL, 1143.15, 1800.0, grain_astm=7.0)
TABLES = steel_tables(STEEL, LEFT)
BEGIN = float(start(LEFT.composition, LEFT.carbon_pct))
SPEED = float(rate(LEFT.composition, LEFT.carbon_pct))


def _quenched() -> Array:
    """Just above the martensite start, nothing but austenite."""
    state = initial_state(LEFT, STEEL.composition.C, 1143.15, 1)[0]
    advance_node(state, 1143.15, BEGIN + 0.5, 0.0, np.ones(kin.N_SCALE), TABLES)
    return state


def _time(state: Array) -> float:
    return float(state[kin.SELF_TEMPER] / state[kin.MARTENSITE])


@pytest.mark.parametrize("cooling", [300.0, 1000.0])
def test_the_sum_of_a_constant_rate_is_its_integral(cooling: float) -> None:
    # so fast that nothing but martensite forms; each kelvin weighs the martensite there is
    state, scale = _quenched(), np.ones(kin.N_SCALE)
    path = np.arange(BEGIN + 0.5, 350.0, -2.0)
    for above, below in zip(path[:-1], path[1:], strict=True):
        advance_node(state, above, below, (above - below) / cooling, scale, TABLES)

    def slope(temp: float) -> float:
        weight = np.exp((1.0 / autotemper.REFERENCE - 1.0 / temp) * 100e3 / 1.987)
        return float(-np.expm1(-SPEED * (BEGIN - temp)) * weight / cooling)

    end = -np.expm1(-SPEED * (BEGIN - path[-1]))
    exact = quad(slope, path[-1], BEGIN, epsabs=1e-14, limit=200)[0] / end
    assert state[kin.BAINITE] < 1e-3
    # passes of 2 K, over which the weight changes by a third
    assert_allclose(_time(state), exact, rtol=0.02, atol=0.0)


def test_a_hold_below_the_start_counts_as_that_temper() -> None:
    state, scale = _quenched(), np.ones(kin.N_SCALE)
    advance_node(state, BEGIN + 0.5, 300.0, 0.0, scale, TABLES)
    advance_node(state, 300.0, 573.15, 0.0, scale, TABLES)
    advance_node(state, 573.15, 573.15, 7200.0, scale, TABLES)
    told = autotemper.equivalent_temp(np.array([_time(state)]), hold=SPIES_HOLD)[0]
    asked = equivalent_temp((Temper(573.15, 7200.0),), hold=SPIES_HOLD)
    assert_allclose(told, asked, rtol=0.0, atol=0.05)


def test_natural_cooling_takes_nothing_off() -> None:
    carbon, rates = np.full(4, LEFT.carbon_pct), np.array([0.1, 1.0, 10.0, 100.0])
    natural = autotemper.natural_time(LEFT.composition, carbon, rates)
    off = autotemper.softening(np.full(4, 520.0), STEEL.composition, time=natural, natural=natural)
    assert_allclose(off, 0.0, rtol=0.0, atol=1e-12)


def test_natural_time_is_its_integral() -> None:
    def slope(temp: float) -> float:
        weight = np.exp((1.0 / autotemper.REFERENCE - 1.0 / temp) * 100e3 / 1.987)
        formed = -np.expm1(-SPEED * (BEGIN - temp))
        return float(formed * weight * 680.0 / (5.0 * (temp - 293.15)))

    end = -np.expm1(-SPEED * (BEGIN - 293.15))
    exact = quad(slope, 300.0, BEGIN, epsabs=1e-14, limit=300)[0] / end
    found = autotemper.natural_time(LEFT.composition, np.array([LEFT.carbon_pct]), np.array([5.0]))
    assert_allclose(found, [exact], rtol=5e-3, atol=0.0)


def test_a_long_hold_takes_off_what_its_temper_would() -> None:
    # nothing natural behind it: the whole of the temper's own softening
    hard, temper = np.array([520.0]), Temper(623.15, SPIES_HOLD)
    time = autotemper.weight(np.array([623.15])) * SPIES_HOLD
    off = autotemper.softening(hard, STEEL.composition, time=time, natural=np.array([1e-20]))
    expected = hard - martensite_hv(hard, STEEL.composition, (temper,))
    assert_allclose(off, expected, rtol=1e-9, atol=0.0)


def test_a_tenfold_natural_time_softens_less_than_the_rate_term_of_the_hardness() -> None:
    # Maynier 1978 (memory): 21 HV per tenfold rate. Were the model's own figure larger, the
    # term could not hold it and leaving natural cooling alone would be wrong.
    carbon = np.full(2, LEFT.carbon_pct)
    natural = autotemper.natural_time(LEFT.composition, carbon, np.array([10.0, 1.0]))
    at = autotemper.equivalent_temp(natural, hold=SPIES_HOLD)
    tempers = [(Temper(float(t), SPIES_HOLD),) for t in at]
    hv = [float(martensite_hv(np.array(520.0), STEEL.composition, t)) for t in tempers]
    assert 1.0 < hv[0] - hv[1] < 21.0
