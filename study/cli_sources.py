"""``midradius sources``: what every model rests on."""

import json
import textwrap
from collections.abc import Iterable
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.sources import Sheet, Used
    from midradius.thermo.source import Source

SCHEMA_VERSION = 1
_WIDTH = 96
_LEGEND = "* from memory, not opened again when it was written down; ~ an estimate without a work."

_EPILOG = """\b
Examples:
  midradius sources
  midradius sources --model martensite
  midradius sources --case shaft.toml
  midradius run shaft.toml --out shaft --sources
"""


@click.command(epilog=_EPILOG, short_help="List the works that the models rest on.")
@click.option("--model", metavar="TEXT", help="Only models or works that mention it.")
@click.option(
    "--case", "path", type=click.Path(path_type=Path), help="Only those that a run of it uses."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def sources(model: str | None, path: Path | None, as_json: bool) -> None:
    """List every model with work, place in it, status and range of validity.

    A status is "read" (the work was opened), "derived" (computed from read or exact
    values), "remembered" or "estimate".
    """
    with answered():
        from midradius.study import sources as known
        from midradius.thermo.errors import InputFault

        document: dict[str, Any]
        if path is not None:
            from midradius.study.casefile import read_any

            used = known.of_case(read_any(path))
            wanted = (model or "").strip().casefold()
            used = tuple(
                u for u in used if wanted in f"{u.source.model} {u.source.work}".casefold()
            )
            document, lines = {"sources": described(used)}, used_lines(used)
        else:
            sheets = known.find(model or "")
            used = ()
            document = {"models": [asdict(sheet) for sheet in sheets]}
            lines = _sheet_lines(sheets)
        if not (used or document.get("models")):
            remedy = "midradius sources lists all."
            raise InputFault("--model", f'"{model}"', "part of the name of a model or work", remedy)
    if as_json:
        content = {"schema_version": SCHEMA_VERSION, **document}
        click.echo(json.dumps(content, indent=1, allow_nan=False))
        return
    for line in lines:
        click.echo(line)


def described(used: "Iterable[Used]") -> list[dict[str, str]]:
    """Sources with their ranges as plain dictionaries."""
    return [{**asdict(item.source), "holds_for": item.holds} for item in used]


def used_lines(used: "Iterable[Used]") -> list[str]:
    """The sources of a run in lines: those of one range together."""
    by_range: dict[str, list[Source]] = {}
    for item in used:
        by_range.setdefault(item.holds, []).append(item.source)
    lines: list[str] = []
    for holds, group in by_range.items():
        lines += [line for source in group for line in _source(source)]
        lines += [*_folded("holds for: ", holds, indent=4), ""] if holds else [""]
    return [*lines, _LEGEND]


def _sheet_lines(sheets: "Iterable[Sheet]") -> list[str]:
    lines: list[str] = []
    for sheet in sheets:
        lines.append(f"{sheet.module}: {sheet.title}")
        lines += [line for source in sheet.sources for line in _source(source)]
        lines += [*_folded("holds for: ", sheet.holds, indent=4), ""] if sheet.holds else [""]
    return [*lines, _LEGEND]


def _source(source: "Source") -> list[str]:
    mark = {"remembered": "*", "estimate": "~"}.get(source.status, "-")
    text = f"{source.model}: {source.work}; {source.locator} [{source.status}]"
    return _folded(f"{mark} ", text, indent=2)


def _folded(label: str, text: str, *, indent: int) -> list[str]:
    blank = " " * indent
    return textwrap.wrap(
        printable(f"{label}{text}"),
        _WIDTH,
        initial_indent=blank,
        subsequent_indent=blank + "  ",
        break_on_hyphens=False,
    )
