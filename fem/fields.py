"""Field files that any VTK viewer opens: one PVD index and one VTU per stored time.

Layout
------
``fields.pvd`` lists ``fields/step_0000.vtu`` and so on, and last ``final.vtu``,
which can also be opened alone. PVD times are seconds.

Every file carries the same arrays. What is known only at the end of the run
(phases, hardness, times, rates) is nan before the end: viewers build the list
of arrays from one file of a series and drop or misname an array that others
lack, and a zero would be read as a result.

Units
-----
Point coordinates are metres, as everywhere inside. Each array ends with its
unit (``UNIT_ENDINGS``); ``position_mm`` repeats the coordinates in the unit of
the drawing, so that a viewer shows both and nobody has to guess the scale. (A
VTU has no place for the unit of its coordinates, and meshio drops field data.)

Format
------
VTK XML UnstructuredGrid 0.1 through meshio, base64, zlib in blocks of 32 KiB,
float64, nan kept. Connectivity is int32 where it fits: half the bytes.
"""

import os
from collections.abc import Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from xml.sax.saxutils import quoteattr

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import TURNED_WEDGE
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

UNIT_ENDINGS = (
    "_K_per_s",
    "_astm",
    "_code",
    "_degC",
    "_fraction",
    "_HV",
    "_MPa",
    "_mm",
    "_pct",
    "_s",
    "_um",
)
INDEX = "fields.pvd"
FINAL = "final.vtu"
STEPS = "fields"
POSITION = "position_mm"

Blocks = tuple[tuple[str, IntArray], ...]
Given = Mapping[str, NDArray[np.generic]]
NOTHING: Given = {}


def write_series(
    folder: Path,
    *,
    points_mm: Array,
    cells: Blocks,
    times_s: Array,
    each_time: Mapping[str, Array],
    at_end: Mapping[str, Array],
    given_point: Given = NOTHING,
    given_cell: Given = NOTHING,
) -> Path:
    """Write the whole series and return the path of its index.

    Parameters
    ----------
    folder
        An existing folder; files of an earlier series in it are overwritten.
    points_mm
        Points of the drawing [mm], shape (n_point, 3).
    cells
        Blocks of one type each: its name and its corner points (n, n_corner).
    times_s
        Stored times [s], rising, shape (n_time,).
    each_time
        Arrays known at every stored time, shape (n_time, n_point).
    at_end
        Arrays known at the end, shape (n_point,); nan where not available.
    given_point, given_cell
        Arrays that a mesh file brought, shapes (n_point, ...) and (n_cell, ...) over
        all blocks: written into every file as they are. One with the name of a result
        gets "given " before it.

    Raises
    ------
    InputFault
        A name without a unit, two arrays with one name, shapes that do not
        agree, times that do not rise, or a cell that names a missing point.
    """
    _check(points_mm, cells, times_s, each_time, at_end)
    narrow = [(kind, _narrow(block)) for kind, block in cells if len(block)]
    ours = {*each_time, *at_end, POSITION}
    beside = {_beside(name, ours): values for name, values in given_point.items()}
    ends = np.cumsum([len(block) for _, block in narrow])[:-1]
    of_cells = {_beside(name, ours): np.split(values, ends) for name, values in given_cell.items()}
    points = np.ascontiguousarray(points_mm * 1e-3)
    unknown = np.full(len(points), np.nan)
    last = len(times_s) - 1
    names = [f"{STEPS}/step_{k:04d}.vtu" for k in range(last)] + [FINAL]
    (folder / STEPS).mkdir(exist_ok=True)

    def write(k: int) -> None:
        data = {key: values[k] for key, values in each_time.items()}
        data |= {key: values if k == last else unknown for key, values in at_end.items()}
        data |= {POSITION: points_mm}
        results = {key: np.asarray(values, dtype=np.float64) for key, values in data.items()}
        _write_vtu(folder / names[k], points, narrow, results | beside, of_cells)

    # Nearly all the time goes into zlib, which lets other threads run.
    with ThreadPoolExecutor(max_workers=min(8, os.cpu_count() or 1)) as pool:
        for _ in pool.map(write, range(len(names))):
            pass
    index = folder / INDEX
    index.write_text(_index(times_s, names), encoding="utf-8", newline="\n")
    return index


def _beside(name: str, ours: set[str]) -> str:
    return f"given {name}" if name in ours else name


def for_meshio(cells: Sequence[tuple[str, IntArray]]) -> list[tuple[str, IntArray]]:
    """Blocks whose corners meshio then writes to VTK formats in the order they have here.

    meshio turns wedges to run as in vtk up to 9.6. From 9.7 on vtk has them as all other
    formats do, and negative volumes for the turned ones.
    """
    return [(kind, block[:, TURNED_WEDGE] if kind == "wedge" else block) for kind, block in cells]


def _narrow(block: IntArray) -> IntArray:
    fits = block.max() <= np.iinfo(np.int32).max
    return block.astype(np.int32) if fits else block


def _write_vtu(
    path: Path,
    points: Array,
    cells: list[tuple[str, IntArray]],
    data: Mapping[str, NDArray[np.generic]],
    of_cells: Mapping[str, list[NDArray[np.generic]]],
) -> None:
    import meshio

    mesh = meshio.Mesh(points, for_meshio(cells), dict(data), dict(of_cells))
    meshio.write(path, mesh, file_format="vtu", binary=True, compression="zlib")


def _index(times_s: Array, names: list[str]) -> str:
    rows = "\n".join(
        f'    <DataSet timestep="{float(time)!r}" group="" part="0" file={quoteattr(name)}/>'
        for time, name in zip(times_s, names, strict=True)
    )
    return (
        '<?xml version="1.0"?>\n'
        '<VTKFile type="Collection" version="0.1">\n'
        "  <!-- timestep in seconds; point coordinates in metres -->\n"
        f"  <Collection>\n{rows}\n  </Collection>\n</VTKFile>\n"
    )


def _check(
    points_mm: Array,
    cells: Blocks,
    times_s: Array,
    each_time: Mapping[str, Array],
    at_end: Mapping[str, Array],
) -> None:
    n_point, n_time = len(points_mm), len(times_s)
    if points_mm.ndim != 2 or points_mm.shape[1] != 3 or not np.all(np.isfinite(points_mm)):
        raise InputFault("points", f"shape {points_mm.shape}", "(n_point, 3), finite")
    if n_time == 0 or np.any(np.diff(times_s) <= 0.0) or not np.all(np.isfinite(times_s)):
        raise InputFault("stored times", f"{times_s}", "at least one, finite and rising")
    if not any(len(block) for _, block in cells):
        raise InputFault("cells", "none", "at least one cell")
    for kind, block in cells:
        if len(block) and not 0 <= block.min() <= block.max() < n_point:
            raise InputFault(f"{kind} corners", f"{block.min()} to {block.max()}", "known points")
    for expected, arrays in (((n_time, n_point), each_time), ((n_point,), at_end)):
        for name, values in arrays.items():
            if not name.endswith(UNIT_ENDINGS):
                raise InputFault("field name", name, f"one ending with {', '.join(UNIT_ENDINGS)}")
            if values.shape != expected:
                raise InputFault(f"shape of {name}", f"{values.shape}", f"{expected}")
    for name in ({POSITION} | set(each_time)) & (set(at_end) | {POSITION}):
        if name in each_time or name in at_end:
            raise InputFault("field name", name, "used once")
