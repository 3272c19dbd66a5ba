"""Where a stage stops, what is noted on the way, and the steps' independence of pauses.

Exact: a lump of one temperature under a constant film,
``T = T_bath + (T_0 - T_bath) exp(-t / tau)``, ``tau = rho cp L / h``; a slab by
its series.
"""

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.optimize import brentq
from trial import Face, around, constant, start

from midradius.fem import coupled, march
from midradius.fem.coupled import Until
from midradius.fem.grids import axis, line
from midradius.thermo.arrays import Array

HOT, BATH = 1173.15, 333.15
LEVELS = np.array([1073.15, 973.15, 773.15])  # 800, 700, 500 degC
THICK, HTC, DENSITY, CP = 0.02, 500.0, 8000.0, 500.0
TAU = DENSITY * CP * THICK / HTC
# conducts so well that it is one lump: Biot number 1e-7
LUMP = constant(k=1e8, density=DENSITY, cp=CP)
LUMP_BODY = line(axis(0.0, THICK, 4, fine="even", first=1.0, low=None, high="face"), "slab")
LUMP_FACE = around(Face(HTC, BATH))


def lump_temp(time: Array | float) -> Array:
    return np.asarray(BATH + (HOT - BATH) * np.exp(-np.asarray(time) / TAU))


def lump_time(temp: Array | float) -> Array:
    return np.asarray(TAU * np.log((HOT - BATH) / (np.asarray(temp) - BATH)))


def at(*nodes: int, share: tuple[float, ...] = (1.0,), temp: float) -> Until:
    return Until(np.array(nodes, dtype=np.int64), np.array(share), temp)


# the steps' errors add up to 2.4 tolerances on the way, measured
@pytest.mark.parametrize("tolerance", [1.0, 0.1, 0.01, 0.001])
def test_a_lump_follows_its_exponential_within_three_tolerances(tolerance: float) -> None:
    moments = np.array([10.0, 33.0, 100.0, 222.2, 400.0])
    run = start(LUMP_BODY, LUMP, HOT, fields=moments, watch=[0])
    assert run.stage(LUMP_FACE, duration=400.0, tolerance=tolerance) == "time"
    assert_allclose(run.time, 400.0, rtol=1e-12, atol=0.0)
    expected = np.tile(lump_temp(moments)[:, None], LUMP_BODY.n_node)
    assert_allclose(run.progress.field, expected, rtol=0.0, atol=3.0 * tolerance)
    history = run.history
    assert_allclose(history[:, 1, 0], lump_temp(history[:, 0, 0]), rtol=0.0, atol=3.0 * tolerance)


@pytest.mark.parametrize("tolerance", [1.0, 0.1, 0.01])
@pytest.mark.parametrize("limit", [1172.9, 1000.0, 423.15, 340.0])
def test_a_stage_stops_within_a_hundredth_of_a_kelvin_of_its_limit(
    limit: float, tolerance: float
) -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    ended = run.stage(LUMP_FACE, duration=1e5, tolerance=tolerance, until=at(0, temp=limit))
    assert ended == "limit"
    assert_allclose(run.progress.temp[0], limit, rtol=0.0, atol=0.01)
    # the moment is as good as the temperature on the way
    slope = (limit - BATH) / TAU
    error = (0.01 + 3.0 * tolerance) / slope
    assert_allclose(run.time, lump_time(limit), rtol=0.0, atol=error)


def test_a_node_that_starts_on_a_mark_is_marked_when_it_leaves_it() -> None:
    marks = np.full(march.N_MARK, -1.0)
    level = march.MARKS_K[0]
    march._mark(marks, 0.0, 1.0, level, level, level)  # it stands still: nothing yet
    assert marks[0] == -1.0
    march._mark(marks, 7.0, 1.0, level, level - 0.5, level - 1.0)
    assert_allclose(marks[0], 7.0, rtol=0.0, atol=1e-12)


def test_a_stage_stops_where_two_nodes_share_the_limit() -> None:
    body = line(axis(0.0, 0.05, 64, fine="high", first=5e-4, low=None, high="face"), "slab")
    stuff = constant(k=30.0, density=DENSITY, cp=CP)
    run = start(body, stuff, HOT)
    until = at(20, 21, share=(0.3, 0.7), temp=600.0)
    assert run.stage(around(Face(2000.0, BATH)), duration=1e4, tolerance=0.1, until=until) == (
        "limit"
    )
    reached = 0.3 * run.progress.temp[20] + 0.7 * run.progress.temp[21]
    assert_allclose(reached, 600.0, rtol=0.0, atol=0.01)


def test_a_stage_whose_limit_is_met_already_takes_no_time() -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    ended = run.stage(LUMP_FACE, duration=10.0, tolerance=0.1, until=at(0, temp=HOT))
    assert (ended, run.time) == ("limit", 0.0)


