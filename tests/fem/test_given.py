"""Nodes carried along given temperatures, against exact integrals and another cubic."""

import weakref
from collections.abc import Iterator

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad
from scipy.interpolate import PchipInterpolator

from midradius.fem.follow import end_slopes, slopes
from midradius.fem.given import Followed, follow
from midradius.fem.histories import Histories
from midradius.thermo import clocks, extension, kinetics
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import initial_state, steel_tables
from midradius.thermo.austenite import Austenite, soak
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.kinetics import Tables
from midradius.thermo.phases import BAINITE, FERRITE, MARTENSITE, PEARLITE

SOAK = 860.0 + 273.15
STEEL = grade("42CrMo4")
AE1 = equilibrium(STEEL.composition).ae1


def soaked() -> Austenite:
    return soak(STEEL, SOAK, 3600.0)


def tables_of(*kept: int) -> Tables:
    """The steel with the rates of these products alone."""
    tables = steel_tables(STEEL, soaked())
    value = tables.value.copy()
    every = (
        *(kinetics.RATE_FERRITE, kinetics.RATE_PEARLITE, kinetics.RATE_BAINITE),
        *(kinetics.RATE_CEMENTITE, kinetics.LIMIT_FERRITE, kinetics.LIMIT_CEMENTITE),
    )
    for column in set(every) - set(kept):
        value[..., column] = 0.0
    return tables._replace(value=value)


def histories(times: Array, temps: Array) -> Histories:
    return Histories(times, temps.shape[1], lambda: iter(temps), "a test")


def followed(times: Array, temps: Array, tables: Tables, starts: float | None = None) -> Followed:
    state = initial_state(soaked(), STEEL.composition.C, SOAK, 1)[0]
    watch = np.arange(temps.shape[1])
    return follow(histories(times, temps), tables, state=state, starts=starts, ae1=AE1, watch=watch)


def clock(fraction: float, power: float) -> float:
    """The integral of the clocks by an adaptive rule; x = y^(1/(1-p)) takes its end out."""
    stretch = 1.0 / (1.0 - power)

    def of(y: float) -> float:
        x = y**stretch
        return float(stretch * x**power / (x ** (power * (1.0 - x)) * (1.0 - x) ** (power * x)))

    return float(quad(of, 0.0, fraction ** (1.0 - power), epsabs=1e-12)[0])


@pytest.mark.parametrize(
    ("column", "phase", "shape"),
    [
        (kinetics.RATE_PEARLITE, PEARLITE, extension.PEARLITE_SHAPE),
        (kinetics.RATE_BAINITE, BAINITE, clocks.LI),
    ],
)
def test_one_product_at_a_constant_cooling_rate_meets_the_integral_of_additivity(
    column: int, phase: int, shape: clocks.Shape
) -> None:
    tables = tables_of(column)
    temp = np.linspace(SOAK, 620.0, 400_001)
    grid = tables.first + tables.step * np.arange(tables.value.shape[1])
    ticks = np.trapezoid(np.interp(temp, grid, tables.value[0, :, column]), -temp)
    for exact in (0.05, 0.3, 0.6, 0.9):
        rate = ticks / clock(exact, shape.power)
        times = np.linspace(0.0, (SOAK - 620.0) / rate, 30)
        found = followed(times, SOAK - rate * times[:, None], tables)
        assert_allclose(found.lines.phases[phase, 0], exact, rtol=0.0, atol=3e-4)


def test_a_jump_below_the_nose_leaves_the_martensite_of_the_exponential_law() -> None:
    tables = tables_of()
    carbon = soaked().carbon_pct
    a, b, c = tables.start[0]
    start = a - b * (1.0 - np.exp(-c * carbon))
    p, q, r = tables.rate[0]
    speed = p - q * (1.0 - np.exp(-r * carbon))
    times = np.arange(6.0)
    temps = np.linspace(SOAK, 293.15, 6)[:, None]
    found = followed(times, temps, tables)
    exact = 1.0 - np.exp(-speed * (start - 293.15))
    assert_allclose(found.lines.phases[MARTENSITE, 0], exact, rtol=0.0, atol=1e-9)


def test_constant_cooling_is_timed_exactly_between_samples() -> None:
    rate = np.array([0.3, 4.0])
    times = np.array([0.0, 1.0, 40.0, 55.0, 160.0, 2500.0])
    temps = np.maximum(SOAK - rate * times[:, None], 300.0)
    # every sample of the slow node lies on its line, of the fast one until 40 s
    found = followed(times, temps, tables_of())
    assert_allclose(found.lines.rate_700[0], 0.3, rtol=1e-12, atol=0.0)
    assert_allclose(found.lines.time_800_500[0], 1000.0, rtol=1e-12, atol=0.0)
    assert_allclose(found.lines.rate_700[1], 4.0, rtol=1e-12, atol=0.0)


