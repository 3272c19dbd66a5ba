"""Manufactured fields: every term of the equation and its order, on uneven meshes.

Source and ambient follow from a field chosen freely (``manufactured.py``), with
conductivity and heat capacity that depend on temperature. Numbers of the first
case after heat conduction notes of our own; the orders expected are two and two.
"""

import numpy as np
import pytest
from manufactured import Manufactured
from numpy.testing import assert_allclose
from trial import Face, around, cooled, family, in_even_steps, lopsided, one_zone_each, orders

from midradius.fem.coupled import Surroundings
from midradius.fem.grids import Axis, axis, line, rectangle
from midradius.fem.volumes import ControlVolumes, Sense

LENGTH, HEIGHT = 0.02, 0.03
POWER = {"slab": 0, "cylinder": 1, "ball": 2, "plane": 0, "axisymmetric": 1}


def driven(
    field: Manufactured, along: Axis, sense: Sense, *, end: float, moments: int
) -> tuple[ControlVolumes, Surroundings]:
    """A line and what makes the field its solution."""
    body = line(along, sense)
    moment = np.linspace(0.0, end, moments)
    source = np.array([field.source(body.points, t) for t in moment])
    ambient = np.array([field.ambient(body.points[-1:], t, 0)[0] for t in moment])
    faces = Face(field.htc, ambient)
    return body, around(faces, moment=moment, source=source, source_moment=moment)


def axes_of(kind: str) -> list[Axis]:
    """Four axes of 8 to 64 cells."""
    if kind == "lopsided":
        return [lopsided(LENGTH, n, "side") for n in (8, 16, 32, 64)]
    return family(axis(0.0, LENGTH, 64, fine="high", first=5e-5, low=None, high="side"), 4)


# the last number: largest error on 64 cells [K], as measured
@pytest.mark.parametrize(
    ("sense", "kind", "measured"),
    [
        ("slab", "graded", 2.4e-2),
        ("slab", "lopsided", 1.03e-2),
        ("cylinder", "graded", 1.9e-2),
        ("cylinder", "lopsided", 1.25e-2),
        ("ball", "graded", 3.1e-2),
        ("ball", "lopsided", 2.0e-2),
    ],
)
def test_halving_uneven_cells_quarters_the_error_of_every_term(
    sense: Sense, kind: str, measured: float
) -> None:
    field, end = Manufactured((LENGTH,), POWER[sense]), 10.0
    stuff = field.stuff(0.1)
    errors = []
    for along in axes_of(kind):
        body, surroundings = driven(field, along, sense, end=end, moments=2001)
        start = field.temp(body.points, 0.0)
        run = cooled(body, stuff, start, surroundings, end, tolerance=1e-4)
        errors.append(float(np.abs(run.progress.temp - field.temp(body.points, end)).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * measured


def test_halving_the_steps_quarters_the_error_of_every_term() -> None:
    field, end = Manufactured((LENGTH,), POWER["slab"]), 10.0
    stuff = field.stuff(0.1)
    along = axis(0.0, LENGTH, 1024, fine="even", first=1.0, low=None, high="side")
    body, surroundings = driven(field, along, "slab", end=end, moments=1001)
    start, expected = field.temp(body.points, 0.0), field.temp(body.points, end)
    errors = []
    for steps in (5, 10, 20, 40, 80):
        run = in_even_steps(body, stuff, start, surroundings, end, steps=steps)
        errors.append(float(np.abs(run.progress.temp - expected).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    # measured 2.3e-3 K
    assert errors[-1] < 3e-3


def plane_error(field: Manufactured, across: Axis, along: Axis, sense: Sense) -> float:
    """Largest error [K] of a two-dimensional run of 5 s, every face with its own ambient."""
    body = one_zone_each(rectangle(across, along, sense))
    end, moment = 5.0, np.linspace(0.0, 5.0, 251)
    source = np.array([field.source(body.points, t) for t in moment])
    faces = body.points[body.face_node]
    # faces of the side come first, one for each node along it
    side = np.arange(len(faces)) < len(along.nodes)
    ambient = np.array(
        [np.where(side, field.ambient(faces, t, 0), field.ambient(faces, t, 1)) for t in moment]
    )
    surroundings = around(
        *[Face(field.htc, seen) for seen in ambient.T],
        moment=moment,
        source=source,
        source_moment=moment,
    )
    start = field.temp(body.points, 0.0)
    run = cooled(body, field.stuff(1.0), start, surroundings, end, tolerance=2e-4)
    return float(np.abs(run.progress.temp - field.temp(body.points, end)).max())


def pairs_of(kind: str, finest: int) -> list[tuple[Axis, Axis]]:
    """Four pairs of axes, the finest with that many cells each way."""
    count = 4
    if kind == "lopsided":
        cells = [finest // 2**i for i in range(count)][::-1]
        return [(lopsided(LENGTH, n, "side"), lopsided(HEIGHT, n, "top")) for n in cells]
    across = axis(0.0, LENGTH, finest, fine="high", first=6.4e-3 / finest, low=None, high="side")
    along = axis(0.0, HEIGHT, finest, fine="both", first=9.6e-3 / finest, low=None, high="top")
    return list(zip(family(across, count), family(along, count), strict=True))


# the last number: largest error on 48 by 48 cells [K], as measured
PLANES = [
    ("plane", "graded", 1.73e-2),
    ("plane", "lopsided", 2.12e-2),
    ("axisymmetric", "graded", 3.76e-2),
    ("axisymmetric", "lopsided", 2.54e-2),
]


@pytest.mark.parametrize(("sense", "kind", "measured"), PLANES)
def test_halving_uneven_cells_of_two_directions_quarters_the_error(
    sense: Sense, kind: str, measured: float
) -> None:
    field = Manufactured((LENGTH, HEIGHT), POWER[sense])
    errors = [plane_error(field, *pair, sense) for pair in pairs_of(kind, 48)]
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * measured


@pytest.mark.slow
@pytest.mark.parametrize(("sense", "kind"), [case[:2] for case in PLANES])
def test_the_order_of_two_directions_holds_on_finer_cells(sense: Sense, kind: str) -> None:
    field = Manufactured((LENGTH, HEIGHT), POWER[sense])
    errors = [plane_error(field, *pair, sense) for pair in pairs_of(kind, 96)]
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
