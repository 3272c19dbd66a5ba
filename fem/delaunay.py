"""Makes the conductances of a plane mesh positive without moving a node.

The weight of an edge between triangles is ``(cot a + cot b) / 2`` of the two
angles that see it. It is negative where the angles sum to more than 180 degrees:
heat would then flow towards the hotter node, and temperatures overshoot. Turning
such edges into the other diagonal (Lawson) makes every inner weight positive. An
edge of the boundary that is seen under more than 90 degrees gets a node of its
own at the foot of the altitude. Nodes of the mesh keep their numbers; the added
ones follow.

Rectangles and other quads with their corners on a circle are kept whole: both
their diagonals count half, which on a rectangle is the finite difference.

Source
------
Lawson 1977; weights of P1 elements, for example Barth, AIAA 92-0439 (both
remembered). Feet of altitudes on the boundary: derived.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array, BoolArray, IntArray

ROUND = 1e-9  # a cotangent above minus this counts as positive
CIRCLE = 1e-6  # how near the cotangents of opposite corners must be for one circle
MOST_ROUNDS = 200
NEAR_END = 0.02  # of a boundary edge: no foot is put so near to its end


@dataclass(frozen=True)
class Plane:
    """A plane mesh whose weights are positive as far as they can be.

    ``points`` (n, 2), the mesh's nodes first; ``triangles`` (n, 3) and ``quads``
    (n, 4), counter-clockwise; ``segments`` (n, 2) of the boundary and the zone
    ``segment_zone`` of each; ``n_turned`` edges were turned.
    """

    points: Array
    triangles: IntArray
    quads: IntArray
    segments: IntArray
    segment_zone: IntArray
    n_turned: int


def positive(
    points: Array, triangles: IntArray, quads: IntArray, segments: IntArray, zone: IntArray
) -> Plane:
    """The mesh with inner edges turned and feet set on the boundary."""
    whole = _on_circle(points, quads)
    kept = quads[whole]
    triangles = np.concatenate([triangles, _halves(points, quads[~whole])])
    n_turned = 0
    for _ in range(MOST_ROUNDS):
        triangles, turned = _turned(points, triangles)
        n_turned += turned
        bad = _quads_at_negative(points, triangles, kept)
        if bad.any():
            triangles = np.concatenate([triangles, _halves(points, kept[bad])])
            kept = kept[~bad]
            continue
        fed = _feet(points, triangles, segments, zone)
        if fed is None:
            break
        points, triangles, segments, zone = fed
    return Plane(points, triangles, kept, segments, zone, n_turned)


def cotangents(points: Array, triangles: IntArray) -> Array:
    """Cotangent of the angle at every corner, (n, 3)."""
    out = np.empty(triangles.shape)
    for k in range(3):
        here = points[triangles[:, k]]
        one = points[triangles[:, (k + 1) % 3]] - here
        other = points[triangles[:, (k + 2) % 3]] - here
        cross = one[:, 0] * other[:, 1] - one[:, 1] * other[:, 0]
        tiny = 1e-12 * np.maximum((one**2).sum(axis=1), (other**2).sum(axis=1))
        out[:, k] = (one * other).sum(axis=1) / np.maximum(cross, tiny)
    return out


def _on_circle(points: Array, quads: IntArray) -> BoolArray:
    """Convex quads whose four corners lie on one circle."""
    if not len(quads):
        return np.zeros(0, dtype=bool)
    at = [cotangents(points, quads[:, [(k - 1) % 4, k, (k + 1) % 4]])[:, 1] for k in range(4)]
    convex = np.all([_area(points, quads[:, _three(k)]) > 0.0 for k in range(4)], axis=0)
    # opposite corners of a cyclic quad sum to 180 degrees
    return np.asarray(convex & (np.abs(at[0] + at[2]) < CIRCLE) & (np.abs(at[1] + at[3]) < CIRCLE))


def _three(k: int) -> list[int]:
    return [k, (k + 1) % 4, (k + 2) % 4]


def _area(points: Array, triangles: IntArray) -> Array:
    a, b, c = (points[triangles[:, k]] for k in range(3))
    first, second = b - a, c - a
    return np.asarray(0.5 * (first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0]))


def _halves(points: Array, quads: IntArray) -> IntArray:
    """Two triangles a quad, along the diagonal that both halves stand on."""
    if not len(quads):
        return np.empty((0, 3), dtype=np.int64)
    first = np.minimum(_area(points, quads[:, [0, 1, 2]]), _area(points, quads[:, [0, 2, 3]]))
    second = np.minimum(_area(points, quads[:, [0, 1, 3]]), _area(points, quads[:, [1, 2, 3]]))
    one, other = quads[first >= second], quads[first < second]
    return np.concatenate(
        [one[:, [0, 1, 2]], one[:, [0, 2, 3]], other[:, [0, 1, 3]], other[:, [1, 2, 3]]]
    )


def _pairs(triangles: IntArray) -> tuple[IntArray, IntArray, IntArray, IntArray]:
    """Triangles that share an edge: both, and the corner of each that faces it."""
    n = len(triangles)
    ends = np.concatenate([triangles[:, [1, 2]], triangles[:, [2, 0]], triangles[:, [0, 1]]])
    ends.sort(axis=1)
    owner, local = np.tile(np.arange(n), 3), np.repeat(np.arange(3), n)
    order = np.lexsort((ends[:, 1], ends[:, 0]))
    same = np.all(ends[order[1:]] == ends[order[:-1]], axis=1)
    one, other = order[:-1][same], order[1:][same]
    return owner[one], local[one], owner[other], local[other]


def _turned(points: Array, triangles: IntArray) -> tuple[IntArray, int]:
    """Turn edges of negative weight until none is left."""
    triangles = triangles.copy()
    count = 0
    for _ in range(MOST_ROUNDS):
        one, at_one, other, at_other = _pairs(triangles)
        cot = cotangents(points, triangles)
        weight = cot[one, at_one] + cot[other, at_other]
        wrong = np.flatnonzero(weight < -ROUND)
        if not len(wrong):
            break
        # the worst edge of each triangle first, no triangle twice in a round
        wrong = wrong[np.argsort(weight[wrong])]
        rank = np.full(len(triangles), len(wrong))
        np.minimum.at(rank, one[wrong], np.arange(len(wrong)))
        np.minimum.at(rank, other[wrong], np.arange(len(wrong)))
        place = np.arange(len(wrong))
        chosen = wrong[(rank[one[wrong]] == place) & (rank[other[wrong]] == place)]
        p, q = one[chosen], other[chosen]
        c, a, b = (triangles[p, (at_one[chosen] + k) % 3] for k in range(3))
        d = triangles[q, at_other[chosen]]
        triangles[p] = np.stack([c, a, d], axis=1)
        triangles[q] = np.stack([d, b, c], axis=1)
        count += len(chosen)
    return triangles, count


def _quads_at_negative(points: Array, triangles: IntArray, quads: IntArray) -> BoolArray:
    """Whole quads one of whose sides has a negative weight."""
    bad = np.zeros(len(quads), dtype=bool)
    if not len(quads):
        return bad
    n = len(points)
    sides = np.sort(np.stack([quads, np.roll(quads, -1, axis=1)], axis=2), axis=2)
    keys, weights = [sides[:, :, 0] * n + sides[:, :, 1]], [np.zeros(quads.shape)]
    halves = [[0, 1, 2], [0, 2, 3], [0, 1, 3], [1, 2, 3]]
    for local, share in (*((quads[:, h], 0.5) for h in halves), (triangles, 1.0)):
        cot = share * cotangents(points, local)
        for k in range(3):
            ends = np.sort(local[:, [(k + 1) % 3, (k + 2) % 3]], axis=1)
            keys.append(ends[:, 0] * n + ends[:, 1])
            weights.append(cot[:, k])
    flat = np.concatenate([key.ravel() for key in keys])
    unique, inverse = np.unique(flat, return_inverse=True)
    total = np.bincount(inverse, np.concatenate([w.ravel() for w in weights]), len(unique))
    return np.asarray(np.any(total[inverse[: quads.size]].reshape(quads.shape) < -ROUND, axis=1))


def _feet(
    points: Array, triangles: IntArray, segments: IntArray, zone: IntArray
) -> tuple[Array, IntArray, IntArray, IntArray] | None:
    """A node on every boundary edge that is seen under an obtuse angle."""
    n = len(points)
    cot = cotangents(points, triangles)
    owner, local = np.nonzero(cot < -ROUND)
    if not len(owner):
        return None
    a, b = triangles[owner, (local + 1) % 3], triangles[owner, (local + 2) % 3]
    key = np.minimum(a, b) * n + np.maximum(a, b)
    known = segments.min(axis=1) * n + segments.max(axis=1)
    order = np.argsort(known)
    at = order[np.minimum(np.searchsorted(known[order], key), len(known) - 1)]
    along = points[b] - points[a]
    c = triangles[owner, local]
    share = ((points[c] - points[a]) * along).sum(axis=1) / (along**2).sum(axis=1)
    wanted = (known[at] == key) & (share > NEAR_END) & (share < 1.0 - NEAR_END)
    if not wanted.any():
        return None
    owner, a, b, c, at = owner[wanted], a[wanted], b[wanted], c[wanted], at[wanted]
    foot = points[a] + share[wanted, None] * along[wanted]
    new = n + np.arange(len(owner))
    triangles = triangles.copy()
    triangles[owner] = np.stack([c, a, new], axis=1)
    triangles = np.concatenate([triangles, np.stack([c, new, b], axis=1)])
    segments = segments.copy()
    segments[at] = np.stack([a, new], axis=1)
    segments = np.concatenate([segments, np.stack([new, b], axis=1)])
    return np.concatenate([points, foot]), triangles, segments, np.concatenate([zone, zone[at]])
