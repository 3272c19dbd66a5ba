"""The two solvers of linear systems against independent ones.

Multigrid-preconditioned conjugate gradients against a sparse factorisation, the
sweep on a line against a banded one. The systems are those of heat conduction:
``excess`` is the heat capacity over a step, in units of the conductance.
"""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.linalg import solve_banded
from scipy.sparse import coo_matrix, csc_matrix, diags
from scipy.sparse.linalg import spsolve
from trial import renumbered

from midradius.fem.grids import axis, line, rectangle
from midradius.fem.linear import Line, scheme, solve
from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo.arrays import Array

ACCURACY = 1e-6


def matrix(body: ControlVolumes, excess: Array, weight: Array) -> csc_matrix:
    """``diag(excess)`` and the Laplacian of the weights."""
    i, j = body.edge.T
    n = body.n_node
    rows, columns = np.concatenate([i, j]), np.concatenate([j, i])
    joined = coo_matrix((np.tile(weight, 2), (rows, columns)), shape=(n, n)).tocsr()
    return csc_matrix(diags(excess + np.asarray(joined.sum(axis=1)).ravel()) - joined)


def solved(body: ControlVolumes, excess: Array, weight: Array, rhs: Array) -> tuple[Array, int]:
    out = np.empty(body.n_node)
    return out, solve(scheme(body), excess, weight, rhs, out, ACCURACY)


def square(
    cells: int, *, first: float, aspect: float = 1.0, sense: Sense = "plane"
) -> ControlVolumes:
    """A rectangle of ``cells`` each way, the finest ``first`` of its side."""
    fine = "even" if first == 0.0 else "both"
    return rectangle(
        axis(0.0, 1.0, cells, fine=fine, first=first, low="a", high="b"),
        axis(0.0, aspect, cells, fine=fine, first=first * aspect, low="c", high="d"),
        sense,
    )


def random_graph(n_node: int, decades: float, rng: np.random.Generator) -> ControlVolumes:
    """A connected graph with three edges a node, weights over many decades."""
    tree = np.array([(rng.integers(0, i), i) for i in range(1, n_node)])
    more = np.sort(rng.integers(0, n_node, (2 * n_node, 2)), axis=1)
    edge = np.unique(np.concatenate([tree, more[more[:, 0] < more[:, 1]]]), axis=0)
    none = np.empty(0)
    return ControlVolumes(
        points=np.zeros((n_node, 2)),
        volume=np.ones(n_node),
        edge=edge.astype(np.int64),
        conductance_length=10.0 ** rng.uniform(-decades / 2, decades / 2, len(edge)),
        face_node=none.astype(np.int64),
        face_area=none,
        face_zone=none.astype(np.int64),
        zones=(),
        sense="plane",
    )


# Per case the body and the excess over volume: 3 is a step as long as heat takes to cross
# the side, 3e3 a thousandth of it. The last number: iterations measured.
BODIES = {
    "even 16": (square(16, first=0.0), 3.0, 14),
    "even 64": (square(64, first=0.0), 3.0, 27),
    "even 64, short steps": (square(64, first=0.0), 3e3, 9),
    "even 128": (square(128, first=0.0), 3.0, 37),
    "graded 32": (square(32, first=1 / 400), 3.0, 46),
    "graded 64": (square(64, first=1 / 800), 3.0, 55),
    "graded 64, short steps": (square(64, first=1 / 800), 3e3, 36),
    "graded axisymmetric 32": (square(32, first=1 / 400, sense="axisymmetric"), 3.0, 47),
    "three times as long, 48": (square(48, first=0.0, aspect=3.0), 3.0, 28),
    "ten times as long, 48": (square(48, first=0.0, aspect=10.0), 3.0, 33),
    "a hundred times as long, 48": (square(48, first=0.0, aspect=100.0), 3.0, 20),
    "a hundred times as long, long steps": (square(48, first=0.0, aspect=100.0), 1e-3, 26),
    "graded 128, strongly": (square(128, first=1 / 12_000), 3.0, 24),
    "graded 128, strongly, long steps": (square(128, first=1 / 12_000), 1e-3, 29),
}