def test_a_stage_whose_limit_is_never_met_ends_by_time() -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    until = at(0, temp=BATH - 1.0)
    assert run.stage(LUMP_FACE, duration=50.0, tolerance=0.1, until=until) == "time"
    assert_allclose(run.time, 50.0, rtol=1e-12, atol=0.0)


def test_a_lump_is_marked_when_it_passes_800_700_and_500_degc() -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    run.stage(LUMP_FACE, duration=600.0, tolerance=1e-3)
    marks = run.progress.marks
    # of 320 s; measured 4.5e-4 s
    expected = np.tile(lump_time(LEVELS), (LUMP_BODY.n_node, 1))
    assert_allclose(marks[:, :3], expected, rtol=0.0, atol=6e-4)
    # cooling rate at 700 degC, 4 K/s; measured 5e-6
    assert_allclose(marks[:, 3], (973.15 - BATH) / TAU, rtol=0.0, atol=7e-6)


def test_every_depth_of_a_slab_is_marked_when_the_series_says() -> None:
    thick, htc, k = 0.05, 2000.0, 30.0
    alpha = k / (DENSITY * CP)
    body = line(axis(0.0, thick, 128, fine="high", first=2.5e-4, low=None, high="face"), "slab")
    run = start(body, constant(k=k, density=DENSITY, cp=CP), HOT)
    run.stage(around(Face(htc, BATH)), duration=300.0, tolerance=1e-3)
    for node in (0, 64, 128):
        place = body.points[node, 0] / thick

        def temp(time: float, place: float = place) -> float:
            fourier = alpha * time / thick**2
            theta = exact.theta("slab", biot=htc * thick / k, fourier=fourier, place=place)
            return float(BATH + (HOT - BATH) * theta[0])

        times = [brentq(lambda t, x=x: temp(t) - x, 1e-2, 300.0, xtol=1e-10) for x in LEVELS]
        marks = run.progress.marks[node]
        # measured 1.1e-3 s and 6.4e-5 of the rate
        assert_allclose(marks[:3], times, rtol=0.0, atol=1.45e-3)
        h = 1e-3 * times[1]
        rate = (temp(times[1] - h) - temp(times[1] + h)) / (2.0 * h)
        assert_allclose(marks[3], rate, rtol=8.5e-5, atol=0.0)


def test_what_is_not_passed_is_not_marked() -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    run.stage(LUMP_FACE, duration=float(lump_time(900.0)), tolerance=0.1)
    marks = run.progress.marks
    assert (marks[:, :2] > 0.0).all()
    assert_allclose(marks[:, 2], coupled.NEVER_MARKED, rtol=0.0, atol=0.0)


def test_marks_are_those_of_the_first_passage() -> None:
    run = start(LUMP_BODY, LUMP, HOT)
    run.stage(LUMP_FACE, duration=300.0, tolerance=0.01)
    first = run.progress.marks.copy()
    run.stage(around(Face(HTC, 1400.0)), duration=300.0, tolerance=0.01)
    assert run.progress.temp.min() > LEVELS[0]
    run.stage(LUMP_FACE, duration=600.0, tolerance=0.01)
    done = first >= 0.0
    assert done[:, :2].all()
    assert_allclose(run.progress.marks[done], first[done], rtol=0.0, atol=0.0)


def test_pauses_change_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    body = line(axis(0.0, 0.05, 64, fine="high", first=5e-4, low=None, high="face"), "cylinder")
    stuff = constant(k=30.0, density=DENSITY, cp=CP)
    runs = []
    for rows in (512, 7):
        monkeypatch.setattr(coupled, "HISTORY_ROWS", rows)
        run = start(body, stuff, HOT, fields=[1.0, 20.0], watch=[0, 64])
        run.stage(around(Face(2000.0, BATH)), duration=60.0, tolerance=1e-2)
        runs.append(run)
    whole, paused = runs
    assert whole.progress.clock[march.TAKEN] > 21
    assert_allclose(paused.progress.temp, whole.progress.temp, rtol=0.0, atol=1e-10)
    assert_allclose(paused.history, whole.history, rtol=1e-12, atol=1e-10)
    assert_allclose(paused.progress.field, whole.progress.field, rtol=0.0, atol=1e-10)
    assert_allclose(paused.progress.zone_heat, whole.progress.zone_heat, rtol=1e-12, atol=0.0)


def test_fields_are_kept_at_the_start_and_at_the_end_of_a_stage() -> None:
    run = start(LUMP_BODY, LUMP, HOT, fields=[0.0, 50.0, 100.0])
    run.stage(LUMP_FACE, duration=50.0, tolerance=0.01)
    assert_allclose(run.progress.field[0], HOT, rtol=0.0, atol=0.0)
    assert_allclose(run.progress.field[1], run.progress.temp, rtol=0.0, atol=1e-9)
    assert np.isnan(run.progress.field[2]).all()
    run.stage(LUMP_FACE, duration=50.0, tolerance=0.01)
    assert_allclose(run.progress.field[2], run.progress.temp, rtol=0.0, atol=1e-9)
