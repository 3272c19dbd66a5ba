"""A mesh as its file has it: points, cells by type, data, named groups.

The one currency between the readers of mesh files. Cell types carry the names
that meshio uses; in all of them the corners come first, so that a cell of
higher order is reduced by taking its first columns.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault


@dataclass(frozen=True)
class Shape:
    """A family of cells: dimension, corners, facets by local corner, number in VTK."""

    dim: int
    n_corner: int
    facets: tuple[tuple[int, ...], ...]
    vtk: int


SHAPES: Mapping[str, Shape] = {
    "vertex": Shape(0, 1, (), 1),
    "line": Shape(1, 2, ((0,), (1,)), 3),
    "triangle": Shape(2, 3, ((0, 1), (1, 2), (2, 0)), 5),
    "quad": Shape(2, 4, ((0, 1), (1, 2), (2, 3), (3, 0)), 9),
    "tetra": Shape(3, 4, ((0, 1, 2), (0, 3, 1), (1, 3, 2), (2, 3, 0)), 10),
    "hexahedron": Shape(
        3,
        8,
        ((0, 1, 2, 3), (4, 7, 6, 5), (0, 4, 5, 1), (1, 5, 6, 2), (2, 6, 7, 3), (3, 7, 4, 0)),
        12,
    ),
    "wedge": Shape(3, 6, ((0, 1, 2), (3, 5, 4), (0, 3, 4, 1), (1, 4, 5, 2), (2, 5, 3, 0)), 13),
    "pyramid": Shape(3, 5, ((0, 1, 2, 3), (0, 4, 1), (1, 4, 2), (2, 4, 3), (3, 4, 0)), 14),
}
"""Facets in the order in which input decks of the .inp family number them."""

TURNED_WEDGE = [0, 2, 1, 3, 5, 4]
"""Corners of a wedge as vtk up to 9.6 had them, and meshio still writes; its own inverse."""

_FAMILY = re.compile(r"[a-z]+")


@dataclass(frozen=True)
class Group:
    """A named part of a mesh: points, cells, facets, whichever the file gives.

    ``points`` (n,) and ``cells`` (n,) are indices, cells counted over all blocks
    in their order; ``facets`` (n, 4) holds corner points, -1 where there are fewer.
    """

    points: IntArray = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    cells: IntArray = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    facets: IntArray = field(default_factory=lambda: np.empty((0, 4), dtype=np.int64))


@dataclass(frozen=True)
class RawMesh:
    """What a file holds, in its own unit and order.

    ``points`` (n_point, 3); ``cells`` pairs of type and connectivity (n, k);
    ``point_ids`` (n_point,) and ``cell_ids`` (n_cell over all blocks,) are the
    file's own numbers; ``point_data`` (n_point, ...) and ``cell_data``
    (n_cell, ...) over all blocks; ``notes`` say what was left out or changed.
    """

    points: Array
    cells: tuple[tuple[str, IntArray], ...]
    point_ids: IntArray
    cell_ids: IntArray
    point_data: Mapping[str, NDArray[np.generic]]
    cell_data: Mapping[str, NDArray[np.generic]]
    groups: Mapping[str, Group]
    notes: tuple[str, ...]
    format: str

    @property
    def n_cell(self) -> int:
        """Cells of all types together."""
        return sum(len(block) for _, block in self.cells)


def family(kind: str) -> str:
    """The family of a cell type: ``"tetra10"`` is a ``"tetra"``; ``""`` if unknown."""
    found = _FAMILY.match(kind)
    name = found[0] if found else ""
    return name if name in SHAPES else ""


def refuse(path_name: str, allowed: str, remedy: str) -> InputFault:
    """The fault of a mesh file, in the words that all its readers share."""
    return InputFault("mesh file", f'"{path_name}"', allowed, remedy)


def facet_table(rows: list[tuple[int, ...]]) -> IntArray:
    """Facets of 2 to 4 corners as one table (n, 4) filled with -1."""
    table = np.full((len(rows), 4), -1, dtype=np.int64)
    for k, row in enumerate(rows):
        table[k, : len(row)] = row
    return table
