"""The march in time against another integrator, under a film that rises and falls.

The same semi-discrete equations (steel by EN 1993-1-2, a boiling film of up to
14 kW/(m2 K), twenty cells) go through LSODA of scipy with a tolerance of 1e-8: an
independent code and method, in enthalpies instead of temperatures.
"""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp
from test_identities import HOT, STEEL, film
from trial import Face, around, start

from midradius.fem.grids import axis, line
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array

BATH, RADIUS = 333.15, 0.05
CURVE = film(8.0)
TIMES = np.array([1.0, 3.0, 10.0, 20.0, 40.0, 60.0, 90.0, 150.0])
BODY = line(axis(0.0, RADIUS, 20, fine="high", first=8e-4, low=None, high="side"), "cylinder")


@pytest.fixture(scope="module")
def independent() -> Array:
    """Temperatures [K] at all times and nodes."""
    tables = STEEL.tables
    grid = tables.first + tables.step * np.arange(tables.value.shape[1])
    heat, conductivity = tables.value[0, :, kin.H_AUSTENITE], tables.value[0, :, kin.K_AUSTENITE]
    mass = BODY.volume * STEEL.density
    (surface,), (area,) = BODY.face_node, BODY.face_area

    def rate(_: float, enthalpy: Array) -> Array:
        temp = np.interp(enthalpy, heat, grid)
        k = np.interp(temp, grid, conductivity)
        flow = BODY.conductance_length * 0.5 * (k[1:] + k[:-1]) * np.diff(temp)
        into = np.diff(flow, prepend=0.0, append=0.0)
        into[surface] -= area * np.interp(temp[surface], *CURVE) * (temp[surface] - BATH)
        return np.asarray(into / mass)

    at_start = np.full(BODY.n_node, np.interp(HOT, grid, heat))
    done = solve_ivp(
        rate, (0.0, TIMES[-1]), at_start, "LSODA", TIMES, rtol=1e-8, atol=1e-3, lband=1, uband=1
    )
    return np.asarray(np.interp(done.y.T, heat, grid))


# largest difference measured: 0.8, 1.09, 0.14, 0.044, 0.0034 K
@pytest.mark.parametrize("tolerance", [1.0, 0.5, 0.1, 0.02, 0.001])
def test_the_march_agrees_with_another_integrator_within_a_few_tolerances(
    tolerance: float, independent: Array
) -> None:
    run = start(BODY, STEEL, HOT, fields=list(TIMES))
    run.stage(around(Face(CURVE, BATH)), duration=TIMES[-1], tolerance=tolerance)
    assert_allclose(run.progress.field, independent, rtol=0.0, atol=4.5 * tolerance)
