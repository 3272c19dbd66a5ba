"""The case file: TOML to a checked ``Case``, or all of its faults together.

``read`` opens a file, ``loads`` takes its text, ``dumps`` writes a text that
reads back as the same case.
"""

import re
import tomllib
from dataclasses import replace
from pathlib import Path

from . import casekeys as keys
from .case import Case, SteelInput
from .caseblocks import grid, section_input, steel_input
from .casefaults import CaseFaults, Fault, Notebook
from .caselines import locate
from .caseneed import needs
from .caseoutput import outputs
from .casepath import paths
from .caseroute import route, soak_and_tempers
from .casetable import Table, is_line
from .casetank import tank_blocks
from .casewrite import dumps
from .seriescase import SeriesCase, temperatures
from .seriesplaces import needs_at, places

__all__ = ["CaseFaults", "Fault", "dumps", "loads", "loads_any", "read", "read_any"]

LARGEST = 1_000_000  # bytes; a case is some kilobytes
_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)")
_TUPLE = re.compile(r"\('([^']*)',\)")
_MEND = "Quantities stand in quotes, tables in [brackets], one key on a line."


def read(path: Path | str) -> Case:
    """The case of a file.

    Parameters
    ----------
    path
        A TOML file, UTF-8, at most 1 MB. Film curves count from its folder.

    Returns
    -------
    Case
        In SI, checked.

    Raises
    ------
    CaseFaults
        With every fault of the file, or with the one that kept it from being
        read. Nothing else is raised for a bad file.
    """
    path = Path(path)
    return loads(_text(path), path)


def read_any(path: Path | str) -> Case | SeriesCase:
    """The case of a file, with a section or with temperatures from elsewhere.

    Raises
    ------
    CaseFaults
        As `read`.
    """
    path = Path(path)
    return loads_any(_text(path), path)


def loads(text: str, path: Path | None = None) -> Case:
    """The case of a text; ``path`` is where it stands, for messages and film curves.

    Raises
    ------
    CaseFaults
        With every fault of the text; with one where it has no section of its own.
    """
    found = loads_any(text, path)
    if isinstance(found, Case):
        return found
    line = locate(text).get(("temperatures",))
    sentence = "temperatures from elsewhere have no section, which is needed here"
    remedy = "Describe the part by [section] and stages that cool it."
    raise CaseFaults((Fault(line, "", sentence, "", remedy, _printable(path or Path("case"))),))


def loads_any(text: str, path: Path | None = None) -> Case | SeriesCase:
    """As `loads`, or a case whose temperatures come from a file."""
    name = _printable(path) if path else "case"
    try:
        data = tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        raise CaseFaults((_not_toml(error, name),)) from None
    if not data:
        remedy = "`midradius new` writes a case to start from."
        raise CaseFaults((Fault(None, "", "the file holds no keys", "", remedy, name),))
    folder = path.parent if path else Path()
    notes = Notebook(name, folder, lambda: locate(text))
    top = Table(data, (), notes)
    top.only(keys.TOP)
    title = top.text("title", keys.LONGEST_TITLE)
    title = title or (path.stem if path and is_line(path.stem) else "untitled")
    if not top.has("steel"):
        top.missing("steel", "given as a table [steel]")
    steel_table = top.table("steel", "[steel]")
    steel = steel_input(steel_table) if steel_table else None
    if top.has("temperatures"):
        return _series(top, title, steel, text, path)
    if not top.has("section"):
        top.missing("section", "given as a table [section]")
    section_table = top.table("section", "[section]")
    section = section_input(section_table, top) if section_table else None
    output = top.table("output", "[output]")
    wanted = replace(outputs(output, section), paths=paths(output, section))
    stages = route(top, steel, section, wanted)
    asked = needs(top, section, wanted)
    cells = grid(top.table("grid", "[grid]"), section)
    load, tank, shift = tank_blocks(top, section, stages)
    notes.close()
    if steel is None or section is None:  # cannot be: each None has its note
        raise AssertionError("a block is missing without a fault")
    return Case(
        title=title,
        steel=steel,
        section=section,
        route=stages,
        outputs=wanted,
        grid=cells,
        needs=asked,
        load=load,
        tank=tank,
        shift=shift,
        text=text,
        path=path,
    )


def _series(
    top: Table, title: str, steel: SteelInput | None, text: str, path: Path | None
) -> SeriesCase:
    load = "How much heat a load gives is known of a section only."
    for block, why in (
        ("section", "Keep one of the two."),
        ("grid", "Nothing is solved on it."),
        *((name, load) for name in ("load", "tank", "shift")),
    ):
        if top.has(block):
            sentence = f"{block} does not go with temperatures, which come with their own nodes"
            top.refuse(block, sentence, why)
    table = top.table("temperatures", "[temperatures]")
    given = temperatures(table) if table else None
    wanted = places(top, given)
    stages = soak_and_tempers(top, steel)
    asked = needs_at(top, wanted, given)
    top.notes.close()
    if steel is None or given is None:  # cannot be: each None has its note
        raise AssertionError("a block is missing without a fault")
    return SeriesCase(
        title=title,
        steel=steel,
        temperatures=given,
        route=stages,
        outputs=wanted,
        needs=asked,
        text=text,
        path=path,
    )


def _text(path: Path) -> str:
    try:
        if path.is_dir():
            raise _refused(path, "this is a folder", "Name the case file in it.")
        if path.exists() and not path.is_file():
            raise _refused(path, "this is a device or a pipe", "Name an ordinary file.")
        with path.open("rb") as file:
            data = file.read(LARGEST + 1)
    except FileNotFoundError:
        remedy = "Check the path; `midradius new` writes a case to start from."
        raise _refused(path, "there is no such file", remedy) from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _refused(path, f"cannot be read: {reason}", "Check its rights.") from None
    if len(data) > LARGEST:
        remedy = "A case file is some kilobytes: is this the right file?"
        raise _refused(path, "larger than 1 MB", remedy)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        value = f"byte {data[error.start]:#04x} is not UTF-8"
        remedy = "Save the file as UTF-8 text."
        raise CaseFaults((Fault(line, "", value, "", remedy, _printable(path)),)) from None
    if not text.strip():
        raise _refused(path, "the file is empty", "`midradius new` writes a case to start from.")
    return text


def _refused(path: Path, value: str, remedy: str) -> CaseFaults:
    return CaseFaults((Fault(None, "", value, "", remedy, _printable(path)),))


def _printable(path: Path) -> str:
    return str(path).encode(errors="replace").decode()


def _not_toml(error: Exception, name: str) -> Fault:
    if isinstance(error, RecursionError):
        return Fault(None, "", "not TOML: brackets nested too deep", "", _MEND, name)
    message = str(error)
    found = _PLACE.search(message)
    reason = _TUPLE.sub(r"\1", _PLACE.sub("", message)).rstrip(".")
    if found is None:
        return Fault(None, "", f"not TOML: {reason}", "", _MEND, name)
    if found[1] is None:
        return Fault(None, "", f"not TOML: {reason} at the end of the file", "", _MEND, name)
    return Fault(int(found[1]), "", f"not TOML: {reason}, column {found[2]}", "", _MEND, name)
