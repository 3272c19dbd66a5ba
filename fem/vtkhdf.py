"""A field series in one compressed HDF5 file that VTK readers open, written as it comes.

Layout
------
VTKHDF 2.3, type UnstructuredGrid: the mesh once, each array as one long dataset
with an offset for every time. What is known only at the end is one block of nan
for all earlier times and one of numbers for the last. Every array ends with its
unit and says it again in an attribute ``units``.

Numbers
-------
float32, byte shuffle, gzip level 1. Temperatures are rounded to ``ROUNDING``, a
power of two far below any error of the model, which makes them three times
smaller; the step stands in the attribute ``rounded_to``. ``libver`` is pinned to
the 1.10 format: VTK's HDF5 crashes on newer layouts.

Source
------
VTK file formats, "VTKHDF files", version 2.3 (remembered; checked against the
reader of the vtk library in the tests).
"""

from collections.abc import Mapping
from pathlib import Path
from types import TracebackType
from typing import Any

import numpy as np

from midradius.fem.fields import NOTHING, POSITION, UNIT_ENDINGS, Given
from midradius.fem.meshraw import SHAPES
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

SERIES = "fields.vtkhdf"
ROUNDING = 1.0 / 64.0  # K
LIBVER = ("v110", "v110")
CHUNK = 1 << 18  # values
VERSION = (2, 3)
HOW: Mapping[str, Any] = {"compression": "gzip", "compression_opts": 1, "shuffle": True}


