"""Grossmann's arithmetic and equivalent distances against tables made before this code.

The end-quench times and the rounds come from one table each (``hardenability_times.csv``,
``hardenability_severity.csv``); the rounds are cooled here by a conduction solution of
their own, with the properties that the table was made with: ``k = 22 + 0.008 T``, T in degC,
4.87 MJ/(m3 K), from 845 degC into 20 degC. H is turned into a film with 27 W/(m K), which
is that k at 625 degC (inferred: of 25, 26, 27 and 27.6 it fits best).
"""

from functools import cache

import numpy as np
import pytest
from endquench import Row, rows
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp

from midradius.thermo import severity
from midradius.thermo.arrays import Array

TABLE = rows("hardenability_severity")
INCH, ZERO = 0.0254, 273.15
UPPER, LOWER, START, BATH = 700.0, 500.0, 845.0, 20.0
HEAT_CAPACITY, CONDUCTIVITY_OF_H = 4.87e6, 27.0
DIFFUSIVITY = 5.8e-6  # of the half-temperature times
N_CELL = 80


def _rows(quantity: str) -> list[object]:
    return [
        pytest.param(row, id=f"{row['place']} {row['diameter_mm']} mm H {row['severity_per_in']}")
        for row in TABLE
        if row["quantity"] == quantity
    ]


def _conductivity(temp_degC: Array) -> Array:
    return np.asarray(22.0 + 0.008 * temp_degC)


@cache
def _cooling_times(diameter_mm: float, per_inch: float) -> tuple[float, float]:
    """Time [s] from 700 to 500 degC at the core and at the surface of a round."""
    radius = 0.5e-3 * diameter_mm
    film = severity.film(per_inch / INCH, conductivity=CONDUCTIVITY_OF_H)
    edges = radius * (1.0 - (1.0 - np.linspace(0.0, 1.0, N_CELL + 1)) ** 1.6)
    middles = 0.5 * (edges[1:] + edges[:-1])
    volumes = 0.5 * np.diff(edges**2)

    def slope(_: float, temp: Array) -> Array:
        k = _conductivity(temp)
        inner = -0.5 * (k[1:] + k[:-1]) * np.diff(temp) / np.diff(middles) * edges[1:-1]
        outer = (temp[-1] - BATH) / (1.0 / film + (radius - middles[-1]) / k[-1]) * radius
        flow = np.concatenate([[0.0], inner, [outer]])
        return -np.diff(flow) / volumes / HEAT_CAPACITY

    times = np.geomspace(1e-3, 1500.0, 3000)
    run = solve_ivp(
        slope,
        (0.0, times[-1]),
        np.full(N_CELL, START),
        method="LSODA",
        lband=1,
        uband=1,
        t_eval=times,
        rtol=1e-6,
        atol=1e-4,
    )
    core, surface = severity.cooling_time(
        times, run.y[[0, -1]].T + ZERO, upper=UPPER + ZERO, lower=LOWER + ZERO
    )
    return float(core), float(surface)


@cache
def _piece() -> severity.EndQuenchTimes:
    table = rows("hardenability_times")
    position = np.array([float(row["position"]) for row in table])
    time = np.array([float(row["time_700_500_s"]) for row in table])
    return severity.EndQuenchTimes(INCH / 16.0 * position, time)


@pytest.mark.parametrize("row", _rows("half-temperature time"))
def test_the_half_temperature_time_of_a_round_is_as_tabulated(row: Row) -> None:
    diameter = 1e-3 * float(row["diameter_mm"])
    fourier = severity.half_time_fourier(float(row["severity_per_in"]) / INCH * diameter)
    assert_allclose(
        fourier * (0.5 * diameter) ** 2 / DIFFUSIVITY,
        float(row["value"]),
        rtol=float(row["tolerance_relative"]),
        atol=float(row["tolerance_absolute"]),
    )


@pytest.mark.parametrize("row", _rows("equivalent distance"))
def test_a_round_stands_for_the_tabulated_end_quench_distance(row: Row) -> None:
    core, surface = _cooling_times(float(row["diameter_mm"]), float(row["severity_per_in"]))
    time = core if row["place"] == "core" else surface
    ours = float(severity.equivalent_distance(time, _piece()))
    # both tables are printed to a tenth or to two figures
    assert_allclose(
        ours * 16.0 / INCH,
        float(row["value"]),
        rtol=float(row["tolerance_relative"]),
        atol=float(row["tolerance_absolute"]),
    )
