"""The blocks of a case file that stand alone: steel, section, grid."""

import math
import re
from dataclasses import replace
from pathlib import Path
from typing import Any, cast

from midradius.thermo.certificate import Certificate, CertificateFaults, read_certificates
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.steel import ELEMENTS, HARD_BOUNDS, Composition, Steel, check
from midradius.thermo.units import show

from . import casekeys as keys
from .calibrationfile import read_calibration, refuse_other_rates, refuse_other_steel
from .case import Form, Grid, SectionInput, SteelInput
from .casemedium import medium_use
from .casemesh import mesh_input, zones_named
from .caseoutline import outline_input
from .caserates import with_rates
from .casetable import Table, one_of
from .steelfile import FileSteel, notes_of, pick

_GRAIN = re.compile(r"ASTM\s*(-?[0-9]{1,2}(?:\.[0-9]{1,3})?)", re.IGNORECASE)
_OF_FILES = tuple(dict.fromkeys((*keys.MESH, *keys.OUTLINE)))
_STRANGE = "No model here knows this element: leave it out."


def steel_input(table: Table) -> SteelInput | None:
    """``[steel]``: a grade of the table, a composition, or a steel of a file; calibrated."""
    table.only(keys.STEEL)
    steel = with_rates(table, _steel(table))
    return _calibrated(table, steel) if table.has("calibration") else steel


def _calibrated(table: Table, steel: SteelInput | None) -> SteelInput | None:
    """The steel with the shifts of ``calibration``; one of another steel is a fault."""
    file = table.text("calibration", 1000)
    if file is None:
        return steel
    try:
        found = read_calibration(table.notes.folder / file)
        if steel is None:
            return None
        refuse_other_steel(found, steel.steel)
        refuse_other_rates(found, steel.kinetics.name)
    except InputFault as fault:
        if fault.quantity in ("file", "calibration"):
            table.fault("calibration", fault.allowed, fault.remedy)
        else:
            sentence = f"{file}: {fault.quantity} = {fault.value}, but must be {fault.allowed}"
            table.refuse("calibration", sentence, fault.remedy)
        return None
    return replace(steel, shifts=found.shifts, calibration=found)


def _steel(table: Table) -> SteelInput | None:
    grain = _grain(table)
    example = 'grade = "42CrMo4" or composition = { C = 0.42, Mn = 0.75 }'
    given = [key for key in keys.STEEL_FROM if table.has(key)]
    if len(given) > 1:
        for key in given[1:]:
            allowed = f"left out where a {given[0]} is given"
            table.fault(key, allowed, "Keep one of the two.")
        return None
    for key in ("heat", "name"):
        if table.has(key) and given != ["file"]:
            table.fault(key, "left out where no file is given", 'Write file = "works.toml" beside.')
    if given == ["file"]:
        return _steel_of_file(table, grain)
    if table.has("composition"):
        steel = _own_steel(table)
    else:
        steel = _shipped_steel(table)
        if not table.has("grade"):
            table.missing("grade", "given, unless there is a composition", f"Write {example}.")
    return SteelInput(steel, grain) if steel else None


def _shipped_steel(table: Table) -> Steel | None:
    name = table.text("grade", keys.LONGEST_NAME)
    if name is None:
        return None
    try:
        return grade(name)
    except InputFault as fault:
        table.fault("grade", fault.allowed, fault.remedy)
        return None


def _steel_of_file(table: Table, grain: float | None) -> SteelInput | None:
    """The certificate that ``file`` with ``heat`` or ``name`` means."""
    if table.has("heat") and table.has("name"):
        table.fault("name", "left out where a heat is given", "Keep one of the two.")
        return None
    key = "heat" if table.has("heat") else "name"
    file = table.text("file", 1000)
    wanted = table.text(key, keys.LONGEST_NAME)
    if file is None or (table.has(key) and wanted is None):
        return None
    path = table.notes.folder / file
    certificates = _certificates(table, path)
    if certificates is None:
        return None
    try:
        found = pick(certificates, key=key, wanted=wanted or "")
    except InputFault as fault:
        if table.has(key):
            table.fault(key, fault.allowed, fault.remedy)
        else:
            table.missing(key, fault.allowed, fault.remedy)
        return None
    return SteelInput(found.steel, grain, FileSteel(path, found.name), notes_of(found))


def _certificates(table: Table, path: Path) -> tuple[Certificate, ...] | None:
    remedy = "There is no such file; the path counts from the case file."
    try:
        if path.is_file():
            return read_certificates(path)
        if path.exists():
            remedy = "This is a folder." if path.is_dir() else "This is a device or a pipe."
    except InputFault as fault:
        faults = fault.faults if isinstance(fault, CertificateFaults) else (fault,)
        for item in faults:
            place = item.quantity.removeprefix("steels ")
            sentence = f"{place} = {item.value}, but must be {item.allowed}"
            table.refuse("file", sentence, item.remedy)
        return None
    except (OSError, ValueError) as error:
        remedy = f"{error}."
    table.fault("file", "a TOML or CSV file of certificates", remedy)
    return None


