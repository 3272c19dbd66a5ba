"""Plane and axisymmetric bodies against products of one-dimensional series."""

from collections.abc import Callable

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from trial import Face, Stuff, around, constant, cooled, family, orders

from midradius.fem.grids import Axis, axis, rectangle
from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo.arrays import Array

Rows = Callable[..., list[tuple[str, float]]]

K, DIFFUSIVITY, DENSITY, HTC = 30.0, 6.2e-6, 7850.0, 1000.0
HOT, COLD, TIME = 850.0 + 273.15, 60.0 + 273.15, 60.0
STUFF = constant(k=K, density=DENSITY, cp=K / (DIFFUSIVITY * DENSITY))


def quarter(a: float, b: float, cells: int, first: float) -> tuple[Axis, Axis]:
    """A quarter of a body: both low ends are middles, both high ends cool."""
    fine = "even" if first == 0.0 else "high"
    return (
        axis(0.0, a, cells, fine=fine, first=first, low=None, high="side"),
        axis(0.0, b, cells, fine=fine, first=first, low=None, high="end"),
    )


def product(
    body: ControlVolumes,
    a: float,
    b: float,
    *,
    htc: float,
    stuff_k: float,
    alpha: float,
    time: float,
) -> Array:
    """Theta at every node."""
    form: exact.Form = "cylinder" if body.sense == "axisymmetric" else "slab"
    across = exact.theta(
        form, biot=htc * a / stuff_k, fourier=alpha * time / a**2, place=body.points[:, 0] / a
    )
    along = exact.theta(
        "slab", biot=htc * b / stuff_k, fourier=alpha * time / b**2, place=body.points[:, 1] / b
    )
    return across * along


def theta(body: ControlVolumes, stuff: Stuff, tolerance: float) -> Array:
    run = cooled(
        body, stuff, HOT, around(Face(HTC, COLD), Face(HTC, COLD)), TIME, tolerance=tolerance
    )
    return np.asarray((run.progress.temp - COLD) / (HOT - COLD))


# rows of heat.csv: exact products, computed outside this code; measured 0.021 K and 0.001 K
@pytest.mark.parametrize(
    ("quantity", "sense", "half_length", "ceiling"),
    [
        ("product solution square bar 50x50 centre", "plane", 0.025, 0.03),
        ("product solution cylinder D50 x L100 centre", "axisymmetric", 0.05, 0.003),
    ],
)
def test_the_centre_of_a_short_body_is_the_product(
    quantity: str, sense: Sense, half_length: float, ceiling: float, published_heat: Rows
) -> None:
    ((_, value),) = published_heat(quantity)
    body = rectangle(*quarter(0.025, half_length, 32, 0.0), sense)
    centre = COLD + (HOT - COLD) * theta(body, STUFF, 1e-3)[0]
    assert_allclose(centre - 273.15, value, rtol=0.0, atol=ceiling)


def test_the_textbook_cylinder_is_at_its_temperature_after_three_minutes(
    published_heat: Rows,
) -> None:
    # Incropera & DeWitt ex. 5.6, data from memory; the exact product is the row
    ((_, value),) = published_heat("short cylinder textbook")
    stuff = constant(k=17.4, density=7900.0, cp=526.0)
    body = rectangle(*quarter(0.04, 0.03, 24, 0.0), "axisymmetric")
    run = cooled(
        body, stuff, 600.0, around(Face(500.0, 300.0), Face(500.0, 300.0)), 180.0, tolerance=1e-3
    )
    assert_allclose(run.progress.temp[0], value, rtol=0.0, atol=0.02)
    expected = product(
        body, 0.04, 0.03, htc=500.0, stuff_k=17.4, alpha=17.4 / (7900.0 * 526.0), time=180.0
    )
    assert_allclose((run.progress.temp - 300.0) / 300.0, expected, rtol=0.0, atol=1e-4)


# the last number: largest error of theta on the finest grid, as measured
@pytest.mark.parametrize(
    ("sense", "half_length", "first", "measured"),
    [
        ("plane", 0.025, 0.0, 2.65e-5),
        ("plane", 0.025, 4e-4, 5.66e-5),
        ("axisymmetric", 0.05, 0.0, 4.01e-5),
        ("axisymmetric", 0.05, 4e-4, 1.14e-4),
    ],
)
def test_halving_the_cells_of_two_directions_quarters_the_error(
    sense: Sense, half_length: float, first: float, measured: float
) -> None:
    errors = []
    across, along = quarter(0.025, half_length, 32, first)
    for pair in zip(family(across, 4), family(along, 4), strict=True):
        body = rectangle(*pair, sense)
        expected = product(
            body, 0.025, half_length, htc=HTC, stuff_k=K, alpha=DIFFUSIVITY, time=TIME
        )
        errors.append(float(np.abs(theta(body, STUFF, 1e-4) - expected).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * measured
