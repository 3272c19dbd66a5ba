"""Temperatures over time on a mesh: PVD with VTU, XDMF, Exodus, VTKHDF.

One sample is held at a time, whatever the number of samples and however often they are gone
through. The points of all samples must be the same to the bit; a mesh that moves or is
refined on the way has no histories at its nodes.

A PVD index opens only VTU files of its own folder and below; it may define no entities.
"""

from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from midradius.fem.drawing import Drawing
from midradius.fem.histories import GivenMesh, Histories
from midradius.fem.meshguard import guarded, read_mesh
from midradius.fem.meshraw import SHAPES, RawMesh, family
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

LARGEST_INDEX = 50_000_000  # bytes of a PVD


class Series(Protocol):
    """One file of samples: mesh, times, and the arrays of points of one sample."""

    def mesh(self, step: int) -> RawMesh: ...
    def times(self) -> Array: ...
    def values(self, step: int, array: str) -> NDArray[Any]: ...
    def arrays(self) -> tuple[list[str], list[str]]: ...


Opened = Callable[[], AbstractContextManager[Series]]


def refuse(value: str, allowed: str, remedy: str = "", key: str = "file") -> InputFault:
    """A fault of the file that ``[temperatures]`` names."""
    return InputFault(f"temperatures.{key}", value, allowed, remedy)


def read_given_mesh(
    path: Path,
    *,
    array: str,
    time_factor: float,
    to_kelvin: tuple[float, float],
    length_factor: float,
) -> Histories:
    """Open a series on a mesh.

    Parameters
    ----------
    path
        ``.pvd``, ``.xdmf``, Exodus or ``.vtkhdf``.
    array
        Name of the temperature, one number at every point.
    time_factor, length_factor
        Seconds, and metres, in one unit of the file.
    to_kelvin
        ``(factor, offset)``: kelvin are ``factor (value + offset)``.

    Raises
    ------
    InputFault
        A file that cannot be read, no such array, times that do not rise, and, once the
        samples are gone through, points or numbers of them that change.
    """
    opened = _opened(path)
    with opened() as series:
        times = series.times()
        _refuse_times(times, path)
        on_points, on_cells = series.arrays()
        if array not in on_points:
            _refuse_array(array, on_points, on_cells)
        last = series.mesh(len(times) - 1)
    n_node = len(last.points)
    factor, offset = to_kelvin

    def samples() -> Iterator[Array]:
        with opened() as series:
            for step in range(len(times)):
                found = np.asarray(series.values(step, array))
                if found.size != n_node or found.shape not in ((n_node,), (n_node, 1)):
                    raise refuse(
                        f"shape {found.shape} of {array} at time {times[step]:.6g}",
                        f"one number at each of {n_node} points",
                        "A vector is no temperature, and a mesh that changes has no histories.",
                        "array",
                    )
                yield factor * (found.reshape(n_node).astype(np.float64) + offset)

    points = last.points * length_factor
    return Histories(
        times=times * time_factor,
        n_node=n_node,
        samples=samples,
        text=f"{path.name}, {n_node} nodes, {len(times)} samples",
        points=points,
        least_dim=2,
        mesh=GivenMesh(points, last.cells, last.point_data, last.cell_data),
        drawing=_drawing(points, last.cells),
        sense="mesh",
        remarks=tuple(f"{path.name}: {note}" for note in last.notes),
    )


def _opened(path: Path) -> Opened:
    suffix = path.suffix.lower()
    if suffix == ".pvd":
        return lambda: _Indexed(path)
    if suffix in (".xdmf", ".xmf"):
        from midradius.fem.givenxdmf import XdmfSeries

        return lambda: XdmfSeries(path)
    if suffix == ".vtkhdf":
        from midradius.fem.givenvtkhdf import VtkhdfSeries

        return lambda: VtkhdfSeries(path)
    return lambda: _Exodus(path)


def _refuse_times(times: Array, path: Path) -> None:
    if len(times) < 2:
        raise refuse(f'"{path.name}"', "a series of several times", f"It holds {len(times)}.")
    falls = np.flatnonzero(~(np.diff(times) > 0.0))
    if falls.size or not np.isfinite(times).all():
        k = int(falls[0]) if falls.size else 0
        raise refuse(
            f"time {times[k + 1]:.6g} after {times[k]:.6g} (sample {k + 2})",
            "times that rise from sample to sample",
        )


def _refuse_array(array: str, on_points: list[str], on_cells: list[str]) -> None:
    remedy = f"The file has no array of points in its first sample. {_LISTED}"
    if on_points:
        remedy = "The file has " + ", ".join(f'"{name}"' for name in on_points[:20]) + "."
    if array in on_cells:
        remedy = f'"{array}" belongs to cells: write it at the points. {remedy}'
    raise refuse(f'"{array}"', "an array of points of the file", remedy, "array")


_LISTED = "Name it as the viewer lists it."


