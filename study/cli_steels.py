"""``midradius steels``: the shipped grades, or the steels of a works' own file."""

import json
import math
from pathlib import Path
from typing import Any

import click

from midradius.study.cli_answer import answered, printable
from midradius.thermo.certificate import Certificate, deviations, read_certificates
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import GradeRow, families, find, row
from midradius.thermo.source import RangeNote
from midradius.thermo.steel import Composition

SCHEMA_VERSION = 1
# The rates note an unusual grain; a list of analyses has none, so one inside.
_USUAL_GRAIN_ASTM = 7.0
_NOT_LIMITED = "-"

_EPILOG = """\b
Examples:
  midradius steels
  midradius steels crmo --carbon 0.35:0.45
  midradius steels 4140H --limits
  midradius steels --family spring --json
  midradius steels --file certificates.csv
  midradius steels --file certificates.toml --against 42CrMo4

\b
A file of certificates, as TOML (or CSV with the same words as heads):
  [[steel]]
  heat = "H 4711"
  grade = "42CrMo4"
  analysis = { C = 0.42, Mn = 0.81, Cr = 1.09, Mo = 0.21, B_ppm = 3 }
A case runs it with: [steel] file = "certificates.toml" and heat = "H 4711".
"""


@click.command(epilog=_EPILOG, short_help="List the shipped grades, or a file of certificates.")
@click.argument("text", required=False, default="")
@click.option("--family", help="Alloy family or use, such as CrMo, spring, case-hardening.")
@click.option("--carbon", metavar="LO:HI", help="Range of the aim of carbon, mass percent.")
@click.option("--limits", "with_limits", is_flag=True, help="Limits and aim of every element.")
@click.option(
    "--file",
    "path",
    type=click.Path(path_type=Path),
    help="List the certificates of a TOML or CSV file, held against the grade each names.",
)
@click.option("--against", metavar="GRADE", help="With --file: hold them against this grade.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def steels(
    text: str,
    family: str | None,
    carbon: str | None,
    with_limits: bool,
    path: Path | None,
    against: str | None,
    as_json: bool,
) -> None:
    """List the shipped grades whose name, number or standard contains TEXT.

    One grade a line: name, number, standard, whether its row was read or is from
    memory, families, aim in mass percent. A heat's own certificate is always better
    than an aim: --file lists those of a works.
    """
    with answered():
        bounds = _bounds(carbon)
        if path is None:
            if against is not None:
                raise InputFault("--against", f'"{against}"', "given beside --file")
            lines, document = _shipped(text, family, bounds, with_limits)
        else:
            if family is not None:
                allowed = "left out with --file: certificates have no family"
                raise InputFault("--family", f'"{family}"', allowed)
            lines, document = _own(path, text, bounds, against)
    if as_json:
        content = {"schema_version": SCHEMA_VERSION, **document}
        click.echo(json.dumps(content, indent=1, allow_nan=False))
        return
    for line in lines if lines[-1] else lines[:-1]:
        click.echo(line)


def _bounds(carbon: str | None) -> tuple[float, float] | None:
    """``"0.35:0.45"`` in mass percent; an end left out is open."""
    if carbon is None:
        return None
    low, colon, high = carbon.partition(":")
    try:
        bounds = float(low or 0.0), float(high or 100.0)
    except ValueError:
        bounds = math.nan, math.nan
    if not colon or not 0.0 <= bounds[0] <= bounds[1] <= 100.0:
        allowed = "two numbers in mass percent, from the lower to the higher"
        raise InputFault("--carbon", f'"{carbon}"', allowed, "Write for example 0.35:0.45.")
    return bounds


def _shipped(
    text: str, family: str | None, carbon: tuple[float, float] | None, with_limits: bool
) -> tuple[list[str], dict[str, Any]]:
    found = find(family=family, carbon=carbon, text=text)
    if not found:
        raise _nothing(text, family, carbon)
    notes = {item.name: _range_notes(item.steel.composition) for item in found if with_limits}
    lines = []
    for item in found:
        if with_limits:
            lines += _table(item, notes[item.name])
        else:
            doubt = f" [doubt: {item.note}]" if item.note else ""
            lines.append(f"{_head(item)} {_amounts(item.steel.composition)}{doubt}")
    return lines, {"grades": [_of_row(item, notes.get(item.name)) for item in found]}


def _nothing(text: str, family: str | None, carbon: tuple[float, float] | None) -> InputFault:
    remedy = "midradius steels lists all."
    if text and family is None and carbon is None:
        try:
            row(text)
        except InputFault as unknown:
            remedy = f"{unknown.remedy.partition(' Or give')[0]} {remedy}"
        same = [name for name in families() if name.casefold() == text.casefold()]
        if same:
            remedy = f"It is a family: write --family {same[0]}."
        return InputFault("TEXT", f'"{text}"', "part of the name of a shipped grade", remedy)
    filters = [f'"{text}"'] if text else []
    filters += [f"family {family}"] if family else []
    filters += [f"carbon {carbon[0]:g} to {carbon[1]:g} %"] if carbon else []
    allowed = "filters that a shipped grade passes"
    return InputFault("filters", ", ".join(filters), allowed, f"Leave one out; {remedy}")


