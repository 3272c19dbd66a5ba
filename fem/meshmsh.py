"""Reader of Gmsh's .msh files, versions 2.2 and 4.1, text and binary.

Physical groups become named groups; one without a name is ``physical N``. Node
and element data that cover a part of the mesh are nan elsewhere.

Source
------
Gmsh reference manual, "MSH file format" (remembered).
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import SHAPES, Group, RawMesh, family, refuse
from midradius.thermo.arrays import Array, IntArray

KINDS: Mapping[int, tuple[str, int]] = {
    1: ("line", 2),
    2: ("triangle", 3),
    3: ("quad", 4),
    4: ("tetra", 4),
    5: ("hexahedron", 8),
    6: ("wedge", 6),
    7: ("pyramid", 5),
    8: ("line3", 3),
    9: ("triangle6", 6),
    10: ("quad9", 9),
    11: ("tetra10", 10),
    12: ("hexahedron27", 27),
    13: ("wedge18", 18),
    14: ("pyramid14", 14),
    15: ("vertex", 1),
    16: ("quad8", 8),
    17: ("hexahedron20", 20),
    18: ("wedge15", 15),
    19: ("pyramid13", 13),
    21: ("triangle10", 10),
    26: ("line4", 4),
    29: ("tetra20", 20),
    36: ("quad16", 16),
    92: ("hexahedron64", 64),
}
_NAME = re.compile(r'\s*(\d+)\s+(\d+)\s+"(.*)"')


def read_msh(data: bytes, name: str) -> RawMesh:
    """The mesh of a .msh file's bytes; ``name`` is the file, for messages.

    Raises
    ------
    InputFault
        Another version, a damaged file, cells that name missing nodes.
    """
    try:
        return _read(data, name)
    except (ValueError, IndexError, KeyError, UnicodeDecodeError) as error:
        fault = f"It is damaged or was not written to its end ({error})."
        raise refuse(name, "a whole .msh file", fault) from None


@dataclass
class _Cursor:
    """Takes numbers from a section's bytes one lot after the other."""

    data: bytes
    text: bool
    order: str
    place: int = 0
    words: list[bytes] = field(default_factory=list)

    def __post_init__(self) -> None:
        if self.text:
            self.words = self.data.split()

    def take(self, kind: str, count: int) -> NDArray[np.generic]:
        if self.text:
            lot = self.words[self.place : self.place + count]
            self.place += count
            if len(lot) < count:
                raise ValueError("a section is cut short")
            return np.array(lot, dtype=np.float64 if kind == "f8" else np.int64)
        dtype = np.dtype(self.order + kind)
        lot_bytes = np.frombuffer(self.data, dtype, count, self.place)
        self.place += count * dtype.itemsize
        return lot_bytes.astype(dtype.newbyteorder("="))

    def ints(self, kind: str, count: int) -> list[int]:
        return [int(value) for value in self.take(kind, count).tolist()]


@dataclass
class _Content:
    """What the sections hold."""

    ids: IntArray = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    points: Array = field(default_factory=lambda: np.empty((0, 3)))
    blocks: list[tuple[str, IntArray, IntArray, list[tuple[int, int]]]] = field(
        default_factory=list
    )
    names: dict[tuple[int, int], str] = field(default_factory=dict)
    physical: dict[tuple[int, int], list[int]] = field(default_factory=dict)
    node_data: dict[str, tuple[IntArray, Array]] = field(default_factory=dict)
    cell_data: dict[str, tuple[IntArray, Array]] = field(default_factory=dict)
    notes: list[str] = field(default_factory=list)


def _read(data: bytes, name: str) -> RawMesh:
    head = _section(data, b"MeshFormat")
    if head is None:
        raise refuse(name, "a .msh file of Gmsh", "It has no $MeshFormat.")
    first, _, rest = head.partition(b"\n")
    version, mode, size = first.split()[:3]
    text = mode == b"0"
    order = "<" if text or np.frombuffer(rest, "<i4", 1)[0] == 1 else ">"
    if version not in (b"2", b"2.1", b"2.2", b"4.1"):
        raise refuse(
            name,
            "a .msh file of version 2.2 or 4.1",
            f"This is version {version.decode()}: write it again as 4.1.",
        )
    content = _Content()
    for line in (_section(data, b"PhysicalNames") or b"").decode(errors="replace").splitlines():
        if found := _NAME.match(line):
            content.names[(int(found[1]), int(found[2]))] = found[3]
    nodes, elements = _section(data, b"Nodes"), _section(data, b"Elements")
    if nodes is None or elements is None:
        raise refuse(name, "a .msh file with $Nodes and $Elements", "One of them is missing.")
    if version == b"4.1":
        wide = f"u{int(size)}"
        entities = _section(data, b"Entities")
        if entities is not None:
            _entities(_Cursor(entities, text, order), wide, content)
        _nodes41(_Cursor(nodes, text, order), wide, content)
        _elements41(_Cursor(elements, text, order), wide, content)
    else:
        _nodes22(nodes, text, order, content)
        _elements22(elements, text, order, content)
    for word, into in ((b"NodeData", content.node_data), (b"ElementData", content.cell_data)):
        _values(data, word, text, order, into)
    return _mesh(content, name)


