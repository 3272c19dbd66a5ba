"""Reader of bulk data decks (.bdf, .nas): grid points and elements, nothing else.

Small field (8 columns), large field (16, marked by ``*``) and free field
(commas), continued lines, reals such as ``1.5-3``. A deck may lack the line
``BEGIN BULK``. Coordinate systems other than the basic one are refused, and so
is ``INCLUDE``. Elements of one property form the group ``property N``.
"""

import re
from collections.abc import Iterator, Mapping

import numpy as np

from midradius.fem.meshraw import Group, RawMesh, refuse
from midradius.thermo.arrays import IntArray

_SHORT_EXPONENT = re.compile(r"(?<=[0-9.])([+-][0-9]+)$")
# Cells by card and number of nodes; the order of the columns where it is not ours.
_CARDS: Mapping[str, Mapping[int, str]] = {
    **dict.fromkeys(("CTRIA3", "CTRIAR", "CTRAX3"), {3: "triangle"}),
    **dict.fromkeys(("CQUAD4", "CQUADR", "CQUADX4"), {4: "quad"}),
    **dict.fromkeys(("CTRIA6", "CTRIAX6", "CTRAX6"), {6: "triangle6"}),
    **dict.fromkeys(("CQUAD8", "CQUADX8"), {8: "quad8"}),
    **dict.fromkeys(("CQUAD", "CQUADX", "CQUAD9"), {4: "quad", 8: "quad8", 9: "quad9"}),
    "CTETRA": {4: "tetra", 10: "tetra10"},
    "CPENTA": {6: "wedge", 15: "wedge15"},
    "CHEXA": {8: "hexahedron", 20: "hexahedron20"},
    "CPYRAM": {5: "pyramid", 13: "pyramid13"},
    **dict.fromkeys(("CBAR", "CBEAM", "CROD"), {2: "line"}),
}
_ALTERNATING = [0, 2, 4, 1, 3, 5]  # CTRIAX6 goes round: corner, middle, corner, ...


def read_bulk(text: str, name: str) -> RawMesh:
    """The mesh of a deck; ``name`` is its file, for messages.

    Raises
    ------
    InputFault
        The deck reads another file, uses a local coordinate system, names a
        grid point that it does not hold, or has no cells.
    """
    ids: list[int] = []
    points: list[tuple[float, ...]] = []
    cells: dict[str, list[tuple[int, int, list[int]]]] = {}
    left_out: dict[str, int] = {}
    for card in _cards(text, name):
        word = card[0].upper().rstrip("_")  # as some writers mark ten nodes
        if word == "GRID":
            if _field(card, 2) not in ("", "0"):
                raise refuse(
                    name,
                    f"a deck in the basic coordinate system (grid {card[1]} is in {card[2]})",
                    "Export the grid points in global x, y, z.",
                )
            ids.append(_whole(card, 1, name))
            points.append(tuple(_real(card, k, name) for k in (3, 4, 5)))
        elif word in _CARDS:
            kind, row = _cell(word, card, name)
            cells.setdefault(kind, []).append(row)
        elif word.startswith("C") and len(card) > 4 and not word.startswith("CORD"):
            left_out[word] = left_out.get(word, 0) + 1
    notes = [f"{count} {word} cards left out" for word, count in left_out.items()]
    if not cells or not ids:
        raise refuse(name, "a deck with GRID points and elements", "; ".join(notes))
    return _mesh(np.array(ids), np.array(points), cells, tuple(notes), name)


def _cell(word: str, card: list[str], name: str) -> tuple[str, tuple[int, int, list[int]]]:
    sizes = _CARDS[word]
    nodes = []
    for k in range(3, min(len(card), 3 + max(sizes))):
        if not card[k] or "." in card[k]:
            break
        nodes.append(_whole(card, k, name))
    size = max((n for n in sizes if n <= len(nodes)), default=0)
    if not size:
        raise refuse(name, f"a deck whose {word} cards name {max(sizes)} grid points", "")
    nodes = nodes[:size]
    if word == "CTRIAX6":
        nodes = [nodes[k] for k in _ALTERNATING]
    element = _whole(card, 1, name)
    prop = _whole(card, 2, name) if _field(card, 2) else element
    return sizes[size], (element, prop, nodes)


