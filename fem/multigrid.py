"""Conjugate gradients around one cycle through a hierarchy of aggregates.

Model
-----
``(diag(excess) + L(weight)) x = rhs`` with a graph Laplacian ``L``. A coarse system
is again of that form, made by adding up. One cycle: a sweep of Gauss and Seidel
forward, the coarse system by at most two steps of its own conjugate gradients
around the next level's cycle, a sweep backward. Those inner steps find the right
length of the coarse correction, which plain aggregates get wrong by a factor of
two, and keep the number of iterations from growing with the number of nodes. As
they are not linear the outer directions are made conjugate one by one.

Source
------
Hestenes & Stiefel, J. Res. NBS 49 (1952) 409; recursive cycle: Notay & Vassilevski,
Numer. Linear Algebra Appl. 15 (2008) 473; flexible conjugate gradients: Notay, SIAM
J. Sci. Comput. 22 (2000) 1444 (all remembered).
"""

import numpy as np

from midradius.fem.aggregates import INSIDE, Aggregates
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel

MOST_ITERATIONS = 200
WELL_ENOUGH = 0.35  # residual after one inner step that makes a second one needless
AT_ROUNDING = 1e-26  # of the first energy: an error smaller by 1e-13


@kernel
def _sum_up(grid: Aggregates, excess: Array, weight: Array) -> None:
    """Fill every level's numbers from the finest."""
    n_level = len(grid.node_start) - 1
    grid.excess[: len(excess)] = excess
    grid.weight[: len(weight)] = weight
    for level in range(n_level):
        n0, n1 = grid.node_start[level], grid.node_start[level + 1]
        e0, e1 = grid.edge_start[level], grid.edge_start[level + 1]
        row, through = grid.row[n0 + level : n1 + level + 1], grid.through[2 * e0 : 2 * e1]
        own, joins, value = grid.excess[n0:n1], grid.weight[e0:e1], grid.value[2 * e0 : 2 * e1]
        inverse = grid.inverse[n0:n1]
        for i in range(n1 - n0):
            diagonal = own[i]
            for p in range(row[i], row[i + 1]):
                value[p] = joins[through[p]]
                diagonal += value[p]
            inverse[i] = 1.0 / diagonal
        if level < n_level - 1:
            parent, edge_parent = grid.parent[n0:n1], grid.edge_parent[e0:e1]
            coarse = grid.excess[n1 : grid.node_start[level + 2]]
            coarse[:] = 0.0
            for i in range(n1 - n0):
                coarse[parent[i]] += own[i]
            coarse = grid.weight[e1 : grid.edge_start[level + 2]]
            coarse[:] = 0.0
            for e in range(e1 - e0):
                if edge_parent[e] != INSIDE:
                    coarse[edge_parent[e]] += joins[e]
    _factor(grid)


@kernel
def _factor(grid: Aggregates) -> None:
    """Cholesky's factor of the last level, whose matrix is small and full."""
    last = len(grid.node_start) - 2
    n0, p0 = grid.node_start[last], 2 * grid.edge_start[last]
    n = grid.node_start[last + 1] - n0
    a = grid.coarsest
    for i in range(n):
        for j in range(n):
            a[i, j] = 0.0
        a[i, i] = 1.0 / grid.inverse[n0 + i]
        for p in range(p0 + grid.row[n0 + last + i], p0 + grid.middle[n0 + i]):
            a[i, grid.neighbour[p]] -= grid.value[p]
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
def _forward(grid: Aggregates, level: int) -> None:
    """A sweep from zero, whose residual goes to the next level's load.

    From zero a sweep sees lower neighbours only, and what it leaves at a node is
    what the higher ones still send.
    """
    n0, n1, n2 = grid.node_start[level], grid.node_start[level + 1], grid.node_start[level + 2]
    p0, p1 = 2 * grid.edge_start[level], 2 * grid.edge_start[level + 1]
    row, middle = grid.row[n0 + level : n1 + level + 1], grid.middle[n0:n1]
    neighbour, value = grid.neighbour[p0:p1], grid.value[p0:p1]
    guess, load, inverse = grid.guess[n0:n1], grid.load[n0:n1], grid.inverse[n0:n1]
    parent, coarse = grid.parent[n0:n1], grid.load[n1:n2]
    for i in range(n1 - n0):
        total = load[i]
        for p in range(row[i], middle[i]):
            total += value[p] * guess[neighbour[p]]
        guess[i] = total * inverse[i]
    coarse[:] = 0.0
    for i in range(n1 - n0):
        rest = 0.0
        for p in range(middle[i], row[i + 1]):
            rest += value[p] * guess[neighbour[p]]
        coarse[parent[i]] += rest


@kernel
def _backward(grid: Aggregates, level: int) -> None:
    """Add the coarse correction, then sweep backward."""
    n0, n1, n2 = grid.node_start[level], grid.node_start[level + 1], grid.node_start[level + 2]
    p0, p1 = 2 * grid.edge_start[level], 2 * grid.edge_start[level + 1]
    row, neighbour = grid.row[n0 + level : n1 + level + 1], grid.neighbour[p0:p1]
    guess, load, value = grid.guess[n0:n1], grid.load[n0:n1], grid.value[p0:p1]
    parent, coarse, inverse = grid.parent[n0:n1], grid.guess[n1:n2], grid.inverse[n0:n1]
    for i in range(n1 - n0):
        guess[i] += coarse[parent[i]]
    for turn in range(n1 - n0):
        i = n1 - n0 - 1 - turn
        total = load[i]
        for p in range(row[i], row[i + 1]):
            total += value[p] * guess[neighbour[p]]
        guess[i] = total * inverse[i]


