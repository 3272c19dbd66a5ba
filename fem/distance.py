"""Distance from points to a surface made of segments or triangles.

Each point is compared with the facets nearest by their centres; facets much
longer than the rest are cut up first, so that the nearest is among them.
"""

import numpy as np

from midradius.thermo.arrays import Array, IntArray

NEIGHBOURS = 24
LONG = 2.0  # times the median: longer facets are cut up
MOST_ROUNDS = 6
CHUNK = 100_000
MOST_POINTS, MOST_PIECES = 2_000, 20_000  # of an exposure


def pieces(points: Array, facets: IntArray) -> Array:
    """Facets (n, 4, with -1) as segments (m, 2, 2) or triangles (m, 3, 3) of even size."""
    if points.shape[1] == 2:
        found = points[facets[:, :2]]
    else:
        three, four = facets[facets[:, 3] < 0], facets[facets[:, 3] >= 0]
        found = points[np.concatenate([three[:, :3], four[:, [0, 1, 2]], four[:, [0, 2, 3]]])]
    for _ in range(MOST_ROUNDS):
        size = _longest(found)
        long = size > LONG * np.median(size)
        if not long.any():
            break
        found = np.concatenate([found[~long], _halved(found[long])])
    return found


def nearest(points: Array, surface: Array) -> tuple[Array, Array]:
    """Distance (n,) from points (n, dim) to the surface's pieces, and the foot (n, dim)."""
    from scipy.spatial import cKDTree

    tree = cKDTree(surface.mean(axis=1))
    k = min(NEIGHBOURS, len(surface))
    gaps, feet = [], []
    for start in range(0, len(points), CHUNK):
        lot = points[start : start + CHUNK]
        _, index = tree.query(lot, k=k)
        index = index.reshape(len(lot), k)
        best = np.full(len(lot), np.inf)
        foot = np.empty_like(lot)
        for column in range(k):
            on = _foot(lot, surface[index[:, column]])
            gap = np.linalg.norm(lot - on, axis=1)
            better = gap < best
            best[better], foot[better] = gap[better], on[better]
        gaps.append(best)
        feet.append(foot)
    return np.concatenate(gaps), np.concatenate(feet)


def exposure(points: Array, surface: Array) -> Array:
    """How open points (n, dim) are to a surface: its size over the square of the distance, (n,).

    Of more points or pieces than that would be quick for, some are left out: points get inf.
    """
    step = -(-len(points) // MOST_POINTS)
    while len(surface) < MOST_PIECES // 8:  # coarse pieces lie unevenly about a point
        surface = _halved(surface)
    seen = surface[:: -(-len(surface) // MOST_PIECES)]
    centre, size = seen.mean(axis=1), _longest(seen) ** (points.shape[1] - 1)
    found = np.full(len(points), np.inf)
    for k in range(0, len(points), step):
        found[k] = (size / ((centre - points[k]) ** 2).sum(axis=1)).sum()
    return found


def _longest(found: Array) -> Array:
    sides = found - np.roll(found, 1, axis=1)
    return np.asarray(np.linalg.norm(sides, axis=2).max(axis=1))


def _halved(found: Array) -> Array:
    if found.shape[1] == 2:
        middle = found.mean(axis=1)
        return np.concatenate(
            [np.stack([found[:, 0], middle], axis=1), np.stack([middle, found[:, 1]], axis=1)]
        )
    a, b, c = (found[:, k] for k in range(3))
    ab, bc, ca = 0.5 * (a + b), 0.5 * (b + c), 0.5 * (c + a)
    parts = ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))
    return np.concatenate([np.stack(part, axis=1) for part in parts])


def _foot(points: Array, piece: Array) -> Array:
    """The nearest point of each piece (n, k, dim) to its own point (n, dim)."""
    if piece.shape[1] == 2:
        return _on_segment(points, piece[:, 0], piece[:, 1])
    return _on_triangle(points, piece)


def _on_segment(points: Array, a: Array, b: Array) -> Array:
    ahead = b - a
    square = np.maximum((ahead**2).sum(axis=1), 1e-300)
    share = np.clip(((points - a) * ahead).sum(axis=1) / square, 0.0, 1.0)
    return np.asarray(a + share[:, None] * ahead)


def _on_triangle(points: Array, piece: Array) -> Array:
    a, b, c = (piece[:, k] for k in range(3))
    normal = np.cross(b - a, c - a)
    square = np.maximum((normal**2).sum(axis=1), 1e-300)
    above = ((points - a) * normal).sum(axis=1) / square
    on = points - above[:, None] * normal
    inside = np.ones(len(points), dtype=bool)
    for first, second in ((a, b), (b, c), (c, a)):
        inside &= (np.cross(second - first, on - first) * normal).sum(axis=1) >= 0.0
    edges = [_on_segment(points, first, second) for first, second in ((a, b), (b, c), (c, a))]
    gaps = np.stack([np.linalg.norm(points - edge, axis=1) for edge in edges])
    best = np.argmin(gaps, axis=0)
    edge = np.stack(edges)[best, np.arange(len(points))]
    return np.asarray(np.where(inside[:, None], on, edge))
