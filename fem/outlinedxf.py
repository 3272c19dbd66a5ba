"""Reads a DXF drawing as the curves of an outline; layers name the surface zones.

Curves are flattened to polygons with a sagitta of at most ``SAGITTA`` of the
radius, for the checks and the area; the mesher gets arcs and smooth curves as
such. The unit is the one that the drawing states in ``$INSUNITS``, or the
caller's; it is never guessed from the size.

Source
------
DXF Reference, header variable $INSUNITS and entities (remembered); the file is
parsed by ezdxf.
"""

import math
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.fem.outlineloops import (
    SAGITTA,
    Outline,
    Piece,
    PieceKind,
    outline,
    refuse,
)
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from ezdxf.document import Drawing

UNIT_CODES: Mapping[int, str] = {1: "in", 2: "ft", 4: "mm", 5: "cm", 6: "m"}
METRES: Mapping[str, float] = {"mm": 1e-3, "cm": 1e-2, "m": 1.0, "in": 0.0254, "ft": 0.3048}
CURVES = ("LINE", "ARC", "CIRCLE", "ELLIPSE", "SPLINE", "LWPOLYLINE", "POLYLINE")
SURFACE = "surface"  # zone of what lies on layer 0
KINK = 0.35  # rad
FLAT = 1e-6  # of the drawing's size: more height than this is a third dimension


@dataclass(frozen=True)
class DxfOutline:
    """An outline in the drawing's unit, that unit in metres, and what to know of it."""

    outline: Outline
    metre: float
    notes: tuple[str, ...]


def read_dxf(path: Path, *, unit: str | None = None, layers: tuple[str, ...] = ()) -> DxfOutline:
    """The outline of a drawing.

    Parameters
    ----------
    path
        The file.
    unit
        Unit of its lengths (a key of ``METRES``), for a drawing that states none.
    layers
        Layers to read; all that are shown if empty.

    Raises
    ------
    InputFault
        Not a drawing, no unit or two different ones, no such layer, or curves
        that do not bound one body.
    """
    document = _document(path)
    metre, unit_note = _unit(document, unit, path.name)
    shown, notes = _entities(document, layers, path.name)
    pieces: list[Piece] = []
    height = 0.0
    for entity in shown:
        for piece, z in _pieces(entity, path.name):
            pieces.append(piece)
            height = max(height, float(np.ptp(z)), abs(float(z[0])))
    found = outline(pieces, path.name)
    if height > FLAT * math.sqrt(found.outer.area):
        raise refuse(
            path.name, "a flat drawing", f"Its curves leave the plane z = 0 by {height:.6g}."
        )
    return DxfOutline(found, metre, (*unit_note, *notes, *found.notes))


def _document(path: Path) -> "Drawing":
    from ezdxf import recover
    from ezdxf.lldxf.const import DXFError

    try:
        if path.read_bytes()[:4_000_000].strip() == b"":
            raise refuse(path.name, "a drawing with a closed outline", "The file is empty.")
        document, _ = recover.readfile(path)
    except (DXFError, ValueError, LookupError, TypeError, AttributeError) as error:
        raise refuse(path.name, "a whole DXF file", f"It could not be read: {error}.") from error
    except OSError as error:
        reason = "There is no such file." if not path.exists() else f"{error.strerror or error}."
        raise refuse(path.name, "a DXF file that can be read", reason) from error
    return document


def _unit(document: "Drawing", given: str | None, name: str) -> tuple[float, tuple[str, ...]]:
    """Metres per drawing unit."""
    # a drawing older than 2000 has no such variable, and the library then invents one
    code = int(document.header.get("$INSUNITS", 0)) if document.dxfversion > "AC1009" else 0
    stated = UNIT_CODES.get(code)
    choices = ", ".join(f'"{unit}"' for unit in METRES)
    if given is not None and given not in METRES:
        raise InputFault("length_unit", f'"{given}"', f"one of {choices}")
    if code and stated is None:
        if given is None:
            raise InputFault(
                "length_unit",
                "not given",
                f"one of {choices}",
                f'"{name}" states $INSUNITS = {code}, which is none of them.',
            )
        return METRES[given], (f"the drawing states $INSUNITS = {code}; {given} was given",)
    if stated is None and given is None:
        raise InputFault(
            "length_unit",
            "not given",
            f"one of {choices}",
            f'"{name}" does not state its unit, and it is not guessed.',
        )
    if stated is not None and given is not None and stated != given:
        raise InputFault(
            "length_unit",
            f'"{given}"',
            f'"{stated}", which "{name}" states',
            "Leave the unit out, or mend $INSUNITS in the drawing.",
        )
    unit = stated or given or ""
    return METRES[unit], ()


