"""A measured end-quench curve from a CSV file, checked, every fault with its line."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from midradius.study.casefaults import CaseFaults, Fault
from midradius.study.measuredfile import MeasuredFile, one_fault, read_file
from midradius.thermo.arrays import Array

MOST_POINTS = 200
SIXTEENTH_MM = 25.4 / 16.0
DISTANCE_MM = (1.5, 80.0)
HARDNESS_HRC = (0.0, 68.0)
MILLIMETRES = ("distance_mm", "mm")
SIXTEENTHS = ("distance_sixteenths_in", "distance_sixteenths", "sixteenths", "j")
ROCKWELL = ("hardness_hrc", "hrc")
_HEAD = "distance_mm,hardness_hrc"
REMEDY = f"Begin with {_HEAD}, or distance_sixteenths_in for J positions."


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

    Columns beside distance and hardness are not looked at, rows without a hardness are not
    points. With both a millimetre and a sixteenths column the first is taken.

    Raises
    ------
    CaseFaults
        All that is wrong with the file.
    """
    return curve_of(read_file(path, remedy=REMEDY))


def curve_of(file: MeasuredFile) -> MeasuredCurve:
    """As `read_curve`, of a file that is read."""
    distances, hardnesses, blank = _points(file)
    if not distances:
        remedy = "One point a line, after the head."
        raise one_fault(file.shown, "the file holds no measured point", remedy)
    order = np.argsort(distances, kind="stable")
    return MeasuredCurve(
        np.array(distances)[order], np.array(hardnesses)[order], file.name, file.sha256, blank
    )


def _points(file: MeasuredFile) -> tuple[list[float], list[float], int]:
    at_mm, at_j = file.column(MILLIMETRES), file.column(SIXTEENTHS)
    at_hrc = file.column(ROCKWELL)
    at, unit = (at_j, "1/16 in") if at_mm is None else (at_mm, "mm")
    faults = []
    line = file.head_line
    if at is None:
        allowed = "distance_mm or distance_sixteenths_in"
        faults.append(Fault(line, "distance column", "", allowed, REMEDY, file.shown))
    if at_hrc is None:
        faults.append(Fault(line, "hardness column", "", "hardness_hrc", REMEDY, file.shown))
    if at is None or at_hrc is None:
        raise CaseFaults(tuple(faults))
    scale = SIXTEENTH_MM if unit == "1/16 in" else 1.0
    within = (DISTANCE_MM[0] / scale, DISTANCE_MM[1] / scale)
    distances, hardnesses, blank = [], [], 0
    for line, row in file.rows:
        if at_hrc >= len(row) or not row[at_hrc]:
            blank += 1
            continue
        cell = row[at] if at < len(row) else ""
        distance, hardness = file.number(cell), file.number(row[at_hrc])
        if distance is None or not within[0] <= distance <= within[1]:
            allowed = f"{within[0]:.3g} to {within[1]:.3g} ({unit})"
            faults.append(file.fault(line, "distance", cell, allowed, ""))
        if hardness is None or not HARDNESS_HRC[0] <= hardness <= HARDNESS_HRC[1]:
            allowed = f"{HARDNESS_HRC[0]:g} to {HARDNESS_HRC[1]:g} HRC"
            remedy = "Leave the cell empty where nothing was measured." if hardness is None else ""
            faults.append(file.fault(line, "hardness", row[at_hrc], allowed, remedy))
        if distance is not None and hardness is not None:
            distances.append(distance * scale)
            hardnesses.append(hardness)
    if len(file.rows) > MOST_POINTS:
        value = f"{len(file.rows)} rows, but at most {MOST_POINTS} are read"
        faults.append(Fault(None, "", value, "", "Is this the right file?", file.shown))
    if faults:
        raise CaseFaults(tuple(faults))
    return distances, hardnesses, blank