def _own_steel(table: Table) -> Steel | None:
    inner = table.table("composition", "{ C = 0.42, Mn = 0.75 } in mass percent")
    if inner is None:
        return None
    meant = {name.casefold(): f'Write "{name}".' for name in ELEMENTS}
    meant |= {"fe": "Iron is the rest: leave it out."}
    inner.only(ELEMENTS, {name: meant.get(name.casefold(), _STRANGE) for name in inner.names()})
    amounts = {name: inner.number(name, "in mass percent") for name in ELEMENTS}
    if not inner.has("C"):
        low, high = HARD_BOUNDS["C"]
        inner.missing("C", f"{low:g} to {high:g} % by mass", "Carbon decides everything else.")
    known = {name: amount for name, amount in amounts.items() if amount is not None}
    composition = Composition(**{"C": HARD_BOUNDS["C"][0], **known})
    for fault in check(composition):
        element = fault.quantity.removeprefix("composition.")
        if element not in ELEMENTS:
            said = fault.quantity[0].upper() + fault.quantity[1:]
            remedy = f"{said} is {fault.value}. {fault.remedy}"
            table.fault("composition", fault.allowed, remedy)
        elif element in known:
            inner.fault(element, fault.allowed, fault.remedy)
    if table.notes.has(inner.place):
        return None
    return Steel(keys.OWN_COMPOSITION, composition, "the case file", "given")


def _grain(table: Table) -> float | None:
    value = table.raw("austenite_grain")
    if value is None:
        return None
    low, high = keys.GRAIN_RANGE
    found = _GRAIN.fullmatch(value.strip()) if isinstance(value, str) else None
    if found and low <= float(found[1]) <= high:
        return float(found[1])
    remedy = "" if found else "Leave it out to take the grain from the soak."
    table.fault("austenite_grain", f'"ASTM {low:g}" to "ASTM {high:g}"', remedy)
    return None


def section_input(table: Table, top: Table) -> SectionInput | None:
    """``[section]``: a form and its dimensions, without those at fault.

    ``top`` is the whole case: a mesh takes the zones that the route speaks of, an
    outline the films as well.
    """
    forms = keys.FORMS
    if table.raw("form") == "mesh":
        return mesh_input(table, _emissivity(table), zones_named(top))
    if table.raw("form") == "outline":
        return outline_input(table, _emissivity(table), top)
    form = cast(Form | None, table.choice("form", forms))
    if form is None:
        if not table.has("form"):
            table.missing("form", one_of(forms))
        table.only((*_OF_FILES, *keys.ALL_DIMENSIONS, "bore_medium"))
        for name in keys.ALL_DIMENSIONS:
            table.quantity(name, "length", keys.DIMENSION_RANGE)
        return None
    known = ("form", *keys.DIMENSIONS[form], *keys.OPTIONAL[form], "emissivity")
    strange = f'form = "{form}" has no such key; it takes {", ".join(known[1:])}.'
    table.only(known, dict.fromkeys((*keys.ALL_DIMENSIONS, *_OF_FILES, "bore_medium"), strange))
    size: dict[str, Any] = {
        name: table.quantity(name, "length", keys.DIMENSION_RANGE)
        for name in known[1:]
        if name not in ("bore_medium", "emissivity")
    }
    low, high = (show(end, "length") for end in keys.DIMENSION_RANGE)
    for name in keys.DIMENSIONS[form]:
        if not table.has(name):
            table.missing(name, f'{low} to {high} for form = "{form}"')
    outside, bore = size.get("outside"), size.get("bore")
    if outside and bore and outside - bore < 2.0 * keys.WALL_MIN:
        most = outside - 2.0 * keys.WALL_MIN
        allowed = f'at most {most * 1e3:.6g} mm for outside = "{table.raw("outside")}"'
        remedy = "Give the two diameters, not the wall; it must be at least 0.5 mm thick."
        table.fault("bore", allowed, remedy)
    medium = None
    if table.has("bore_medium") and "bore_medium" in known:
        medium = medium_use(table, "bore_medium")
    if table.has("length") and size.get("length") is None:
        return None  # whether the ends cool is not known
    emissivity = _emissivity(table)
    return SectionInput(form=form, bore_medium=medium, emissivity=emissivity, **size)


def _emissivity(table: Table) -> float:
    """Emissivity of the surface; scaled steel where it is left out."""
    low, high = keys.EMISSIVITY_RANGE
    value = table.number("emissivity", f"{low:g} to {high:g}")
    if value is not None and not low <= value <= high:
        table.fault(
            "emissivity",
            f"{low:g} to {high:g}",
            "Scaled steel has 0.8, bright steel 0.35 to 0.5; it acts in air and gas only.",
        )
        value = None
    return SectionInput("slab").emissivity if value is None else value


def grid(table: Table | None, section: SectionInput | None) -> Grid:
    """``[grid]``: cells along each axis and the asked accuracy."""
    if table is None:
        return Grid()
    table.only(keys.GRID)
    accuracy = table.quantity("accuracy", "temperature difference", keys.ACCURACY_RANGE)
    if section is not None and section.mesh is not None and table.has("cells"):
        remedy = "A mesh has its own cells."
        if section.form == "outline":
            remedy = "Its cells follow section.finest, or else the films."
        table.fault("cells", f'left out where form = "{section.form}"', remedy)
        return Grid()
    low, high = keys.CELLS_RANGE
    value = table.raw("cells")
    given = value if isinstance(value, list) else [] if value is None else [value]
    counts = tuple(count for count in given if type(count) is int and low <= count <= high)
    right = len(counts) == len(given)
    n_dim = section.n_dim if section else len(given)
    if not right or (value is not None and len(given) not in ((n_dim,) if n_dim else (1, 2))):
        many = "two whole numbers" if n_dim == 2 else "a whole number"
        table.fault(
            "cells", f"{many}, {low} to {high}, such as {'[60, 60]' if n_dim == 2 else 200}"
        )
    elif math.prod(counts) > keys.CELLS_MOST:
        table.fault("cells", f"at most {keys.CELLS_MOST} cells in all")
    else:
        return Grid(counts, accuracy if accuracy is not None else Grid().accuracy)
    return Grid()
