"""Graded grids: a line or a rectangle of control volumes, fine where heat leaves.

Node positions are a smooth function of an even parameter, so that halving the
number of cells keeps every second node and the error falls with the square of
the cell. Nodes sit on the surface; cell faces lie midway between nodes.

Source
------
Control volumes: Patankar, Numerical Heat Transfer and Fluid Flow, 1980, ch. 3-4
(remembered). Geometric and tanh stretching are common practice, no source.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo.arrays import Array

Fine = Literal["low", "high", "both", "even"]
MOST_RATIO = 400.0  # largest cell over smallest


@dataclass(frozen=True)
class Axis:
    """One direction of a grid.

    ``nodes`` (n_cell + 1,) [m] ascending; ``low`` and ``high`` name the surface
    zone at either end, or None where no heat passes (symmetry, centre).
    """

    nodes: Array
    low: str | None
    high: str | None

    @property
    def faces(self) -> Array:
        """Cell faces [m], shape (n_cell + 2,): the ends and the midpoints."""
        middle = 0.5 * (self.nodes[1:] + self.nodes[:-1])
        return np.concatenate([self.nodes[:1], middle, self.nodes[-1:]])


def axis(
    start: float,
    end: float,
    n_cell: int,
    *,
    fine: Fine,
    first: float,
    low: str | None,
    high: str | None,
) -> Axis:
    """Nodes from ``start`` to ``end`` [m], ``first`` [m] wide at the fine ends.

    ``first`` wider than an even cell gives an even axis.
    """
    length = end - start
    share = np.linspace(0.0, 1.0, n_cell + 1)
    n_side = n_cell if fine != "both" else n_cell / 2.0
    side = length if fine != "both" else length / 2.0
    if fine == "even" or first >= 0.98 * side / n_side:
        return Axis(start + length * share, low, high)
    if fine == "both":

        def stretched(a: float) -> Array:
            out: Array = 0.5 * (1.0 + np.tanh(a * (2.0 * share - 1.0)) / np.tanh(a))
            return out

        top = float(np.arccosh(np.sqrt(MOST_RATIO)))
        a = _solve(lambda a: length * float(stretched(a)[1]) - first, 1e-3, top)
        return Axis(start + length * stretched(a), low, high)

    def geometric(log_ratio: float) -> Array:
        out: Array = np.expm1(log_ratio * share) / np.expm1(log_ratio)
        return out

    b = _solve(lambda b: length * float(geometric(b)[1]) - first, 1e-6, float(np.log(MOST_RATIO)))
    place = length * geometric(b)
    nodes = start + place if fine == "low" else end - place[::-1]
    nodes[0], nodes[-1] = start, end
    return Axis(nodes, low, high)


def _solve(gap: Callable[[float], float], low: float, high: float) -> float:
    """Root of a falling function, or the bound that comes nearest.

    Halving instead of a library's root finder: importing one costs more than the run.
    """
    if gap(high) > 0.0:
        return high
    if gap(low) < 0.0:
        return low
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if gap(middle) > 0.0 else (low, middle)
    return 0.5 * (low + high)


def halved(line: Axis) -> Axis:
    """The same axis with every second node."""
    return Axis(line.nodes[::2].copy(), line.low, line.high)


_POWER = {"slab": 0, "cylinder": 1, "ball": 2}


def line(along: Axis, sense: Sense) -> ControlVolumes:
    """A slab, cylinder or ball: per square metre, per radian and metre, per steradian."""
    power = _POWER[sense]
    faces, nodes = along.faces, along.nodes
    volume = np.diff(faces ** (power + 1)) / (power + 1)
    conductance = faces[1:-1] ** power / np.diff(nodes)
    n = len(nodes)
    edge = np.stack([np.arange(n - 1), np.arange(1, n)], axis=1).astype(np.int64)
    zones, node, area = [], [], []
    for name, at in ((along.low, 0), (along.high, n - 1)):
        if name is not None:
            zones.append(name)
            node.append(at)
            area.append(nodes[at] ** power)
    return ControlVolumes(
        points=nodes[:, None].copy(),
        volume=volume,
        edge=edge,
        conductance_length=conductance,
        face_node=np.array(node, dtype=np.int64),
        face_area=np.array(area, dtype=np.float64),
        face_zone=np.arange(len(zones), dtype=np.int64),
        zones=tuple(zones),
        sense=sense,
    )


def rectangle(across: Axis, along: Axis, sense: Sense) -> ControlVolumes:
    """A plane bar or an axisymmetric body; ``across`` is x or r, ``along`` y or z.

    Node ``i * n_along + j`` sits at ``across[i], along[j]``.
    """
    power = 1 if sense == "axisymmetric" else 0
    fa, fb = across.faces, along.faces
    size_a = np.diff(fa ** (power + 1)) / (power + 1)
    size_b = np.diff(fb)
    na, nb = len(across.nodes), len(along.nodes)
    number = np.arange(na * nb).reshape(na, nb)
    through_a = (fa[1:-1] ** power / np.diff(across.nodes))[:, None] * size_b[None, :]
    through_b = size_a[:, None] / np.diff(along.nodes)[None, :]
    edge = np.concatenate(
        [
            np.stack([number[:-1].ravel(), number[1:].ravel()], axis=1),
            np.stack([number[:, :-1].ravel(), number[:, 1:].ravel()], axis=1),
        ]
    ).astype(np.int64)
    zones: list[str] = []
    node, area, zone = [], [], []
    sides = (
        (across.low, number[0], across.nodes[0] ** power * size_b),
        (across.high, number[-1], across.nodes[-1] ** power * size_b),
        (along.low, number[:, 0], size_a),
        (along.high, number[:, -1], size_a),
    )
    for name, nodes, areas in sides:
        if name is None:
            continue
        if name not in zones:
            zones.append(name)
        node.append(nodes)
        area.append(areas)
        zone.append(np.full(len(nodes), zones.index(name)))
    grid_a, grid_b = np.meshgrid(across.nodes, along.nodes, indexing="ij")
    none = np.empty(0)
    return ControlVolumes(
        points=np.stack([grid_a.ravel(), grid_b.ravel()], axis=1),
        volume=np.outer(size_a, size_b).ravel(),
        edge=edge,
        conductance_length=np.concatenate([through_a.ravel(), through_b.ravel()]),
        face_node=np.concatenate([*node, none]).astype(np.int64),
        face_area=np.concatenate([*area, none]).astype(np.float64),
        face_zone=np.concatenate([*zone, none]).astype(np.int64),
        zones=tuple(zones),
        sense=sense,
    )
