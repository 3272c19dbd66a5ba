"""``[section] form = "outline"``: a drawing or a solid of CAD as the section.

It is meshed while the case is read, once for the same outline and cells, and taken
from there as a mesh file is. The surface cells follow the strongest film that the
route names, unless ``finest`` states them.
"""

from dataclasses import replace
from typing import TYPE_CHECKING, cast

import numpy as np

from midradius.thermo.errors import InputFault
from midradius.thermo.units import show

from . import casekeys as keys
from .case import Grid, MediumUse, MeshFile, MeshSense, OutlineFile, SectionInput
from .casefaults import Notebook
from .casemedium import effective_bath, medium_in, medium_use
from .casemesh import SENSES, symmetry_of, taken, zones_named
from .casetable import Table, is_line, one_of, quantity

if TYPE_CHECKING:
    from midradius.fem.outline import Meshed, Slice

USUAL_FILM = 1000.0  # W/(m2 K), where the route names none that cools; for the cells alone
GAS_LENGTH = 0.1  # m, of the part as a gas sees it, before the outline is known
_NO_SIZE = 'form = "outline" has its size from the file.'
_SLICE = '{ point = ["0 mm", "0 mm", "0 mm"], normal = [0, 1, 0], axis = [0, 0, 1] }'
_Triple = tuple[float, float, float]


def outline_input(table: Table, emissivity: float, top: Table) -> SectionInput | None:
    """The section of an outline; ``top`` is the case, whose route says how strongly it cools."""
    table.only(keys.OUTLINE, dict.fromkeys((*keys.ALL_DIMENSIONS, "bore_medium"), _NO_SIZE))
    file = table.text("file", 1000)
    sense = cast(MeshSense | None, table.choice("sense", SENSES))
    for name, allowed in (
        ("file", "a .dxf, .step or .stp file, its path from the case file"),
        ("sense", one_of(SENSES)),
    ):
        if not table.has(name):
            table.missing(name, allowed)
    symmetry = symmetry_of(table, sense)
    given = OutlineFile(
        table.notes.folder / (file or ""),
        table.choice("length_unit", keys.LENGTH_UNITS),
        _layers(table),
        _slice(table, sense),
        table.quantity("finest", "length", keys.FINEST_RANGE),
    )
    if file is not None:
        _fits(table, given, sense)
    if any(table.notes.has(table.key(name)) for name in keys.OUTLINE):
        return None
    if file is None or sense is None or symmetry is None:
        return None
    first, why = _surface_cells(given.finest, emissivity, top)
    made = _made(table, given, sense, symmetry, first)
    if made is None:
        return None
    given = replace(given, statements=_statements(given, made, why))
    mesh = MeshFile(made.path, "mm", sense, symmetry, zones_named(top), given)
    return taken(table, mesh, "outline", emissivity)


def _layers(table: Table) -> tuple[str, ...]:
    example = 'layers = ["outside", "bore"]'
    found = []
    items = table.items("layers", example)
    for key, value in items[: keys.LAYERS_MOST]:
        if isinstance(value, str) and is_line(value, keys.LONGEST_NAME):
            found.append(value)
        else:
            table.notes.add(key, value, f"the name of a layer, as in {example}")
    if table.raw("layers") == [] or len(items) > keys.LAYERS_MOST:
        table.fault("layers", f"1 to {keys.LAYERS_MOST} layers, or left out for all")
    return tuple(found)


def _slice(table: Table, sense: MeshSense | None) -> "Slice | None":
    from midradius.fem.outline import Slice, axes_of

    inner = table.table("slice", _SLICE)
    if inner is None:
        return None
    inner.only(keys.SLICE)
    for name in ("point", "normal"):
        if not inner.has(name):
            inner.missing(name, f"given, as in slice = {_SLICE}")
    point, normal, axis = _point(inner), _direction(inner, "normal"), _direction(inner, "axis")
    if point is None or normal is None or inner.notes.has(inner.place):
        return None
    cut = Slice(point, normal, axis)
    if sense is not None and sense != "solid":
        try:
            axes_of(cut, sense)
        except InputFault as fault:
            name = fault.quantity.removeprefix("slice.")
            note = inner.fault if inner.has(name) else inner.missing
            note(name, fault.allowed, fault.remedy)
    return cut


def _point(table: Table) -> _Triple | None:
    items = table.items("point", '["0 mm", "0 mm", "100 mm"]')
    found = [quantity(table.notes, key, value, "length", keys.PLANE_RANGE) for key, value in items]
    known = [value for value in found if value is not None]
    if len(items) == len(known) == 3:
        return known[0], known[1], known[2]
    if table.has("point") and not table.notes.has(table.key("point")):
        table.fault("point", 'three lengths, such as ["0 mm", "0 mm", "100 mm"]')
    return None


def _direction(table: Table, name: str) -> _Triple | None:
    value = table.raw(name)
    if value is None:
        return None
    right = (
        isinstance(value, list) and len(value) == 3 and all(type(v) in (int, float) for v in value)
    )
    if isinstance(value, list) and right and all(abs(v) <= 1e9 for v in value) and any(value):
        return float(value[0]), float(value[1]), float(value[2])
    table.fault(name, "three numbers that are not all zero, such as [0, 0, 1]")
    return None