@pytest.mark.parametrize("name", ["C45E", "42CrMo4", "100Cr6"])
def test_how_a_straight_line_is_sampled_changes_nothing(name: str) -> None:
    steel = grade(name)
    left = soak(steel, SOAK, 3600.0)
    tables = steel_tables(steel, left)
    state = initial_state(left, steel.composition.C, SOAK, 1)[0]
    share = np.linspace(0.0, 1.0, 1501)
    ends = (SOAK - 300.0) / np.geomspace(0.02, 40.0, 12)
    for end in ends:
        temps = (SOAK - share * (SOAK - 300.0))[:, None]
        phases = []
        for step in (1, 30):
            given = histories(end * share[::step], temps[::step])
            found = follow(given, tables, state=state, starts=None, ae1=0.0, watch=np.array([0]))
            phases.append(found.lines.phases)
        assert_allclose(phases[1], phases[0], rtol=0.0, atol=1.5e-3)


@pytest.mark.parametrize("hold_degC", [640.0, 560.0, 480.0])
def test_a_hold_in_which_products_compete_needs_no_samples_on_its_way(hold_degC: float) -> None:
    # jump in 1 s, hold for 3 h: once with two samples, once with 5,000
    tables = steel_tables(STEEL, soaked())
    hold, end = hold_degC + 273.15, 10_800.0
    found = []
    for many in (1, 5000):
        times = np.concatenate([[0.0], np.linspace(1.0, end, many + 1), end + np.array([60.0, 70])])
        temps = np.full(len(times), hold)
        temps[0], temps[-2:] = SOAK, 320.0
        found.append(followed(times, temps[:, None], tables).lines.phases[:, 0])
    # measured: 1.4e-4 at most
    assert_allclose(found[0], found[1], rtol=0.0, atol=5e-4)


@pytest.mark.parametrize("count", [40, 41])
def test_every_second_sample_is_what_a_file_of_those_alone_would_give(count: int) -> None:
    tables = steel_tables(STEEL, soaked())
    times = np.linspace(0.0, 900.0, count)
    temps = newton(times, np.array([60.0, 200.0]))
    kept = np.unique([*range(0, count, 2), count - 1])
    halved = followed(times, temps, tables).halved
    alone = followed(times[kept], temps[kept], tables).lines
    assert_allclose(halved.phases, alone.phases, rtol=0.0, atol=1e-12)
    assert_allclose(halved.rate_700, alone.rate_700, rtol=1e-12, atol=0.0)


def test_slopes_are_those_of_the_monotone_cubic_of_another_library() -> None:
    rng = np.random.default_rng(1)
    times = np.cumsum(rng.uniform(0.1, 3.0, 40))
    temps = np.cumsum(rng.normal(0.0, 1.0, (40, 7)), axis=0)
    reference = PchipInterpolator(times, temps).derivative()(times)
    spans, rises = np.diff(times), np.diff(temps, axis=0)
    for k in range(1, 39):
        own = slopes((spans[k - 1], spans[k]), (rises[k - 1], rises[k]))
        assert_allclose(own, reference[k], rtol=1e-9, atol=1e-9)
    first = end_slopes((spans[0], spans[1]), (rises[0], rises[1]))
    last = end_slopes((spans[-1], spans[-2]), (rises[-1], rises[-2]))
    assert_allclose(first, reference[0], rtol=1e-9, atol=1e-9)
    assert_allclose(last, reference[-1], rtol=1e-9, atol=1e-9)


def newton(times: Array, pace: Array) -> Array:
    """A part that gives off heat through a film: exact exponentials [K]."""
    return 330.0 + (SOAK - 330.0) * np.exp(-times[:, None] / pace[None, :])


def test_the_stated_errors_hold_against_the_curve_itself() -> None:
    # five steps of sampling of eight curves, against 40 times as many samples
    tables = steel_tables(STEEL, soaked())
    pace = np.geomspace(8.0, 2000.0, 8)
    for count in (24, 40, 64, 100, 160):
        # even in temperature for the middle curve, hence uneven for all others
        share = np.linspace(0.0, 1.0, count)
        times = -300.0 * np.log1p(-0.97 * share)
        fine = np.interp(np.linspace(0.0, 1.0, 40 * (count - 1) + 1), share, times)
        many = fine[:, None] / 300.0 * pace[None, :]
        # each node has its own clock: one run for each
        for k in range(len(pace)):
            truth = followed(many[:, k], newton(many[:, k], pace[k : k + 1]), tables)
            own = times / 300.0 * pace[k]
            found = followed(own, newton(own, pace[k : k + 1]), tables)
            stated = np.maximum(
                np.abs(found.lines.phases - found.halved.phases) / 3.0,
                np.abs(found.lines.phases - found.cubic.phases),
            )
            off = np.abs(found.lines.phases - truth.lines.phases)
            assert (off <= 1.5 * stated + 2e-3).all(), (count, pace[k], off - stated)


