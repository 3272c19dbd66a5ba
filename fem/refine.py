"""A mesh with every edge halved: each cell in 4 in the plane, in 8 in space.

Nodes of the mesh keep their numbers; the new ones lie in the middle of edges,
of quadrilateral faces and of hexahedra, so that solutions on both meshes can be
compared at the nodes they share.
"""

from collections.abc import Mapping
from itertools import combinations

import numpy as np

from midradius.fem.meshhealth import volumes
from midradius.fem.meshraw import SHAPES
from midradius.thermo.arrays import Array, IntArray

Blocks = tuple[tuple[str, IntArray], ...]
# Parents of the local nodes: corners, then the middles. Children name local nodes.
_Parents = tuple[tuple[int, ...], ...]
_Children = tuple[tuple[str, tuple[int, ...]], ...]


def refined(
    points: Array, cells: Blocks, facets: IntArray, zone: IntArray
) -> tuple[Array, Blocks, IntArray, IntArray]:
    """Points, cells, boundary facets and their zones of the finer mesh."""
    new = _Middles(points)
    blocks: dict[str, list[IntArray]] = {}
    for kind, block in cells:
        parents, children = RULES[kind]
        local = np.stack([new.node(block[:, list(of)]) for of in parents], axis=1)
        for child, corners in children:
            blocks.setdefault(child, []).append(local[:, list(corners)])
        if kind == "tetra":
            blocks["tetra"].append(_octahedra(new.points(), local))
    rims, zones = [], []
    for kind, width in (("line", 2), ("triangle", 3), ("quad", 4)):
        here = (facets >= 0).sum(axis=1) == width
        if not here.any():
            continue
        parents, children = RULES[kind]
        block = facets[here]
        local = np.stack([new.node(block[:, list(of)]) for of in parents], axis=1)
        for _, corners in children:
            rim = np.full((len(block), 4), -1, dtype=np.int64)
            rim[:, :width] = local[:, list(corners)]
            rims.append(rim)
            zones.append(zone[here])
    points = new.points()
    done = tuple(
        (kind, _right(points, kind, np.concatenate(lots))) for kind, lots in blocks.items()
    )
    return points, done, np.concatenate(rims), np.concatenate(zones)


class _Middles:
    """Hands out one node for each set of parents; it has a life, hence a class."""

    def __init__(self, points: Array) -> None:
        self._points = [points]
        self._count = len(points)
        self._known: dict[int, tuple[IntArray, IntArray]] = {}

    def points(self) -> Array:
        """All nodes so far."""
        self._points = [np.concatenate(self._points)]
        return self._points[0]

    def node(self, parents: IntArray) -> IntArray:
        """Nodes in the middle of the parents (n, k); one parent is its own node."""
        if parents.shape[1] == 1:
            return parents[:, 0]
        keys = np.sort(parents, axis=1)
        size = keys.shape[1]
        known, numbers = self._known.get(size, (np.empty((0, size), np.int64), np.empty(0, int)))
        unique, first, inverse = np.unique(
            np.concatenate([known, keys]), axis=0, return_index=True, return_inverse=True
        )
        number = np.empty(len(unique), dtype=np.int64)
        old = first < len(known)
        number[old] = numbers[first[old]]
        number[~old] = self._count + np.arange(int((~old).sum()))
        self._count += int((~old).sum())
        middle = self.points()[unique[~old]].mean(axis=1)
        self._points.append(middle)
        self._known[size] = unique, number
        return np.asarray(number[inverse.ravel()[len(known) :]])


def _grid_rule(kind: str, steps: tuple[tuple[int, int, int], ...]) -> tuple[_Parents, _Children]:
    """The rule of a line, quad or hexahedron: a lattice of 3 nodes a side."""
    dim = SHAPES[kind].dim
    corner = {place[:dim]: k for k, place in enumerate(steps)}
    lattice = sorted({tuple(p) for p in np.ndindex(*(3,) * dim)})
    parents = []
    for place in lattice:
        ends = [_ENDS[v] for v in place]
        parents.append(tuple(corner[tuple(c)] for c in _product(ends)))
    number = {place: k for k, place in enumerate(lattice)}
    children = []
    for low in np.ndindex(*(2,) * dim):
        places = [tuple(a + b for a, b in zip(low, c[:dim], strict=True)) for c in steps]
        children.append((kind, tuple(number[place] for place in places)))
    return tuple(parents), tuple(children)


