"""What a run says about its own error, against the error itself.

The error itself is the difference from a run with a twentieth of the tolerance and,
for the grid, four times the cells along each axis: what that run still lacks is a
sixteenth of the grid error and a seventh of the time error of the run under test.
Stated errors are those at two hundred moments, so the truth is looked for there.
"""

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pytest
from scipy.interpolate import CubicSpline, RectBivariateSpline

from midradius.study import casefile
from midradius.study.case import Case, Grid
from midradius.study.job import solve
from midradius.study.result import Result
from midradius.study.runner import N_ERROR_TIMES

MESHES = Path(__file__).resolve().parents[2] / "meshes"
SHARPER = 20.0
FINER = 4
WITHIN = 3.0


@dataclass(frozen=True)
class Errors:
    """Largest error of a temperature [K] and of a hardness at the positions [HV]."""

    time: float
    grid: float
    time_hv: float
    grid_hv: float


def axes_of(result: Result) -> list[np.ndarray]:
    return [np.unique(column) for column in result.points_mm.T]


def onto(points_mm: np.ndarray, finer: Result) -> np.ndarray:
    """The fields of a finer run at other points, (n_time, n_point), by cubic splines."""
    axes = axes_of(finer)
    if len(axes) == 1:
        return np.asarray(CubicSpline(axes[0], finer.temp_degC, axis=1)(points_mm[:, 0]))
    shape = tuple(len(axis) for axis in axes)
    return np.array(
        [
            RectBivariateSpline(*axes, field.reshape(shape)).ev(*points_mm.T)
            for field in finer.temp_degC
        ]
    )


def stated_and_true(case: Case) -> tuple[Errors, Errors]:
    first = solve(replace(case, outputs=replace(case.outputs, n_field=N_ERROR_TIMES)))
    cells = tuple(len(axis) - 1 for axis in axes_of(first))
    accuracy = case.grid.accuracy
    # the same moments for all, and none after the end of the route, where fields stand still
    case = replace(
        case, outputs=replace(case.outputs, field_times=tuple(first.times_s[:-1].tolist()))
    )
    run = solve(replace(case, grid=Grid(cells, accuracy)))
    sharp = solve(replace(case, grid=Grid(cells, accuracy / SHARPER)))
    fine = solve(replace(case, grid=Grid(tuple(FINER * c for c in cells), accuracy / SHARPER)))

    def hardness(one: Result, other: Result) -> float:
        pairs = zip(one.positions, other.positions, strict=True)
        return max(abs(a.hardness_hv - b.hardness_hv) for a, b in pairs)

    stated = Errors(
        run.time_error_K,
        run.grid_error_K,
        max(p.hardness_time_error_hv for p in run.positions),
        max(p.hardness_grid_error_hv for p in run.positions),
    )
    true = Errors(
        float(np.abs(run.temp_degC - sharp.temp_degC).max()),
        float(np.abs(sharp.temp_degC - onto(run.points_mm, fine)).max()),
        hardness(run, sharp),
        hardness(sharp, fine),
    )
    return stated, true


def is_honest(case: Case) -> None:
    stated, true = stated_and_true(case)
    told = f"stated {stated}\ntrue   {true}"
    print(told)
    assert 1.0 / WITHIN <= stated.time / true.time <= WITHIN, told
    assert 1.0 / WITHIN <= stated.grid / true.grid <= WITHIN, told
    # Hardness at a few places, of errors far below what a tester reads: no less than
    # a third of the truth, or both below half a Vickers.
    assert stated.time_hv >= true.time_hv / WITHIN or true.time_hv < 0.5, told
    assert stated.grid_hv >= true.grid_hv / WITHIN or true.grid_hv < 0.5, told


# a round in oil; two films; a bore that passes no heat; water and a hold; slow, with a plateau
ONE_DIMENSION = ["pump-shaft", "die-plate", "cylinder-liner", "drive-shaft", "mill-roll"]


@pytest.mark.parametrize("name", ONE_DIMENSION)
def test_a_coarse_run_states_its_errors_within_a_factor_of_three(name: str) -> None:
    case = casefile.read(MESHES / f"{name}.toml")
    cells = 32 if case.section.form in ("round", "ball") else 48
    is_honest(replace(case, grid=Grid((cells,), 2.0)))


@pytest.mark.slow
@pytest.mark.parametrize("name", [*ONE_DIMENSION, "valve-ball"])
def test_a_shipped_case_states_its_errors_within_a_factor_of_three(name: str) -> None:
    is_honest(casefile.read(MESHES / f"{name}.toml"))


@pytest.mark.slow
@pytest.mark.parametrize(("name", "cells"), [("guide-rail", (16, 16)), ("pinion", (16, 16))])
def test_a_plane_run_states_its_errors_within_a_factor_of_three(
    name: str, cells: tuple[int, int]
) -> None:
    is_honest(replace(casefile.read(MESHES / f"{name}.toml"), grid=Grid(cells, 1.0)))