@kernel
def _apply(grid: Aggregates, level: int, out: Array) -> None:
    """A level's matrix times the guess."""
    n0, n1 = grid.node_start[level], grid.node_start[level + 1]
    p0, p1 = 2 * grid.edge_start[level], 2 * grid.edge_start[level + 1]
    row, neighbour = grid.row[n0 + level : n1 + level + 1], grid.neighbour[p0:p1]
    guess, value, inverse = grid.guess[n0:n1], grid.value[p0:p1], grid.inverse[n0:n1]
    for i in range(n1 - n0):
        total = guess[i] / inverse[i]
        for p in range(row[i], row[i + 1]):
            total -= value[p] * guess[neighbour[p]]
        out[i] = total


@kernel
def _first_step(grid: Aggregates, level: int) -> bool:
    """Scale a level's guess to the right length; True when a second step is worth it."""
    n0, n1, f0 = grid.node_start[level], grid.node_start[level + 1], grid.node_start[1]
    guess, load = grid.guess[n0:n1], grid.load[n0:n1]
    first, image = grid.first[n0 - f0 : n1 - f0], grid.image[n0 - f0 : n1 - f0]
    _apply(grid, level, image)
    energy, gain, size = 0.0, 0.0, 0.0
    for i in range(n1 - n0):
        first[i] = guess[i]
        energy += guess[i] * image[i]
        gain += guess[i] * load[i]
        size += load[i] * load[i]
    length = gain / energy if energy > 0.0 else 0.0
    left = 0.0
    for i in range(n1 - n0):
        load[i] -= length * image[i]
        left += load[i] * load[i]
        guess[i] *= length
    grid.inner[level, 0], grid.inner[level, 1] = length, energy
    return energy > 0.0 and left > WELL_ENOUGH**2 * size


@kernel
def _second_step(grid: Aggregates, level: int) -> None:
    """Make the guess conjugate to the first one and add both."""
    n0, n1, f0 = grid.node_start[level], grid.node_start[level + 1], grid.node_start[1]
    guess, load = grid.guess[n0:n1], grid.load[n0:n1]
    first, image = grid.first[n0 - f0 : n1 - f0], grid.image[n0 - f0 : n1 - f0]
    length, energy = grid.inner[level, 0], grid.inner[level, 1]
    cross, gain = 0.0, 0.0
    for i in range(n1 - n0):
        cross += guess[i] * image[i]
        gain += guess[i] * load[i]
    own = -cross * cross / energy
    _apply(grid, level, image)
    for i in range(n1 - n0):
        own += guess[i] * image[i]
    second = gain / own if own > 0.0 else 0.0
    length -= second * cross / energy
    for i in range(n1 - n0):
        guess[i] = length * first[i] + second * guess[i]


@kernel
def _cycle(grid: Aggregates) -> None:
    """One cycle: the finest ``guess`` approximates the solution for its ``load``.

    Written out without recursion, which the compiler cannot keep in its cache.
    """
    last = len(grid.node_start) - 2
    for level in range(last + 1):
        grid.inner[level, 2] = 0.0
    level = 0
    while True:
        while level < last:
            _forward(grid, level)
            level += 1
        _eliminate(grid)
        while level > 0:
            if level < last:
                once = grid.inner[level, 2] == 0.0
                if once and _first_step(grid, level):
                    grid.inner[level, 2] = 1.0
                    break
                if not once:
                    _second_step(grid, level)
                    grid.inner[level, 2] = 0.0
            level -= 1
            _backward(grid, level)
        if level == 0:
            return


@kernel
def gradients(
    grid: Aggregates,
    excess: Array,
    weight: Array,
    rhs: Array,
    out: Array,
    accuracy: float,
    share: float,
) -> int:
    """Solve until the correction is below ``accuracy``; see :func:`linear.solve`."""
    n = len(excess)
    _sum_up(grid, excess, weight)
    step, image = grid.work[0], grid.work[1]
    rest, fixed = grid.load[:n], grid.guess[:n]  # a cycle takes the one to the other
    held = 0.0
    for i in range(n):
        out[i] = 0.0
        rest[i] = rhs[i]
        step[i] = 0.0
        image[i] = 0.0
        held += excess[i]
    start, energy, most = 0.0, 1.0, np.inf
    for iteration in range(MOST_ITERATIONS):
        _cycle(grid)
        fresh, common = 0.0, 0.0
        for i in range(n):
            fresh += rest[i] * fixed[i]
            common += image[i] * fixed[i]
        if iteration == 0:
            start = fresh
        # A smooth error moves little in one iteration; its energy shows it.
        if fresh <= max(share * share, AT_ROUNDING) * start or (
            most < accuracy and fresh < held * accuracy * accuracy
        ):
            _balance(excess, rhs, out, held)
            return iteration if fresh >= 0.0 else -1
        for i in range(n):
            step[i] = fixed[i] - common / energy * step[i]
            image[i] = excess[i] * step[i]
        for e in range(len(weight)):
            i, j = grid.tail[e], grid.head[e]
            flow = weight[e] * (step[i] - step[j])
            image[i] += flow
            image[j] -= flow
        gain, energy = 0.0, 0.0
        for i in range(n):
            gain += step[i] * rest[i]
            energy += step[i] * image[i]
        if not energy > 0.0:
            return -1
        length = gain / energy
        most = 0.0
        for i in range(n):
            out[i] += length * step[i]
            rest[i] -= length * image[i]
            most = max(most, abs(length * step[i]))
    return -1


@kernel
def _balance(excess: Array, rhs: Array, out: Array, held: float) -> None:
    """Shift all alike so that the residuals sum to zero: no heat is lost."""
    total = 0.0
    for i in range(len(out)):
        total += rhs[i] - excess[i] * out[i]
    for i in range(len(out)):
        out[i] += total / held
