"""Control volumes of meshes: P1 elements with lumped capacity.

Model
-----
``w_ij = -integral grad(phi_i) . grad(phi_j)`` over triangles or tetrahedra, as
the conductance between two nodes; ``integral phi_i`` as the volume of a node and
as its share of the surface. In a body of revolution every integral carries the
factor r, taken exactly. Plane meshes are made positive first (``delaunay``);
solid ones keep what their shape gives, and :func:`negative_share` tells it.

Source
------
P1 elements: any text, for example Strang & Fix 1973, ch. 1 (remembered);
checked against an independent assembler in the tests.

Holds for
---------
Second order in the longest edge where cells are not slivers. Curved outlines
are the polygon that the mesh makes of them.
"""

from dataclasses import dataclass

import numpy as np

from midradius.fem.delaunay import Plane, cotangents
from midradius.fem.split import n_splitting, simplices_of
from midradius.thermo.arrays import Array, IntArray

CHUNK = 200_000  # simplices at a time
NOTHING = 1e-13  # of the largest weight at its nodes: an edge that carries no heat


@dataclass(frozen=True)
class Weights:
    """Edges (n, 2), their weights (n,) and the volume of every node (n_node,)."""

    edge: IntArray
    weight: Array
    volume: Array


@dataclass(frozen=True)
class Skin:
    """The surface by node: ``node``, ``area``, ``zone``, (n,) each."""

    node: IntArray
    area: Array
    zone: IntArray


_QUAD_HALVES = ((0, 1, 2), (0, 2, 3), (0, 1, 3), (1, 2, 3))


def plane_weights(plane: Plane, *, turned: bool) -> Weights:
    """Weights of a plane mesh; ``turned``: a body of revolution, per radian about x = 0."""
    n = len(plane.points)
    lots = [(plane.triangles, 1.0), *((plane.quads[:, list(h)], 0.5) for h in _QUAD_HALVES)]
    keys, weights, volume = [], [], np.zeros(n)
    for triangles, share in lots:
        corner = plane.points[triangles]
        one, other = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
        area = 0.5 * share * np.abs(one[:, 0] * other[:, 1] - one[:, 1] * other[:, 0])
        radius = corner[:, :, 0]
        mean = radius.mean(axis=1) if turned else np.ones(len(triangles))
        cot = 0.5 * share * mean[:, None] * cotangents(plane.points, triangles)
        for k in range(3):
            part = (3.0 * mean + radius[:, k]) / 12.0 if turned else np.full(len(triangles), 1 / 3)
            volume += np.bincount(triangles[:, k], area * part, n)
            ends = np.sort(triangles[:, [(k + 1) % 3, (k + 2) % 3]], axis=1)
            keys.append(ends[:, 0] * n + ends[:, 1])
            weights.append(cot[:, k])
    return _summed(np.concatenate(keys), np.concatenate(weights), volume)


def plane_skin(plane: Plane, *, turned: bool) -> Skin:
    """Surface of a plane mesh by node; segments of zone -1 are insulated."""
    seen = plane.segment_zone >= 0
    ends, zone = plane.segments[seen], plane.segment_zone[seen]
    a, b = plane.points[ends[:, 0]], plane.points[ends[:, 1]]
    length = np.linalg.norm(b - a, axis=1)
    first, second = 0.5 * length, 0.5 * length
    if turned:
        first = length * (2.0 * a[:, 0] + b[:, 0]) / 6.0
        second = length * (a[:, 0] + 2.0 * b[:, 0]) / 6.0
    return _skin(ends.T.ravel(), np.concatenate([first, second]), np.tile(zone, 2))


def solid_weights(points: Array, cells: tuple[tuple[str, IntArray], ...]) -> Weights:
    """Weights of a solid mesh, every cell by all its splittings in equal shares."""
    n = len(points)
    volume = np.zeros(n)
    keys: list[IntArray] = []
    weights: list[Array] = []
    for kind, block in cells:
        for local in simplices_of(kind):
            for start in range(0, len(block), CHUNK):
                tetra = block[start : start + CHUNK][:, list(local)]
                _tetra(points, tetra, 1.0 / n_splitting(kind), volume, keys, weights)
            if len(keys) > 64:
                key, weight = _merged(np.concatenate(keys), np.concatenate(weights))
                keys, weights = [key], [weight]
    return _summed(np.concatenate(keys), np.concatenate(weights), volume)


