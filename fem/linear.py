"""The linear systems of one implicit step: a sweep on a line, multigrid elsewhere.

Every system is ``(diag(excess) + L(weight)) x = rhs`` with a graph Laplacian
``L`` of positive edge weights and a positive excess per node, so that a coarse
system is again of that form, made by adding up: the aggregates are found once
from the section's geometry and only the numbers are summed anew. Conjugate
gradients around one V-cycle of such aggregates.

Source
------
Thomas elimination; conjugate gradients of Hestenes & Stiefel 1952; pairwise
aggregation in the manner of Notay, Electron. Trans. Numer. Anal. 37 (2010) 123
(remembered).
"""

from collections.abc import Callable
from typing import Any, NamedTuple

import numpy as np
from numba.extending import overload

from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.compiled import kernel

COARSEST = 24  # nodes below which a level is eliminated


class Line(NamedTuple):
    """A chain of nodes: eliminated directly. ``work`` has shape (n_node,)."""

    work: Array


class Aggregates(NamedTuple):
    """A hierarchy of graphs, level after level in flat arrays.

    ``node_start`` and ``edge_start`` (n_level + 1,) say where a level lies;
    ``tail``, ``head`` are node numbers within the level; ``parent`` gives each
    node's aggregate, ``edge_parent`` each edge's coarse edge or -1 inside one;
    ``row``, ``neighbour``, ``through`` list each node's neighbours and edges;
    ``coarsest`` holds the triangular factor of the last level.
    """

    node_start: IntArray
    edge_start: IntArray
    tail: IntArray
    head: IntArray
    parent: IntArray
    edge_parent: IntArray
    row: IntArray
    neighbour: IntArray
    through: IntArray
    excess: Array
    weight: Array
    diagonal: Array
    guess: Array
    load: Array
    work: Array
    coarsest: Array


Scheme = Line | Aggregates


def scheme(body: ControlVolumes) -> Scheme:
    """The scheme that fits a section, built once from its geometry."""
    if body.is_chain:
        return Line(np.empty(body.n_node))
    return _aggregates(body)


@kernel
def _pairs(n_node: int, row: IntArray, neighbour: IntArray, strength: Array) -> IntArray:
    """Join each node with its strongest free neighbour; number the pairs."""
    parent = np.full(n_node, -1, np.int64)
    count = 0
    for i in range(n_node):
        if parent[i] >= 0:
            continue
        best = -1
        most = 0.0
        for p in range(row[i], row[i + 1]):
            j = neighbour[p]
            if parent[j] < 0 and j != i and strength[p] > most:
                most = strength[p]
                best = j
        parent[i] = count
        if best >= 0:
            parent[best] = count
        count += 1
    return parent


def _adjacency(n_node: int, edge: IntArray) -> tuple[IntArray, IntArray, IntArray]:
    ends = np.concatenate([edge[:, 0], edge[:, 1]])
    others = np.concatenate([edge[:, 1], edge[:, 0]])
    number = np.tile(np.arange(len(edge)), 2)
    order = np.argsort(ends, kind="stable")
    row = np.zeros(n_node + 1, dtype=np.int64)
    np.cumsum(np.bincount(ends, minlength=n_node), out=row[1:])
    return row, others[order].astype(np.int64), number[order].astype(np.int64)


