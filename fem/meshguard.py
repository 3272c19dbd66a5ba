"""Reads a mesh file of any known format, and never lets a bad one do harm.

Readers of our own serve the formats where the general library fails or drops
cells without a word: VTU, Gmsh .msh, .inp decks, bulk data decks, Exodus. The
others go through meshio behind a guard: the format is named and never guessed
by trial, nothing is printed, an end of the process is caught, and the counts
are compared with those that the file states.

A mesh file opens no other file (``*INCLUDE`` and the like are refused), save
the HDF5 file that an XDMF file names for its numbers.
"""

import contextlib
import io
import re
import warnings
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import SHAPES, TURNED_WEDGE, Group, RawMesh, family, refuse
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

T = TypeVar("T")

LARGEST = 8_000_000_000  # bytes
OWN: Mapping[str, str] = {
    ".vtu": "vtu",
    ".msh": "msh",
    ".inp": "inp",
    **dict.fromkeys((".bdf", ".nas", ".fem"), "bulk"),
    **dict.fromkeys((".e", ".exo", ".ex2", ".g", ".gen"), "exodus"),
}
BY_LIBRARY: Mapping[str, str] = {
    ".vtk": "vtk",
    ".xdmf": "xdmf",
    ".xmf": "xdmf",
    ".med": "med",
    ".mesh": "medit",
    ".meshb": "medit",
    ".avs": "avsucd",
}
_KNOWN = ", ".join([*OWN, *BY_LIBRARY])
_OTHERS: Mapping[str, str] = {
    **dict.fromkeys(
        (".step", ".stp", ".iges", ".igs", ".brep", ".dxf"),
        "This is a drawing or a solid, not a mesh: midradius mesh makes one of it.",
    ),
    **dict.fromkeys(
        (".stl", ".obj", ".ply", ".off"),
        "This format holds a surface only: fill it with cells first.",
    ),
    ".pvd": "This is an index of a series: name one of its VTU files.",
    ".pvtu": "This is an index of pieces: write them as one VTU file.",
}
_AGAIN = "Write it once more, or in another format such as .vtu."
_TURNED = {"pixel": ("quad", [0, 1, 3, 2]), "voxel": ("hexahedron", [0, 1, 3, 2, 4, 5, 7, 6])}


def read_mesh(path: Path) -> RawMesh:
    """The mesh of a file, in its own unit and order.

    Raises
    ------
    InputFault
        No such file, a format that is not read, a file that is damaged, or one
        with cells that no section can hold.
    """
    suffix = path.suffix.lower()
    if suffix not in OWN and suffix not in BY_LIBRARY:
        raise refuse(path.name, f"a file of one of these kinds: {_KNOWN}", _OTHERS.get(suffix, ""))
    _present(path)
    mesh = _own(path, OWN[suffix]) if suffix in OWN else _by_library(path, BY_LIBRARY[suffix])
    if not len(mesh.points) or not np.all(np.isfinite(mesh.points)):
        raise refuse(path.name, "a mesh whose points have finite coordinates", "Export it again.")
    return mesh


def guarded(action: Callable[[], T], name: str, what: str) -> tuple[T, tuple[str, ...]]:
    """Call a foreign reader; what it would have printed comes back as lines.

    Raises
    ------
    InputFault
        Whatever the reader raised, an end of the process among it.
    """
    said = io.StringIO()
    try:
        with (
            contextlib.redirect_stdout(said),
            contextlib.redirect_stderr(said),
            warnings.catch_warnings(),
        ):
            warnings.simplefilter("ignore")
            found = action()
    except InputFault:
        raise
    except (Exception, SystemExit) as error:
        lines = [" ".join(said.getvalue().split()), _told(error)]
        reason = next((line for line in lines if line and line != "1"), type(error).__name__)
        remedy = f"It could not be read: {reason.rstrip('.')}. {_AGAIN}"
        raise refuse(name, f"a whole {what} file", remedy) from error
    return found, tuple(line.strip() for line in said.getvalue().splitlines() if line.strip())


