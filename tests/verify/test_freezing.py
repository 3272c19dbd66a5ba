"""Fronts with latent heat: Neumann's and Stefan's problems by enthalpy.

Source: Carslaw & Jaeger 1959, ch. XI (remembered); rows in ``heat.csv`` computed
outside this code. The jump of the enthalpy is spread over a narrow range; the
front moves cell by cell, so the error falls with the first power of the cell.
"""

from collections.abc import Callable

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.special import erf
from trial import Face, around, cooled, orders, varying

from midradius.fem.grids import Axis, axis, line
from midradius.thermo.arrays import Array

Rows = Callable[..., list[tuple[str, float]]]

HELD_WELL = 1e7  # W/(m2 K)
DEPTH = 0.2
WATER = {
    "k_solid": 2.22,
    "c_solid": 1762.0,
    "k_liquid": 0.556,
    "c_liquid": 4226.0,
    "density": 1000.0,
    "latent": 338e3,
}


def jump(
    temp: Array, at: float, half: float, *, below: float, above: float, latent: float
) -> Array:
    """Enthalpy with ``latent`` spread over ``at - half`` to ``at + half``."""
    share = np.clip((temp - at + half) / (2.0 * half), 0.0, 1.0)
    cold, hot = np.minimum(temp - at + half, 0.0), np.maximum(temp - at - half, 0.0)
    return np.asarray(below * cold + above * hot + latent * share)


def half_a_cell(along: Axis, depth: float) -> float:
    """What a front at ``depth`` may be off: it waits at a node until its cell has frozen."""
    k = int(np.searchsorted(along.nodes, depth))
    return float(0.5 * (along.nodes[k] - along.nodes[k - 1]))


def test_the_front_constants_are_the_published_ones(published_heat: Rows) -> None:
    for condition, value in published_heat("Stefan one-phase lambda"):
        got = exact.one_phase_lambda(float(condition.removeprefix("St=")))
        assert_allclose(got, value, rtol=0.0, atol=6e-7)
    ((_, value),) = published_heat("Neumann two-phase lambda")
    assert_allclose(
        exact.neumann_lambda(**WATER, above=10.0, below=20.0), value, rtol=0.0, atol=6e-7
    )


def test_water_freezes_as_deep_as_neumann_says_and_gives_off_that_heat(
    published_heat: Rows,
) -> None:
    freezing, half, time = 273.0, 0.1, 3600.0
    k_solid, k_liquid = WATER["k_solid"], WATER["k_liquid"]
    stuff = varying(
        lambda t: (
            k_solid + (k_liquid - k_solid) * np.clip((t - freezing + half) / (2.0 * half), 0.0, 1.0)
        ),
        lambda t: jump(
            t,
            freezing,
            half,
            below=WATER["c_solid"],
            above=WATER["c_liquid"],
            latent=WATER["latent"],
        ),
        density=WATER["density"],
        first=250.0,
        last=285.0,
        step=half,
    )
    ((_, front),) = published_heat("Neumann front position")
    ((_, constant),) = published_heat("Neumann two-phase lambda")
    diffusivity = k_solid / (WATER["density"] * WATER["c_solid"])
    heat = 2.0 * k_solid * 20.0 * np.sqrt(time / (np.pi * diffusivity)) / erf(constant)
    fronts, heats = [], []
    for cells in (100, 200, 400):
        along = axis(0.0, DEPTH, cells, fine="low", first=DEPTH / cells / 3, low="s", high=None)
        body = line(along, "slab")
        run = cooled(body, stuff, 283.0, around(Face(HELD_WELL, 253.0)), time, tolerance=0.1)
        fronts.append(1e3 * float(np.interp(freezing, run.progress.temp, along.nodes)))
        heats.append(float(-run.progress.zone_heat[0]))
        assert_allclose(run.heat_at_start - run.heat(), heats[-1], rtol=1e-9, atol=0.0)
    # to 1 % on every grid; on the finest half a cell, 0.4 %, and 0.19 % of heat measured
    assert_allclose(fronts, front, rtol=0.01, atol=0.0)
    assert_allclose(heats, heat, rtol=0.01, atol=0.0)
    assert_allclose(fronts[-1], front, rtol=0.0, atol=1e3 * half_a_cell(along, 1e-3 * front))
    assert_allclose(heats[-1], heat, rtol=2.5e-3, atol=0.0)
    assert_allclose(orders([heat - h for h in heats]), 1.0, rtol=0.0, atol=0.2)


@pytest.mark.parametrize("stefan", [0.1, 0.5, 1.0, 2.0])
def test_a_melt_at_its_freezing_point_freezes_as_deep_as_stefan_says(
    stefan: float, published_heat: Rows
) -> None:
    k, cp, density, below, time = 30.0, 700.0, 7850.0, 100.0, 100.0
    freezing, half = 900.0, 0.1
    stuff = varying(
        lambda t: np.full_like(t, k),
        lambda t: jump(t, freezing, half, below=cp, above=cp, latent=cp * below / stefan),
        density=density,
        first=780.0,
        last=920.0,
        step=half,
    )
    ((_, constant),) = published_heat("Stefan one-phase lambda", f"St={stefan:g}")
    diffusivity = k / (density * cp)
    along = axis(0.0, DEPTH, 400, fine="low", first=DEPTH / 1200, low="s", high=None)
    run = cooled(
        line(along, "slab"),
        stuff,
        freezing + half,
        around(Face(HELD_WELL, freezing - below)),
        time,
        tolerance=0.2,
    )
    depth = np.interp(freezing, run.progress.temp, along.nodes)
    heat = 2.0 * k * below * np.sqrt(time / (np.pi * diffusivity)) / erf(constant)
    expected = 2.0 * constant * np.sqrt(diffusivity * time)
    assert_allclose(depth, expected, rtol=0.0, atol=half_a_cell(along, expected))
    # measured 0.03 %
    assert_allclose(-run.progress.zone_heat[0], heat, rtol=4e-4, atol=0.0)
