"""Severity of quench, ideal and actual diameter, equivalent end-quench distance."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.special import j0, j1, jn_zeros

from midradius.thermo import severity as s
from midradius.thermo.errors import InputFault

INCH = 0.0254
SIXTEENTH = INCH / 16.0
# t = (d / 2 mm)^1.5 s: a power law is straight in logarithms
POWER = s.EndQuenchTimes(1e-3 * np.arange(1.0, 51.0), np.arange(1.0, 51.0) ** 1.5 / 2.0**1.5)


def test_severity_is_the_film_over_twice_the_conductivity() -> None:
    # 2362 W/(m2 K) at 30 W/(m K) is H = 1 per inch: 2 x 30 / 0.0254 = 2362.2
    assert_allclose(s.severity(2362.2, conductivity=30.0) * INCH, 1.0, rtol=1e-5, atol=0.0)
    assert_allclose(s.film(1.0 / INCH, conductivity=28.0), 2204.72, rtol=1e-5, atol=0.0)


def test_the_half_time_of_an_ideal_quench_solves_the_series_of_bessel_zeros() -> None:
    # theta = sum 2 / (z J1(z)) exp(-z^2 Fo), Carslaw & Jaeger ch. VII (from memory)
    z = jn_zeros(0, 30)
    fourier = s.half_time_fourier(math.inf)
    assert_allclose(np.sum(2.0 / (z * j1(z)) * np.exp(-(z**2) * fourier)), 0.5, rtol=0, atol=1e-13)
    # first term alone: ln(2 x 1.6020) / 5.7832 = 0.2013, the second takes 0.4 % off it
    assert_allclose(fourier, 0.2013, rtol=5e-3, atol=0.0)


@pytest.mark.parametrize("biot", [0.1, 1.0, 10.0])
def test_the_half_time_solves_the_one_term_series_of_its_table_value(biot: float) -> None:
    # one-term roots and coefficients of a round, printed in heat transfer books (from memory)
    root, weight = {0.1: (0.4417, 1.0246), 1.0: (1.2558, 1.2071), 10.0: (2.1795, 1.5677)}[biot]
    one_term = math.log(2.0 * weight) / root**2
    # printed to four figures; the terms left out take up to 0.3 % off
    assert_allclose(s.half_time_fourier(biot), one_term, rtol=4e-3, atol=0.0)


def test_a_mild_quench_is_that_of_a_lumped_body() -> None:
    # m c dT/dt = -h A T of a round: Fo = ln 2 / (2 Bi), first correction + ln 2 / 8 - ...
    for biot in (1e-9, 1e-8, 1e-6, 1e-4):
        lumped = math.log(2.0) / (2.0 * biot)
        assert_allclose(s.half_time_fourier(biot), lumped, rtol=biot, atol=0.0)


def test_the_half_time_falls_with_the_film_towards_that_of_an_ideal_quench() -> None:
    times = np.array([s.half_time_fourier(biot) for biot in np.geomspace(1e-9, 1e9, 200)])
    assert np.all(np.diff(times) < 0.0)
    assert_allclose(times[-1], s.half_time_fourier(math.inf), rtol=1e-8, atol=0.0)


def test_an_ideal_quench_leaves_the_diameter_as_it_is() -> None:
    assert_allclose(s.ideal_of_actual(0.05, severity=math.inf), 0.05, rtol=1e-12, atol=0.0)
    assert_allclose(s.actual_of_ideal(0.05, severity=math.inf), 0.05, rtol=1e-12, atol=0.0)


def test_ideal_and_actual_diameter_cool_their_middles_equally_fast() -> None:
    # half-temperature times with any diffusivity
    actual, severity, diffusivity = 0.040, 0.35 / INCH, 5.8e-6
    ideal = s.ideal_of_actual(actual, severity=severity)
    time = s.half_time_fourier(severity * actual) * (actual / 2.0) ** 2 / diffusivity
    z = jn_zeros(0, 30)
    decay = np.exp(-(z**2) * diffusivity * time / (ideal / 2.0) ** 2)
    assert_allclose(np.sum(2.0 / (z * j1(z)) * decay), 0.5, rtol=0.0, atol=1e-12)


def test_the_roots_of_the_series_meet_the_film_condition() -> None:
    for biot in (1e-6, 0.3, 25.0, 1e5):
        zeta, _ = s._series(biot)
        assert np.all(np.diff(zeta) > 0.0)
        gap = zeta * j1(zeta) - biot * j0(zeta)
        assert_allclose(gap / (zeta + biot), 0.0, rtol=0.0, atol=1e-13)


@given(
    diameter=st.floats(1e-3, 3.0),
    per_inch=st.one_of(st.just(math.inf), st.floats(1e-3, 1e3)),
)
def test_ideal_diameter_of_actual_and_back(diameter: float, per_inch: float) -> None:
    ideal = s.ideal_of_actual(diameter, severity=per_inch / INCH)
    assert ideal >= diameter * (1.0 - 1e-12)
    back = s.actual_of_ideal(ideal, severity=per_inch / INCH)
    assert_allclose(back, diameter, rtol=1e-10, atol=0.0)


@given(ideal=st.floats(0.01, 0.3), low=st.floats(0.01, 10.0), factor=st.floats(1.001, 5.0))
def test_a_sharper_quench_hardens_a_thicker_round(ideal: float, low: float, factor: float) -> None:
    mild, sharp = (s.actual_of_ideal(ideal, severity=h / INCH) for h in (low, low * factor))
    assert mild < sharp < ideal


@pytest.mark.parametrize("value", [0.0, -1.0, math.nan])
def test_what_is_not_positive_is_refused(value: float) -> None:
    with pytest.raises(InputFault, match=r"^film coefficient = .* but must be positive\."):
        s.severity(value, conductivity=25.0)
    with pytest.raises(InputFault, match=r"^severity = "):
        s.actual_of_ideal(0.05, severity=value)
    with pytest.raises(InputFault, match=r"^diameter = "):
        s.ideal_of_actual(value, severity=10.0)
    with pytest.raises(InputFault, match=r"^Biot number = "):
        s.half_time_fourier(value)


def test_the_time_between_two_temperatures_is_that_of_a_straight_and_a_broken_history() -> None:
    time = np.array([0.0, 10.0, 20.0, 30.0, 40.0])
    straight = 1100.0 - 15.0 * time  # 973.15 at 8.4567 s, 773.15 at 21.79 s
    # falls below 973.15 once at 10 + 10 x 26.85/100, warms again, below 773.15 at 30 + 10 x 0.5
    warms = np.array([1100.0, 1000.0, 900.0, 973.15, 573.15])
    never = np.full(5, 900.0)
    late = 1100.0 - 5.0 * time
    ours = s.cooling_time(
        time, np.stack([straight, warms, never, late], axis=1), upper=973.15, lower=773.15
    )
    assert_allclose(ours[0], 200.0 / 15.0, rtol=1e-12, atol=0.0)
    assert_allclose(ours[1], 35.0 - 12.685, rtol=1e-12, atol=0.0)
    assert np.isnan(ours[2:]).all()


def test_equal_cooling_times_are_equal_distances() -> None:
    ours = s.equivalent_distance(POWER.cooling_time, POWER)
    assert_allclose(ours, POWER.distance, rtol=1e-12, atol=0.0)


@given(st.floats(1.0, 50.0))
def test_between_the_rows_a_power_law_is_met(distance_mm: float) -> None:
    time = (distance_mm / 2.0) ** 1.5
    ours = s.equivalent_distance(time, POWER)
    if np.isnan(ours):  # on the first or last row, by rounding
        assert min(distance_mm - 1.0, 50.0 - distance_mm) < 1e-9
    else:
        assert_allclose(ours, 1e-3 * distance_mm, rtol=1e-9, atol=0.0)


@given(st.lists(st.floats(0.01, 3.0), min_size=2, max_size=12), st.data())
def test_a_slower_place_is_never_nearer_the_quenched_end(
    steps: list[float], data: st.DataObject
) -> None:
    table = s.EndQuenchTimes(1e-3 * np.arange(1.0, len(steps) + 1.0), np.cumsum(steps))
    asked = np.linspace(table.cooling_time[0], table.cooling_time[-1], 101)
    distance = s.equivalent_distance(asked, table)
    assert np.all(np.diff(distance) >= -1e-15)


def test_outside_the_table_there_is_no_distance_and_a_note_says_why() -> None:
    first, last = POWER.cooling_time[[0, -1]]
    asked = np.array([0.9 * first, 1.0, 1.1 * last, np.nan])
    distance = s.equivalent_distance(asked, POWER)
    assert np.isnan(distance).tolist() == [True, False, True, True]
    assert [str(note) for note in s.range_notes(asked, POWER)] == [
        "equivalent end-quench distance: cooling time = 0.318 to 138 s, "
        "source holds for 0.354 to 125 s"
    ]
    assert s.range_notes(np.array([1.0]), POWER) == ()
    assert [note.value for note in s.range_notes(np.nan, POWER)] == ["unknown"]


@pytest.mark.parametrize(
    ("distance", "time", "message"),
    [
        ([1.0, 2.0], [3.0, 3.0], "cooling time of the test piece = not rising"),
        ([2.0, 1.0], [3.0, 4.0], "distance of the test piece = not rising"),
        ([0.0, 1.0], [3.0, 4.0], "distance of the test piece = not rising"),
        ([1.0, 2.0], [3.0, math.nan], "cooling time of the test piece = not rising"),
        ([1.0, 2.0], [3.0, 4.0, 5.0], "cooling time = 3 values"),
        ([1.0], [3.0], "distance = 1 values"),
    ],
)
def test_a_table_that_does_not_rise_is_refused(
    distance: list[float], time: list[float], message: str
) -> None:
    with pytest.raises(InputFault, match=message):
        s.EndQuenchTimes(np.array(distance), np.array(time))
