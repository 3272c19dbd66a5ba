"""Fitting shifts of a heat: recovery of known shifts, refusal, standard errors."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo.arrays import Array
from midradius.thermo.calibration import NAMES, NONE, Shifts, calibrate
from midradius.thermo.errors import InputFault

PLACE = np.linspace(0.0, 1.0, 16)


def _curve(shifts: Shifts) -> Array:
    """A made-up curve that each shift bends in its own way but Ms in none."""
    late, bainite = np.log(shifts.diffusional_time), np.log(shifts.bainite_time)
    step = 40.0 / (1.0 + np.exp(20.0 * (PLACE - 0.35 - 0.1 * late)))
    tail = 8.0 * np.exp(-((PLACE - 0.75 - 0.05 * bainite) ** 2) / 0.02)
    return np.asarray(20.0 + step + tail + shifts.hardness / 12.0)


def test_known_shifts_come_back() -> None:
    made = Shifts(diffusional_time=1.8, bainite_time=0.6, hardness=18.0)
    fit = calibrate(_curve, _curve(made), scatter=0.5)
    assert_allclose(fit.shifts.diffusional_time, 1.8, rtol=1e-2, atol=0.0)
    assert_allclose(fit.shifts.bainite_time, 0.6, rtol=3e-2, atol=0.0)
    assert_allclose(fit.shifts.hardness, 18.0, rtol=0.0, atol=0.3)
    assert fit.root_mean_square[1] < 0.05 < fit.root_mean_square[0]


def test_a_shift_that_the_data_do_not_show_is_held_and_named() -> None:
    fit = calibrate(_curve, _curve(Shifts(diffusional_time=1.4)), scatter=0.5)
    assert fit.shifts.martensite_start == 0.0
    assert any(line.startswith("martensite start: the data do not depend") for line in fit.held)
    assert np.isnan(fit.error[NAMES.index("martensite start")])


def test_two_shifts_that_act_alike_are_not_both_fitted() -> None:
    def alike(shifts: Shifts) -> Array:
        moved = np.log(shifts.diffusional_time) + np.log(shifts.bainite_time)
        return np.asarray(50.0 - 20.0 * PLACE + 5.0 * moved * PLACE)

    fit = calibrate(alike, alike(Shifts(diffusional_time=1.5)), scatter=0.5, free=NAMES[:2])
    assert len(fit.held) == 3
    assert any("cannot be told from" in line for line in fit.held)


def test_the_standard_error_is_that_of_a_straight_line() -> None:
    # One shift that enters linearly: error = scatter / (slope sqrt(n)), exact.
    def line(shifts: Shifts) -> Array:
        return np.full(25, 30.0 + 0.5 * shifts.hardness)

    fit = calibrate(line, line(NONE), scatter=1.0, free=("hardness",))
    assert_allclose(fit.error[3], 1.0 / (0.5 * 5.0), rtol=1e-6, atol=0.0)


def test_points_that_no_shift_meets_are_not_said_to_be_without_effect() -> None:
    def line(shifts: Shifts) -> Array:
        return np.full(16, 30.0 + 0.5 * shifts.hardness)

    # 16 points, 100 above and below by turns: sqrt(16 x 100^2 / 15) = 103.3 are left
    wild = line(NONE) + np.where(np.arange(16) % 2 == 0, 100.0, -100.0)
    with pytest.raises(InputFault) as told:
        calibrate(line, wild, scatter=1.0, free=("hardness",))
    assert told.value.remedy.startswith("No shifts meet these points: check points, steel")
    said = "hardness: lost in the misfit, 103.3 times the scatter of a point"
    assert told.value.remedy.endswith(f"{said}).")


def test_the_scatter_left_widens_the_error() -> None:
    noise = np.where(np.arange(16) % 2 == 0, 3.0, -3.0)
    quiet = calibrate(_curve, _curve(NONE), scatter=0.5, free=("hardness",))
    loud = calibrate(_curve, _curve(NONE) + noise, scatter=0.5, free=("hardness",))
    # sum of squares 16 * (3 / 0.5)^2 over 15 degrees of freedom
    assert_allclose(loud.error[3] / quiet.error[3], np.sqrt(16 * 36 / 15), rtol=1e-3, atol=0.0)


@pytest.mark.parametrize(
    ("measured", "scatter", "free", "text"),
    [
        (np.array([50.0, 40.0]), 1.0, NAMES, "at least 5 points for 4 shifts"),
        (np.array([50.0, np.nan, 40.0]), 1.0, NAMES[:1], "numbers only"),
        (PLACE, 0.0, NAMES[:1], "more than 0"),
        (PLACE, 1.0, ("grain",), "one of ferrite and pearlite time"),
    ],
)
def test_a_curve_that_cannot_be_used_is_refused(
    measured: Array, scatter: float, free: tuple[str, ...], text: str
) -> None:
    with pytest.raises(InputFault, match=text):
        calibrate(_curve, measured, scatter=scatter, free=free)


def test_a_curve_that_nothing_moves_is_refused() -> None:
    with pytest.raises(InputFault, match="able to tell at least one shift"):
        calibrate(lambda _: PLACE, PLACE + 1.0, scatter=1.0)


def test_a_local_minimum_near_no_shift_does_not_win() -> None:
    # A screw of 40 HV a turn: its end is met exactly at 40, and from 0 a turn lies between.
    def screw(shifts: Shifts) -> Array:
        turn = shifts.hardness / 40.0
        around = [np.cos(2.0 * np.pi * turn), np.sin(2.0 * np.pi * turn), turn]
        return np.array(around * 4)

    fit = calibrate(screw, np.array([1.0, 0.0, 1.0] * 4), scatter=0.1, free=("hardness",))
    assert_allclose(fit.shifts.hardness, 40.0, rtol=0.0, atol=0.05)
    assert fit.rivals == ()


def test_minima_that_fit_alike_are_all_named() -> None:
    # A circle comes back to its first point after 40 HV, either way round.
    def alike(shifts: Shifts) -> Array:
        h = shifts.hardness
        return np.array([np.cos(2.0 * np.pi * h / 40.0), np.sin(2.0 * np.pi * h / 40.0)] * 6)

    fit = calibrate(alike, np.array([1.0, 0.0] * 6), scatter=0.5, free=("hardness",))
    assert_allclose(fit.shifts.hardness, 0.0, rtol=0.0, atol=0.1)
    assert len(fit.rivals) == 1
    assert_allclose(abs(fit.rivals[0].hardness), 40.0, rtol=0.0, atol=0.2)


def test_points_of_two_units_weigh_by_their_scatter() -> None:
    # Mean of 11 with scatter 4 and 16 with scatter 8 is 12, error 4 / sqrt(1 + 1/4); exact.
    def flat(shifts: Shifts) -> Array:
        return np.full(2, shifts.hardness)

    fit = calibrate(flat, np.array([11.0, 16.0]), scatter=np.array([4.0, 8.0]), free=("hardness",))
    assert_allclose(fit.shifts.hardness, 12.0, rtol=1e-3, atol=0.0)
    assert_allclose(fit.error[3], 4.0 / np.sqrt(1.25), rtol=1e-6, atol=0.0)