class HdfSeries:
    """An open series; a context manager that leaves a whole file or none.

    Parameters
    ----------
    path
        The file; an earlier one is replaced.
    points_mm
        Points of the drawing [mm], shape (n_point, 3).
    cells
        Pairs of type (a key of `meshraw.SHAPES`) and corner points (n, k).
    rounding
        Step to which the arrays of every time are rounded, None for none.
    given_point, given_cell
        Arrays that a mesh file brought, (n_point, ...) and (n_cell, ...) over all blocks:
        stored once, as ``given NAME``.

    Raises
    ------
    InputFault
        No cells, or a cell that names a missing point.
    """

    def __init__(
        self,
        path: Path,
        *,
        points_mm: Array,
        cells: tuple[tuple[str, IntArray], ...],
        rounding: float | None = ROUNDING,
        given_point: Given = NOTHING,
        given_cell: Given = NOTHING,
    ) -> None:
        import h5py

        filled = [(kind, block) for kind, block in cells if len(block)]
        n_point = len(points_mm)
        if not filled:
            raise InputFault("cells", "none", "at least one")
        for kind, block in filled:
            if not 0 <= block.min() <= block.max() < n_point:
                raise InputFault(
                    f"{kind} corners", f"{block.min()} to {block.max()}", "known points"
                )
        self.path = path
        self._n_point = n_point
        self._rounding = rounding
        self._times: list[float] = []
        self._offsets: dict[str, list[int]] = {}
        self._file = h5py.File(path, "w", libver=LIBVER)
        root = self._file.create_group("VTKHDF")
        root.attrs["Version"] = np.array(VERSION, dtype=np.int64)
        root.attrs.create("Type", np.bytes_("UnstructuredGrid"))
        corners = np.concatenate([block.ravel() for _, block in filled]).astype(np.int64)
        widths = np.concatenate([np.full(len(b), b.shape[1], dtype=np.int64) for _, b in filled])
        types = np.concatenate([np.full(len(b), SHAPES[k].vtk, dtype=np.uint8) for k, b in filled])
        for name, count in (
            ("NumberOfPoints", n_point),
            ("NumberOfCells", len(widths)),
            ("NumberOfConnectivityIds", len(corners)),
        ):
            root.create_dataset(name, data=np.array([count], dtype=np.int64))
        packed = dict(HOW)
        root.create_dataset("Points", data=points_mm * 1e-3, **packed)
        root.create_dataset("Connectivity", data=corners, **packed)
        offsets = np.concatenate([[0], np.cumsum(widths)])
        root.create_dataset("Offsets", data=offsets, **packed)
        root.create_dataset("Types", data=types, **packed)
        self._root = root
        self._data = root.create_group("PointData")
        self._append(POSITION, np.asarray(points_mm, dtype=np.float32), None)
        self._still = [POSITION]
        for name, values in given_point.items():
            self._data.create_dataset(_given(name), data=values, **HOW)
            self._still.append(_given(name))
        self._of_cells: Any = None
        if given_cell:
            self._of_cells = root.create_group("CellData")
        for name, values in given_cell.items():
            self._of_cells.create_dataset(_given(name), data=values, **HOW)

    def close(self) -> None:
        """Close the file; only `finish` makes it whole."""
        self._file.close()

    def __enter__(self) -> "HdfSeries":
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()
        if kind is not None:
            self.path.unlink(missing_ok=True)

    def add(self, time: float, arrays: Mapping[str, Array]) -> None:
        """Append the arrays (n_point,) of one time [s].

        Raises
        ------
        InputFault
            A time that does not rise, a name without a unit, a wrong shape.
        """
        if self._times and not time > self._times[-1]:
            raise InputFault("stored time", f"{time:g} s", f"later than {self._times[-1]:g} s")
        self._check(arrays)
        for name, values in arrays.items():
            if self._rounding is not None:
                values = np.round(values / self._rounding) * self._rounding
            if name not in self._offsets:
                # times that went by without this array
                self._offsets[name] = [0] * len(self._times)
            start = self._append(name, values.astype(np.float32), self._rounding)
            self._offsets[name].append(start)
        self._times.append(float(time))

    def finish(self, at_end: Mapping[str, Array]) -> None:
        """Add what is known at the end, and the table of times.

        Raises
        ------
        InputFault
            As `add`; no time was added.
        """
        if not self._times:
            raise InputFault("stored times", "none", "at least one")
        self._check(at_end)
        n_time = len(self._times)
        for name, values in at_end.items():
            unknown = np.full(self._n_point, np.nan, dtype=np.float32)
            first = self._append(name, unknown, None) if n_time > 1 else 0
            last = self._append(name, values.astype(np.float32), None)
            self._offsets[name] = [first] * (n_time - 1) + [last]
        self._offsets |= {name: [0] * n_time for name in self._still}
        steps = self._root.create_group("Steps")
        steps.attrs["NSteps"] = np.int64(n_time)
        none = np.zeros(n_time, dtype=np.int64)
        steps.create_dataset("Values", data=np.array(self._times))
        steps.create_dataset("PartOffsets", data=none)
        steps.create_dataset("NumberOfParts", data=none + 1)
        steps.create_dataset("PointOffsets", data=none)
        steps.create_dataset("CellOffsets", data=none[:, None])
        steps.create_dataset("ConnectivityIdOffsets", data=none[:, None])
        offsets = steps.create_group("PointDataOffsets")
        for name, starts in self._offsets.items():
            offsets.create_dataset(name, data=np.array(starts, dtype=np.int64))
        if self._of_cells is not None:
            cell_offsets = steps.create_group("CellDataOffsets")
            for name in self._of_cells:
                cell_offsets.create_dataset(name, data=none)

    def _check(self, arrays: Mapping[str, Array]) -> None:
        for name, values in arrays.items():
            if not name.endswith(UNIT_ENDINGS):
                raise InputFault("field name", name, f"one ending with {', '.join(UNIT_ENDINGS)}")
            if values.shape != (self._n_point,):
                raise InputFault(f"shape of {name}", f"{values.shape}", f"({self._n_point},)")

    def _append(self, name: str, values: Any, rounding: float | None) -> int:
        """Append values to a dataset; where they begin."""
        if name not in self._data:
            chunk = (min(len(values), CHUNK), *values.shape[1:])
            empty = self._data.create_dataset(
                name,
                shape=(0, *values.shape[1:]),
                maxshape=(None, *values.shape[1:]),
                dtype=values.dtype,
                chunks=chunk,
                **HOW,
            )
            ending = next(e for e in UNIT_ENDINGS if name.endswith(e))
            empty.attrs["units"] = ending.removeprefix("_").replace("_per_", "/")
            if rounding is not None:
                empty.attrs["rounded_to"] = rounding
        dataset = self._data[name]
        start = len(dataset)
        dataset.resize(start + len(values), axis=0)
        dataset[start:] = values
        return int(start)


def _given(name: str) -> str:
    # a slash would open a group
    return f"given {name}".replace("/", " per ")
