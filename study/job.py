"""The one job: a case in, a result folder out. Everything that starts a run calls it."""

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from midradius.study.casefile import read
from midradius.study.folder import ResultFolder

if TYPE_CHECKING:
    from midradius.study.case import Case
    from midradius.study.result import Result

Tell = Callable[[float, float], None]


def solve(case: "Case | Path | str", *, tell: Tell | None = None) -> "Result":
    """Solve a case, given as such or as the path of its file, and return the result.

    Raises
    ------
    CaseFaults
        The file cannot be read or is not a sound case.
    InputFault
        The case asks for something that cannot be computed.
    SolverFault
        The solver gave up.
    """
    from midradius.study import runner

    return runner.run(read(case) if isinstance(case, Path | str) else case, tell=tell)


def write(result: "Result", folder: Path | str) -> Path:
    """Write everything a run leaves into ``folder``, whole or not at all.

    Raises
    ------
    InputFault
        The place cannot be written or holds something else.
    """
    target = Path(folder)
    with ResultFolder(target) as work:
        _fill(result, work)
    return target


def run(case: "Case | Path | str", folder: Path | str, *, tell: Tell | None = None) -> "Result":
    """Solve a case and write its result folder; refuses a bad folder before solving."""
    asked = read(case) if isinstance(case, Path | str) else case
    with ResultFolder(Path(folder)) as work:
        result = solve(asked, tell=tell)
        _fill(result, work)
    return result


def _fill(result: "Result", work: Path) -> None:
    from midradius.study.archive import write_fields, write_result_record
    from midradius.study.pictures import write_pictures
    from midradius.study.tables import write_tables

    write_fields(result, work)
    write_tables(result, work)
    write_pictures(result, work)
    write_result_record(result, work)
    if result.case_text:
        (work / "case.toml").write_text(result.case_text, encoding="utf-8")
