"""Reader of Exodus files, classic netCDF and HDF5, without the netCDF library.

Blocks, node sets and side sets become groups (``block N``, ``node set N``,
``side set N`` where they have no names); data are those of one stored time.

Source
------
Exodus II: A Finite Element Data Model, SAND92-2137 (remembered).
"""

import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import SHAPES, Group, RawMesh, facet_table, family, refuse
from midradius.thermo.arrays import Array, IntArray

_FAMILIES = (
    ("TRI", "triangle"),
    ("QUAD", "quad"),
    ("SHELL", "quad"),
    ("TET", "tetra"),
    ("HEX", "hexahedron"),
    ("WEDGE", "wedge"),
    ("PYR", "pyramid"),
    ("BAR", "line"),
    ("BEAM", "line"),
    ("TRUSS", "line"),
    ("ROD", "line"),
    ("SPHERE", "vertex"),
    ("CIRCLE", "vertex"),
)
# Sides in the order of the format; those of plane cells are ours.
_SIDES: Mapping[str, tuple[tuple[int, ...], ...]] = {
    "tetra": ((0, 1, 3), (1, 2, 3), (0, 3, 2), (0, 2, 1)),
    "hexahedron": (
        *((0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6)),
        *((0, 4, 7, 3), (0, 3, 2, 1), (4, 5, 6, 7)),
    ),
    "wedge": ((0, 1, 4, 3), (1, 2, 5, 4), (0, 3, 5, 2), (0, 2, 1), (3, 4, 5)),
    "pyramid": ((0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4), (0, 3, 2, 1)),
}
LAST = -1


class ExodusFile:
    """The variables of a file by name; open while it lives.

    Raises
    ------
    InputFault
        No Exodus file, or one in a layout that is not read.
    """

    def __init__(self, path: Path) -> None:
        self.name = path.name
        with path.open("rb") as file:
            magic = file.read(4)
        self._file: Any
        if magic == b"\x89HDF":
            import h5py

            self._file = h5py.File(path, "r")
            self._variables: Any = self._file
        elif magic in (b"CDF\x01", b"CDF\x02"):
            from scipy.io import netcdf_file

            # mapped: a series of many steps is not read to get at one of them
            self._file = netcdf_file(path, "r", mmap=True)
            self._variables = self._file.variables
        else:
            raise refuse(
                path.name,
                "an Exodus file in classic netCDF or HDF5",
                "Write it again in one of these layouts.",
            )

    def __enter__(self) -> "ExodusFile":
        return self

    def __exit__(self, *_: object) -> None:
        self._variables = {}  # what still points into a mapped file would keep it open
        self._file.close()

    def names(self) -> list[str]:
        """Names of all variables."""
        return list(self._variables)

    def has(self, name: str) -> bool:
        """Whether there is such a variable."""
        return name in self._variables

    def get(self, name: str, row: int | None = None) -> NDArray[Any]:
        """Values of a variable, or one row of its first axis."""
        found = self._variables[name]
        values = np.asarray(
            found[row] if row is not None else found[()] if _h5(found) else found[:]
        )
        return values.astype(values.dtype.newbyteorder("="))

    def attribute(self, name: str, key: str) -> str:
        """A text attribute of a variable."""
        found = self._variables[name]
        value = found.attrs.get(key, b"") if _h5(found) else getattr(found, key, b"")
        value = value[0] if isinstance(value, np.ndarray) else value
        return value.decode() if isinstance(value, bytes) else str(value)

    def texts(self, name: str) -> list[str]:
        """A list of names, stored letter by letter."""
        if not self.has(name):
            return []
        rows = self.get(name).reshape(-1, self.get(name).shape[-1])
        return [b"".join(row).split(b"\0")[0].decode(errors="replace").strip() for row in rows]

    def times(self) -> Array:
        """Stored times, (n_time,), in the file's own unit."""
        if not self.has("time_whole"):
            return np.empty(0)
        return self.get("time_whole").astype(np.float64)

    def point_values(self, step: int) -> dict[str, NDArray[np.generic]]:
        """Values on points at a stored time, by name."""
        names = self.texts("name_nod_var")
        found = {k: f"vals_nod_var{k + 1}" for k in range(len(names))}
        return {
            names[k]: self.get(variable, step)
            for k, variable in found.items()
            if self.has(variable)
        }


def _h5(found: Any) -> bool:
    return hasattr(found, "attrs")


def read_exodus(path: Path, step: int = LAST) -> RawMesh:
    """The mesh of an Exodus file, with the data of one stored time.

    Raises
    ------
    InputFault
        No Exodus file, one that is damaged, or cells that no section can hold.
    """
    with ExodusFile(path) as file:
        return _mesh(file, step)


