"""A peer out of general libraries: scikit-fem assembles, scipy's splu factorises.

The same equations, the same method in time and the same steps as ours, so that the
error is the same and only the work on the matrices differs: linear triangles with
lumped capacity. Newton's method as we do it, a matrix assembled and factorised afresh
(symmetric mode) for each move, or thriftily with the first factor of a stage. The
kinetics are our own compiled kernel, a gift to the peer.
"""

import time
from dataclasses import dataclass

import numba
import numpy as np
from reference import BATH, DENSITY, FILM, FILM_TEMP, START
from scipy.sparse import diags
from scipy.sparse.linalg import splu
from skfem import Basis, BilinearForm, ElementTriP1, FacetBasis, LinearForm, MeshTri
from skfem.helpers import dot, grad

from midradius.fem.heat import EXPLICIT, GAMMA, IMPLICIT
from midradius.thermo.arrays import Array
from midradius.thermo.kinetics import Tables, advance, enthalpy_node

NEWTON = 1e-3  # K, as ours
MOST_MOVES = 30


@BilinearForm
def _conduction(u, v, w):  # type: ignore[no-untyped-def]
    return w.k * dot(grad(u), grad(v))


@LinearForm
def _share(v, w):  # type: ignore[no-untyped-def]
    return 1.0 * v


@numba.njit
def _react(from_temp, temp, from_state, span, scale, carbon, tables, backward):  # type: ignore[no-untyped-def]
    n = len(temp)
    state = from_state.copy()
    energy, capacity, k = np.empty(n), np.empty(n), np.empty(n)
    for i in range(n):
        slope = 0.0
        if min(from_temp[i], temp[i]) < tables.top:
            slope = advance(state, i, from_temp[i], temp[i], span, scale, tables, backward)
        energy[i], cp, k[i] = enthalpy_node(state[i], temp[i], carbon, tables)
        capacity[i] = max(cp + slope, 0.5 * cp)
    return state, energy, capacity, k


@dataclass(frozen=True)
class Peer:
    """What the peer leaves: temperatures (n_step + 1, n_node) [K] and CPU seconds."""

    field: Array
    assembly: float
    factor: float
    kinetics: float
    total: float


def finite_elements(
    mesh: MeshTri, tables: Tables, start: Array, carbon: float, times: Array, *, afresh: bool
) -> Peer:
    """The mesh over given step times; ``afresh``: a matrix and a factor for each move."""
    basis = Basis(mesh, ElementTriP1())
    mass = DENSITY * _share.assemble(basis)
    points = mesh.p
    cooled = mesh.facets_satisfying(lambda x: np.isclose(x.max(axis=0), points.max()), True)
    area = _share.assemble(FacetBasis(mesh, ElementTriP1(), facets=cooled))
    n = len(mass)
    state = np.tile(start, (n, 1))
    scale = np.ones((n, 4))
    temp = np.full(n, START)
    older, before = temp.copy(), 0.0
    spent = np.zeros(3)
    film_slope = np.diff(FILM, append=FILM[-1]) / np.diff(FILM_TEMP, append=np.inf)

    def surface(at: Array) -> tuple[Array, Array]:
        film = np.interp(at, FILM_TEMP, FILM)
        row = np.searchsorted(FILM_TEMP, at) - 1
        steep = np.where(row >= 0, film_slope[row], 0.0)
        return -area * film * (at - BATH), area * (film + steep * (at - BATH))

    def stage(known, from_temp, from_state, span, share, at, backward):  # type: ignore[no-untyped-def]
        solver, most, matrix = None, np.inf, None
        for _ in range(MOST_MOVES):
            begin = time.process_time()
            after, energy, capacity, k = _react(
                from_temp, at, from_state, span, scale, carbon, tables, backward
            )
            spent[2] += time.process_time() - begin
            if matrix is None or afresh:
                begin = time.process_time()
                matrix = _conduction.assemble(basis, k=basis.interpolate(k))
                spent[0] += time.process_time() - begin
            flow, stiff = surface(at)
            rate = flow - matrix @ at
            if most < NEWTON:
                return at, after, rate
            if solver is None or afresh:
                begin = time.process_time()
                system = share * matrix + diags(
                    np.maximum(mass * capacity + share * stiff, 0.2 * mass * capacity)
                )
                solver = splu(
                    system.tocsc(),
                    permc_spec="MMD_AT_PLUS_A",
                    diag_pivot_thresh=0.0,
                    options={"SymmetricMode": True},
                )
                spent[1] += time.process_time() - begin
            move = solver.solve(known + share * rate - mass * energy)
            at = at + move
            most = np.abs(move).max()
        raise AssertionError("the peer did not converge")

    begin = time.process_time()
    book = mass * _react(temp, temp, state, 0.0, scale, carbon, tables, False)[1]
    rate = surface(temp)[0]
    field = [temp]
    for count, step in enumerate(np.diff(times)):
        drift = (temp - older) / before if before > 0.0 else 0.0 * temp
        known = book + IMPLICIT * step * rate
        middle, state1, rate1 = stage(
            known, temp, state, GAMMA * step, IMPLICIT * step,
            temp + GAMMA * step * drift, count % 2 == 1,
        )  # fmt: skip
        known = book + EXPLICIT * step * (rate + rate1)
        end, state2, rate2 = stage(
            known, middle, state1, (1.0 - GAMMA) * step, IMPLICIT * step,
            temp + (middle - temp) / GAMMA, count % 2 == 0,
        )  # fmt: skip
        book = book + step * (EXPLICIT * (rate + rate1) + IMPLICIT * rate2)
        older, before, temp, state, rate = temp, step, end, state2, rate2
        field.append(temp)
    return Peer(np.array(field), *spent, time.process_time() - begin)