def _told(error: BaseException) -> str:
    """What an error says; of a missing key the bare text is the key alone."""
    if isinstance(error, KeyError) and error.args:
        text = str(error.args[0])
        return text if " " in text else f"its reader does not know {text}, which it holds"
    return str(error)


def _present(path: Path) -> None:
    try:
        if path.is_file():
            size = path.stat().st_size
            if not size:
                raise refuse(path.name, "a mesh file", "The file is empty.")
            if size > LARGEST:
                raise refuse(path.name, f"at most {LARGEST // 10**9} GB", "Thin the mesh out.")
            return
        reason = "There is no such file." if not path.exists() else "This is a folder or a device."
    except OSError as error:
        reason = f"{error.strerror or error}."
    raise refuse(path.name, "a mesh file that can be read", reason)


def _own(path: Path, format: str) -> RawMesh:
    # The readers are imported here: a case without a mesh needs none of them.
    if format == "exodus":
        from midradius.fem.meshexodus import read_exodus

        return guarded(lambda: read_exodus(path), path.name, "Exodus")[0]
    data = path.read_bytes()
    if format == "vtu":
        from midradius.fem.meshvtu import read_vtu

        return guarded(lambda: read_vtu(data, path.name), path.name, "VTU")[0]
    if format == "msh":
        from midradius.fem.meshmsh import read_msh

        return guarded(lambda: read_msh(data, path.name), path.name, ".msh")[0]
    text = data.decode("utf-8", errors="replace")
    if "\0" in text:
        raise refuse(path.name, "a text file", "It holds binary data.")
    if format == "inp":
        from midradius.fem.meshinp import read_inp

        return guarded(lambda: read_inp(text, path.name), path.name, ".inp")[0]
    from midradius.fem.meshbulk import read_bulk

    return guarded(lambda: read_bulk(text, path.name), path.name, "bulk data")[0]


def _by_library(path: Path, format: str) -> RawMesh:
    def read() -> Any:
        import meshio

        from midradius.fem.meshlibrary import mended

        with mended():
            return found(meshio)

    def found(meshio: Any) -> Any:
        if format == "xdmf" and b'CollectionType="Temporal"' in path.read_bytes()[:1_000_000]:
            with meshio.xdmf.TimeSeriesReader(path) as series:
                points, cells = series.read_points_cells()
                return meshio.Mesh(points, cells)
        return meshio._helpers.reader_map[format](str(path))

    mesh, said = guarded(read, path.name, format)
    return _converted(mesh, path, format, said)


def _converted(mesh: Any, path: Path, format: str, said: tuple[str, ...]) -> RawMesh:
    cells: list[tuple[str, IntArray]] = []
    for block in mesh.cells:
        kind, table = block.type, np.asarray(block.data)
        if kind in _TURNED:
            kind, order = _TURNED[kind]
            table = table[:, order]
        elif format == "vtk" and kind == "wedge":
            table = table[:, TURNED_WEDGE]  # meshio has turned it: back to the order of the file
        cells.append((kind, table))
    strange = [kind for kind, table in cells if len(table) and not family(kind)]
    if strange:
        raise refuse(
            path.name,
            "a mesh of triangles, quads, tetrahedra, hexahedra, wedges or pyramids",
            f"It holds cells of the type {strange[0]}.",
        )
    cells = [(kind, table.astype(np.int64)) for kind, table in cells if len(table)]
    found = np.asarray(mesh.points, dtype=np.float64)
    points = np.zeros((len(found), 3))
    points[:, : found.shape[1]] = found[:, :3]
    if format == "med":
        cells = [(kind, _turned_as_others(points, kind, table)) for kind, table in cells]
    n_cell = sum(len(table) for _, table in cells)
    _count(path, format, len(points), n_cell, said)
    for kind, table in cells:
        corners = table[:, : SHAPES[family(kind)].n_corner]
        if not 0 <= corners.min() <= corners.max() < len(points):
            raise refuse(path.name, "a file whose cells fit its points", "It is damaged.")
    point_data = {k: np.asarray(v) for k, v in mesh.point_data.items() if len(v) == len(points)}
    cell_data: dict[str, NDArray[np.generic]] = {}
    for key, blocks in mesh.cell_data.items():
        whole = np.concatenate([np.asarray(block) for block in blocks]) if blocks else np.empty(0)
        if len(whole) == n_cell:
            cell_data[key] = whole
    return RawMesh(
        points=points,
        cells=tuple(cells),
        point_ids=np.arange(1, len(points) + 1, dtype=np.int64),
        cell_ids=np.arange(1, n_cell + 1, dtype=np.int64),
        point_data=point_data,
        cell_data=cell_data,
        groups=_groups(mesh, cells, cell_data, point_data),
        notes=tuple(f"meshio: {line}" for line in said),
        format=format,
    )