def _entities(
    document: "Drawing", layers: tuple[str, ...], name: str
) -> tuple[list[Any], tuple[str, ...]]:
    """The curves to read, blocks taken apart, and what was passed over."""
    space = document.modelspace()
    known = {str(layer.dxf.name) for layer in document.layers}
    known |= {str(entity.dxf.layer) for entity in space}
    folded = {layer.casefold() for layer in layers}
    missing = [x for x in layers if x.casefold() not in {layer.casefold() for layer in known}]
    if missing:
        raise InputFault(
            "layers", f'"{missing[0]}"', f"layers of the drawing: {', '.join(sorted(known))}"
        )
    hidden = {
        layer.dxf.name.casefold()
        for layer in document.layers
        if layer.is_off() or layer.is_frozen()
    }
    passed: Counter[str] = Counter()
    curves = []
    for entity in _apart(space, depth=0):
        layer = str(entity.dxf.layer).casefold()
        if folded and layer not in folded:
            continue
        if not folded and layer in hidden:
            passed["curves on layers that are off"] += 1
        elif entity.dxftype() in CURVES:
            curves.append(entity)
        else:
            passed[entity.dxftype()] += 1
    said = ", ".join(f"{count} {what}" for what, count in sorted(passed.items()))
    if not curves:
        extra = f" It holds only {said}." if said else ""
        raise refuse(name, f"a drawing with some of {', '.join(CURVES)}", f"There is none.{extra}")
    return curves, (f"passed over: {said}",) if said else ()


def _apart(space: Any, depth: int) -> Iterator[Any]:
    for entity in space:
        kind = entity.dxftype()
        if kind == "INSERT" and depth < 8:
            yield from _apart(entity.virtual_entities(), depth + 1)
        elif kind in ("LWPOLYLINE", "POLYLINE") and not getattr(entity, "is_poly_face_mesh", 0):
            yield from entity.virtual_entities()
        else:
            yield entity


def _pieces(entity: Any, name: str) -> Iterator[tuple[Piece, Array]]:
    """The pieces of one curve, with the heights of their points."""
    kind = entity.dxftype()
    zone = str(entity.dxf.layer)
    zone = SURFACE if zone == "0" else zone
    if kind == "LINE":
        ends = _plain([entity.dxf.start, entity.dxf.end])
        if np.linalg.norm(ends[1] - ends[0]) > 0.0:
            yield Piece("line", ends[:, :2], zone), ends[:, 2]
        return
    if kind in ("ARC", "CIRCLE"):
        radius = abs(float(entity.dxf.radius))
        if radius <= 0.0:
            return
        # in halves, since a closed curve has no ends to join and an arc needs a middle
        points = _plain(entity.flattening(0.5 * SAGITTA * radius))
        if kind == "CIRCLE" and np.linalg.norm(points[0] - points[-1]) > 1e-9 * radius:
            points = np.concatenate([points, points[:1]])
        for part in _halves(points) if kind == "CIRCLE" else (points,):
            if len(part) == 2:
                yield Piece("line", part[:, :2], zone), part[:, 2]
                continue
            middle = part[len(part) // 2, :2]
            yield Piece("arc", part[:, :2], zone, (float(middle[0]), float(middle[1]))), part[:, 2]
        return
    rough = _plain(entity.flattening(np.inf, segments=8))
    size = float(np.linalg.norm(np.ptp(rough, axis=0)))
    if not np.isfinite(size):
        raise refuse(name, "a drawing with finite coordinates", "")
    if size <= 0.0:
        return
    points = _plain(entity.flattening(0.5 * SAGITTA * size, segments=8))
    closed = np.linalg.norm(points[0] - points[-1]) <= 1e-9 * size
    for half in _halves(points) if closed else (points,):
        for part in _smooth(half):
            shape: PieceKind = "line" if len(part) == 2 else "curve"
            yield Piece(shape, part[:, :2], zone), part[:, 2]


def _smooth(points: Array) -> list[Array]:
    """Split a polygon where it turns by more than ``KINK``: no smooth curve fits there."""
    along = np.diff(points[:, :2], axis=0)
    course = np.unwrap(np.arctan2(along[:, 1], along[:, 0]))
    kinks = 1 + np.flatnonzero(np.abs(np.diff(course)) > KINK)
    ends = [0, *kinks.tolist(), len(points) - 1]
    return [points[a : b + 1] for a, b in zip(ends[:-1], ends[1:], strict=True)]


def _plain(points: Any) -> Array:
    return np.array([(p[0], p[1], p[2]) for p in points], dtype=np.float64)


def _halves(points: Array) -> tuple[Array, Array]:
    middle = len(points) // 2
    return points[: middle + 1], points[middle:]
