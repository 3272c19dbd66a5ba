"""Fields handed over as they come are those that a run would have held until the end.

Exact: a lump of one temperature under a constant film,
``T = T_bath + (T_0 - T_bath) exp(-t / tau)``, ``tau = rho cp L / h``.
"""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from trial import Face, around, constant, start

from midradius.fem import coupled
from midradius.fem.coupled import FIELD_WINDOW
from midradius.fem.grids import axis, line
from midradius.thermo.arrays import Array

HOT, BATH = 1173.15, 333.15
THICK, HTC, DENSITY, CP = 0.02, 500.0, 8000.0, 500.0
TAU = DENSITY * CP * THICK / HTC
LUMP = constant(k=1e8, density=DENSITY, cp=CP)
BODY = line(axis(0.0, THICK, 4, fine="even", first=1.0, low=None, high="face"), "slab")
FACE = around(Face(HTC, BATH))

SPARSE = np.array([0.0, 10.0, 33.0, 100.0, 222.2, 400.0, 500.0])
# many more than a window in one step, and a few after the end
DENSE = np.concatenate([[0.0], np.linspace(50.0, 51.0, 100), np.linspace(390.0, 450.0, 61)])
# some pending when the last ones come, fewer than a window
LATE = np.concatenate([np.linspace(0.0, 380.0, 60), np.linspace(381.0, 400.0, 7)])


@pytest.fixture(autouse=True)
def narrow(monkeypatch: pytest.MonkeyPatch) -> None:
    """As narrow a window as that of a million nodes."""
    monkeypatch.setattr(coupled, "WINDOW_SIZE", 0)


def taken(moments: Array, tolerance: float) -> tuple[Array, Array]:
    """The moments and fields that a sink was given."""
    seen: list[tuple[float, Array]] = []
    run = start(
        BODY,
        LUMP,
        HOT,
        fields=moments.tolist(),
        sink=lambda time, field: seen.append((time, field.copy())),
    )
    assert len(run.progress.field) <= FIELD_WINDOW
    run.stage(FACE, duration=150.0, tolerance=tolerance)
    run.stage(FACE, duration=250.0, tolerance=tolerance)
    assert run.fields().shape == (0, BODY.n_node)
    return np.array([time for time, _ in seen]), np.array([field for _, field in seen])


@pytest.mark.parametrize("moments", [SPARSE, DENSE, LATE])
@pytest.mark.parametrize("tolerance", [1.0, 0.01])
def test_a_sink_gets_every_moment_once_and_in_order(moments: Array, tolerance: float) -> None:
    times, fields = taken(moments, tolerance)
    assert_allclose(times, moments, rtol=0.0, atol=0.0)
    exact = BATH + (HOT - BATH) * np.exp(-np.minimum(moments, 400.0) / TAU)
    expected = np.tile(exact[:, None], BODY.n_node)
    assert_allclose(fields, expected, rtol=0.0, atol=3.0 * tolerance)


def test_a_sink_does_not_change_the_fields() -> None:
    held = start(BODY, LUMP, HOT, fields=SPARSE.tolist())
    held.stage(FACE, duration=150.0, tolerance=0.1)
    held.stage(FACE, duration=250.0, tolerance=0.1)
    assert_allclose(taken(SPARSE, 0.1)[1], held.fields(), rtol=1e-12, atol=0.0)