def _tetra(
    points: Array,
    tetra: IntArray,
    share: float,
    volume: Array,
    keys: list[IntArray],
    weights: list[Array],
) -> None:
    """Add the weights of one lot of tetrahedra."""
    n = len(points)
    corner = points[tetra]
    # the face opposite each corner, as a vector of twice its area pointing inwards
    faces = np.stack(
        [
            np.cross(corner[:, b] - corner[:, a], corner[:, c] - corner[:, a])
            for a, b, c in ((1, 3, 2), (0, 2, 3), (0, 3, 1), (0, 1, 2))
        ],
        axis=1,
    )
    six = np.einsum("ij,ij->i", corner[:, 0] - corner[:, 1], faces[:, 0])
    size = np.ptp(corner, axis=1).max(axis=1)
    real = np.abs(six) > 1e-12 * size**3
    tetra, faces, six = tetra[real], faces[real], np.abs(six[real])
    for k in range(4):
        volume += np.bincount(tetra[:, k], share * six / 24.0, n)
    for i in range(4):
        for j in range(i):
            ends = np.sort(tetra[:, [i, j]], axis=1)
            keys.append(ends[:, 0] * n + ends[:, 1])
            product = np.einsum("ij,ij->i", faces[:, i], faces[:, j])
            weights.append(-share * product / (6.0 * six))


def solid_skin(points: Array, facets: IntArray, zone: IntArray) -> Skin:
    """Surface of a solid mesh by node: facets (n, 4) with -1 where there are three corners."""
    nodes, areas, zones = [], [], []
    seen = zone >= 0
    three = seen & (facets[:, 3] < 0)
    four = seen & (facets[:, 3] >= 0)
    lots = [(facets[three][:, :3], zone[three], 1.0)]
    lots += [(facets[four][:, list(half)], zone[four], 0.5) for half in _QUAD_HALVES]
    for triangle, of, share in lots:
        corner = points[triangle]
        cross = np.cross(corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0])
        area = 0.5 * share * np.linalg.norm(cross, axis=1)
        for k in range(3):
            nodes.append(triangle[:, k])
            areas.append(area / 3.0)
            zones.append(of)
    return _skin(np.concatenate(nodes), np.concatenate(areas), np.concatenate(zones))


def negative_share(weights: Weights) -> float:
    """Largest share of a node's conductance that is negative: 0 keeps temperatures in bounds."""
    n = len(weights.volume)
    ends = weights.edge.T.ravel()
    twice = np.tile(weights.weight, 2)
    below = np.bincount(ends, np.maximum(-twice, 0.0), n)
    above = np.bincount(ends, np.maximum(twice, 0.0), n)
    return float((below / np.maximum(above, 1e-300)).max())


def _merged(key: IntArray, weight: Array) -> tuple[IntArray, Array]:
    unique, inverse = np.unique(key, return_inverse=True)
    return unique, np.asarray(np.bincount(inverse, weight, len(unique)), dtype=np.float64)


def _summed(key: IntArray, weight: Array, volume: Array) -> Weights:
    n = len(volume)
    unique, total = _merged(key, weight)
    edge = np.stack([unique // n, unique % n], axis=1).astype(np.int64)
    largest = np.zeros(n)
    for k in range(2):
        np.maximum.at(largest, edge[:, k], np.abs(total))
    carries = np.abs(total) > NOTHING * np.minimum(largest[edge[:, 0]], largest[edge[:, 1]])
    return Weights(edge[carries], total[carries], volume)


def _skin(node: IntArray, area: Array, zone: IntArray) -> Skin:
    """One entry for each node and zone."""
    n_zone = int(zone.max(initial=0)) + 1
    key, total = _merged(node * n_zone + zone, area)
    some = total > 0.0
    key, total = key[some], total[some]
    return Skin((key // n_zone).astype(np.int64), total, (key % n_zone).astype(np.int64))
