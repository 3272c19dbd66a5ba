"""Reader of VTU files (VTK XML, UnstructuredGrid), every encoding.

Text, base64 or raw appended data; none, zlib, LZMA or LZ4 compression; either
byte order; several pieces; pixels and voxels as quads and hexahedra. Neighbours
of one type form one block, so that the order of the cells is the file's.

Source
------
VTK file formats, XML section (kitware, public documentation; remembered). LZ4
block format: github.com/lz4/lz4, doc/lz4_Block_format.md (remembered).
"""

import base64
import lzma
import re
import zlib
from dataclasses import dataclass
from typing import Any
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import RawMesh, refuse
from midradius.thermo.arrays import IntArray
from midradius.thermo.compiled import kernel

_TYPES = {
    **{f"Float{n}": f"f{n // 8}" for n in (32, 64)},
    **{f"Int{n}": f"i{n // 8}" for n in (8, 16, 32, 64)},
    **{f"UInt{n}": f"u{n // 8}" for n in (8, 16, 32, 64)},
}
CELLS: dict[int, str] = {
    1: "vertex",
    3: "line",
    5: "triangle",
    9: "quad",
    10: "tetra",
    12: "hexahedron",
    13: "wedge",
    14: "pyramid",
    21: "line3",
    22: "triangle6",
    23: "quad8",
    24: "tetra10",
    25: "hexahedron20",
    26: "wedge15",
    27: "pyramid13",
    28: "quad9",
    29: "hexahedron27",
    32: "wedge18",
    33: "hexahedron24",
    34: "triangle7",
    37: "pyramid19",
}
_ANY_ORDER = {68: "line", 69: "triangle", 70: "quad", 71: "tetra", 72: "hexahedron", 73: "wedge"}
_PIXEL, _VOXEL, _POLYGON = 8, 11, 7
_TURNED = {
    _PIXEL: ("quad", [0, 1, 3, 2]),
    _VOXEL: ("hexahedron", [0, 1, 3, 2, 4, 5, 7, 6]),
}
_THIN = {2: "poly-vertex", 4: "poly-line"}
MOST_BLOCKS = 2000


def read_vtu(data: bytes, name: str) -> RawMesh:
    """The mesh of a VTU file's bytes; ``name`` is the file, for messages.

    Raises
    ------
    InputFault
        No VTU file, one that is damaged, or cells that no section can hold.
    """
    file = _open(data, name)
    pieces = file.root.findall("./UnstructuredGrid/Piece")
    if not pieces:
        raise refuse(name, "a VTU file with an UnstructuredGrid", "It holds no piece of one.")
    read = [_piece(file, piece) for piece in pieces]
    points = np.concatenate([p.points for p in read])
    first = np.cumsum([0, *(len(p.points) for p in read)])
    cells: list[tuple[str, IntArray]] = []
    notes: list[str] = []
    kept = []
    for piece, start in zip(read, first[:-1], strict=True):
        blocks, keep, more = _blocks(piece, name)
        cells += [(kind, block + start) for kind, block in blocks]
        kept.append(keep)
        notes += more
    point_data = _stacked([p.point_data for p in read])
    cell_data = _stacked(
        [{k: v[keep] for k, v in p.cell_data.items()} for p, keep in zip(read, kept, strict=True)]
    )
    n_cell = sum(len(block) for _, block in cells)
    return RawMesh(
        points=points,
        cells=tuple(cells),
        point_ids=np.arange(len(points), dtype=np.int64),
        cell_ids=np.arange(n_cell, dtype=np.int64),
        point_data=point_data,
        cell_data=cell_data,
        groups={},
        notes=tuple(dict.fromkeys(notes)),
        format="vtu",
    )


@dataclass(frozen=True)
class _File:
    root: Any
    appended: bytes
    raw: bool
    header: np.dtype[Any]
    order: str
    compressor: str
    name: str


@dataclass(frozen=True)
class _Piece:
    points: NDArray[np.float64]
    connectivity: IntArray
    offsets: IntArray
    types: IntArray
    point_data: dict[str, NDArray[np.generic]]
    cell_data: dict[str, NDArray[np.generic]]


