"""From loose curves of a drawing to the closed loops that bound one body.

A drawing says nothing of what belongs together: curves are joined where their
ends meet within a gap, and refused where they stay open, branch, cross, or
bound more than one body.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

SAGITTA = 1e-4  # of the radius: a polygon that misses 1.3e-4 of a disc's area
GAP = 1e-5  # of the drawing's size: ends nearer than this meet
MOST_SEGMENTS = 100_000
SHOWN = 5  # places that a message names

PieceKind = Literal["line", "arc", "curve"]


@dataclass(frozen=True)
class Piece:
    """One curve: its polygon ``points`` (n, 2) from end to end, and its zone.

    An ``"arc"`` runs through its first, ``middle`` and last point; a ``"curve"``
    is smooth through all points.
    """

    kind: PieceKind
    points: Array
    zone: str
    middle: tuple[float, float] | None = None

    def turned(self) -> "Piece":
        """The same curve from its other end."""
        return Piece(self.kind, self.points[::-1], self.zone, self.middle)


@dataclass(frozen=True)
class Loop:
    """Pieces end to end, counter-clockwise."""

    pieces: tuple[Piece, ...]

    @property
    def polygon(self) -> Array:
        """Corners (n, 2) without repetition of the first."""
        return np.concatenate([piece.points[:-1] for piece in self.pieces])

    @property
    def area(self) -> float:
        """Enclosed area, in the square of the drawing's unit."""
        return signed_area(self.polygon)


@dataclass(frozen=True)
class Outline:
    """One body: its outer loop, its holes, and what was mended on the way."""

    outer: Loop
    holes: tuple[Loop, ...]
    notes: tuple[str, ...]

    @property
    def loops(self) -> tuple[Loop, ...]:
        """Outer loop first."""
        return self.outer, *self.holes

    @property
    def area(self) -> float:
        """Area of the polygons, in the square of the drawing's unit."""
        return self.outer.area - sum(hole.area for hole in self.holes)


def signed_area(polygon: Array) -> float:
    """Area of a polygon (n, 2), positive if counter-clockwise."""
    x, y = (polygon - polygon.mean(axis=0)).T
    return 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def outline(pieces: list[Piece], name: str) -> Outline:
    """The body that the pieces of the drawing ``name`` bound.

    Raises
    ------
    InputFault
        There is no closed loop, or an open or branching one, crossing lines, or
        more than one body.
    """
    if not pieces:
        raise refuse(name, "a drawing with a closed outline", "It holds no curve at all.")
    size = _size(pieces)
    if not np.isfinite(size) or size <= 0.0:
        raise refuse(name, "a drawing with finite coordinates", "")
    loops, notes = _loops(pieces, GAP * size, name)
    _uncrossed(loops, name)
    order = sorted(loops, key=lambda loop: -loop.area)
    outer, inner = order[0], order[1:]
    for k, loop in enumerate(inner):
        corner = loop.polygon[0]
        if not inside(corner, outer.polygon):
            raise refuse(
                name,
                "the outline of one body",
                f"A second outline lies beside the first, at {_at(corner)}: choose its layers, "
                "or draw the bodies in files of their own.",
            )
        if any(inside(corner, other.polygon) for other in inner[:k]):
            raise refuse(
                name,
                "the outline of one body",
                f"A loop lies inside a hole, at {_at(corner)}: take it out.",
            )
    return Outline(outer, tuple(inner), notes)


def refuse(name: str, allowed: str, remedy: str) -> InputFault:
    """The fault of an outline file."""
    return InputFault("outline file", f'"{name}"', allowed, remedy)


def _at(point: Array) -> str:
    return f"({point[0]:.6g}, {point[1]:.6g})"


def _size(pieces: list[Piece]) -> float:
    all_points = np.concatenate([piece.points for piece in pieces])
    return float(np.linalg.norm(np.ptp(all_points, axis=0)))


def _loops(pieces: list[Piece], gap: float, name: str) -> tuple[list[Loop], tuple[str, ...]]:
    """Join pieces end to end; the notes say which gaps were closed."""
    kept, repeated = _without_repetition(pieces, gap)
    node, corner, widest = _ends(kept, gap)
    meeting: dict[int, list[int]] = {}
    for k, (first, last) in enumerate(node):
        meeting.setdefault(int(first), []).append(k)
        meeting.setdefault(int(last), []).append(k)
    lonely = [corner[n] for n, at in meeting.items() if len(at) == 1]
    if lonely:
        places = ", ".join(_at(p) for p in lonely[:SHOWN])
        more = f" and {len(lonely) - SHOWN} more places" if len(lonely) > SHOWN else ""
        raise refuse(
            name,
            "a drawing whose outline closes",
            f"A curve ends alone at {places}{more}. Close the outline; leave axes and other "
            "helping lines on layers that are not read.",
        )
    branching = [corner[n] for n, at in meeting.items() if len(at) > 2]
    if branching:
        raise refuse(
            name,
            "a drawing in which two curves meet at each corner",
            f"More than two meet at {', '.join(_at(p) for p in branching[:SHOWN])}.",
        )
    loops, left = [], set(range(len(kept)))
    while left:
        k = min(left)
        start, here = (int(n) for n in node[k])
        left.discard(k)
        chain = [_snapped(kept[k], corner[start], corner[here])]
        while here != start:
            k = next(n for n in meeting[here] if n in left)
            left.discard(k)
            first, last = (int(n) for n in node[k])
            piece = _snapped(kept[k], corner[first], corner[last])
            chain.append(piece if first == here else piece.turned())
            here = last if first == here else first
        loop = Loop(tuple(chain))
        if loop.area < 0.0:
            loop = Loop(tuple(piece.turned() for piece in reversed(chain)))
        loops.append(loop)
    notes = []
    if repeated:
        notes.append(f"{repeated} curves are drawn twice; one of each was taken")
    if widest > 0.01 * gap:
        notes.append(f"ends up to {widest:.3g} drawing units apart were joined")
    return loops, tuple(notes)