def _section(data: bytes, word: bytes, start: int = 0) -> bytes | None:
    begin = data.find(b"$" + word, start)
    if begin < 0:
        return None
    line = data.index(b"\n", begin) + 1
    end = data.find(b"$End" + word, line)
    if end < 0:
        raise ValueError(f"${word.decode()} has no end")
    return data[line:end]


def _entities(cursor: _Cursor, wide: str, content: _Content) -> None:
    for dim, count in enumerate(cursor.ints(wide, 4)):
        for _ in range(count):
            (tag,) = cursor.ints("i4", 1)
            cursor.take("f8", 3 if dim == 0 else 6)
            (n,) = cursor.ints(wide, 1)
            content.physical[(dim, tag)] = cursor.ints("i4", n)
            if dim:
                (n,) = cursor.ints(wide, 1)
                cursor.take("i4", n)


def _nodes41(cursor: _Cursor, wide: str, content: _Content) -> None:
    n_block, *_ = cursor.ints(wide, 4)
    ids, points = [], []
    for _ in range(n_block):
        dim, _, parametric = cursor.ints("i4", 3)
        (n,) = cursor.ints(wide, 1)
        ids.append(cursor.take(wide, n).astype(np.int64))
        width = 3 + (dim if parametric else 0)
        points.append(cursor.take("f8", width * n).astype(np.float64).reshape(n, width)[:, :3])
    content.ids, content.points = np.concatenate(ids), np.concatenate(points)


def _elements41(cursor: _Cursor, wide: str, content: _Content) -> None:
    n_block, *_ = cursor.ints(wide, 4)
    for _ in range(n_block):
        dim, tag, number = cursor.ints("i4", 3)
        (n,) = cursor.ints(wide, 1)
        kind, size = KINDS[number]
        table = cursor.take(wide, n * (size + 1)).astype(np.int64).reshape(n, size + 1)
        groups = [(dim, abs(k)) for k in content.physical.get((dim, tag), [])]
        content.blocks.append((kind, table[:, 0], table[:, 1:], groups))


def _nodes22(section: bytes, text: bool, order: str, content: _Content) -> None:
    count, _, rest = section.partition(b"\n")
    n = int(count)
    if text:
        table = np.array(rest.split(), dtype=np.float64).reshape(n, 4)
        content.ids, content.points = table[:, 0].astype(np.int64), table[:, 1:].copy()
        return
    row = np.dtype([("id", f"{order}i4"), ("xyz", f"{order}f8", 3)])
    rows = np.frombuffer(rest, row, n)
    content.ids, content.points = rows["id"].astype(np.int64), rows["xyz"].astype(np.float64)


def _elements22(section: bytes, text: bool, order: str, content: _Content) -> None:
    count, _, rest = section.partition(b"\n")
    rows: dict[tuple[int, int], list[IntArray]] = {}  # by type and group, in order of appearance
    n = int(count)
    if text:
        for line in rest.splitlines()[:n]:
            number, tags, row = _row22(line)
            rows.setdefault((number, tags), []).append(row[None, :])
    else:
        place, done = 0, 0
        while done < n:
            number, many, n_tag = np.frombuffer(rest, f"{order}i4", 3, place).tolist()
            width = 1 + n_tag + KINDS[number][1]
            table = np.frombuffer(rest, f"{order}i4", many * width, place + 12)
            table = table.reshape(many, width).astype(np.int64)
            place += 12 + 4 * many * width
            done += many
            for tag in np.unique(table[:, 1]) if n_tag else [0]:
                chosen = table[table[:, 1] == tag] if n_tag else table
                kept = np.delete(chosen, np.s_[1 : 1 + n_tag], axis=1)
                rows.setdefault((number, int(tag)), []).append(kept)
    for (number, tag), tables in rows.items():
        table = np.concatenate(tables)
        kind = KINDS[number][0]
        dim = SHAPES[family(kind)].dim
        groups = [(dim, tag)] if tag else []
        content.blocks.append((kind, table[:, 0], table[:, 1:], groups))