def _fits(table: Table, given: OutlineFile, sense: MeshSense | None) -> None:
    """Note where the file is not there, where it cannot be meshed, or what is not for its kind."""
    from midradius.fem.outline import DXF, STEP, MissingExtra, check_source

    kind = given.file.suffix.lower()
    try:
        check_source(given.file)
    except MissingExtra as error:
        table.refuse("file", str(error).rstrip("."))
    except InputFault as fault:
        table.fault("file", fault.allowed, fault.remedy)
    if kind in DXF and sense == "solid":
        table.fault("sense", '"plane" or "axisymmetric" for a drawing', "A solid comes as STEP.")
    strange = {
        "slice": kind in DXF or sense == "solid",
        "length_unit": kind in STEP,
        "layers": kind in STEP,
    }
    why = {
        "slice": 'left out for a drawing, which is flat, and where sense = "solid"',
        "length_unit": "left out for a STEP file, which states its unit itself",
        "layers": "left out for a STEP file, which has none",
    }
    for name, is_strange in strange.items():
        if is_strange and table.has(name):
            table.fault(name, why[name])


def _made(
    table: Table,
    given: OutlineFile,
    sense: MeshSense,
    symmetry: tuple[str, ...],
    first: float,
) -> "Meshed | None":
    from midradius.fem.outline import UNCOOLED, MissingExtra
    from midradius.fem.outlinecache import meshed_once

    try:
        return meshed_once(
            given.file,
            sense=sense,
            first=first,
            length_unit=given.length_unit,
            layers=given.layers,
            cut=given.cut,
            uncooled=tuple(dict.fromkeys((*UNCOOLED, *symmetry))),
        )
    except MissingExtra as error:
        table.refuse("file", str(error).rstrip("."))
    except InputFault as fault:
        name = fault.quantity
        if name in keys.OUTLINE and table.has(name):
            table.fault(name, fault.allowed, fault.remedy)
        elif name == "outline file":
            table.fault("file", fault.allowed, fault.remedy)
        else:
            said = f"{name} = {fault.value}, but must be {fault.allowed}"
            table.refuse("file", said, fault.remedy)
    return None


def _surface_cells(finest: float | None, emissivity: float, top: Table) -> tuple[float, str]:
    """Size of the surface cells [m], and what it was chosen for."""
    from midradius.fem.outline import first_cell

    if finest is not None:
        return finest, f"at most {show(finest, 'length')} are asked for"
    aside = Notebook("", top.notes.folder, dict)
    asked = top.raw("grid")
    accuracy = Grid().accuracy
    if isinstance(asked, dict):
        read = Table(asked, (), aside).quantity(
            "accuracy", "temperature difference", keys.ACCURACY_RANGE
        )
        accuracy = accuracy if read is None else read
    film, name = _strongest(top, emissivity, aside)
    first = first_cell(film, accuracy)
    why = f"at most {1e3 * first:.3g} mm are asked for by {film:.4g} W/(m2 K), {name}"
    return first, f"{why}, and {accuracy:.3g} K"


def _strongest(top: Table, emissivity: float, aside: Notebook) -> tuple[float, str]:
    """The strongest film [W/(m2 K)] of the cooling stages and its name.

    The reader of the route tells what is wrong there: a film that cannot be read is passed over.
    """
    found = [(USUAL_FILM, "taken, since the route names no film that cools")]
    stages = top.raw("route")
    uses: list[MediumUse | None] = []
    for stage in stages if isinstance(stages, list) else []:
        if not isinstance(stage, dict) or stage.get("stage") not in keys.COOLS:
            continue
        uses.append(medium_in(Table(stage, (), aside)))
        faces = stage.get("faces")
        if isinstance(faces, dict):
            uses += [medium_use(Table(faces, (), aside), name) for name in faces]
    films = [film for use in uses if use is not None and (film := _film(use, emissivity))]
    return max(films or found)


def _film(use: MediumUse, emissivity: float) -> tuple[float, str] | None:
    """The largest coefficient of one medium, its name; None where no heat flows."""
    from midradius.fem.media import medium
    from midradius.fem.surface import film, film_from_csv

    try:
        if use.film_file is not None:
            curve = film_from_csv(use.film_file)
            name = use.film_file.name
        else:
            known = medium(use.name or "")
            bath = effective_bath(use)
            bath = known.bath_default if bath is None else bath
            if bath is None:
                return None
            curve, _ = film(
                known,
                bath=bath,
                length=GAS_LENGTH,
                geometry="horizontal cylinder",
                emissivity=emissivity,
            )
            name = known.name
    except InputFault:
        return None
    most = float(np.max(curve.htc))
    return (most, name) if 1.0 <= most <= 1e6 else None


def _statements(given: OutlineFile, made: "Meshed", why: str) -> tuple[str, ...]:
    """What a reader of the result must know of the outline and its mesh."""
    solid = made.sense == "solid"
    what, unit, scale = ("volume", "cm3", 1e6) if solid else ("area", "cm2", 1e4)
    return (
        f"Outline: {given.file.name} was meshed with {made.n_node} nodes and {made.n_cell} cells,"
        f" {1e3 * made.first:.3g} mm at the cooled surface; {why}.",
        f"Outline: {what} of the cells {made.content * scale:.7g} {unit}, CAD states"
        f" {made.cad_content * scale:.7g} {unit} ({-100.0 * made.missing_share:+.3f} %).",
        *(f"Outline: {note}." for note in made.notes),
    )