def _open(data: bytes, name: str) -> _File:
    start = data.find(b"<AppendedData")
    appended, raw = b"", False
    text = data
    if start >= 0:
        end = data.index(b">", start)
        raw = b'"raw"' in data[start:end]
        appended = data[data.index(b"_", end) + 1 :]
        text = data[:start] + b"</VTKFile>"
    try:
        root = ElementTree.fromstring(text)
    except ElementTree.ParseError as error:
        raise refuse(name, "a VTU file", f"Its XML is broken: {error}.") from None
    if root.tag != "VTKFile" or root.get("type") != "UnstructuredGrid":
        kind = root.get("type") or root.tag
        raise refuse(name, "a VTU file of an UnstructuredGrid", f"This one holds: {kind}.")
    order = ">" if root.get("byte_order") == "BigEndian" else "<"
    return _File(
        root=root,
        appended=appended,
        raw=raw,
        header=np.dtype(order + _TYPES[root.get("header_type", "UInt32")]),
        order=order,
        compressor=root.get("compressor", ""),
        name=name,
    )


def _piece(file: _File, piece: Any) -> _Piece:
    n_point, n_cell = int(piece.get("NumberOfPoints", 0)), int(piece.get("NumberOfCells", 0))
    arrays: dict[str, dict[str, NDArray[np.generic]]] = {}
    for part in ("Points", "Cells", "PointData", "CellData"):
        found = piece.find(part)
        items = [] if found is None else found.findall("DataArray")
        arrays[part] = {
            item.get("Name") or part: _array(file, item)
            for item in items
            if item.get("type") in _TYPES
        }
    cells = arrays["Cells"]
    try:
        points = next(iter(arrays["Points"].values())).astype(np.float64).reshape(n_point, 3)
        connectivity, offsets, types = (
            cells[key].astype(np.int64).ravel() for key in ("connectivity", "offsets", "types")
        )
    except (KeyError, StopIteration, ValueError):
        raise refuse(file.name, "a VTU file with all its points and cells", _DAMAGED) from None
    sound = len(types) == len(offsets) == n_cell and (
        not n_cell or offsets[-1] == len(connectivity)
    )
    if not sound or (
        len(connectivity) and not 0 <= connectivity.min() <= connectivity.max() < n_point
    ):
        raise refuse(file.name, "a VTU file whose cells fit its points", _DAMAGED)
    for part, count in (("PointData", n_point), ("CellData", n_cell)):
        for key, values in arrays[part].items():
            if len(values) != count:
                raise refuse(file.name, f'a VTU file whose array "{key}" is whole', _DAMAGED)
    return _Piece(points, connectivity, offsets, types, arrays["PointData"], arrays["CellData"])


_DAMAGED = "The file is damaged or was not written to its end."


def _array(file: _File, item: Any) -> NDArray[np.generic]:
    dtype = np.dtype(file.order + _TYPES[item.get("type")])
    how = item.get("format", "ascii")
    try:
        if how == "ascii":
            values = np.array((item.text or "").split(), dtype=dtype)
        else:
            at = int(item.get("offset", 0)) if how == "appended" else 0
            content = (
                file.appended[at:] if how == "appended" else (item.text or "").strip().encode()
            )
            raw = how == "appended" and file.raw
            values = np.frombuffer(_bytes(file, memoryview(content), raw), dtype=dtype)
    except (ValueError, zlib.error, lzma.LZMAError, IndexError) as error:
        fault = f'It stopped at the array "{item.get("Name")}": {error}.'
        raise refuse(file.name, "a VTU file that can be decoded", fault) from None
    n = int(item.get("NumberOfComponents") or 1)
    native = values.astype(dtype.newbyteorder("="))
    return native.reshape(-1, n) if n > 1 else native


def _bytes(file: _File, content: memoryview, raw: bool) -> bytes:
    """The bytes of one array, whatever its packing."""
    size = file.header.itemsize

    def take(start: int, count: int) -> bytes:
        """``count`` bytes from ``start``, a place in the file's own encoding."""
        if raw:
            return bytes(content[start : start + count])
        return base64.b64decode(content[start : start + _coded(count)])[:count]

    def length(count: int) -> int:
        return count if raw else _coded(count)

    head = int(np.frombuffer(take(0, size), file.header)[0])
    if not file.compressor:
        apart = raw or b"=" in bytes(content[: _coded(size)])
        if apart:
            return take(length(size), head)
        return take(0, size + head)[size:]
    n_block = head
    header = np.frombuffer(take(0, (3 + n_block) * size), file.header)
    full, last, sizes = int(header[1]), int(header[2]), header[3:].astype(np.int64)
    packed = take(length((3 + n_block) * size), int(sizes.sum()))
    ends = np.cumsum(sizes)
    blocks = []
    for k, end in enumerate(ends):
        short = k == n_block - 1 and last
        part = packed[int(end - sizes[k]) : int(end)]
        blocks.append(_unpacked(file.compressor, part, last if short else full))
    return b"".join(blocks)