def _head(item: GradeRow) -> str:
    kinds = " ".join(item.families)
    return f"{item.name:16} {item.number:6} {item.standard:13} {item.steel.status:10} {kinds:22}"


def _amounts(composition: Composition) -> str:
    amounts = composition.as_dict().items()
    return ", ".join(f"{element} {amount:.4g}" for element, amount in amounts if amount)


def _table(item: GradeRow, notes: list[RangeNote]) -> list[str]:
    """One grade on several lines: low, aim and high below each element."""
    limits = {limit.element: limit for limit in item.limits}
    aims = item.steel.composition.as_dict()
    elements = [name for name, aim in aims.items() if name in limits or aim]
    columns = []
    for name in elements:
        limit = limits.get(name)
        low = f"{limit.low:g}" if limit and limit.low > 0.0 else _NOT_LIMITED
        high = f"{limit.high:g}" if limit and math.isfinite(limit.high) else _NOT_LIMITED
        columns.append((name, low, f"{aims[name]:g}", high))
    lines = [_head(item).rstrip()]
    for place, label in enumerate(("mass %", "low", "aim", "high")):
        lines.append(f"  {label:8}" + "".join(f"{column[place]:>8}" for column in columns))
    if not item.own_aim:
        lines.append(f"  aim of the plain grade {item.steel.name}")
    if item.also:
        lines.append(f"  formerly {', '.join(item.also)}")
    if item.note:
        lines.append(f"  doubt: {item.note}")
    lines += [f"  outside a range: {note}" for note in notes]
    return [*lines, ""]


def _of_row(item: GradeRow, notes: list[RangeNote] | None) -> dict[str, Any]:
    content: dict[str, Any] = {
        "name": item.name,
        "number": item.number,
        "standard": item.standard,
        "families": list(item.families),
        "formerly": list(item.also),
        "status": item.steel.status,
        "doubt": item.note,
        "aim_of": item.steel.name,
        "aim_pct": _given(item.steel.composition),
        "limits_pct": {
            limit.element: {
                "low": limit.low,
                "high": limit.high if math.isfinite(limit.high) else None,
            }
            for limit in item.limits
        },
    }
    if notes is not None:
        content["outside_range"] = [str(note) for note in notes]
    return content


def _given(composition: Composition) -> dict[str, float]:
    return {element: amount for element, amount in composition.as_dict().items() if amount}


def _own(
    path: Path, text: str, carbon: tuple[float, float] | None, against: str | None
) -> tuple[list[str], dict[str, Any]]:
    found = [item for item in read_certificates(path) if _passes(item, text, carbon)]
    if not found:
        raise InputFault("filters", "given", f"such that a steel of {path.name} passes them")
    lines: list[str] = []
    described = []
    for item in found:
        wanted = against or item.grade
        left = list(deviations(item, wanted)) if wanted else []
        notes = _range_notes(item.composition)
        lines += [*_certificate(item, wanted, left, notes), ""]
        described.append(
            {
                "name": item.name,
                "heat": item.heat,
                "works": item.works,
                "grade": item.grade,
                "standard": item.standard,
                "analysis_pct": {name: getattr(item.composition, name) for name in item.given},
                "held_against": row(wanted).name if wanted else None,
                "deviations": [
                    {"element": note.quantity, "value": note.value, "allowed": note.allowed}
                    for note in left
                ],
                "outside_range": [str(note) for note in notes],
            }
        )
    return lines, {"file": path.name, "certificates": described}


def _passes(item: Certificate, text: str, carbon: tuple[float, float] | None) -> bool:
    named = f"{item.name} {item.heat} {item.works} {item.grade} {item.standard}".casefold()
    if carbon is not None and not carbon[0] <= item.composition.C <= carbon[1]:
        return False
    return text.strip().casefold() in named


def _certificate(
    item: Certificate, wanted: str, left: list[RangeNote], notes: list[RangeNote]
) -> list[str]:
    about = [item.works, item.heat and f"heat {item.heat}", item.standard]
    about += [item.grade and f"ordered {item.grade}"]
    lines = [printable(", ".join([item.name, *filter(None, about)]))]
    lines.append(f"  {_amounts(item.composition)} (mass %)")
    if not wanted:
        lines.append("  no grade named: held against no limits")
    elif not left:
        lines.append(f"  within the limits of {row(wanted).name}, {row(wanted).standard}")
    lines += [
        f"  outside the {note.model}: {note.quantity} {note.value}, must be {note.allowed}"
        for note in left
    ]
    return lines + [f"  outside a range: {note}" for note in notes]


def _range_notes(composition: Composition) -> list[RangeNote]:
    """Models that a run would use outside their range; grain and soak left aside."""
    from midradius.thermo import equilibrium, martensite, ratesets, steel
    from midradius.thermo.ratechoice import DEFAULT

    return [
        *steel.range_notes(composition),
        *equilibrium.range_notes(composition),
        *ratesets.range_notes(DEFAULT, composition, composition.C, _USUAL_GRAIN_ASTM),
        *martensite.range_notes(composition),
    ]
