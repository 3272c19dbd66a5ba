"""The one job: a case in, a result folder out. Everything that starts a run calls it."""

import contextlib
import re
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from importlib import import_module
from pathlib import Path
from threading import Thread
from typing import TYPE_CHECKING

from midradius.study.casefile import CaseFaults, Fault, read_any
from midradius.study.caselines import locate
from midradius.study.folder import ResultFolder, shown
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from midradius.study.archive import SeriesKeeper
    from midradius.study.case import Case
    from midradius.study.result import Result
    from midradius.study.seriescase import SeriesCase

    AnyCase = Case | SeriesCase | Path | str

Tell = Callable[[float, float], None]

_WRITERS = (
    "matplotlib.backends.backend_agg",
    "matplotlib.figure",
    "matplotlib.tri",
    "meshio",
    "h5py",
)


def look(case: "Case | SeriesCase") -> None:
    """Read what a case on thermocouples names, and solve nothing.

    Raises
    ------
    CaseFaults
        The file cannot be read, or lacks what the case names.
    """
    from midradius.study.seriescase import TABLE, SeriesCase

    if not isinstance(case, SeriesCase) or case.temperatures.kind != TABLE:
        return  # other files need numerics to be read
    from midradius.study.seriesopen import histories, places

    try:
        places(case, histories(case.temperatures))
    except InputFault as fault:
        if not case.path:
            raise
        raise CaseFaults((placed(fault, case.text, case.path),)) from fault


def solve(
    case: "AnyCase", *, tell: Tell | None = None, keeper: "SeriesKeeper | None" = None
) -> "Result":
    """Solve a case, given as such or as the path of its file, and return the result.

    ``keeper`` takes the fields as they come; a result too large for the memory then
    holds no temperatures over time.

    Raises
    ------
    CaseFaults
        The file cannot be read or is not a sound case, or it asks for something that
        turns out only on the way not to be computable.
    InputFault
        The same, of a case that was made in Python.
    SolverFault
        The solver gave up.
    """
    from midradius.study import runner, seriesrun
    from midradius.study.seriescase import SeriesCase

    asked = read_any(case) if isinstance(case, Path | str) else case
    try:
        if isinstance(asked, SeriesCase):
            return seriesrun.run(asked, tell=tell)
        return runner.run(asked, tell=tell, keep=None if keeper is None else keeper.begin)
    except InputFault as fault:
        if not asked.path:
            raise
        raise CaseFaults((placed(fault, asked.text, asked.path),)) from fault


def placed(fault: InputFault, text: str, path: Path) -> Fault:
    """A fault of the solver, which knows no file, with the line of the case that it means."""
    parts = re.findall(r"[^.\[\]]+", fault.quantity)
    key = tuple(int(part) if part.isdecimal() else part for part in parts)
    line = locate(text).get(key)
    return Fault(line, fault.quantity, fault.value, fault.allowed, fault.remedy, str(path))


def write(result: "Result", folder: Path | str) -> Path:
    """Write everything a run leaves into ``folder``, whole or not at all.

    Raises
    ------
    InputFault
        The place cannot be written or holds something else.
    """
    target = Path(folder)
    with _written(target) as work:
        _fill(result, work)
    return target


def run(case: "AnyCase", folder: Path | str, *, tell: Tell | None = None) -> "Result":
    """Solve a case and write its result folder; refuses a bad folder before solving.

    Raises
    ------
    CaseFaults, InputFault, SolverFault
        As `solve` and `write`.
    """
    from midradius.study.seriescase import SeriesCase

    asked = read_any(case) if isinstance(case, Path | str) else case
    outputs = None if isinstance(asked, SeriesCase) else asked.outputs
    with _written(Path(folder)) as work:
        keeper = None
        if outputs is not None and outputs.field_format == "vtkhdf":
            from midradius.fem.vtkhdf import SERIES
            from midradius.study.archive import SeriesKeeper

            keeper = SeriesKeeper(work / SERIES)
        with contextlib.ExitStack() as last, _meanwhile(_load_writers):
            if keeper is not None:
                last.callback(keeper.close)
            result = solve(asked, tell=tell, keeper=keeper)
            if keeper is not None:
                keeper.finish(result)
        scenes = outputs is not None and outputs.pictures == "scenes"
        return _fill(result, work, fields=keeper is None, scenes=scenes)


@contextlib.contextmanager
def _written(target: Path) -> Iterator[Path]:
    """A result folder to fill; what the disk refuses on the way is an answer, not a crash."""
    try:
        with ResultFolder(target) as work:
            yield work
    except OSError as fault:
        reason = fault.strerror or str(fault)
        raise InputFault(
            "output folder", shown(target), "a place that takes all files", f"{reason}."
        ) from fault


@contextlib.contextmanager
def _meanwhile(action: Callable[[], None]) -> Iterator[None]:
    """Do ``action`` beside the body: compiled kernels leave the interpreter free."""
    beside = Thread(target=action)
    beside.start()
    try:
        yield
    finally:
        beside.join()


def _load_writers() -> None:
    # Half a second of imports; whatever fails here fails again, and loudly, in `_fill`.
    with contextlib.suppress(Exception):
        for name in _WRITERS:
            import_module(name)


def _fill(result: "Result", work: Path, *, fields: bool = True, scenes: bool = False) -> "Result":
    """Write all files; the result, with a sentence where the part could not be drawn."""
    from midradius.study.archive import write_fields, write_result_record
    from midradius.study.pictures import write_pictures
    from midradius.study.tables import write_tables

    # Field files are zlib, which leaves the interpreter free for the pictures.
    with ThreadPoolExecutor(max_workers=1) as beside:
        written = beside.submit(write_fields, result, work) if fields else None
        write_pictures(result, work)
        write_tables(result, work)
        if written is not None:
            written.result()
    # A solid has no flat section to draw, so that its scenes are always drawn.
    if (scenes or result.sense == "solid") and len(result.view.node):
        from midradius.study.scene import write_scenes

        failure = write_scenes(result, work)
        if failure:
            result = replace(result, assumptions=(*result.assumptions, failure))
    write_result_record(result, work)
    if result.case_text:
        (work / "case.toml").write_text(result.case_text, encoding="utf-8")
    return result
