"""Measurements of a heat, whichever of the two kinds a file holds."""

from collections.abc import Sequence
from pathlib import Path

from midradius.study.measuredcurve import REMEDY, MeasuredCurve, curve_of
from midradius.study.measureddiagram import MeasuredDiagram, diagram_of, is_diagram
from midradius.study.measuredfile import read_file
from midradius.thermo.errors import InputFault

MOST_FILES = 4


def read_measured(files: Sequence[Path]) -> tuple[MeasuredCurve | MeasuredDiagram, ...]:
    """The measurements of CSV files, told apart by their heads.

    Raises
    ------
    CaseFaults
        All that is wrong with the first file that has faults.
    InputFault
        More than four files, or one of them twice.
    """
    if len(files) > MOST_FILES:
        raise InputFault("--measured", f"{len(files)} files", f"{MOST_FILES} at most", "Join some.")
    if len(set(files)) < len(files):
        raise InputFault("--measured", "one file twice", "every file once", "It counted double.")
    read = [read_file(path, remedy=REMEDY) for path in files]
    return tuple(diagram_of(file) if is_diagram(file) else curve_of(file) for file in read)
