"""A hierarchy of ever coarser graphs: which nodes move together on each level.

Model
-----
Nodes are joined in pairs along their strongest edge, the pairs once more, so that
an aggregate holds about four nodes that heat joins well: along the short side of
flat cells, around in square ones. A coarse graph has the summed weights between
aggregates. Found once from the geometry; conductivities only change numbers.
An edge of negative weight (opposite obtuse corners of triangles) is summed like
any other and never joins a pair.

Source
------
Pairwise aggregation: Notay, Electron. Trans. Numer. Anal. 37 (2010) 123
(remembered).
"""

from typing import NamedTuple

import numpy as np

from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.compiled import kernel

COARSEST = 24  # nodes below which a level is eliminated
STRONG = 0.25  # share of a node's strongest edge below which it joins no pair
INSIDE = 2**32 - 1  # edge parent of an edge within an aggregate: -1 without sign
SLOWEST = 0.9  # a level must be smaller than this share of the finer one


class Aggregates(NamedTuple):
    """Graphs, level after level in flat arrays, with room for their numbers.

    ``node_start``, ``edge_start`` (n_level + 1,) say where a level lies; its row
    lists begin at ``node_start + level``, its entries at twice ``edge_start``.
    Node numbers count from 0 within a level. ``tail``, ``head`` are the ends of
    the finest edges; ``parent`` gives each node's aggregate, ``edge_parent`` each
    edge's coarse edge or INSIDE an aggregate. Of node ``i`` the entries
    ``row[i]`` to ``middle[i]`` lead to lower neighbours, from there to
    ``row[i + 1]`` to higher ones; ``through`` is an entry's edge, ``value`` its
    weight. ``coarsest`` holds the triangular factor of the last level.
    """

    node_start: IntArray
    edge_start: IntArray
    tail: IntArray
    head: IntArray
    parent: IntArray
    edge_parent: IntArray
    row: IntArray
    middle: IntArray
    neighbour: IntArray
    through: IntArray
    excess: Array
    weight: Array
    value: Array
    inverse: Array
    guess: Array
    load: Array
    first: Array
    image: Array
    inner: Array
    work: Array
    coarsest: Array


@kernel
def _adjacency(n_node: int, edge: IntArray) -> tuple[IntArray, IntArray, IntArray, IntArray]:
    """Rows, where each row's higher neighbours begin, neighbours, edges."""
    row = np.zeros(n_node + 1, np.int64)
    middle = np.zeros(n_node, np.int64)
    neighbour = np.empty(2 * len(edge), np.int64)
    through = np.empty(2 * len(edge), np.int64)
    for e in range(len(edge)):
        row[edge[e, 0] + 1] += 1
        row[edge[e, 1] + 1] += 1
    for i in range(n_node):
        row[i + 1] += row[i]
    end = row[:-1].copy()
    for e in range(len(edge)):
        for side in range(2):
            i, j = edge[e, side], edge[e, 1 - side]
            p = end[i]
            while p > row[i] and neighbour[p - 1] > j:  # rows are short: sort as they fill
                neighbour[p] = neighbour[p - 1]
                through[p] = through[p - 1]
                p -= 1
            neighbour[p] = j
            through[p] = e
            end[i] += 1
    for i in range(n_node):
        p = row[i]
        while p < row[i + 1] and neighbour[p] < i:
            p += 1
        middle[i] = p
    return row, middle, neighbour, through


@kernel
def _pairs(row: IntArray, neighbour: IntArray, through: IntArray, weight: Array) -> IntArray:
    """Join each node with its strongest free neighbour; number the pairs."""
    n_node = len(row) - 1
    parent = np.full(n_node, -1, np.int64)
    count = 0
    for i in range(n_node):
        if parent[i] >= 0:
            continue
        most = 0.0
        for p in range(row[i], row[i + 1]):
            most = max(most, weight[through[p]])
        best = -1
        most *= STRONG
        for p in range(row[i], row[i + 1]):
            j = neighbour[p]
            if parent[j] < 0 and weight[through[p]] > most:
                most = weight[through[p]]
                best = j
        parent[i] = count
        if best >= 0:
            parent[best] = count
        count += 1
    return parent


def _joined(parent: IntArray, edge: IntArray, weight: Array) -> tuple[IntArray, IntArray, Array]:
    """Edge parents, coarse edges and their weights."""
    n_coarse = int(parent.max()) + 1
    one, other = parent[edge[:, 0]], parent[edge[:, 1]]
    outside = one != other
    key = (np.minimum(one, other) * n_coarse + np.maximum(one, other))[outside]
    unique, inverse = np.unique(key, return_inverse=True)
    edge_parent = np.full(len(edge), -1, dtype=np.int64)
    edge_parent[outside] = inverse
    coarse = np.stack([unique // n_coarse, unique % n_coarse], axis=1).astype(np.int64)
    summed = np.bincount(inverse, weights=weight[outside], minlength=len(unique))
    return edge_parent, coarse, np.asarray(summed, dtype=np.float64)


def aggregates(body: ControlVolumes) -> Aggregates:
    """The hierarchy of a section's graph."""
    edge, weight = np.ascontiguousarray(body.edge), body.conductance_length
    sizes, edges, parents, edge_parents = [body.n_node], [edge], [], []
    lists = [_adjacency(body.n_node, edge)]
    while sizes[-1] > COARSEST:
        row, _, neighbour, through = lists[-1]
        parent = _pairs(row, neighbour, through, weight)
        edge_parent, coarse, summed = _joined(parent, edges[-1], weight)
        # Two pairings make aggregates of about four and keep the levels few.
        row, _, neighbour, through = _adjacency(int(parent.max()) + 1, coarse)
        second = _pairs(row, neighbour, through, summed)
        second_edge, coarse, summed = _joined(second, coarse, summed)
        edge_parent = np.append(second_edge, -1)[edge_parent]
        parent = second[parent]
        n_coarse = int(parent.max()) + 1
        if n_coarse > SLOWEST * sizes[-1]:
            break
        edge_parents.append(edge_parent)
        parents.append(parent)
        sizes.append(n_coarse)
        edges.append(coarse)
        weight = summed
        lists.append(_adjacency(n_coarse, coarse))
    n_all, e_all, n_last = sum(sizes), sum(map(len, edges)), sizes[-1]
    parents.append(np.zeros(n_last, dtype=np.int64))
    edge_parents.append(np.full(len(edges[-1]), -1, dtype=np.int64))

    def flat(arrays: list[IntArray]) -> IntArray:
        # Without sign: the compiler need not look for places counted from the end.
        return np.concatenate(arrays).astype(np.uint32)

    return Aggregates(
        node_start=np.cumsum([0, *sizes]).astype(np.int64),
        edge_start=np.cumsum([0, *map(len, edges)]).astype(np.int64),
        tail=edge[:, 0].astype(np.uint32),
        head=edge[:, 1].astype(np.uint32),
        parent=flat(parents),
        edge_parent=flat(edge_parents),
        row=flat([part[0] for part in lists]),
        middle=flat([part[1] for part in lists]),
        neighbour=flat([part[2] for part in lists]),
        through=flat([part[3] for part in lists]),
        excess=np.zeros(n_all),
        weight=np.zeros(e_all),
        value=np.zeros(2 * e_all),
        inverse=np.zeros(n_all),
        guess=np.zeros(n_all),
        load=np.zeros(n_all),
        first=np.zeros(n_all - body.n_node),
        image=np.zeros(n_all - body.n_node),
        inner=np.zeros((len(sizes), 3)),
        work=np.zeros((2, body.n_node)),
        coarsest=np.zeros((n_last, n_last)),
    )