def _mesh(
    ids: IntArray,
    points: np.ndarray[tuple[int, ...], np.dtype[np.float64]],
    cells: Mapping[str, list[tuple[int, int, list[int]]]],
    notes: tuple[str, ...],
    name: str,
) -> RawMesh:
    order = np.argsort(ids)
    blocks, cell_ids, properties = [], [], []
    for kind, rows in cells.items():
        wanted = np.array([nodes for _, _, nodes in rows], dtype=np.int64)
        at = np.minimum(np.searchsorted(ids[order], wanted), len(ids) - 1)
        index = order[at]
        if np.any(ids[index] != wanted):
            missing = int(wanted[ids[index] != wanted][0])
            raise refuse(
                name,
                f"a deck that holds every grid point it names ({missing} is missing)",
                "Export the whole mesh again.",
            )
        blocks.append((kind, index.astype(np.int64)))
        cell_ids += [element for element, _, _ in rows]
        properties += [prop for _, prop, _ in rows]
    of = np.array(properties, dtype=np.int64)
    groups = {f"property {k}": Group(cells=np.flatnonzero(of == k)) for k in np.unique(of)}
    return RawMesh(
        points=points,
        cells=tuple(blocks),
        point_ids=ids.astype(np.int64),
        cell_ids=np.array(cell_ids, dtype=np.int64),
        point_data={},
        cell_data={"property": of},
        groups=groups,
        notes=notes,
        format="bulk data",
    )


def _cards(text: str, name: str) -> Iterator[list[str]]:
    """Cards as lists of fields, the continuation lines joined."""
    lines = text.splitlines()
    begin = [k for k, line in enumerate(lines) if line.upper().lstrip().startswith("BEGIN")]
    card: list[str] = []
    for line in lines[begin[0] + 1 if begin else 0 :]:
        plain = line.split("$", 1)[0].rstrip()
        if not plain.strip():
            continue
        upper = plain.lstrip().upper()
        if upper.startswith("INCLUDE"):
            raise refuse(
                name,
                "a deck that holds its own mesh (INCLUDE names another file)",
                "A mesh file opens no other file here: write the mesh into one file.",
            )
        if upper.startswith("ENDDATA"):
            break
        first, fields = _fields(plain)
        if first in ("", "+", "*") or first[0] in "+*":
            card += fields
            continue
        if card:
            yield card
        # a card that goes on has its ninth field filled up
        card = [first, *fields]
    if card:
        yield card


def _fields(line: str) -> tuple[str, list[str]]:
    """The first field, and the data fields of a line (8 of them, or 4 wide ones)."""
    if "," in line:
        first, *rest = (part.strip() for part in line.split(","))
        n = 4 if first.endswith("*") else 8
        return first.rstrip("*") if first != "*" else first, (rest + [""] * n)[:n]
    line = line.expandtabs(8)
    first = line[:8].strip()
    wide = first.endswith("*") or first.startswith("*")
    width, n = (16, 4) if wide else (8, 8)
    body = line[8 : 8 + width * n].ljust(width * n)
    fields = [body[k * width : (k + 1) * width].strip() for k in range(n)]
    return first.rstrip("*") if len(first) > 1 else first, fields


def _field(card: list[str], k: int) -> str:
    return card[k] if k < len(card) else ""


def _whole(card: list[str], k: int, name: str) -> int:
    try:
        return int(_field(card, k))
    except ValueError:
        raise refuse(
            name, f'whole numbers in {card[0]} ("{_field(card, k)}" is none)', ""
        ) from None


def _real(card: list[str], k: int, name: str) -> float:
    text = _field(card, k).upper().replace("D", "E")
    if not text:
        return 0.0
    if "E" not in text:
        text = _SHORT_EXPONENT.sub(r"E\1", text)
    try:
        return float(text)
    except ValueError:
        raise refuse(name, f'numbers in {card[0]} ("{_field(card, k)}" is none)', "") from None
