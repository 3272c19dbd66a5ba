"""A measured end-quench curve from a CSV file, checked, every fault with its line."""

import csv
import hashlib
import io
import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from midradius.study.casefaults import CaseFaults, Fault
from midradius.thermo.arrays import Array

LARGEST = 1_000_000  # bytes
MOST_POINTS = 200
SIXTEENTH_MM = 25.4 / 16.0
DISTANCE_MM = (1.5, 80.0)
HARDNESS_HRC = (0.0, 68.0)
MILLIMETRES = ("distance_mm", "distance", "mm")
SIXTEENTHS = ("distance_sixteenths_in", "distance_sixteenths", "sixteenths", "j")
ROCKWELL = ("hardness_hrc", "hrc")
_HEAD = "distance_mm,hardness_hrc"
_REMEDY = f"Begin with {_HEAD}, or distance_sixteenths_in for J positions."


@dataclass(frozen=True)
class MeasuredCurve:
    """Distance from the quenched end [mm] and hardness, (n_measured,) each, rising.

    ``name`` and ``sha256`` are those of the file; ``blank`` counts the rows without a hardness.
    """

    distance_mm: Array
    hardness_hrc: Array
    name: str
    sha256: str
    blank: int = 0


def read_curve(path: Path) -> MeasuredCurve:
    """The curve of a CSV file.

    A head, then one point a line; comma or semicolon between the columns, a decimal comma
    with semicolons only. Columns beside distance and hardness are not looked at, rows
    without a hardness are not points. With both a millimetre and a sixteenths column the
    first is taken.

    Raises
    ------
    CaseFaults
        All that is wrong with the file.
    """
    name = str(path).encode(errors="replace").decode()
    data = _bytes(path, name)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        value = f"byte {data[error.start]:#04x} is not UTF-8"
        raise _one(name, value, "Save the file as UTF-8 text.", line) from None
    rows = _rows(text, name)
    if not rows:
        raise _one(name, "the file holds no rows", _REMEDY)
    distances, hardnesses, blank = _points(rows, name, has_comma=";" in text)
    if not distances:
        raise _one(name, "the file holds no measured point", "One point a line, after the head.")
    order = np.argsort(distances, kind="stable")
    return MeasuredCurve(
        np.array(distances)[order],
        np.array(hardnesses)[order],
        path.name,
        hashlib.sha256(data).hexdigest(),
        blank,
    )


def _bytes(path: Path, name: str) -> bytes:
    if path.exists() and not path.is_file():
        raise _one(name, "this is no ordinary file", "Name a CSV file.")
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST + 1)
    except FileNotFoundError:
        raise _one(name, "there is no such file", "Check the path.") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _one(name, f"cannot be read: {reason}", "Check its rights.") from None
    if len(data) > LARGEST:
        raise _one(name, "larger than 1 MB", "A curve is some hundred bytes: is this the file?")
    return data


def _rows(text: str, name: str) -> list[tuple[int, list[str]]]:
    """Every row that says something, with its line."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=";" if ";" in text else ",")
    try:
        found = [(reader.line_num, [cell.strip() for cell in row]) for row in reader]
    except csv.Error as error:
        raise _one(name, f"not CSV: {error}", _REMEDY, reader.line_num) from None
    return [(line, row) for line, row in found if any(row) and not row[0].startswith("#")]


def _points(
    rows: list[tuple[int, list[str]]], name: str, *, has_comma: bool
) -> tuple[list[float], list[float], int]:
    line, head = rows[0]
    plain = ["_".join(cell.casefold().replace("[", "").replace("]", "").split()) for cell in head]
    at_mm, at_j, at_hrc = (
        next((k for k, cell in enumerate(plain) if cell in known), None)
        for known in (MILLIMETRES, SIXTEENTHS, ROCKWELL)
    )
    at, unit = (at_j, "1/16 in") if at_mm is None else (at_mm, "mm")
    faults = []
    if at is None:
        allowed = "distance_mm or distance_sixteenths_in"
        faults.append(Fault(line, "distance column", "", allowed, _REMEDY, name))
    if at_hrc is None:
        faults.append(Fault(line, "hardness column", "", "hardness_hrc", _REMEDY, name))
    if at is None or at_hrc is None:
        raise CaseFaults(tuple(faults))
    scale = SIXTEENTH_MM if unit == "1/16 in" else 1.0
    within = (DISTANCE_MM[0] / scale, DISTANCE_MM[1] / scale)
    distances, hardnesses, blank = [], [], 0
    for line, row in rows[1:]:
        if at_hrc >= len(row) or not row[at_hrc]:
            blank += 1
            continue
        cell = row[at] if at < len(row) else ""
        distance = _number(cell, has_comma)
        hardness = _number(row[at_hrc], has_comma)
        if distance is None or not within[0] <= distance <= within[1]:
            allowed = f"{within[0]:.3g} to {within[1]:.3g} ({unit})"
            faults.append(Fault(line, "distance", _said(cell), allowed, "", name))
        if hardness is None or not HARDNESS_HRC[0] <= hardness <= HARDNESS_HRC[1]:
            allowed = f"{HARDNESS_HRC[0]:g} to {HARDNESS_HRC[1]:g} HRC"
            remedy = "Leave the cell empty where nothing was measured." if hardness is None else ""
            faults.append(Fault(line, "hardness", _said(row[at_hrc]), allowed, remedy, name))
        if distance is not None and hardness is not None:
            distances.append(distance * scale)
            hardnesses.append(hardness)
    if len(rows) - 1 > MOST_POINTS:
        value = f"{len(rows) - 1} rows, but at most {MOST_POINTS} are read"
        faults.append(Fault(None, "", value, "", "Is this the right file?", name))
    if faults:
        raise CaseFaults(tuple(faults))
    return distances, hardnesses, blank


def _number(text: str, has_comma: bool) -> float | None:
    try:
        value = float(text.replace(",", ".") if has_comma else text)
    except ValueError:
        return None
    return value if math.isfinite(value) else None


def _said(cell: str) -> str:
    plain = "".join(c if c.isprintable() else "?" for c in cell[:60])
    return f'"{plain}"'


def _one(name: str, value: str, remedy: str, line: int | None = None) -> CaseFaults:
    return CaseFaults((Fault(line, "", value, "", remedy, name),))