def test_the_soak_may_end_between_two_samples() -> None:
    tables = steel_tables(STEEL, soaked())
    times = np.linspace(0.0, 900.0, 181)
    hot = np.where(times < 300.0, 20.0 + 273.15 + times * 2.8, SOAK)
    temps = np.where(times > 402.0, SOAK - 1.5 * (times - 402.0), hot)[:, None]
    temps = np.maximum(temps, 300.0)
    found = followed(times, temps, tables, starts=402.0)
    assert_allclose(found.times[:3], [0.0, 3.0, 8.0], rtol=0.0, atol=1e-12)
    direct = np.concatenate([[402.0], times[81:]])
    same = followed(direct, np.maximum(SOAK - 1.5 * (direct - 402.0), 300.0)[:, None], tables)
    # only the line through 400 and 405 s bends the start, by 0.9 K
    assert_allclose(found.lines.phases, same.lines.phases, rtol=0.0, atol=1e-4)


def test_no_more_than_a_few_samples_are_held_at_a_time() -> None:
    alive = most = 0

    class Sample(np.ndarray):  # type: ignore[type-arg]
        """An array that can be watched."""

    def gone() -> None:
        nonlocal alive
        alive -= 1

    def samples() -> Iterator[Array]:
        nonlocal alive, most
        for k in range(200):
            one = np.full(50, SOAK - 4.0 * k).view(Sample)
            weakref.finalize(one, gone)
            alive += 1
            most = max(most, alive)
            yield one
            del one

    given = Histories(np.arange(200.0), 50, samples, "a test")
    state = initial_state(soaked(), STEEL.composition.C, SOAK, 1)[0]
    follow(given, tables_of(), state=state, starts=None, ae1=AE1, watch=np.empty(0, dtype=np.int64))
    assert most <= 6


def refused(times: Array, temps: Array, starts: float | None = None) -> str:
    with pytest.raises(InputFault) as caught:
        followed(times, temps, steel_tables(STEEL, soaked()), starts)
    return str(caught.value)


COOLING = SOAK - np.linspace(0.0, 800.0, 9)[:, None]
CLOCK = np.linspace(0.0, 80.0, 9)


def test_a_missing_temperature_is_named_by_node_and_time() -> None:
    temps = np.repeat(COOLING, 3, axis=1)
    temps[4, 2] = np.nan
    assert "no number for node 2 at 40 s" in refused(CLOCK, temps)


def test_temperatures_that_no_steel_has_point_at_their_unit() -> None:
    text = refused(CLOCK, COOLING + 1000.0)
    assert "Check temperature_unit" in text


def test_a_history_that_begins_cold_is_told_how_to_name_the_end_of_its_soak() -> None:
    text = refused(CLOCK, COOLING - 300.0)
    assert text.startswith("temperatures.starts_at = node 0 is at 560 degC at 0 s, but must be")
    assert "above Ae1" in text and 'starts_at = "12 min"' in text


def test_a_history_that_is_heated_again_is_refused_with_node_and_time() -> None:
    times = np.linspace(0.0, 4000.0, 41)
    temps = np.where(times < 3500.0, SOAK - 0.1 * times, SOAK)[:, None]
    text = refused(times, temps)
    assert "node 0 comes back to 860 degC at 3500 s, when" in text
    assert "Austenite that forms again is not computed" in text


def test_a_start_outside_the_file_and_too_few_samples_are_refused() -> None:
    assert "within the file, which runs from 0 to 80 s" in refused(CLOCK, COOLING, 80.0)
    assert "4 samples from the end of the soak on" in refused(CLOCK[:4], COOLING[:4])


def test_ferrite_that_forms_above_ae1_is_no_reheating() -> None:
    times = np.linspace(0.0, 60_000.0, 601)
    temps = (SOAK - 0.009 * times)[:, None]
    found = followed(times, np.maximum(temps, 330.0), steel_tables(STEEL, soaked()))
    assert found.lines.phases[FERRITE, 0] > 0.1
