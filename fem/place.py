"""Where a field is read: a point of the section, a line through it.

A place lies between nodes; its value is theirs in shares.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array, IntArray


@dataclass(frozen=True)
class Place:
    """A point of the section: weights on nodes, coordinates and depth [m]."""

    node: IntArray
    share: Array
    coordinates: tuple[float, ...]
    depth: float


@dataclass(frozen=True)
class Line:
    """Points along a line: ``depth`` (n,) [m], their nodes and what they are called.

    On grids the points are nodes: ``node`` (n,), no ``share``. On meshes they lie
    between: ``node`` and ``share`` (n, k).
    """

    depth: Array
    node: IntArray
    label: str
    share: Array | None = None

    def of(self, field: Array) -> Array:
        """A field (..., n_node) along the line, (..., n)."""
        return along(field, self.node, self.share)


def along(field: Array, node: IntArray, share: Array | None) -> Array:
    """A field (..., n_node) at places (n,) or, with shares, (n, k): (..., n)."""
    if share is None:
        return field[..., node]
    return weighted(field[..., node], share)


def weighted(values: Array, share: Array) -> Array:
    """Sum over the last axis; a node without a share may have no value."""
    return np.asarray((np.where(share == 0.0, 0.0, values) * share).sum(axis=-1))