def _coarsen(
    n_node: int, edge: IntArray, weight: Array
) -> tuple[IntArray, IntArray, IntArray, Array]:
    """One level up: parents, edge parents, coarse edges and their weights."""
    row, neighbour, through = _adjacency(n_node, edge)
    parent = _pairs(n_node, row, neighbour, weight[through])
    n_coarse = int(parent.max()) + 1
    ends = np.sort(parent[edge], axis=1)
    outside = ends[:, 0] != ends[:, 1]
    key = ends[:, 0] * n_coarse + ends[:, 1]
    unique, inverse = np.unique(key[outside], return_inverse=True)
    edge_parent = np.full(len(edge), -1, dtype=np.int64)
    edge_parent[outside] = inverse
    coarse = np.stack([unique // n_coarse, unique % n_coarse], axis=1).astype(np.int64)
    summed = np.bincount(inverse, weights=weight[outside], minlength=len(unique))
    return parent, edge_parent, coarse, np.asarray(summed, dtype=np.float64)


def _aggregates(body: ControlVolumes) -> Aggregates:
    n_node, edge, weight = body.n_node, body.edge, body.conductance_length
    sizes, edges, parents, edge_parents = [n_node], [edge], [], []
    while sizes[-1] > COARSEST:
        # Two pairings make aggregates of about four and keep the levels few.
        parent, edge_parent, coarse, summed = _coarsen(sizes[-1], edges[-1], weight)
        second, second_edge, coarse, summed = _coarsen(int(parent.max()) + 1, coarse, summed)
        parent = second[parent]
        if int(parent.max()) + 1 >= sizes[-1]:
            break
        edge_parent = np.where(edge_parent >= 0, second_edge[edge_parent], -1)
        parents.append(parent)
        edge_parents.append(edge_parent)
        sizes.append(int(parent.max()) + 1)
        edges.append(coarse)
        weight = summed
    parents.append(np.zeros(sizes[-1], dtype=np.int64))
    edge_parents.append(np.full(len(edges[-1]), -1, dtype=np.int64))
    rows, neighbours, throughs = [], [], []
    for size, level in zip(sizes, edges, strict=True):
        row, neighbour, through = _adjacency(size, level)
        rows.append(row)
        neighbours.append(neighbour)
        throughs.append(through)
    n_all, e_all = sum(sizes), sum(len(level) for level in edges)
    everything = np.concatenate(edges)
    return Aggregates(
        node_start=np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64),
        edge_start=np.concatenate([[0], np.cumsum([len(e) for e in edges])]).astype(np.int64),
        tail=np.ascontiguousarray(everything[:, 0]),
        head=np.ascontiguousarray(everything[:, 1]),
        parent=np.concatenate(parents),
        edge_parent=np.concatenate(edge_parents),
        row=np.concatenate(rows),
        neighbour=np.concatenate(neighbours),
        through=np.concatenate(throughs),
        excess=np.zeros(n_all),
        weight=np.zeros(e_all),
        diagonal=np.zeros(n_all),
        guess=np.zeros(n_all),
        load=np.zeros(n_all),
        work=np.zeros((4, n_node)),
        coarsest=np.zeros((sizes[-1], sizes[-1])),
    )


@kernel
def _sweep_line(
    line: Line, excess: Array, weight: Array, rhs: Array, out: Array, accuracy: float
) -> int:
    n = len(excess)
    work = line.work
    pivot = excess[0] + weight[0]
    out[0] = rhs[0] / pivot
    for i in range(1, n):
        work[i] = -weight[i - 1] / pivot
        pivot = excess[i] + weight[i - 1] * (1.0 + work[i])
        if i < n - 1:
            pivot += weight[i]
        out[i] = (rhs[i] + weight[i - 1] * out[i - 1]) / pivot
    for i in range(n - 2, -1, -1):
        out[i] -= work[i + 1] * out[i + 1]
    return 1


@kernel
def _sum_up(grid: Aggregates, excess: Array, weight: Array) -> None:
    """Fill every level's excess, weights and diagonal from the finest."""
    n_level = len(grid.node_start) - 1
    grid.excess[:] = 0.0
    grid.weight[:] = 0.0
    for i in range(len(excess)):
        grid.excess[i] = excess[i]
    for e in range(len(weight)):
        grid.weight[e] = weight[e]
    for level in range(n_level):
        n0, n1 = grid.node_start[level], grid.node_start[level + 1]
        e0, e1 = grid.edge_start[level], grid.edge_start[level + 1]
        for i in range(n0, n1):
            grid.diagonal[i] = grid.excess[i]
        for e in range(e0, e1):
            grid.diagonal[n0 + grid.tail[e]] += grid.weight[e]
            grid.diagonal[n0 + grid.head[e]] += grid.weight[e]
        if level < n_level - 1:
            for i in range(n0, n1):
                grid.excess[n1 + grid.parent[i]] += grid.excess[i]
            for e in range(e0, e1):
                if grid.edge_parent[e] >= 0:
                    grid.weight[e1 + grid.edge_parent[e]] += grid.weight[e]
    _factor(grid)


@kernel
def _factor(grid: Aggregates) -> None:
    """Cholesky's factor of the last level, whose matrix is small and full."""
    last = len(grid.node_start) - 2
    n0, e0 = grid.node_start[last], grid.edge_start[last]
    n = grid.node_start[last + 1] - n0
    a = grid.coarsest
    for i in range(n):
        for j in range(n):
            a[i, j] = 0.0
        a[i, i] = grid.diagonal[n0 + i]
    for e in range(e0, grid.edge_start[last + 1]):
        i, j = grid.tail[e], grid.head[e]
        a[i, j] -= grid.weight[e]
        a[j, i] -= grid.weight[e]
    for j in range(n):
        for k in range(j):
            a[j, j] -= a[j, k] * a[j, k]
        a[j, j] = np.sqrt(a[j, j])
        for i in range(j + 1, n):
            for k in range(j):
                a[i, j] -= a[i, k] * a[j, k]
            a[i, j] /= a[j, j]


@kernel
def _eliminate(grid: Aggregates) -> None:
    """Solve the last level exactly: without it a smooth error hardly moves."""
    n0 = grid.node_start[len(grid.node_start) - 2]
    n = len(grid.coarsest)
    a, x = grid.coarsest, grid.guess
    for i in range(n):
        total = grid.load[n0 + i]
        for k in range(i):
            total -= a[i, k] * x[n0 + k]
        x[n0 + i] = total / a[i, i]
    for i in range(n - 1, -1, -1):
        total = x[n0 + i]
        for k in range(i + 1, n):
            total -= a[k, i] * x[n0 + k]
        x[n0 + i] = total / a[i, i]


@kernel
def _smooth(grid: Aggregates, level: int, backward: bool) -> None:
    """One Gauss-Seidel sweep on a level."""
    n0 = grid.node_start[level]
    size = grid.node_start[level + 1] - n0
    e0 = grid.edge_start[level]
    r0 = n0 + level  # each level's row list is one longer than its nodes
    p0 = 2 * e0
    for turn in range(size):
        i = size - 1 - turn if backward else turn
        total = grid.load[n0 + i]
        for p in range(grid.row[r0 + i], grid.row[r0 + i + 1]):
            total += (
                grid.weight[e0 + grid.through[p0 + p]] * grid.guess[n0 + grid.neighbour[p0 + p]]
            )
        grid.guess[n0 + i] = total / grid.diagonal[n0 + i]


@kernel
def _cycle(grid: Aggregates, load: Array, out: Array) -> None:
    """One symmetric V-cycle: ``out`` approximates the solution for ``load``."""
    n_level = len(grid.node_start) - 1
    for i in range(len(load)):
        grid.load[i] = load[i]
    for level in range(n_level):
        n0, n1 = grid.node_start[level], grid.node_start[level + 1]
        e0 = grid.edge_start[level]
        grid.guess[n0:n1] = 0.0
        if level == n_level - 1:
            _eliminate(grid)
            break
        _smooth(grid, level, False)
        n2 = grid.node_start[level + 2]
        grid.load[n1:n2] = 0.0
        r0 = n0 + level
        p0 = 2 * e0
        for i in range(n1 - n0):
            rest = grid.load[n0 + i] - grid.diagonal[n0 + i] * grid.guess[n0 + i]
            for p in range(grid.row[r0 + i], grid.row[r0 + i + 1]):
                rest += (
                    grid.weight[e0 + grid.through[p0 + p]] * grid.guess[n0 + grid.neighbour[p0 + p]]
                )
            grid.load[n1 + grid.parent[n0 + i]] += rest
    for level in range(n_level - 2, -1, -1):
        n0, n1 = grid.node_start[level], grid.node_start[level + 1]
        for i in range(n0, n1):
            grid.guess[i] += grid.guess[n1 + grid.parent[i]]
        _smooth(grid, level, True)
    for i in range(len(out)):
        out[i] = grid.guess[i]


@kernel
def _product(one: Array, other: Array) -> float:
    """Scalar product; the library's own wakes threads that wait for each other."""
    total: float = 0.0
    for i in range(len(one)):
        total += one[i] * other[i]
    return total


@kernel
def _gradients(
    grid: Aggregates, excess: Array, weight: Array, rhs: Array, out: Array, accuracy: float
) -> int:
    """Preconditioned conjugate gradients until the correction is below ``accuracy``."""
    n = len(excess)
    n_edge = len(weight)
    _sum_up(grid, excess, weight)
    rest, step, image, fixed = grid.work[0], grid.work[1], grid.work[2], grid.work[3]
    for i in range(n):
        out[i] = 0.0
        rest[i] = rhs[i]
    _cycle(grid, rest, fixed)
    for i in range(n):
        step[i] = fixed[i]
    gain = _product(rest, fixed)
    if gain <= 0.0:
        return 0
    held = 0.0
    for i in range(n):
        held += excess[i]
    for iteration in range(200):
        for i in range(n):
            image[i] = excess[i] * step[i]
        for e in range(n_edge):
            i, j = grid.tail[e], grid.head[e]
            flow = weight[e] * (step[i] - step[j])
            image[i] += flow
            image[j] -= flow
        length = gain / _product(step, image)
        most = 0.0
        for i in range(n):
            move = length * step[i]
            out[i] += move
            rest[i] -= length * image[i]
            most = max(most, abs(move))
        _cycle(grid, rest, fixed)
        fresh = _product(rest, fixed)
        # A smooth error moves little in one iteration; its energy shows it.
        if fresh <= 0.0 or (most < accuracy and fresh < held * accuracy * accuracy):
            return iteration + 1
        ratio = fresh / gain
        gain = fresh
        for i in range(n):
            step[i] = fixed[i] + ratio * step[i]
    return -1


def solve(
    how: Scheme, excess: Array, weight: Array, rhs: Array, out: Array, accuracy: float
) -> int:
    """Solve ``(diag(excess) + L(weight)) out = rhs`` inside a kernel.

    ``accuracy`` is the largest move [unit of ``out``] below which the iterative
    scheme stops. Returns the iterations, or -1 when it did not converge.
    """
    if isinstance(how, Line):
        return _sweep_line(how, excess, weight, rhs, out, accuracy)
    return _gradients(how, excess, weight, rhs, out, accuracy)


@overload(solve, strict=False)
def _choose(
    how: Any, excess: Any, weight: Any, rhs: Any, out: Any, accuracy: Any
) -> Callable[..., int] | None:
    kind = getattr(how, "instance_class", None)  # numba's type of a named tuple
    if kind is Line:
        return lambda how, excess, weight, rhs, out, accuracy: _sweep_line(
            how, excess, weight, rhs, out, accuracy
        )
    if kind is Aggregates:
        return lambda how, excess, weight, rhs, out, accuracy: _gradients(
            how, excess, weight, rhs, out, accuracy
        )
    return None
