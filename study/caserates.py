"""The rates of a case's steel: a published set by name, and measured curves of the heat."""

from dataclasses import replace

from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import DEFAULT, Kinetics, named

from .case import SteelInput
from .casefaults import CaseFaults
from .casetable import Table


def with_rates(table: Table, steel: SteelInput | None) -> SteelInput | None:
    """The steel with ``kinetics`` and ``transformation`` of its table; None where at fault."""
    name: str | None = DEFAULT.name
    if table.has("kinetics"):
        name = _name(table)
    if not table.has("transformation"):
        return replace(steel, kinetics=Kinetics(name)) if steel and name else None
    if table.has("calibration"):
        table.fault(
            "transformation",
            "left out where a calibration is given",
            "A calibration was fitted to the formulas; measured curves need none.",
        )
        return None
    file = table.text("transformation", 1000)
    if file is None:
        return None
    from .transformationfile import read_transformation  # numpy: most cases do without

    path = table.notes.folder / file
    try:
        measured = read_transformation(path)
    except CaseFaults as faults:
        for fault in faults.faults:
            sentence = str(fault).partition("\n")[0].replace(fault.path, file, 1)
            table.refuse("transformation", sentence.rstrip("."), fault.remedy)
        return None
    if steel is None or name is None:
        return None
    return replace(steel, kinetics=Kinetics(name, measured), transformation=path)


def _name(table: Table) -> str | None:
    text = table.text("kinetics", 100)
    try:
        return None if text is None else named(text)
    except InputFault as fault:
        table.fault("kinetics", fault.allowed, fault.remedy)
        return None