@pytest.mark.parametrize("case", BODIES)
def test_conjugate_gradients_agree_with_a_factorisation_in_few_iterations(case: str) -> None:
    body, share, measured = BODIES[case]
    weight = body.conductance_length
    excess = share * body.volume
    expected = np.random.default_rng(3).uniform(-10.0, 10.0, body.n_node)
    system = matrix(body, excess, weight)
    rhs = np.asarray(system @ expected)
    out, iterations = solved(body, excess, weight, rhs)
    assert_allclose(out, spsolve(system, rhs), rtol=0.0, atol=10.0 * ACCURACY)
    assert 0 < iterations <= 1.3 * measured


@pytest.mark.parametrize("decades", [1.0, 4.0, 8.0])
@pytest.mark.parametrize("n_node", [50, 500, 1500])
def test_conjugate_gradients_agree_with_a_factorisation_on_random_graphs(
    n_node: int, decades: float
) -> None:
    rng = np.random.default_rng(int(n_node + 10 * decades))
    body = random_graph(n_node, decades, rng)
    excess = 10.0 ** rng.uniform(-1.0, 1.0, n_node)
    system = matrix(body, excess, body.conductance_length)
    rhs = np.asarray(system @ rng.uniform(-10.0, 10.0, n_node))
    out, iterations = solved(body, excess, body.conductance_length, rhs)
    assert_allclose(out, spsolve(system, rhs), rtol=0.0, atol=10.0 * ACCURACY)
    assert 0 < iterations <= {1.0: 13, 4.0: 31, 8.0: 130}[decades]


def test_a_conductivity_that_jumps_a_thousandfold_takes_few_iterations() -> None:
    body = square(64, first=0.0)
    k = np.where(body.points[:, 0] + 0.3 * body.points[:, 1] > 0.6, 1.0, 1e3)
    weight = body.conductance_length * k[body.edge].mean(axis=1)
    excess = 30.0 * body.volume
    system = matrix(body, excess, weight)
    rhs = np.asarray(system @ np.random.default_rng(4).uniform(-10.0, 10.0, body.n_node))
    out, iterations = solved(body, excess, weight, rhs)
    assert_allclose(out, spsolve(system, rhs), rtol=0.0, atol=10.0 * ACCURACY)
    assert 0 < iterations <= 44


def obtuse(cells: int) -> ControlVolumes:
    """Right triangles sheared by a cell and more: a third of the weights is negative."""
    body = square(cells, first=0.0)
    n = cells + 1
    number = np.arange(n * n).reshape(n, n)
    # stiffness of linear triangles on the parallelogram (1, 0), (shear, 1)
    shear = 1.4
    edge = [(number[:-1], number[1:], 1.0 + shear**2 - shear)]
    edge += [
        (number[:, :-1], number[:, 1:], 1.0 - shear),
        (number[1:, :-1], number[:-1, 1:], shear),
    ]
    return replace(
        body,
        edge=np.concatenate([np.stack([a.ravel(), b.ravel()], axis=1) for a, b, _ in edge]),
        conductance_length=np.concatenate([np.full(a.size, w) for a, _, w in edge]),
    )


@pytest.mark.parametrize("share", [1e-3, 3.0, 3e3])
def test_obtuse_triangles_are_solved_though_some_weights_are_negative(share: float) -> None:
    body = obtuse(64)
    assert body.conductance_length.min() < 0.0
    excess = share * body.volume
    system = matrix(body, excess, body.conductance_length)
    expected = np.random.default_rng(7).uniform(-10.0, 10.0, body.n_node)
    out, iterations = solved(body, excess, body.conductance_length, np.asarray(system @ expected))
    assert_allclose(out, expected, rtol=0.0, atol=10.0 * ACCURACY)
    assert 0 < iterations <= 70  # 54 measured