def _row22(line: bytes) -> tuple[int, int, IntArray]:
    values = np.array(line.split(), dtype=np.int64)
    number, n_tag = int(values[1]), int(values[2])
    nodes = values[3 + n_tag :]
    if len(nodes) != KINDS[number][1]:
        raise ValueError("an element names too few nodes")
    return number, int(values[3]) if n_tag else 0, np.concatenate([values[:1], nodes])


def _values(
    data: bytes, word: bytes, text: bool, order: str, into: dict[str, tuple[IntArray, Array]]
) -> None:
    place = 0
    while (begin := data.find(b"$" + word + b"\n", place)) >= 0:
        body = _section(data, word, begin) or b""
        lines: list[bytes] = []
        counts: list[bytes] = []
        label, at = "", 0
        for _ in range(3):  # texts, reals, integers
            end = body.index(b"\n", at)
            n, at = int(body[at:end]), end + 1
            lines = []
            for _ in range(n):
                end = body.index(b"\n", at)
                lines.append(body[at:end])
                at = end + 1
            if not label and lines:
                label = lines[0].decode(errors="replace").strip().strip('"')
            counts = lines
        n_value, n_row = int(counts[1]), int(counts[2])
        if text:
            table = np.array(body[at:].split(), dtype=np.float64).reshape(n_row, 1 + n_value)
            into[label] = table[:, 0].astype(np.int64), table[:, 1:]
        else:
            row = np.dtype([("id", f"{order}i4"), ("v", f"{order}f8", n_value)])
            rows = np.frombuffer(body, row, n_row, at)
            into[label] = (
                rows["id"].astype(np.int64),
                rows["v"].astype(np.float64).reshape(n_row, n_value),
            )
        place = begin + 1


def _mesh(content: _Content, name: str) -> RawMesh:
    if not content.blocks or not len(content.ids):
        raise refuse(name, "a .msh file with nodes and elements", "It holds none.")
    known, first = np.unique(content.ids, return_index=True)
    groups: dict[str, list[IntArray]] = {}
    cells, cell_ids, n_cell = [], [], 0
    for kind, ids, nodes, of in content.blocks:
        at = np.minimum(np.searchsorted(known, nodes), len(known) - 1)
        if np.any(known[at] != nodes):
            missing = int(nodes[known[at] != nodes][0])
            raise refuse(
                name,
                f"a .msh file that holds every node it names ({missing} is missing)",
                "Export the whole mesh again.",
            )
        block = first[at].astype(np.int64)
        for key in of:
            label = content.names.get(key, f"physical {key[1]}")
            groups.setdefault(label, []).append(np.arange(n_cell, n_cell + len(block)))
        cells.append((kind, block))
        cell_ids.append(ids)
        n_cell += len(block)
    seen = {label: np.concatenate(members) for label, members in groups.items()}
    mesh_ids = np.concatenate(cell_ids)
    return RawMesh(
        points=np.ascontiguousarray(content.points),
        cells=tuple(cells),
        point_ids=content.ids,
        cell_ids=mesh_ids,
        point_data=_covering(content.node_data, content.ids, content.notes),
        cell_data=_covering(content.cell_data, mesh_ids, content.notes),
        groups={label: Group(cells=members.astype(np.int64)) for label, members in seen.items()},
        notes=tuple(content.notes),
        format="msh",
    )


def _covering(
    found: Mapping[str, tuple[IntArray, Array]], ids: IntArray, notes: list[str]
) -> dict[str, NDArray[np.generic]]:
    """Data in the order of the mesh; what covers a part of it has nan elsewhere."""
    out: dict[str, NDArray[np.generic]] = {}
    for label, (numbers, values) in found.items():
        order = np.argsort(numbers)
        at = order[np.minimum(np.searchsorted(numbers[order], ids), len(numbers) - 1)]
        hit = numbers[at] == ids
        table = np.where(hit[:, None], values[at], np.nan)
        if not hit.all():
            notes.append(f'data "{label}" covers {int(hit.sum())} of {len(ids)}')
        out[label] = table[:, 0] if table.shape[1] == 1 else table
    return out
