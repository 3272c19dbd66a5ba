"""The job behind ``midradius tank``: a case in, an answer and its folder out."""

from pathlib import Path
from typing import TYPE_CHECKING

from midradius.study import casefile
from midradius.study.casefaults import CaseFaults
from midradius.study.job import placed
from midradius.study.sheetfile import written
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from midradius.study.case import Case
    from midradius.study.tankanswer import TankAnswer


def solve(case: "Case | Path | str") -> "TankAnswer":
    """Solve the tank of a case, given as such or as the path of its file.

    Raises
    ------
    CaseFaults, InputFault, SolverFault
        As `tankanswer.answer`; faults of a file name it.
    """
    from midradius.study import tankanswer

    asked = casefile.read(case) if isinstance(case, Path | str) else case
    try:
        return tankanswer.answer(asked)
    except InputFault as fault:
        if not asked.path:
            raise
        raise CaseFaults((placed(fault, asked.text, asked.path),)) from fault


def run(case: "Case | Path | str", folder: Path | str) -> "TankAnswer":
    """Solve the tank of a case and write its folder, whole or not at all."""
    from midradius.study.tanksheet import write

    asked = casefile.read(case) if isinstance(case, Path | str) else case
    with written(Path(folder)) as work:
        found = solve(asked)
        write(found, work)
    return found