def _turned_as_others(points: Array, kind: str, table: IntArray) -> IntArray:
    """MED has its solid cells the other way round than all other formats."""
    from midradius.fem.meshhealth import turned

    shape = SHAPES[family(kind)]
    if shape.dim != 3 or not 0 <= table.min() <= table.max() < len(points):
        return table
    ((_, corners),), mixed = turned(points, ((family(kind), table[:, : shape.n_corner]),))
    if mixed:
        return table
    return np.concatenate([corners, table[:, shape.n_corner :]], axis=1)


def _groups(
    mesh: Any,
    cells: list[tuple[str, IntArray]],
    cell_data: Mapping[str, NDArray[np.generic]],
    point_data: Mapping[str, NDArray[np.generic]],
) -> dict[str, Group]:
    """Point and cell sets, and the families of a MED file."""
    groups: dict[str, Group] = {}
    first = np.cumsum([0, *(len(table) for _, table in cells)])
    for name, members in (getattr(mesh, "point_sets", None) or {}).items():
        groups[str(name)] = Group(points=np.unique(np.asarray(members, dtype=np.int64)))
    for name, parts in (getattr(mesh, "cell_sets", None) or {}).items():
        if ":" in str(name) or len(parts) != len(cells):
            continue
        known = [
            np.asarray(part, dtype=np.int64) + start
            for part, start in zip(parts, first[:-1], strict=True)
            if part is not None and len(part)
        ]
        before = groups.get(str(name), Group())
        if known:
            groups[str(name)] = Group(before.points, np.concatenate(known), before.facets)
    for tags, data, of_cells in (
        (getattr(mesh, "cell_tags", None), cell_data.get("cell_tags"), True),
        (getattr(mesh, "point_tags", None), point_data.get("point_tags"), False),
    ):
        if not tags or data is None:
            continue
        for number, names in tags.items():
            inside = np.flatnonzero(np.asarray(data) == number)
            for name in names:
                before = groups.get(name, Group())
                groups[name] = (
                    Group(before.points, np.union1d(before.cells, inside), before.facets)
                    if of_cells
                    else Group(np.union1d(before.points, inside), before.cells, before.facets)
                )
    return groups


def _count(path: Path, format: str, n_point: int, n_cell: int, said: tuple[str, ...]) -> None:
    """Compare with the numbers that the file states, where its format has them."""
    stated: dict[str, int] = {}
    if format == "vtk":
        data = path.read_bytes()
        for what, word in (("points", rb"POINTS"), ("cells", rb"CELL_TYPES")):
            found = re.search(rb"^" + word + rb"\s+(\d+)", data, re.MULTILINE)
            if found:
                stated[what] = int(found[1])
    elif format == "xdmf":
        head = path.read_bytes()[:4_000_000]
        first = head.split(b"<Geometry", 1)[0]
        found = re.search(rb"<Topology[^>]*NumberOfElements=\"\s*(\d+)", first)
        if found:
            stated["cells"] = int(found[1])
    for what, count in (("points", n_point), ("cells", n_cell)):
        if stated.get(what, count) != count:
            why = f" {said[0]}" if said else ""
            raise refuse(
                path.name,
                f"a file whose {what} can all be read ({count} of {stated[what]} were)",
                f"Write it in another format, such as .vtu.{why}",
            )