def test_no_heat_is_lost_however_early_the_iteration_stops() -> None:
    body = square(64, first=1 / 800)
    excess = 3.0 * body.volume
    rhs = np.random.default_rng(8).uniform(0.0, 1.0, body.n_node)
    out = np.empty(body.n_node)
    assert solve(scheme(body), excess, body.conductance_length, rhs, out, 0.0, 0.3) < 5
    assert_allclose((excess * out).sum(), rhs.sum(), rtol=1e-12, atol=0.0)


def test_a_smooth_load_is_solved_as_well_as_a_rough_one() -> None:
    body = square(64, first=1 / 400)
    excess = 0.1 * body.volume
    system = matrix(body, excess, body.conductance_length)
    for wave in (0.0, 1.0, 2.0):
        expected = 5.0 + np.cos(wave * np.pi * body.points[:, 0]) * np.cos(
            np.pi * body.points[:, 1]
        )
        out, _ = solved(body, excess, body.conductance_length, np.asarray(system @ expected))
        assert_allclose(out, expected, rtol=0.0, atol=100.0 * ACCURACY)


def test_a_smooth_load_is_solved_as_well_in_a_step_that_lasts_a_thousand_crossings() -> None:
    body = square(128, first=0.0)
    excess = 1e-3 * body.volume
    expected = np.cos(np.pi * body.points[:, 0])
    rhs = np.asarray(matrix(body, excess, body.conductance_length) @ expected)
    out = np.empty(body.n_node)
    iterations = solve(scheme(body), excess, body.conductance_length, rhs, out, 1e-4)
    assert iterations > 0
    assert_allclose(out, expected, rtol=0.0, atol=100.0 * 1e-4)


@pytest.mark.parametrize("sense", ["slab", "cylinder", "ball"])
def test_the_sweep_agrees_with_a_banded_solver(sense: Sense) -> None:
    rng = np.random.default_rng(5)
    for n in (2, 3, 10, 1001):
        along = axis(0.0, 1.0, n - 1, fine="high", first=1e-2 / n, low=None, high="s")
        body = line(along, sense)
        assert isinstance(scheme(body), Line)
        excess = 10.0 ** rng.uniform(-6.0, 2.0, n)
        weight = body.conductance_length * rng.uniform(0.5, 2.0, n - 1)
        # a load that makes numbers of order one
        expected = rng.uniform(-10.0, 10.0, n)
        rhs = np.asarray(matrix(body, excess, weight) @ expected)
        out, iterations = solved(body, excess, weight, rhs)
        banded = np.zeros((3, n))
        banded[0, 1:] = banded[2, :-1] = -weight
        banded[1] = excess
        banded[1, :-1] += weight
        banded[1, 1:] += weight
        assert_allclose(out, solve_banded((1, 1), banded, rhs), rtol=1e-8, atol=1e-8)
        assert iterations == 1


def test_the_multigrid_solves_a_line_as_the_sweep_does() -> None:
    along = axis(0.0, 1.0, 400, fine="high", first=1e-4, low=None, high="s")
    body = line(along, "slab")
    rng = np.random.default_rng(6)
    order = rng.permutation(body.n_node)
    mixed = renumbered(body, order)
    for share in (1.0, 1e2, 1e4):
        excess = share * body.volume
        expected = rng.uniform(-10.0, 10.0, body.n_node)
        rhs = np.asarray(matrix(body, excess, body.conductance_length) @ expected)
        plain, _ = solved(body, excess, body.conductance_length, rhs)
        other, iterations = solved(
            mixed, share * mixed.volume, mixed.conductance_length, rhs[order]
        )
        assert_allclose(other, plain[order], rtol=0.0, atol=10.0 * ACCURACY)
        assert 0 < iterations <= 83