def _mesh(file: ExodusFile, step: int) -> RawMesh:
    points = _points(file)
    n_block = max(_numbers(file, "connect"), default=0)
    names = file.texts("eb_names")
    cells, groups, n_cell, shells = [], dict[str, Group](), 0, []
    for k in range(1, n_block + 1):
        variable = f"connect{k}"
        if not file.has(variable):
            continue
        table = file.get(variable).astype(np.int64) - 1
        kind, shell = _kind(file, variable, table.shape[1])
        if table.size and not 0 <= table.min() <= table.max() < len(points):
            raise refuse(file.name, "an Exodus file whose cells fit its points", "It is damaged.")
        cells.append((kind, table))
        shells.append(shell and len(points) > 0)
        label = _label(names, k, "block")
        groups[label] = Group(cells=np.arange(n_cell, n_cell + len(table)))
        n_cell += len(table)
    if not cells:
        raise refuse(file.name, "an Exodus file with cells", "It holds none.")
    for _, label, members in _sets(file, "node_ns", "ns_names", "node set"):
        groups[label] = Group(points=np.unique(members - 1))
    for k, label, members in _sets(file, "elem_ss", "ss_names", "side set"):
        sides = file.get(f"side_ss{k}").astype(np.int64) - 1
        groups[label] = Group(facets=_facets(cells, shells, members - 1, sides))
    times = file.times()
    notes = (
        [f"of {len(times)} stored times the last one is read"]
        if len(times) > 1 and step == LAST
        else []
    )
    ids = _map(file, ("node_num_map", "node_map"), len(points))
    return RawMesh(
        points=points,
        cells=tuple(cells),
        point_ids=ids,
        cell_ids=_map(file, ("elem_num_map", "elem_map"), n_cell),
        point_data=file.point_values(step) if len(times) else {},
        cell_data={},
        groups=groups,
        notes=tuple(notes),
        format="exodus",
    )


def _points(file: ExodusFile) -> Array:
    if file.has("coord"):
        found = file.get("coord").T
    else:
        found = np.stack([file.get(f"coord{c}") for c in "xyz" if file.has(f"coord{c}")], axis=1)
    points = np.zeros((len(found), 3))
    points[:, : found.shape[1]] = found
    return points


def _kind(file: ExodusFile, variable: str, n: int) -> tuple[str, bool]:
    title = file.attribute(variable, "elem_type").upper()
    for start, kind in _FAMILIES:
        if title.startswith(start) or (start == "TRI" and title == "SHELL" and n in (3, 6)):
            corners = SHAPES[kind].n_corner
            if n < corners:
                break
            return (kind if n == corners else f"{kind}{n}"), "SHELL" in title
    raise refuse(
        file.name,
        "a mesh of triangles, quads, tetrahedra, hexahedra, wedges or pyramids",
        f"It holds {title or 'unnamed'} cells with {n} nodes.",
    )


def _label(names: list[str], k: int, word: str) -> str:
    return names[k - 1] if k <= len(names) and names[k - 1] else f"{word} {k}"


def _sets(file: ExodusFile, start: str, names: str, word: str) -> list[tuple[int, str, IntArray]]:
    titles = file.texts(names)
    return [
        (k, _label(titles, k, word), file.get(f"{start}{k}").astype(np.int64))
        for k in _numbers(file, start)
    ]


def _numbers(file: ExodusFile, start: str) -> list[int]:
    """The numbers behind variables such as ``connect1``, rising."""
    found = (re.fullmatch(start + r"(\d+)", name) for name in file.names())
    return sorted(int(hit[1]) for hit in found if hit)


def _facets(
    cells: list[tuple[str, IntArray]], shells: list[bool], members: IntArray, sides: IntArray
) -> IntArray:
    rows: list[tuple[int, ...]] = []
    first = 0
    for (kind, table), shell in zip(cells, shells, strict=True):
        name = family(kind)
        own = _SIDES.get(name, SHAPES[name].facets)
        inside = (members >= first) & (members < first + len(table))
        # a shell counts its two faces first, then its edges
        skipped = 2 if shell and sides[inside].max(initial=0) >= SHAPES[name].n_corner else 0
        for member, side in zip(members[inside] - first, sides[inside] - skipped, strict=True):
            if 0 <= side < len(own):
                rows.append(tuple(int(table[member, c]) for c in own[side]))
        first += len(table)
    return facet_table(rows)


def _map(file: ExodusFile, names: tuple[str, ...], count: int) -> IntArray:
    for name in names:
        if file.has(name):
            values = file.get(name).astype(np.int64).ravel()
            if len(values) == count:
                return values
    return np.arange(1, count + 1, dtype=np.int64)
