"""A cooler that fails: which load is the worst, and what the bath does then."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.fluids import fluid
from midradius.study.bath import LONGEST_STEP, Immersion, Tank
from midradius.study.bathcooler import Cooler
from midradius.study.shift import cooler_failure, loads_in, through
from midradius.thermo.arrays import Array, IntArray

USUAL = 333.15
DAY = 7200.0


class Steady:
    """A load of so much heat [J], given evenly over its stay [s]; 10 % less with film 1."""

    def __init__(self, heat: float, stay: float) -> None:
        self.given, self.stay = heat, stay

    def immersion(self, time: float, variant: IntArray) -> Immersion:
        share = self.given * np.where(variant == 0, 1.0, 0.9)

        def heat(seconds: Array, temp: Array) -> Array:
            return np.minimum(seconds / self.stay, 1.0)[:, None] * share

        return Immersion(time, self.stay, 0.0, heat)


def tank(per_kelvin: float) -> Tank:
    cooler = Cooler(per_kelvin, 298.15, 0.0, "")
    return Tank(fluid("medium quench oil"), 3400.0, 3.0, 293.15, cooler, USUAL, lid=True)


@pytest.fixture
def loads() -> list[tuple[Steady, float]]:
    short, long = Steady(80e6, 30.0), Steady(160e6, 3000.0)
    return [(short, 0.0), (long, 1200.0), (short, 6000.0)]


def test_the_worst_load_is_the_hottest_without_its_cooler_not_the_hottest_of_the_day(
    loads: list[tuple[Steady, float]],
) -> None:
    asked = tank(20e3)
    shift = through(
        asked,
        [kind.immersion(time, np.arange(2)) for kind, time in loads],
        period=DAY,
        morning=np.full(2, USUAL),
        repeats=True,
    )
    rows = loads_in(shift.steady, shift.loads, DAY)
    assert rows[1].hottest[0] < rows[0].hottest[0]
    found = cooler_failure(asked, loads, shift, limit=USUAL + 15.0)
    assert found is not None
    assert_allclose(found.at, 1200.0, rtol=0.0, atol=0.0)
    # nothing leaves the bath but through the cooler: its heat content says how hot it gets
    oil = asked.fluid
    for hottest, share, before in zip(found.band[::-1], (1.0, 0.9), rows[1].before, strict=True):
        content = oil.enthalpy(before) + share * 160e6 / asked.fill_mass
        assert_allclose(hottest, oil.temp_of(content), rtol=0.0, atol=1e-6)
    assert_allclose(found.hottest, found.band[1], rtol=0.0, atol=0.0)
    # failing with the first load of the day, all three stay in the oil
    content = oil.enthalpy(rows[0].before[0]) + 320e6 / asked.fill_mass
    assert_allclose(found.hottest_if_loads_go_on, oil.temp_of(content), rtol=0.0, atol=1e-6)
    # and the limit is passed in the second, as soon as both have given that much
    lacks = asked.fill_mass * (oil.enthalpy(USUAL + 15.0) - oil.enthalpy(rows[0].before[0]))
    passes = 1200.0 + (lacks - 80e6) / 160e6 * 3000.0
    assert passes <= found.passes_limit_after <= passes + LONGEST_STEP


def test_a_tank_without_a_cooler_has_none_that_fails(loads: list[tuple[Steady, float]]) -> None:
    alone = Tank(fluid("medium quench oil"), 3400.0, 3.0, 293.15)
    shift = through(
        alone,
        [kind.immersion(time, np.arange(2)) for kind, time in loads],
        period=DAY,
        morning=np.full(2, USUAL),
        repeats=False,
    )
    assert cooler_failure(alone, loads, shift, limit=400.0) is None