def _coded(count: int) -> int:
    return -(-count // 3) * 4


def _unpacked(compressor: str, part: bytes, size: int) -> bytes:
    if compressor == "vtkZLibDataCompressor":
        return zlib.decompress(part)
    if compressor == "vtkLZMADataCompressor":
        return lzma.decompress(part)
    if compressor == "vtkLZ4DataCompressor":
        out = np.empty(size, dtype=np.uint8)
        if _lz4(np.frombuffer(part, dtype=np.uint8), out) != size:
            raise ValueError("an LZ4 block is broken")
        return out.tobytes()
    raise ValueError(f"compression {compressor} is not known")


@kernel
def _lz4(packed: NDArray[np.uint8], out: NDArray[np.uint8]) -> int:
    """Unpack one LZ4 block; returns the bytes written, -1 for a broken one."""
    i, o, n, most = 0, 0, len(packed), len(out)
    while i < n:
        token = packed[i]
        i += 1
        count = int(token >> 4)
        if count == 15:
            while i < n:
                more = int(packed[i])
                i += 1
                count += more
                if more != 255:
                    break
        if i + count > n or o + count > most:
            return -1
        for k in range(count):
            out[o + k] = packed[i + k]
        i += count
        o += count
        if i >= n:
            break
        if i + 2 > n:
            return -1
        back = int(packed[i]) + 256 * int(packed[i + 1])
        i += 2
        count = int(token & 15)
        if count == 15:
            while i < n:
                more = int(packed[i])
                i += 1
                count += more
                if more != 255:
                    break
        count += 4
        if back == 0 or back > o or o + count > most:
            return -1
        for k in range(count):
            out[o + k] = out[o + k - back]
        o += count
    return o


def _blocks(piece: _Piece, name: str) -> tuple[list[tuple[str, IntArray]], IntArray, list[str]]:
    """Blocks of one type each, the cells kept, and notes on the others."""
    starts = np.concatenate([[0], piece.offsets[:-1]]).astype(np.int64)
    sizes = piece.offsets - starts
    keep = np.arange(len(sizes))
    notes: list[str] = []
    for thin_type, text in _THIN.items():
        thin = piece.types[keep] == thin_type
        if thin.any():
            notes.append(f"{int(thin.sum())} {text} cells left out")
            keep = keep[~thin]
    key = piece.types[keep] * 4096 + sizes[keep]
    runs = np.flatnonzero(np.diff(key)) + 1
    if len(runs) > MOST_BLOCKS:
        notes.append("cells of several types stood mixed in the file; they are sorted by type")
        keep = keep[np.argsort(key, kind="stable")]
        key = np.sort(key, kind="stable")
        runs = np.flatnonzero(np.diff(key)) + 1
    blocks: list[tuple[str, IntArray]] = []
    for run in np.split(keep, runs) if len(keep) else []:
        number, n = int(piece.types[run[0]]), int(sizes[run[0]])
        table = piece.connectivity[starts[run][:, None] + np.arange(n)]
        kind, order = cell_kind(number, n)
        if not kind:
            raise refuse(
                name,
                "a mesh of triangles, quads, tetrahedra, hexahedra, wedges or pyramids",
                f"It holds {len(run)} cells of VTK type {number} with {n} points.",
            )
        blocks.append((kind, table if order is None else table[:, order]))
    return blocks, keep, notes


def cell_kind(number: int, n: int) -> tuple[str, list[int] | None]:
    """Cell type and order of corners for a type number of VTK; ``""`` if no section holds it."""
    if number in _TURNED:
        return _TURNED[number]
    if number == _POLYGON:
        return {3: "triangle", 4: "quad"}.get(n, ""), None
    if number in _ANY_ORDER:
        return f"{_ANY_ORDER[number]}{n}", None
    kind = CELLS.get(number, "")
    wanted = re.search(r"\d+", kind)
    return ("", None) if wanted and int(wanted[0]) != n else (kind, None)


def _stacked(parts: list[dict[str, NDArray[np.generic]]]) -> dict[str, NDArray[np.generic]]:
    """Arrays that all pieces have, one after the other."""
    shared = [key for key in parts[0] if all(key in part for part in parts)]
    return {key: np.concatenate([part[key] for part in parts]) for key in shared}
