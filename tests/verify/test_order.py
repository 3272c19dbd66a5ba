"""The observed orders of the heat solver in space and time, against exact solutions."""

from typing import Literal

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.linalg import expm
from trial import Face, around, constant, cooled, family, in_even_steps, matrices, orders

from midradius.fem.grids import axis, line, rectangle
from midradius.fem.volumes import ControlVolumes, Sense

RADIUS, K, DENSITY, CP = 0.05, 30.0, 8000.0, 500.0
DIFFUSIVITY = K / (DENSITY * CP)
HOT, COLD = 1100.0, 300.0
STUFF = constant(k=K, density=DENSITY, cp=CP)
FORMS: tuple[exact.Form, ...] = ("slab", "cylinder", "ball")

# largest error of theta over all nodes on 128 cells, as measured; the ceiling is 1.3 times it
MEASURED = {
    ("slab", "even"): 4.9e-6,
    ("slab", "high"): 1.9e-5,
    ("slab", "both"): 1.3e-5,
    ("cylinder", "even"): 3.1e-6,
    ("cylinder", "high"): 1.7e-5,
    ("cylinder", "both"): 1.5e-5,
    ("ball", "even"): 5.9e-6,
    ("ball", "high"): 2.6e-5,
    ("ball", "both"): 2.3e-5,
}


@pytest.mark.parametrize("fine", ["even", "high", "both"])
@pytest.mark.parametrize("form", FORMS)
def test_halving_the_cells_quarters_the_error(
    form: exact.Form, fine: Literal["even", "high", "both"]
) -> None:
    biot, fourier = 10.0, 0.2
    finest = axis(0.0, RADIUS, 128, fine=fine, first=5e-5, low=None, high="surface")
    errors = []
    for along in family(finest, 5):
        body = line(along, form)
        run = cooled(
            body,
            STUFF,
            HOT,
            around(Face(biot * K / RADIUS, COLD)),
            fourier * RADIUS**2 / DIFFUSIVITY,
            tolerance=2e-5,
        )
        theta = (run.progress.temp - COLD) / (HOT - COLD)
        place = body.points[:, 0] / RADIUS
        wrong = theta - exact.theta(form, biot=biot, fourier=fourier, place=place)
        errors.append(float(np.abs(wrong).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * MEASURED[form, fine]


def bodies() -> dict[str, ControlVolumes]:
    """One small body of every sense, graded."""
    out = {
        form: line(axis(0.0, RADIUS, 40, fine="high", first=2e-4, low=None, high="side"), form)
        for form in FORMS
    }
    for sense in ("plane", "axisymmetric"):
        out[sense] = rectangle(
            axis(0.0, RADIUS, 8, fine="high", first=2e-3, low=None, high="side"),
            axis(0.0, 2.0 * RADIUS, 8, fine="both", first=4e-3, low="bottom", high=None),
            sense,
        )
    return out


# the last number: largest error of theta after 128 steps, as measured
@pytest.mark.parametrize(
    ("sense", "measured"),
    [
        ("slab", 1.31e-6),
        ("cylinder", 1.39e-6),
        ("ball", 2.48e-6),
        ("plane", 2.09e-6),
        ("axisymmetric", 2.49e-6),
    ],
)
def test_halving_the_steps_quarters_the_error_against_the_matrix_exponential(
    sense: Sense, measured: float
) -> None:
    body = bodies()[sense]
    htc, duration = 6000.0, 65.0
    films = np.full(len(body.zones), htc)
    laplacian, area = matrices(body)
    capacity = body.volume * DENSITY * CP
    system = -(K * laplacian + np.diag(area @ films)) / capacity[:, None]
    theta = expm(system * duration) @ np.ones(body.n_node)
    errors = []
    for steps in (8, 16, 32, 64, 128):
        faces = around(*[Face(h, COLD) for h in films])
        run = in_even_steps(body, STUFF, HOT, faces, duration, steps=steps)
        wrong = (run.progress.temp - COLD) / (HOT - COLD) - theta
        errors.append(float(np.abs(wrong).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * measured


def test_a_second_stage_goes_on_from_the_first_to_the_matrix_exponential() -> None:
    body = bodies()["cylinder"]
    laplacian, area = matrices(body)
    capacity = body.volume * DENSITY * CP
    temp = np.full(body.n_node, HOT)
    run = cooled(body, STUFF, HOT, around(Face(6000.0, COLD)), 20.0, tolerance=1e-4)
    run.stage(around(Face(500.0, 700.0)), duration=30.0, tolerance=1e-4)
    for htc, ambient, duration in ((6000.0, COLD, 20.0), (500.0, 700.0, 30.0)):
        system = -(K * laplacian + np.diag(area[:, 0] * htc)) / capacity[:, None]
        temp = ambient + expm(system * duration) @ (temp - ambient)
    # measured 1.7e-4 K
    assert_allclose(run.progress.temp, temp, rtol=0.0, atol=2.3e-4)