def _without_repetition(pieces: list[Piece], gap: float) -> tuple[list[Piece], int]:
    seen: set[tuple[object, ...]] = set()
    kept = []
    for piece in pieces:
        if np.sum(np.linalg.norm(np.diff(piece.points, axis=0), axis=1)) <= gap:
            continue
        ends = sorted(tuple(np.round(piece.points[k] / gap).tolist()) for k in (0, -1))
        key = (*ends, tuple(np.round(piece.points.mean(axis=0) / gap).tolist()))
        if key not in seen:
            seen.add(key)
            kept.append(piece)
    return kept, len(pieces) - len(kept)


def _ends(pieces: list[Piece], gap: float) -> tuple[NDArray[np.int64], Array, float]:
    """Corner number of both ends of each piece (n, 2), the corners, the widest gap."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    ends = np.concatenate([piece.points[[0, -1]] for piece in pieces])
    pairs = cKDTree(ends).query_pairs(gap, output_type="ndarray")
    n = len(ends)
    link = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    count, label = connected_components(link, directed=False)
    corner = np.zeros((count, 2))
    corner[label] = ends  # one of the ends that meet, not their mean: no new coordinates
    widest = float(np.linalg.norm(ends - corner[label], axis=1).max())
    return label.reshape(-1, 2).astype(np.int64), corner, widest


def _snapped(piece: Piece, first: Array, last: Array) -> Piece:
    points = piece.points.copy()
    points[0], points[-1] = first, last
    return Piece(piece.kind, points, piece.zone, piece.middle)


def _uncrossed(loops: list[Loop], name: str) -> None:
    """Refuse segments that cross or touch one another anywhere but at common corners."""
    tail = np.concatenate([loop.polygon for loop in loops])
    head = np.concatenate([np.roll(loop.polygon, -1, axis=0) for loop in loops])
    after = np.zeros(len(tail), dtype=np.int64)
    first = 0
    for loop in loops:
        n = len(loop.polygon)
        after[first : first + n] = first + np.roll(np.arange(n), -1)
        first += n
    if len(tail) > MOST_SEGMENTS:
        raise refuse(name, f"an outline of at most {MOST_SEGMENTS} segments", "Simplify it.")
    low, high = np.minimum(tail, head), np.maximum(tail, head)
    order = np.argsort(low[:, 0], kind="stable")
    starts = low[order, 0]
    until = np.searchsorted(starts, high[order, 0], side="right")
    for rank, k in enumerate(order):
        others = order[rank + 1 : until[rank]]
        near = (low[others, 1] <= high[k, 1]) & (high[others, 1] >= low[k, 1])
        others = others[near & (others != after[k]) & (after[others] != k)]
        if not len(others):
            continue
        crossing = _meet(tail[k], head[k], tail[others], head[others])
        if crossing.any():
            other = others[crossing][0]
            place = 0.25 * (tail[k] + head[k] + tail[other] + head[other])
            raise refuse(
                name,
                "an outline that does not cross or touch itself",
                f"It does near {_at(place)}.",
            )


def _meet(a: Array, b: Array, c: Array, d: Array) -> NDArray[np.bool_]:
    """Whether the segment a-b has a point in common with each of c-d (n, 2)."""

    def side(p: Array, q: Array, r: Array) -> Array:
        turn: Array = (q[..., 0] - p[..., 0]) * (r[..., 1] - p[..., 1]) - (
            q[..., 1] - p[..., 1]
        ) * (r[..., 0] - p[..., 0])
        return turn

    one, two = side(a, b, c), side(a, b, d)
    three, four = side(c, d, a), side(c, d, b)
    found: NDArray[np.bool_] = (one * two <= 0.0) & (three * four <= 0.0)
    return found


def inside(point: Array, polygon: Array) -> bool:
    """Whether a point lies in a polygon (n, 2), by the count of crossings to its right."""
    x, y = polygon[:, 0], polygon[:, 1]
    x_next, y_next = np.roll(x, -1), np.roll(y, -1)
    spans = (y > point[1]) != (y_next > point[1])
    slope = (x_next - x) / np.where(spans, y_next - y, 1.0)
    at = x + (point[1] - y) * slope
    return bool(np.count_nonzero(spans & (at > point[0])) % 2)
