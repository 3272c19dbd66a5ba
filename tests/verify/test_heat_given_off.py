"""The heat that steel by EN 1993-1-2 gives off on its way to a bath, by the solver.

Rows of ``heat.csv``: integrals of the standard's heat capacity (formula read,
integral computed outside this code by two ways).
"""

import re
from collections.abc import Callable

import numpy as np
import pytest
from numpy.testing import assert_allclose
from test_identities import STEEL, film
from trial import Face, around, cooled, start

from midradius.fem.coupled import Until
from midradius.fem.grids import axis, line, rectangle
from midradius.fem.volumes import Sense

Rows = Callable[..., list[tuple[str, float]]]
ZERO = 273.15


def degrees(condition: str) -> tuple[float, float]:
    """``20->600 C`` as (hot, cold)."""
    cold, hot = re.findall(r"[\d.]+", condition)
    return float(hot), float(cold)


def test_a_slab_gives_off_the_published_heat(published_heat: Rows) -> None:
    body = line(axis(0.0, 0.05, 32, fine="both", first=5e-4, low="a", high="b"), "slab")
    mass = body.volume.sum() * STEEL.density
    for condition, value in published_heat("EN carbon steel enthalpy difference"):
        hot, cold = degrees(condition)
        faces = around(*[Face(film(1.0), cold + ZERO)] * 2)
        run = cooled(body, STEEL, hot + ZERO, faces, 4e4, tolerance=0.1)
        assert_allclose(run.progress.temp - ZERO, cold, rtol=0.0, atol=2e-5)
        given = -run.progress.zone_heat.sum() / mass / 1e3
        # the rows end at 0.01 kJ/kg
        assert_allclose(given, value, rtol=0.0, atol=0.006, err_msg=condition)


@pytest.mark.parametrize("sense", ["plane", "axisymmetric"])
def test_a_short_body_gives_off_the_published_heat(sense: Sense, published_heat: Rows) -> None:
    ((condition, value),) = published_heat("EN carbon steel enthalpy difference", "60->850")
    hot, cold = degrees(condition)
    body = rectangle(
        axis(0.0, 0.05, 16, fine="high", first=1e-3, low=None, high="a"),
        axis(0.0, 0.05, 16, fine="high", first=1e-3, low=None, high="b"),
        sense,
    )
    faces = around(*[Face(film(1.0), cold + ZERO)] * 2)
    run = cooled(body, STEEL, hot + ZERO, faces, 4e4, tolerance=0.1)
    # what conjugate gradients leave over, a hundredth of the tolerance
    assert_allclose(run.progress.temp - ZERO, cold, rtol=0.0, atol=1e-3)
    given = -run.progress.zone_heat.sum() / (body.volume.sum() * STEEL.density) / 1e3
    assert_allclose(given, value, rtol=0.0, atol=0.006)


def test_a_sheet_stopped_at_the_cusp_has_given_off_the_published_part(
    published_heat: Rows,
) -> None:
    # a thin sheet is one lump, so that its middle stands for all of it
    rows = dict(published_heat("EN carbon steel enthalpy difference"))
    expected = rows["20->900 C"] - rows["20->735 C"]
    body = line(axis(0.0, 1e-4, 4, fine="even", first=1.0, low=None, high="a"), "slab")
    run = start(body, STEEL, 900.0 + ZERO)
    until = Until(np.array([2]), np.array([1.0]), 735.0 + ZERO)
    run.stage(around(Face(50.0, 20.0 + ZERO)), duration=1e4, tolerance=1e-2, until=until)
    given = -run.progress.zone_heat.sum() / (1e-4 * STEEL.density) / 1e3
    # 5 kJ/(kg K) at the cusp times the 0.01 K of the stop, and the rows' rounding
    assert_allclose(given, expected, rtol=0.0, atol=0.065)
