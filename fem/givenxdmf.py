"""Samples of an XDMF series through meshio, behind the guard of mesh files."""

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshguard import guarded, read_mesh
from midradius.fem.meshraw import RawMesh
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault


class XdmfSeries:
    """An XDMF file with a temporal collection, open while it lives."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._reader: Any = None

    def __enter__(self) -> "XdmfSeries":
        self._reader = self._guarded(self._open)
        return self

    def __exit__(self, *_: object) -> None:
        self._reader.__exit__()

    def _open(self) -> Any:
        import meshio

        from midradius.fem.meshlibrary import mended

        reader = meshio.xdmf.TimeSeriesReader(self._path)
        self._refuse_moving(reader.collection)
        with mended():
            reader.read_points_cells()
        return reader

    def _refuse_moving(self, grids: Any) -> None:
        """Each time may bring its own mesh; the library would take the first for all."""
        if any(item.get("Format") == "Binary" for grid in grids for item in grid.iter("DataItem")):
            allowed = "an XDMF file with its numbers in HDF5 or in itself"
            raise InputFault("temperatures.file", f'"{self._path.name}"', allowed)
        for what in ("Geometry", "Topology"):
            found = {" ".join("".join(e.itertext()).split()) for g in grids for e in g.iter(what)}
            if len(found) > 1:
                raise InputFault(
                    "temperatures.file",
                    f'"{self._path.name}"',
                    "a series on one mesh",
                    "Its times have meshes of their own: a mesh that moves has no histories.",
                )

    def _guarded(self, action: Any) -> Any:
        try:
            return guarded(action, self._path.name, "XDMF series")[0]
        except InputFault as fault:
            raise InputFault(
                "temperatures.file", fault.value, fault.allowed, fault.remedy
            ) from fault

    def times(self) -> Array:
        # from the tags: the library reads all numbers of a step to tell its time
        tags = [grid.find("Time") for grid in self._reader.collection]
        known = [np.nan if tag is None else float(tag.get("Value", "nan")) for tag in tags]
        return np.array(known)

    def _read(self, step: int) -> tuple[float, dict[str, NDArray[Any]], dict[str, Any]]:
        found: tuple[float, dict[str, NDArray[Any]], dict[str, Any]] = self._reader.read_data(step)
        return found

    def mesh(self, step: int) -> RawMesh:
        try:
            bare = read_mesh(self._path)
        except InputFault as fault:
            raise InputFault(
                "temperatures.file", fault.value, fault.allowed, fault.remedy
            ) from fault
        _, points, cells = self._guarded(lambda: self._read(step))
        whole = {name: np.concatenate(blocks) for name, blocks in cells.items()}
        n_cell = bare.n_cell
        return replace(
            bare,
            point_data={k: np.asarray(v) for k, v in points.items()},
            cell_data={k: v for k, v in whole.items() if len(v) == n_cell},
        )

    def arrays(self) -> tuple[list[str], list[str]]:
        _, points, cells = self._guarded(lambda: self._read(0))
        return list(points), list(cells)

    def values(self, step: int, array: str) -> NDArray[Any]:
        points = self._guarded(lambda: self._read(step))[1]
        if array not in points:
            raise InputFault(
                "temperatures.array", f'"{array}"', f"in every sample; sample {step + 1} lacks it"
            )
        return np.asarray(points[array])
