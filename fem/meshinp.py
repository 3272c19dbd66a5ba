"""Reader of .inp decks: the keyword format that finite element codes share.

Understood: ``*NODE``, ``*ELEMENT``, ``*NSET``, ``*ELSET`` (``GENERATE`` too),
``*SURFACE`` of elements or nodes, ``*PART``, ``*ASSEMBLY``, ``*INSTANCE`` with
translation and rotation. Everything that says nothing of the mesh (materials,
steps, loads) is passed over. What would move or make nodes in ways not
understood is refused, and so is ``*INCLUDE``: a mesh file opens no other file.

Element names by family, with the heat-transfer ones (DC2D4, DCAX3, DC3D8, ...)
among them; letters after the number of nodes (R, I, H, T, ...) do not matter.
"""

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

import numpy as np

from midradius.fem.meshdeck import OfInstance, Placed, Space, joined
from midradius.fem.meshraw import SHAPES, RawMesh, family, refuse
from midradius.thermo.arrays import Array, IntArray

_PLANE = {3: "triangle", 4: "quad", 6: "triangle6", 8: "quad8", 9: "quad9"}
_SOLID = {
    4: "tetra",
    5: "pyramid",
    6: "wedge",
    8: "hexahedron",
    10: "tetra10",
    13: "pyramid13",
    15: "wedge15",
    20: "hexahedron20",
    27: "hexahedron27",
}
_LINE = {2: "line", 3: "line3"}
_NAMES = (
    (r"(?:DCC?|C|AC|DC)3D(\d+)", _SOLID),
    (r"(?:DCC?|AC|W?R)2D(\d+)|DCC?AX(\d+)|ACAX(\d+)", _PLANE),
    (r"(?:CPS|CPE|CPEG|CAX|CGAX|CAXA|S|STRI|DS|M3D|SFM3D|R3D)(\d+)", _PLANE),
    (r"(?:DC1D|T2D|T3D|RAX)(\d+)", _LINE),
    (r"(?:SAX|DSAX|MAX)(\d+)", {1: "line", 2: "line3"}),
)
_BEAM = re.compile(r"[BF][23]([123])")
_MAKES_OR_MOVES = frozenset(["NGEN", "NFILL", "NCOPY", "NMAP", "ELGEN", "ELCOPY", "SYSTEM"])
_BY_FILE = ("NODE", "ELEMENT", "NSET", "ELSET", "SURFACE", "INSTANCE", "PART")


@dataclass
class _Block:
    """One keyword with its options and the lines below it."""

    word: str
    options: Mapping[str, str]
    lines: list[str] = field(default_factory=list)


def read_inp(text: str, name: str) -> RawMesh:
    """The mesh of a deck; ``name`` is its file, for messages.

    Raises
    ------
    InputFault
        The deck reads another file, makes nodes in ways not understood, names
        an element or a node that it does not hold, or has no cells.
    """
    reader = _Reader(name)
    for block in _blocks(text, name):
        reader.take(block)
    return reader.mesh()


def _blocks(text: str, name: str) -> Iterator[_Block]:
    block: _Block | None = None
    pending = ""
    for line in text.splitlines():
        if line.startswith("**"):
            continue
        if line.startswith("*") or pending:
            pending += line.strip()
            if pending.endswith(","):
                continue
            if block is not None:
                yield block
            block = _keyword(pending, name)
            pending = ""
        elif block is not None and line.strip():
            block.lines.append(line)
    if block is not None:
        yield block


def _keyword(line: str, name: str) -> _Block:
    head, *rest = line[1:].split(",")
    word = " ".join(head.upper().split())
    options = {}
    for item in rest:
        key, _, value = item.partition("=")
        options[key.strip().upper()] = value.strip().strip('"')
    if word == "INCLUDE" or ("INPUT" in options and word in _BY_FILE):
        raise refuse(
            name,
            f"a deck that holds its own mesh (*{word} names another file)",
            "A mesh file opens no other file here: write the mesh into one file.",
        )
    if word in _MAKES_OR_MOVES or (word == "NODE" and options.get("SYSTEM", "R").upper() != "R"):
        raise refuse(
            name,
            f"a deck with its nodes and elements written out (*{word} is not understood)",
            "Export the mesh with plain *NODE and *ELEMENT in global x, y, z.",
        )
    return _Block(word, options)


