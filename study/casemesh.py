"""``[section] form = "mesh"``: a mesh file as the section, looked over while the case is read.

The file is read here as well, so that what is wrong with it comes together with
the other faults of the case, and so that ``faces`` can name its surface zones.
"""

import re
from collections.abc import Mapping
from dataclasses import replace
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, cast

from midradius.thermo.errors import InputFault
from midradius.thermo.units import parse

from . import casekeys as keys
from .case import Form, MeshFile, MeshSense, SectionInput
from .casetable import Table, is_line, one_of

if TYPE_CHECKING:
    from midradius.fem.meshfile import MeshInput

_PLANE = re.compile(r"\s*([xyzr])\s*=\s*(\S.*?)\s*")
_COORDINATES: Mapping[str, tuple[str, ...]] = {
    "plane": ("x", "y"),
    "axisymmetric": ("r", "z"),
    "solid": ("x", "y", "z"),
}
SENSES = tuple(_COORDINATES)
_EXAMPLE = 'symmetry = ["cut face", "x = 0"]'


def mesh_input(table: Table, emissivity: float, named: tuple[str, ...]) -> SectionInput | None:
    """The section of a mesh; ``named`` are the zones that the route speaks of."""
    table.only(keys.MESH, dict.fromkeys((*keys.ALL_DIMENSIONS, "bore_medium"), _NO_SIZE))
    file = table.text("file", 1000)
    unit = table.choice("length_unit", keys.LENGTH_UNITS)
    sense = cast(MeshSense | None, table.choice("sense", SENSES))
    for name, allowed in (
        ("file", "a mesh file, its path from the case file"),
        ("length_unit", one_of(keys.LENGTH_UNITS)),
        ("sense", one_of(SENSES)),
    ):
        if not table.has(name):
            table.missing(name, allowed)
    symmetry = symmetry_of(table, sense)
    if file is None or unit is None or sense is None or symmetry is None:
        return None
    given = MeshFile(table.notes.folder / file, unit, sense, symmetry, named)
    return taken(table, given, "mesh", emissivity)


def taken(table: Table, given: MeshFile, form: Form, emissivity: float) -> SectionInput | None:
    """The section of a mesh file that is there; what is wrong with it is noted."""
    try:
        mesh = mesh_of(given)
    except InputFault as fault:
        for allowed, remedy in _faults(fault):
            table.fault("file", allowed, remedy)
        return None
    low, high = mesh.points.min(axis=0), mesh.points.max(axis=0)
    found = replace(
        given,
        zones=mesh.zones,
        low=tuple(float(x) for x in low),
        high=tuple(float(x) for x in high),
    )
    return SectionInput(form=form, emissivity=emissivity, mesh=found)


_NO_SIZE = 'form = "mesh" has its size from the file.'


def _faults(fault: InputFault) -> list[tuple[str, str]]:
    from midradius.fem.meshfile import MeshFaults

    if isinstance(fault, MeshFaults):
        return [(f"sound: {finding.what}", finding.remedy) for finding in fault.findings]
    return [(fault.allowed, fault.remedy)]


def symmetry_of(table: Table, sense: str | None) -> tuple[str, ...] | None:
    """Groups and planes that no heat passes; None where one of them is at fault."""
    found: list[str] = []
    good = True
    for key, value in table.items("symmetry", _EXAMPLE):
        if not isinstance(value, str) or not is_line(value, keys.LONGEST_NAME):
            table.notes.add(key, value, f"a group or a plane, as in {_EXAMPLE}")
            good = False
            continue
        if sense is not None:
            try:
                plane(value, sense)
            except InputFault as fault:
                table.notes.add(key, value, fault.allowed, fault.remedy)
                good = False
        found.append(value)
    return tuple(found) if good and (not table.has("symmetry") or found) else None


def plane(text: str, sense: str) -> tuple[int, float] | None:
    """Coordinate and value [m] of ``"x = 0"``; None where the text is a group's name.

    Raises
    ------
    InputFault
        A coordinate that the sense lacks, a value without its unit.
    """
    match = _PLANE.fullmatch(text)
    if match is None:
        return None
    names = _COORDINATES[sense]
    if match[1] not in names:
        listed = " or ".join(f'"{name} = 0"' for name in names)
        raise InputFault("symmetry", f'"{text}"', f'{listed} where sense = "{sense}"')
    value = 0.0 if float_zero(match[2]) else parse(match[2], "length")
    return names.index(match[1]), value


def float_zero(text: str) -> bool:
    """Whether a text is a zero, which needs no unit."""
    return re.fullmatch(r"[+-]?0+(\.0*)?", text) is not None


def mesh_of(given: MeshFile) -> "MeshInput":
    """The mesh of a case, read once while its file stays the same.

    Raises
    ------
    InputFault
        As :func:`midradius.fem.meshfile.open_mesh`.
    """
    try:
        state = given.file.stat()
        stamp = (state.st_mtime_ns, state.st_size)
    except OSError:
        stamp = (0, 0)
    mesh = _opened(given.file, stamp, given.length_unit, given.sense, given.symmetry, given.named)
    if given.outline is not None:  # a person knows the drawing, not the mesh kept of it
        mesh = replace(mesh, name=f"of {given.outline.file.name}")
    return mesh


@lru_cache(maxsize=2)
def _opened(
    file: Path,
    stamp: tuple[int, int],
    length_unit: str,
    sense: MeshSense,
    symmetry: tuple[str, ...],
    named: tuple[str, ...],
) -> "MeshInput":
    from midradius.fem.meshfile import open_mesh
    from midradius.fem.meshzones import Symmetry

    planes = {text: plane(text, sense) for text in symmetry}
    return open_mesh(
        file,
        length_unit=length_unit,
        sense=sense,
        symmetry=Symmetry(
            tuple(text for text, found in planes.items() if found is None),
            tuple(found for found in planes.values() if found is not None),
        ),
        prefer=named,
    )


def zones_named(top: Table) -> tuple[str, ...]:
    """The surface zones that the stages of a route speak of, in their order."""
    found: dict[str, None] = {}
    stages = top.raw("route")
    for stage in stages if isinstance(stages, list) else []:
        faces = stage.get("faces") if isinstance(stage, dict) else None
        if isinstance(faces, dict):
            found |= dict.fromkeys(str(name) for name in faces)
    return tuple(found)
