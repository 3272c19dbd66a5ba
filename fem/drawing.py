"""The whole part as a mesh to look at, from the part of it that was solved.

Rounds, tubes and balls become a disc (a ball its great circle), folded halves
are mirrored, bodies of revolution show their full axial section.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from midradius.fem.grids import Axis
from midradius.fem.section import Cut, Span
from midradius.thermo.arrays import Array, IntArray

N_ANGLE = 72


@dataclass(frozen=True)
class Drawing:
    """``points`` (n_point, 3) [m], ``cells`` by type, the solved ``node`` (n_point,) of each.

    Of a mesh, ``point_data`` (n_point, ...) and ``cell_data`` (n_cell, ...) are what
    its file brought, cells counted over all blocks.
    """

    points: Array
    cells: tuple[tuple[str, IntArray], ...]
    node: IntArray
    point_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)
    cell_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)


def draw(cut: Cut) -> Drawing:
    """The drawing of a cut section."""
    if cut.section.sense in ("cylinder", "ball"):
        return _disc(cut.axes[0].nodes)
    first, first_node = _whole(cut.section.spans[0], cut.axes[0])
    if cut.section.sense == "slab":
        second = np.linspace(0.0, cut.section.spans[0].length, 9)
        return _sheet(first, second, first_node, np.zeros(9, dtype=np.int64), 1)
    second, second_node = _whole(cut.section.spans[1], cut.axes[1])
    n_along = len(cut.axes[1].nodes)
    sheet = _sheet(first, second, first_node, second_node, n_along)
    if cut.section.sense == "plane":
        return sheet
    mirror = _sheet(-first[::-1], second, first_node[::-1], second_node, n_along)
    if first[0] > 0.0:
        return _joined(mirror, sheet)
    both = np.concatenate([-first[:0:-1], first])
    both_node = np.concatenate([first_node[:0:-1], first_node])
    return _sheet(both, second, both_node, second_node, n_along)


def _whole(span: Span, along: Axis) -> tuple[Array, IntArray]:
    """Coordinates over the whole span and the solved node of each."""
    number = np.arange(len(along.nodes), dtype=np.int64)
    if not span.folded:
        return along.nodes, number
    mirrored = span.low + span.high - along.nodes[-2::-1]
    return np.concatenate([along.nodes, mirrored]), np.concatenate([number, number[-2::-1]])


def _sheet(
    across: Array, along: Array, across_node: IntArray, along_node: IntArray, n_along: int
) -> Drawing:
    na, nb = len(across), len(along)
    x, y = np.meshgrid(across, along, indexing="ij")
    number = np.arange(na * nb, dtype=np.int64).reshape(na, nb)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    return Drawing(
        points=np.stack([x.ravel(), y.ravel(), np.zeros(na * nb)], axis=1),
        cells=(("quad", np.stack([c.ravel() for c in corners], axis=1)),),
        node=(across_node[:, None] * n_along + along_node[None, :]).ravel(),
    )


def _joined(one: Drawing, other: Drawing) -> Drawing:
    n = len(one.points)
    return Drawing(
        points=np.concatenate([one.points, other.points]),
        cells=(*one.cells, *((kind, block + n) for kind, block in other.cells)),
        node=np.concatenate([one.node, other.node]),
    )


def _disc(radius: Array) -> Drawing:
    angle = np.linspace(0.0, 2.0 * np.pi, N_ANGLE, endpoint=False)
    solid = radius[0] == 0.0
    rings = radius[1:] if solid else radius
    ring_node = np.arange(len(radius) - len(rings), len(radius), dtype=np.int64)
    x = np.outer(rings, np.cos(angle))
    y = np.outer(rings, np.sin(angle))
    points = np.stack([x.ravel(), y.ravel(), np.zeros(x.size)], axis=1)
    node = np.repeat(ring_node, N_ANGLE)
    number = np.arange(len(rings) * N_ANGLE, dtype=np.int64).reshape(len(rings), N_ANGLE)
    turned = np.roll(number, -1, axis=1)
    corners = (number[:-1], number[1:], turned[1:], turned[:-1])
    quads = np.stack([c.ravel() for c in corners], axis=1)
    cells: list[tuple[str, IntArray]] = [("quad", quads)]
    if solid:
        centre = np.full(N_ANGLE, len(points), dtype=np.int64)
        cells.append(("triangle", np.stack([centre, number[0], turned[0]], axis=1)))
        points = np.concatenate([points, np.zeros((1, 3))])
        node = np.concatenate([node, [0]])
    return Drawing(points, tuple(cells), node)