class _Reader:
    """Takes the blocks of a deck in turn; it has a life, hence a class."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.notes: list[str] = []
        self.flat = Space()
        self.parts: dict[str, Space] = {}
        self.instances: list[Placed] = []
        self.space = self.flat
        self.assembly = Space()
        self.of_instances: list[OfInstance] = []
        self.unknown: dict[str, int] = {}

    def take(self, block: _Block) -> None:
        match block.word:
            case "PART":
                self.space = self.parts.setdefault(block.options.get("NAME", "").upper(), Space())
            case "END PART" | "END ASSEMBLY":
                self.space = self.flat
            case "ASSEMBLY":
                self.space = self.assembly
            case "END INSTANCE":
                self.space = self.assembly
            case "INSTANCE":
                self._instance(block)
            case "NODE":
                self._node(block)
            case "ELEMENT":
                self._element(block)
            case "NSET" | "ELSET":
                self._set(block)
            case "SURFACE":
                self._surface(block)

    def _instance(self, block: _Block) -> None:
        part = self.parts.get(block.options.get("PART", "").upper(), Space())
        rows = [[float(x) for x in line.split(",") if x.strip()] for line in block.lines]
        if any(len(row) not in size for row, size in zip(rows, ((2, 3), (7,)), strict=False)):
            raise refuse(
                self.name,
                "a deck whose *INSTANCE gives a translation and then a rotation",
                "Write the assembly as one mesh in global coordinates.",
            )
        shift = np.zeros(3)
        turn = np.eye(3)
        if rows:
            shift[: len(rows[0])] = rows[0]
        if len(rows) > 1:
            turn, about = _turn(np.array(rows[1]))
            shift = turn @ (shift - about) + about
        if rows and (np.any(shift) or len(rows) > 1):
            self.notes.append(f"instance {block.options.get('NAME', '')} moved as the deck says")
        own = Space(
            list(part.nodes),
            list(part.elements),
            dict(part.node_sets),
            dict(part.element_sets),
            dict(part.surfaces),
        )
        self.instances.append(Placed(block.options.get("NAME", "").upper(), own, turn, shift))
        self.space = own

    def _node(self, block: _Block) -> None:
        table = _numbers(block.lines, self.name, "*NODE")
        if table is None or table.shape[1] < 3:
            raise refuse(
                self.name, "a deck whose *NODE lines hold a number and 2 or 3 coordinates", ""
            )
        points = np.zeros((len(table), 3))
        points[:, : min(table.shape[1] - 1, 3)] = table[:, 1:4]
        ids = table[:, 0].astype(np.int64)
        self.space.nodes.append((ids, points))
        if "NSET" in block.options:
            self.space.node_sets.setdefault(block.options["NSET"], []).append(ids)

    def _element(self, block: _Block) -> None:
        name = block.options.get("TYPE", "").upper()
        kind = element_type(name)
        if not kind:
            self.unknown[name] = self.unknown.get(name, 0) + len(block.lines)
            return
        n = int(re.sub(r"\D", "", kind) or SHAPES[family(kind)].n_corner)
        joined = ",".join(line.strip().rstrip(",") for line in block.lines)
        flat = _integers(joined, self.name, f"*ELEMENT, TYPE={name}")
        # numbers that repeat: lines longer or shorter than the type says, read out of step
        if len(flat) % (n + 1) or len(np.unique(flat[:: n + 1])) < len(flat) // (n + 1):
            raise refuse(
                self.name,
                f"a deck whose {name} elements have {n} nodes each",
                "An element line is cut short, has nodes too many, or a number stands twice.",
            )
        table = flat.reshape(-1, n + 1)
        nodes = table[:, [1, 3, 2]] if kind == "line3" else table[:, 1:]  # end, middle, end
        self.space.elements.append((kind, table[:, 0].copy(), nodes.copy()))
        if "ELSET" in block.options:
            self.space.element_sets.setdefault(block.options["ELSET"], []).append(table[:, 0])

    def _set(self, block: _Block) -> None:
        key = block.options.get(block.word) or block.options.get("NAME", "")
        sets = self.space.node_sets if block.word == "NSET" else self.space.element_sets
        found = sets.setdefault(key, [])
        members: list[IntArray] = []
        for line in block.lines:
            words = [word.strip().strip('"') for word in line.split(",") if word.strip()]
            if "GENERATE" in block.options and len(words) >= 2:
                first, last, *step = (int(word) for word in words)
                members.append(np.arange(first, last + 1, step[0] if step else 1, dtype=np.int64))
                continue
            numbers = [int(word) for word in words if word.lstrip("+-").isdigit()]
            if numbers:
                members.append(np.array(numbers, dtype=np.int64))
            for word in words:
                if not word.lstrip("+-").isdigit():
                    members += _by_name(sets, word)
        if "INSTANCE" in block.options:
            instance = block.options["INSTANCE"].upper()
            self.of_instances.append(OfInstance(block.word, key, instance, members))
            if not found:
                del sets[key]
        else:
            found += members

    def _surface(self, block: _Block) -> None:
        key = block.options.get("NAME", "")
        rows = []
        for line in block.lines:
            words = [word.strip().strip('"') for word in line.split(",")]
            rows.append((words[0], words[1].upper() if len(words) > 1 else ""))
        if block.options.get("TYPE", "ELEMENT").upper() == "NODE":
            rows = [(where, "NODE") for where, _ in rows]
        self.space.surfaces.setdefault(key, []).extend(rows)

    def mesh(self) -> RawMesh:
        """Everything taken, joined into one mesh."""
        spaces = [Placed("", self.flat, np.eye(3), np.zeros(3)), *self.instances]
        for name, count in self.unknown.items():
            what = name or "untyped"
            self.notes.append(f"{count} lines of {what} elements left out: no cell of the section")
        return joined(
            [placed for placed in spaces if placed.space.nodes],
            assembly=self.assembly,
            of_instances=self.of_instances,
            notes=self.notes,
            name=self.name,
        )


def element_type(name: str) -> str:
    """The cell type of an element name of a deck (``"DCAX4"``); ``""`` if unknown."""
    for pattern, sizes in _NAMES:
        found = re.match(pattern, name)
        if found:
            return sizes.get(next(int(number) for number in found.groups() if number), "")
    beam = _BEAM.match(name)
    return {"1": "line", "2": "line3", "3": "line"}[beam[1]] if beam else ""


def _by_name(sets: dict[str, list[IntArray]], word: str) -> list[IntArray]:
    for key, members in sets.items():
        if key.upper() == word.upper():
            return list(members)
    return []


def _turn(row: Array) -> tuple[Array, Array]:
    """Rotation matrix about the axis from a to b by an angle in degrees, and a."""
    about, ahead, angle = row[:3], row[3:6] - row[:3], np.deg2rad(row[6])
    x, y, z = ahead / np.linalg.norm(ahead)
    cross = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    turn = np.eye(3) + np.sin(angle) * cross + (1.0 - np.cos(angle)) * cross @ cross
    return turn, about


def _numbers(lines: list[str], name: str, what: str) -> Array | None:
    rows = [line.strip().rstrip(",") for line in lines]
    widths = {row.count(",") for row in rows}
    if not rows:
        return None
    try:
        if len(widths) == 1:
            flat = np.array(",".join(rows).split(","), dtype=np.float64)
            return flat.reshape(len(rows), -1)
        width = max(widths) + 1
        table = np.zeros((len(rows), width))
        for k, row in enumerate(rows):
            values = [float(x or 0.0) for x in row.split(",")]
            table[k, : len(values)] = values
        return table
    except ValueError as error:
        raise refuse(name, f"numbers below {what}", f"{error}.") from None


def _integers(text: str, name: str, what: str) -> IntArray:
    try:
        return np.array(text.split(","), dtype=np.int64)
    except ValueError as error:
        raise refuse(name, f"whole numbers below {what}", f"{error}.") from None
