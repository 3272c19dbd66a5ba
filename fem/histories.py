"""Temperatures of nodes over time, as every reader of a file hands them over.

The samples come one after the other, so that a million nodes need the memory of a few
samples, not of all.
"""

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from midradius.thermo.arrays import Array, IntArray

if TYPE_CHECKING:
    from midradius.fem.drawing import Drawing
    from midradius.fem.place import Line

Samples = Callable[[], Iterator[Array]]


@dataclass(frozen=True)
class GivenMesh:
    """The mesh of a file: ``points`` (n_node, 3) [m]; cells by meshio's names of kinds, in
    the order of the file; arrays of its last sample as they were, those of cells (n_cell,
    ...) over all blocks."""

    points: Array
    cells: tuple[tuple[str, IntArray], ...]
    point_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)
    cell_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)


@dataclass(frozen=True)
class Histories:
    """Temperatures of nodes over time.

    ``times`` (n_time,) [s] rise; ``samples()`` yields n_time arrays (n_node,) [K], anew
    at every call. ``text`` says what was read, for a person. Where the file has them:
    ``names`` (n_node,) of the nodes, ``points`` (n_node, n_dim) [m] of which at least
    ``least_dim`` coordinates tell a place, ``depth`` (n_node,) [m] below the surface,
    ``places`` by name, the ``mesh``, a ``drawing``, the ``line`` of a profile and the
    ``sense`` as sections have them. ``remarks`` say what was left out in reading.
    """

    times: Array
    n_node: int
    samples: Samples
    text: str
    names: tuple[str, ...] = ()
    points: Array | None = None
    least_dim: int = 0
    depth: Array | None = None
    places: Mapping[str, int] = field(default_factory=dict)
    mesh: GivenMesh | None = None
    drawing: "Drawing | None" = None
    line: "Line | None" = None
    sense: str = "nodes"
    remarks: tuple[str, ...] = ()

    def called(self, node: int) -> str:
        """A node in words."""
        if self.names:
            return f'"{self.names[node]}"'
        if self.points is None:
            return f"node {node}"
        at = ", ".join(f"{1e3 * x:.4g}" for x in self.points[node])
        return f"node {node} at ({at}) mm"
