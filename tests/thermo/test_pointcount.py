"""Intervals of a point count, by the formulas of the standards and by tables of books."""

import math

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy import stats

from midradius.thermo.errors import InputFault
from midradius.thermo.pointcount import CountedFraction, from_fields, from_totals, student, wilson


def _fields(*shares: float, points: float = 100.0, level: float = 0.95) -> CountedFraction:
    return from_fields(np.array(shares), points_per_field=points, level=level)


def test_the_fields_give_mean_interval_and_relative_accuracy_as_worked_by_hand() -> None:
    # ASTM E562 (from memory): mean 0.45; squares 0.0025 + 0.0025 + 0 + 0.01 + 0.01 = 0.025,
    # s = sqrt(0.025 / 4) = 0.0790569; t(4) = 2.776; half = 2.776 x 0.0790569 / sqrt 5 = 0.09815
    counted = _fields(0.40, 0.50, 0.45, 0.35, 0.55)
    assert_allclose(counted.fraction, 0.45, rtol=1e-12, atol=0.0)
    assert_allclose(counted.high - counted.fraction, 0.09815, rtol=3e-4, atol=0.0)
    assert_allclose(counted.fraction - counted.low, 0.09815, rtol=3e-4, atol=0.0)
    assert_allclose(counted.relative_accuracy, 0.21810, rtol=3e-4, atol=0.0)
    assert (counted.n_field, counted.n_point, counted.method) == (5, 500.0, "fields")
    assert counted.notes == ()


@pytest.mark.parametrize(
    ("n_field", "multiplier"),
    [
        (5, 2.776), (6, 2.571), (10, 2.262), (15, 2.145), (20, 2.093), (30, 2.045), (60, 2.001),
        (100, 1.984),
    ],
)  # fmt: skip
def test_the_multiplier_is_that_of_the_table_of_the_standard(
    n_field: int, multiplier: float
) -> None:
    # ASTM E562, table of 95 % multipliers (from memory)
    assert_allclose(student(n_field - 1, 0.95), multiplier, rtol=0.0, atol=6e-4)


@given(freedom=st.integers(1, 500), level=st.floats(0.5, 0.999))
def test_the_multiplier_is_that_of_the_distribution(freedom: int, level: float) -> None:
    expected = stats.t.ppf(0.5 + 0.5 * level, freedom)
    assert_allclose(student(freedom, level), expected, rtol=1e-8, atol=0.0)


@pytest.mark.parametrize(
    ("hits", "points", "low", "high"),
    # Newcombe, Stat. Med. 17 (1998) 857, table I, score method (from memory)
    [(81, 263, 0.2553, 0.3662), (15, 148, 0.0624, 0.1605), (0, 20, 0.0, 0.1611),
     (1, 29, 0.0061, 0.1718)],
)  # fmt: skip
def test_a_total_has_the_interval_of_the_book(
    hits: float, points: float, low: float, high: float
) -> None:
    counted = from_totals(hits, points=points)
    assert_allclose([counted.low, counted.high], [low, high], rtol=0.0, atol=6e-5)
    assert_allclose(counted.fraction, hits / points, rtol=1e-15, atol=0.0)


@given(points=st.integers(1, 5000), part=st.floats(0.0, 1.0), level=st.floats(0.5, 0.999))
def test_a_total_agrees_with_the_library_of_statistics(
    points: int, part: float, level: float
) -> None:
    hits = round(part * points)
    counted = from_totals(hits, points=points, level=level)
    expected = stats.binomtest(hits, points).proportion_ci(level, method="wilson")
    assert_allclose([counted.low, counted.high], [expected.low, expected.high], rtol=0, atol=1e-9)
    assert 0.0 <= counted.low <= counted.fraction <= counted.high <= 1.0


def test_a_total_says_that_its_interval_is_the_least() -> None:
    counted = from_totals(412.5, points=1000)
    assert (counted.n_field, counted.n_point, counted.method) == (None, 1000.0, "totals")
    assert [str(note) for note in counted.notes] == [
        "point count: scatter = not given per field, so the interval is the least there can be, "
        "source holds for a share for every field"
    ]


def test_nothing_hit_still_leaves_an_upper_end() -> None:
    counted = from_totals(0, points=400)
    # z^2 / (n + z^2) = 3.8415 / 403.8415
    assert_allclose(counted.high, 3.8415 / 403.8415, rtol=1e-4, atol=0.0)
    assert counted.low == 0.0
    assert counted.relative_accuracy == math.inf


def test_fields_that_do_not_differ_get_the_interval_of_their_total_and_a_note() -> None:
    counted = _fields(0.3, 0.3, 0.3, points=50.0)
    assert_allclose([counted.low, counted.high], wilson(0.3, 150.0, 0.95), rtol=1e-12, atol=0.0)
    assert counted.fraction == 0.3
    assert [note.quantity for note in counted.notes] == ["scatter"]


def test_an_interval_that_leaves_zero_to_one_is_cut_and_noted() -> None:
    counted = _fields(0.0, 0.0, 0.0, 0.10)
    # mean 0.025, s 0.05, t(3) 3.1824, half 0.07956
    assert counted.low == 0.0
    assert_allclose(counted.high, 0.10456, rtol=1e-4, atol=0.0)
    assert_allclose(counted.relative_accuracy, 3.1824, rtol=1e-4, atol=0.0)
    assert [str(note) for note in counted.notes] == [
        "point count: interval = -0.055 to 0.105, cut, source holds for fractions of 0 to 1"
    ]


def test_nineteen_of_twenty_intervals_hold_the_truth() -> None:
    # fields as independent normal shares; the scatter of 4000 trials is 0.35 %
    draw = np.random.default_rng(562)
    held = 0
    for shares in draw.normal(0.4, 0.06, size=(4000, 12)):
        counted = from_fields(shares, points_per_field=100)
        held += counted.low <= 0.4 <= counted.high
    assert_allclose(held / 4000, 0.95, rtol=0.0, atol=0.012)


@example(shares=[3.5381223187420985e-120] * 2, level=0.75)
@given(
    shares=st.lists(st.floats(0.0, 1.0), min_size=2, max_size=40),
    level=st.floats(0.5, 0.99),
)
def test_the_interval_holds_the_fraction_and_grows_with_the_level(
    shares: list[float], level: float
) -> None:
    lesser, greater = (_fields(*shares, level=x) for x in (level, level + 0.009))
    assert 0.0 <= greater.low <= lesser.low + 1e-15
    assert lesser.low - 1e-12 <= lesser.fraction <= lesser.high + 1e-12
    assert lesser.high - 1e-15 <= greater.high <= 1.0


@pytest.mark.parametrize(
    ("shares", "points", "level", "message"),
    [
        ([0.4], 100, 0.95, "fields = 1, but must be two or more"),
        ([0.4, 1.2], 100, 0.95, "share of a field = 1.2, but must be 0 to 1"),
        ([0.4, math.nan], 100, 0.95, "share of a field = nan, but must be 0 to 1"),
        ([0.4, 0.5], 0, 0.95, "points per field = 0, but must be 1 or more"),
        ([0.4, 0.5], 100, 95.0, "level = 95, but must be between 0 and 1"),
    ],
)
def test_a_count_that_cannot_be_is_refused(
    shares: list[float], points: float, level: float, message: str
) -> None:
    with pytest.raises(InputFault, match=message):
        _fields(*shares, points=points, level=level)


@pytest.mark.parametrize("hits", [-1.0, 101.0, math.nan])
def test_more_hits_than_points_are_refused(hits: float) -> None:
    with pytest.raises(InputFault, match="but must be 0 to 100"):
        from_totals(hits, points=100)
