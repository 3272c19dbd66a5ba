"""Samples of a VTKHDF file: an unstructured grid whose mesh stands once, with steps.

Source
------
VTK file formats, VTKHDF 2 (kitware, public documentation; layout as written by the vtk
library and by ourselves, read in its tests).
"""

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshguard import guarded
from midradius.fem.meshraw import RawMesh
from midradius.fem.meshvtu import CELLS
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

_WEDGE, _PIXEL, _VOXEL = 13, 8, 11
_ORDER: dict[int, tuple[str, list[int]]] = {
    _WEDGE: ("wedge", [0, 2, 1, 3, 5, 4]),
    _PIXEL: ("quad", [0, 1, 3, 2]),
    _VOXEL: ("hexahedron", [0, 1, 3, 2, 4, 5, 7, 6]),
}
GROUP = "VTKHDF"


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
        offsets = steps["PointOffsets"][()].ravel()
        if np.any(offsets != offsets[0]):
            raise self._fault(
                "a series on one mesh",
                "Its times have meshes of their own: a mesh that moves has no histories.",
            )
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
            group = self._file[GROUP]
            start = int(group[f"Steps/PointDataOffsets/{array}"][step])
            count = int(group["NumberOfPoints"][0])
            return np.asarray(group[f"PointData/{array}"][start : start + count])

        found: NDArray[Any] = self._guarded(read)
        return found

    def mesh(self, step: int) -> RawMesh:
        found: RawMesh = self._guarded(lambda: self._mesh(step))
        return found

    def _mesh(self, step: int) -> RawMesh:
        group = self._file[GROUP]
        n_point, n_cell = int(group["NumberOfPoints"][0]), int(group["NumberOfCells"][0])
        points = np.asarray(group["Points"][:n_point], dtype=np.float64)
        offsets = np.asarray(group["Offsets"][: n_cell + 1], dtype=np.int64)
        table = np.asarray(group["Connectivity"][: offsets[-1]], dtype=np.int64)
        kinds = np.asarray(group["Types"][:n_cell], dtype=np.int64)
        data = {name: self.values(step, name) for name in group.get("PointData", ())}
        return RawMesh(
            points=points,
            cells=self._cells(kinds, offsets, table),
            point_ids=np.arange(n_point, dtype=np.int64),
            cell_ids=np.arange(n_cell, dtype=np.int64),
            point_data=data,
            cell_data={},
            groups={},
            notes=("its arrays of cells are left out",) if len(group.get("CellData", ())) else (),
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