_ENDS: tuple[tuple[int, ...], ...] = ((0,), (0, 1), (1,))


def _product(ends: list[tuple[int, ...]]) -> list[tuple[int, ...]]:
    found: list[tuple[int, ...]] = [()]
    for end in ends:
        found = [(*row, value) for row in found for value in end]
    return found


_TRIANGLE: _Parents = ((0,), (1,), (2,), (0, 1), (1, 2), (0, 2))
_IN_TRIANGLE = ((0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5))
_TETRA: _Parents = ((0,), (1,), (2,), (3,), *combinations(range(4), 2))
# middles: 4 = 01, 5 = 02, 6 = 03, 7 = 12, 8 = 13, 9 = 23
_AT_CORNERS = ((0, 4, 5, 6), (4, 1, 7, 8), (5, 7, 2, 9), (6, 8, 9, 3))
_DIAGONALS = (((4, 9), (5, 7, 8, 6)), ((5, 8), (4, 7, 9, 6)), ((6, 7), (4, 5, 9, 8)))


def _octahedra(points: Array, local: IntArray) -> IntArray:
    """The inside of each tetrahedron, split along its shortest diagonal."""
    gaps = [
        np.linalg.norm(points[local[:, a]] - points[local[:, b]], axis=1)
        for (a, b), _ in _DIAGONALS
    ]
    shortest = np.argmin(np.stack(gaps), axis=0)
    found = []
    for k, ((a, b), ring) in enumerate(_DIAGONALS):
        own = local[shortest == k]
        for i in range(4):
            found.append(own[:, [a, b, ring[i], ring[(i + 1) % 4]]])
    return np.concatenate(found)


def _wedge_rule() -> tuple[_Parents, _Children]:
    parents: list[tuple[int, ...]] = []
    for ends in ((0,), (0, 3), (3,)):
        parents += [tuple(p + e for e in ends for p in of) for of in _TRIANGLE]
    children = []
    for layer in (0, 6):
        for corners in _IN_TRIANGLE:
            low = tuple(layer + c for c in corners)
            children.append(("wedge", (*low, *(c + 6 for c in low))))
    return tuple(parents), tuple(children)


def _pyramid_rule() -> tuple[_Parents, _Children]:
    parents: _Parents = (
        *((0,), (1,), (2,), (3,), (4,)),
        *((0, 1), (1, 2), (2, 3), (0, 3)),
        (0, 1, 2, 3),
        *((0, 4), (1, 4), (2, 4), (3, 4)),
    )
    side, up, centre = (5, 6, 7, 8), (10, 11, 12, 13), 9
    children: list[tuple[str, tuple[int, ...]]] = []
    for k in range(4):
        children.append(("pyramid", (k, side[k], centre, side[k - 1], up[k])))
        children.append(("tetra", (side[k], up[k], up[(k + 1) % 4], centre)))
    children.append(("pyramid", (*up, 4)))
    children.append(("pyramid", (*up[::-1], centre)))
    return parents, tuple(children)


def _right(points: Array, kind: str, block: IntArray) -> IntArray:
    """Tetrahedra of positive volume; other cells come out as their parents were."""
    if kind != "tetra":
        return block
    wrong = volumes(points, block) < 0.0
    block[wrong] = block[wrong][:, [0, 2, 1, 3]]
    return block


_CORNERS = ((0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0), (0, 0, 1), (1, 0, 1), (1, 1, 1), (0, 1, 1))
RULES: Mapping[str, tuple[_Parents, _Children]] = {
    "line": _grid_rule("line", _CORNERS[:2]),
    "triangle": (_TRIANGLE, tuple(("triangle", row) for row in _IN_TRIANGLE)),
    "quad": _grid_rule("quad", _CORNERS[:4]),
    "tetra": (_TETRA, tuple(("tetra", row) for row in _AT_CORNERS)),
    "hexahedron": _grid_rule("hexahedron", _CORNERS),
    "wedge": _wedge_rule(),
    "pyramid": _pyramid_rule(),
}
