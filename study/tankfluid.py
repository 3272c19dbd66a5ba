"""A fluid of the user's own, from CSV or TOML; and which fluid a tank holds.

A CSV file has the columns ``temp_degC, density_kg_per_m3, heat_capacity_J_per_kgK``;
a TOML file has ``kind`` (oil, water, brine, polymer or salt), these three as arrays,
and may have ``name`` and ``flash_degC``. A CSV file takes its kind from the medium.
"""

import csv
import tomllib
from dataclasses import replace
from pathlib import Path

import numpy as np

from midradius.fem.fluids import KINDS, ZERO_DEGC, Fluid, fluid, of_medium
from midradius.study.case import MediumUse
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

COLUMNS = ("temp_degC", "density_kg_per_m3", "heat_capacity_J_per_kgK")
_DENSITY, _CP = (400.0, 3000.0), (400.0, 6000.0)
_LARGEST = 1_000_000


def fluid_of(use: MediumUse, file: Path | None) -> Fluid:
    """The fluid of a tank: the file's, else that of the medium.

    Raises
    ------
    InputFault
        A film curve without a fluid file, or a file that cannot be used.
    """
    of_name = of_medium(use.name) if use.name else None
    if file is None:
        if of_name is None:
            allowed = "given where the quench has a film curve of its own"
            raise InputFault("tank.fluid_file", "missing", allowed, "Density and heat capacity.")
        return of_name
    return read_fluid(file, like=of_name)


def read_fluid(path: Path, *, like: Fluid | None = None) -> Fluid:
    """The fluid of a CSV or TOML file; what the file does not say is as in ``like``.

    Raises
    ------
    InputFault
        The file cannot be read or holds no such table.
    """
    try:
        if not path.is_file():
            raise _fault(path, "an existing file", "The path counts from the case file.")
        if path.stat().st_size > _LARGEST:
            raise _fault(path, "at most 1 MB", "A fluid has a few lines.")
        text = path.read_text(encoding="utf-8-sig")
        data = tomllib.loads(text) if path.suffix.lower() == ".toml" else _csv(path, text)
    except (OSError, ValueError) as error:
        raise _fault(path, "a CSV or TOML file of a fluid", f"{error}.") from error
    table = [_column(path, data, name) for name in COLUMNS]
    if not 2 <= len(table[0]) <= 1000 or len({len(column) for column in table}) > 1:
        raise _fault(path, "2 to 1000 temperatures, three columns of one length")
    temp, density, cp = table
    if not np.all(np.diff(temp) > 0.0) or not (temp[0] >= -50.0 and temp[-1] <= 900.0):
        raise _fault(path, "temperatures that ascend, from -50 to 900 degC")
    for name, values, (low, high) in zip(COLUMNS[1:], table[1:], (_DENSITY, _CP), strict=True):
        if not np.all((values >= low) & (values <= high)):
            raise _fault(path, f"{name} from {low:g} to {high:g}")
    kind = data.get("kind", like.kind if like else "oil")
    if kind not in KINDS:
        raise _fault(path, "kind = one of " + ", ".join(KINDS))
    base = like or fluid("medium quench oil" if kind == "oil" else "water")
    flash = data.get("flash_degC")
    if flash is not None and (not isinstance(flash, int | float) or not 30 <= flash <= 400):
        raise _fault(path, "flash_degC from 30 to 400")
    return replace(
        base,
        name=str(data.get("name", path.stem))[:60],
        kind=kind,
        temp=temp + ZERO_DEGC,
        density=density,
        heat_capacity=cp,
        conductivity=np.full(len(temp), np.nan),
        source=Source(f"properties of {path.name}", path.name, "the user's own", "read"),
        flash=float(flash) + ZERO_DEGC if flash is not None else base.flash,
        flash_given=flash is not None,
    )


def fluid_fault(path: Path) -> InputFault | None:
    """What is wrong with a fluid file, if anything."""
    try:
        read_fluid(path)
    except InputFault as fault:
        return fault
    return None


def _csv(path: Path, text: str) -> dict[str, object]:
    rows = list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))
    try:
        return {name: [float(row[name]) for row in rows] for name in COLUMNS}
    except (KeyError, TypeError, ValueError) as error:
        raise _fault(path, "columns " + ", ".join(COLUMNS), f"Found {error}.") from error


def _column(path: Path, data: dict[str, object], name: str) -> np.ndarray:
    try:
        found = np.array(data[name], dtype=np.float64)
    except (KeyError, TypeError, ValueError):
        raise _fault(path, f"{name} as an array of numbers") from None
    if found.ndim != 1 or not np.all(np.isfinite(found)):
        raise _fault(path, f"{name} as an array of numbers")
    return found


def _fault(path: Path, allowed: str, remedy: str = "") -> InputFault:
    return InputFault("fluid file", f'"{path.name}"', allowed, remedy)