def _drawing(points: Array, cells: tuple[tuple[str, IntArray], ...]) -> Drawing:
    """The mesh as its own drawing: cells by their corners, without edges and points."""
    kept = [
        (family(kind), block[:, : SHAPES[family(kind)].n_corner])
        for kind, block in cells
        if SHAPES[family(kind)].dim > 1
    ]
    return Drawing(points, tuple(kept), np.arange(len(points), dtype=np.int64))


@dataclass(frozen=True)
class _Step:
    time: float
    file: Path


class _Indexed:
    """A PVD index and its VTU files; one of them is held at a time."""

    def __init__(self, path: Path) -> None:
        self._steps = _index(path)
        self._first: RawMesh | None = None

    def __enter__(self) -> "_Indexed":
        return self

    def __exit__(self, *_: object) -> None:
        self._first = None

    def times(self) -> Array:
        return np.array([step.time for step in self._steps])

    def mesh(self, step: int) -> RawMesh:
        try:
            return read_mesh(self._steps[step].file)
        except InputFault as fault:
            raise refuse(fault.value, fault.allowed, fault.remedy) from fault

    def arrays(self) -> tuple[list[str], list[str]]:
        first = self.mesh(0)
        return list(first.point_data), list(first.cell_data)

    def values(self, step: int, array: str) -> NDArray[Any]:
        found = self.mesh(step)
        name = self._steps[step].file.name
        if self._first is None:
            # of the first sample only what later ones are compared with
            self._first = replace(found, point_data={}, cell_data={})
        if not np.array_equal(found.points, self._first.points):
            raise refuse(
                f'"{name}"',
                "a mesh with the same points, in the same order, as the first of the series",
                "A mesh that moves or is refined on the way has no histories at its nodes.",
            )
        if array not in found.point_data:
            raise refuse(
                f'"{array}"', f'in every file of the series; "{name}" lacks it', "", "array"
            )
        return found.point_data[array]


class _Exodus:
    """An Exodus file, step by step."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._file: Any = None

    def __enter__(self) -> "_Exodus":
        from midradius.fem.meshexodus import ExodusFile

        try:
            self._file = guarded(lambda: ExodusFile(self._path), self._path.name, "Exodus")[0]
        except InputFault as fault:
            raise refuse(fault.value, fault.allowed, fault.remedy) from fault
        return self

    def __exit__(self, *_: object) -> None:
        self._file.__exit__()

    def times(self) -> Array:
        return np.asarray(self._file.times())

    def mesh(self, step: int) -> RawMesh:
        try:
            return read_mesh(self._path)  # its data are those of the last step
        except InputFault as fault:
            raise refuse(fault.value, fault.allowed, fault.remedy) from fault

    def arrays(self) -> tuple[list[str], list[str]]:
        on_points: list[str] = self._file.texts("name_nod_var")
        on_cells: list[str] = self._file.texts("name_elem_var")
        return on_points, on_cells

    def values(self, step: int, array: str) -> NDArray[Any]:
        number = self._file.texts("name_nod_var").index(array) + 1
        if self._file.has(f"vals_nod_var{number}"):
            return np.asarray(self._file.get(f"vals_nod_var{number}", step))
        # older files hold all variables in one: step, variable, node
        both: NDArray[Any] = self._file.get("vals_nod_var", step)
        return np.asarray(both[number - 1])


def _index(path: Path) -> list[_Step]:
    """Times and files of a PVD."""
    from xml.etree import ElementTree

    if path.stat().st_size > LARGEST_INDEX:
        raise refuse(f'"{path.name}"', f"an index of at most {LARGEST_INDEX // 10**6} MB")
    data = path.read_bytes()
    if b"<!DOCTYPE" in data or b"<!ENTITY" in data:
        raise refuse(f'"{path.name}"', "an index without definitions", "Take the DOCTYPE out.")
    try:
        root = ElementTree.fromstring(data)
    except ElementTree.ParseError as error:
        raise refuse(f'"{path.name}"', "a PVD index", f"It is no XML: {error}.") from error
    steps: dict[float, Path] = {}
    for entry in root.iter("DataSet"):
        file = entry.get("file", "")
        try:
            time = float(entry.get("timestep", ""))
        except ValueError:
            found = f'timestep="{entry.get("timestep", "")[:40]}"'
            raise refuse(found, "a number", f"{path.name} gives no time there.") from None
        part = Path(file)
        if not file or part.is_absolute() or ".." in part.parts:
            raise refuse(f'file="{file[:80]}"', f"a file beside {path.name} or below it")
        if time in steps:
            raise refuse(
                f"two parts at time {time:.6g}",
                "one file for each time",
                "Merge the parts of each time into one VTU file.",
            )
        if part.suffix.lower() != ".vtu":
            raise refuse(f'file="{file[:80]}"', "VTU files", "Write the series as VTU files.")
        steps[time] = path.parent / part
    if not steps:
        raise refuse(f'"{path.name}"', "a PVD index", "It names no file.")
    return [_Step(time, file) for time, file in steps.items()]
