"""The steel that a command names: a shipped grade, a TOML file, a works' certificate."""

import re
import tomllib
from dataclasses import replace
from pathlib import Path

from midradius.study import casekeys as keys
from midradius.study.calibrationfile import (
    read_calibration,
    refuse_other_rates,
    refuse_other_steel,
)
from midradius.study.case import SteelInput
from midradius.study.caseblocks import steel_input
from midradius.study.casefaults import Notebook
from midradius.study.caselines import locate
from midradius.study.casetable import Table
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.ratechoice import named
from midradius.thermo.units import Kind, parse, show

_SUFFIXES = (".toml", ".csv")
_GRAIN = re.compile(r"ASTM\s*(-?[0-9]{1,2}(?:\.[0-9]{1,3})?)", re.IGNORECASE)
SOAK = "soak"


def given(text: str, *, heat: str = "") -> SteelInput:
    """The steel that ``text`` means, and its grain where the file gives one.

    Parameters
    ----------
    text
        A grade; else a file that ends in .toml or .csv: the ``[steel]`` table of a
        case (its other tables are not looked at), or a certificate.
    heat
        Which of a certificate's steels, where it holds several.

    Raises
    ------
    InputFault
        No such grade or file, or a certificate that leaves open which steel is meant.
    CaseFaults
        The faults of the ``[steel]`` table.
    """
    path = Path(text)
    if path.suffix.lower() not in _SUFFIXES:
        return SteelInput(grade(text))
    if path.suffix.lower() == ".toml":
        found = _from_case(path)
        if found is not None:
            return found
    return _from_certificate(path, heat)


def calibrated(steel: SteelInput, file: Path | None) -> SteelInput:
    """The steel with the shifts of a calibration file; itself without one.

    Raises
    ------
    InputFault
        No calibration, or one of another steel.
    """
    if file is None:
        return steel
    found = read_calibration(file)
    refuse_other_steel(found, steel.steel)
    refuse_other_rates(found, steel.kinetics.name)
    if steel.transformation is not None:
        raise InputFault(
            "--calibration",
            f'"{file}"',
            "left out for a steel with measured transformation curves",
            "A calibration was fitted to the formulas; measured curves need none.",
        )
    return replace(steel, shifts=found.shifts, calibration=found)


def _from_case(path: Path) -> SteelInput | None:
    """The ``[steel]`` table of a TOML file; None where it has none."""
    try:
        text = path.read_text(encoding="utf-8-sig")
        data = tomllib.loads(text)
    except (OSError, ValueError, RecursionError):
        return None  # the reader of certificates says what is wrong
    if not isinstance(data.get("steel"), dict):
        return None
    notes = Notebook(path.name, path.parent, lambda: locate(text))
    table = Table(data, (), notes).table("steel", "[steel]")
    steel = steel_input(table) if table else None
    notes.close()
    return steel


def _from_certificate(path: Path, heat: str) -> SteelInput:
    from midradius.thermo.certificate import read_certificates

    found = read_certificates(path)
    names = [item.name for item in found]
    if heat:
        found = tuple(item for item in found if heat.casefold() in _names(item.name, item.heat))
    if len(found) == 1:
        return SteelInput(found[0].steel)
    allowed = f"one of {', '.join(names[:12])}" + (", ..." if len(names) > 12 else "")
    value = f'"{heat}"' if heat else f"not given, and {path.name} holds {len(names)} steels"
    raise InputFault("heat", value, allowed, "Name the one that is meant with --heat.")


def _names(name: str, heat: str) -> tuple[str, str]:
    return name.casefold(), heat.casefold()


def grain_of(text: str) -> float | None:
    """Grain number of ``"ASTM 7"``; None for ``"soak"``, the grain that the soak leaves.

    Raises
    ------
    InputFault
        Anything else, or a number outside the range of a case.
    """
    if text.strip().casefold() == SOAK:
        return None
    low, high = keys.GRAIN_RANGE
    found = _GRAIN.fullmatch(text.strip())
    if found and low <= float(found[1]) <= high:
        return float(found[1])
    raise InputFault("grain", f'"{text}"', f'"ASTM {low:g}" to "ASTM {high:g}", or "{SOAK}"')


def with_kinetics(given: SteelInput, text: str | None) -> SteelInput:
    """The steel with the set of rates that an option names; unchanged where it is not given.

    Raises
    ------
    InputFault
        No such set, or another one than that of the steel's calibration.
    """
    if text is None:
        return given
    name = named(text)
    if given.calibration is not None:
        refuse_other_rates(given.calibration, name)
    return replace(given, kinetics=replace(given.kinetics, name=name))


def quantity(name: str, text: str | None, kind: Kind, within: tuple[float, float]) -> float | None:
    """An option's quantity in SI; None where it is not given.

    Raises
    ------
    InputFault
        Not a quantity of this kind, or outside ``within``.
    """
    if text is None:
        return None
    try:
        value = parse(text, kind)
    except InputFault as fault:
        raise InputFault(name, f'"{text}"', fault.allowed, fault.remedy) from None
    low, high = within
    if low <= value <= high:
        return value
    raise InputFault(name, f'"{text}"', f"{show(low, kind)} to {show(high, kind)}")
