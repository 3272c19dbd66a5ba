"""Samples of a VTKHDF file: an unstructured grid with steps, its mesh once or at every step.

Source
------
VTK file formats, VTKHDF 2 (kitware, public documentation; layout as written by the vtk
library and by ourselves, read in its tests).
"""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshguard import guarded
from midradius.fem.meshraw import RawMesh
from midradius.fem.meshvtu import CELLS
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

_PIXEL, _VOXEL = 8, 11
_ORDER: dict[int, tuple[str, list[int]]] = {
    _PIXEL: ("quad", [0, 1, 3, 2]),
    _VOXEL: ("hexahedron", [0, 1, 3, 2, 4, 5, 7, 6]),
}
GROUP = "VTKHDF"


@dataclass(frozen=True)
class _Place:
    """Where a step begins in the long datasets, and how much of them it takes."""

    part: int
    point: int
    cell: int
    corner: int
    n_point: int
    n_cell: int


class VtkhdfSeries:
    """An open file; one step is read at a time."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._file: Any = None

    def __enter__(self) -> "VtkhdfSeries":
        self._file = self._guarded(self._open)
        return self

    def __exit__(self, *_: object) -> None:
        self._file.close()

    def _open(self) -> Any:
        import h5py

        file = h5py.File(self._path, "r")
        group = file[GROUP]
        kind = group.attrs["Type"]
        kind = kind.decode() if isinstance(kind, bytes) else str(kind)
        if kind != "UnstructuredGrid":
            raise self._fault("an unstructured grid", f"It holds {kind}.")
        if "Steps" not in group:
            raise self._fault("a series of several times", "It holds one state without a time.")
        steps = group["Steps"]
        if int(np.max(steps["NumberOfParts"][()])) != 1:
            raise self._fault("one part for each time", "Merge the parts.")
        return file

    def _fault(self, allowed: str, remedy: str) -> InputFault:
        return InputFault("temperatures.file", f'"{self._path.name}"', allowed, remedy)

    def _guarded(self, action: Any) -> Any:
        try:
            return guarded(action, self._path.name, "VTKHDF")[0]
        except InputFault as fault:
            raise InputFault(
                "temperatures.file", fault.value, fault.allowed, fault.remedy
            ) from fault

    def times(self) -> Array:
        return np.asarray(self._file[GROUP]["Steps/Values"][()], dtype=np.float64)

    def arrays(self) -> tuple[list[str], list[str]]:
        group = self._file[GROUP]
        return list(group.get("PointData", ())), list(group.get("CellData", ()))

    def values(self, step: int, array: str) -> NDArray[Any]:
        def read() -> NDArray[Any]:
            self._refuse_moved(step)
            return self._array("Point", array, step, self._place(step).n_point)

        found: NDArray[Any] = self._guarded(read)
        return found

    def _place(self, step: int) -> "_Place":
        group = self._file[GROUP]

        def at(name: str) -> int:
            return int(np.ravel(group[f"Steps/{name}"][step])[0])

        part = at("PartOffsets")
        return _Place(
            part=part,
            point=at("PointOffsets"),
            cell=at("CellOffsets"),
            corner=at("ConnectivityIdOffsets"),
            n_point=int(group["NumberOfPoints"][part]),
            n_cell=int(group["NumberOfCells"][part]),
        )

    def _array(self, of: str, name: str, step: int, count: int) -> NDArray[Any]:
        group = self._file[GROUP]
        start = int(group[f"Steps/{of}DataOffsets/{name}"][step])
        return np.asarray(group[f"{of}Data/{name}"][start : start + count])

    def _points(self, step: int) -> Array:
        place = self._place(step)
        found = self._file[GROUP]["Points"][place.point : place.point + place.n_point]
        return np.asarray(found, dtype=np.float64)

    def _refuse_moved(self, step: int) -> None:
        """The vtk library writes the mesh anew at every time, whether it moves or not."""
        if self._place(step).point == self._place(0).point:
            return
        if not np.array_equal(self._points(step), self._points(0)):
            raise self._fault(
                f"the same points at all times (sample {step + 1} has others)",
                "A mesh that moves or is refined on the way has no histories at its nodes.",
            )

    def mesh(self, step: int) -> RawMesh:
        found: RawMesh = self._guarded(lambda: self._mesh(step))
        return found

    def _mesh(self, step: int) -> RawMesh:
        group, at = self._file[GROUP], self._place(step)
        # each part has one offset more than cells
        first = at.cell + at.part
        offsets = np.asarray(group["Offsets"][first : first + at.n_cell + 1], dtype=np.int64)
        corners = group["Connectivity"][at.corner : at.corner + int(offsets[-1])]
        kinds = np.asarray(group["Types"][at.cell : at.cell + at.n_cell], dtype=np.int64)
        on_points, on_cells = self.arrays()
        return RawMesh(
            points=self._points(step),
            cells=self._cells(kinds, offsets, np.asarray(corners, dtype=np.int64)),
            point_ids=np.arange(at.n_point, dtype=np.int64),
            cell_ids=np.arange(at.n_cell, dtype=np.int64),
            point_data={name: self._array("Point", name, step, at.n_point) for name in on_points},
            cell_data={name: self._array("Cell", name, step, at.n_cell) for name in on_cells},
            groups={},
            notes=(),
            format="vtkhdf",
        )

    def _cells(
        self, kinds: IntArray, offsets: IntArray, table: IntArray
    ) -> tuple[tuple[str, IntArray], ...]:
        """Neighbours of one type form one block: the order of the cells is the file's."""
        sizes = np.diff(offsets)
        change = np.flatnonzero((np.diff(kinds) != 0) | (np.diff(sizes) != 0)) + 1
        blocks = []
        for first, last in zip([0, *change.tolist()], [*change.tolist(), len(kinds)], strict=True):
            kind, size = int(kinds[first]), int(sizes[first])
            block = table[offsets[first] : offsets[last]].reshape(-1, size)
            name, order = _ORDER.get(kind, (CELLS.get(kind, ""), []))
            if not name:
                raise self._fault(
                    "cells that a section can hold", f"It holds cells of type {kind}."
                )
            blocks.append((name, block[:, order] if order else block))
        return tuple(blocks)
