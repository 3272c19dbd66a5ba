"""``midradius lever``: equilibrium of a steel, and its carbon from a micrograph."""

import json
from typing import TYPE_CHECKING

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.case import SteelInput

SCHEMA_VERSION = 1

_EPILOG = """\b
Examples, from composition to structure:
  midradius lever C45E
  midradius lever 42CrMo4 --at "740 degC" --soak "860 degC, 1 h"
  midradius lever --composition "C 1.1, Mn 0.35, Cr 1.45" --at "800 degC" --json

\b
Examples, from the structure of a slowly cooled steel to its carbon:
  midradius lever --ferrite "42 %" --counted "25 fields of 100 points"
  midradius lever C45E --ferrite "41 38.5 45 40 44 of 100"
  midradius lever --composition "Cr 1.45" --cementite "5.1 % +- 0.4 %"

\b
Hits of every field ("41 38.5 ... of 100", a point on a boundary counts half) give
the interval of ASTM E562 and ISO 9042; totals give the least there can be.
"""


@click.command(epilog=_EPILOG, short_help="Phases at equilibrium; carbon from a counted fraction.")
@click.argument("steel", metavar="[GRADE_OR_FILE]", required=False)
@click.option("--composition", metavar="TEXT", help='Mass percent: "C 0.45, Mn 0.7".')
@click.option("--heat", default="", help="Which steel of a file that holds several.")
@click.option("--at", metavar="TEMP", help='Phases at this temperature: "740 degC".')
@click.option("--soak", metavar="TEXT", help='What a soak leaves: "860 degC, 1 h".')
@click.option("--ferrite", metavar="SHARE", help="Measured proeutectoid ferrite, to carbon.")
@click.option("--cementite", metavar="SHARE", help="Measured proeutectoid cementite, to carbon.")
@click.option("--counted", metavar="TEXT", help='"25 fields of 100 points" or "2500 points".')
@click.option(
    "--basis",
    type=click.Choice(["volume", "mass"]),
    default="volume",
    show_default=True,
    help="What the share is of; a point count gives volume.",
)
@click.option("--level", default="95 %", show_default=True, help="Confidence of the interval.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def lever(
    steel: str | None,
    composition: str | None,
    heat: str,
    at: str | None,
    soak: str | None,
    ferrite: str | None,
    cementite: str | None,
    counted: str | None,
    basis: str,
    level: str,
    as_json: bool,
) -> None:
    """The lever rule, both ways.

    Forward: Ae1, Ae3 or Acm, the eutectoid, the phases at a temperature and the
    structure after slow cooling. Inverse, with --ferrite or --cementite: the carbon
    of a slowly cooled steel from a measured fraction, with its interval.
    """
    with answered():
        _check_options(at, soak, ferrite, cementite, counted)
        from midradius.study import leversheet

        asks_carbon = ferrite is not None or cementite is not None
        named = _steel(steel, composition, heat, needs_carbon=not asks_carbon)
        if asks_carbon:
            document = leversheet.inverse(named, ferrite, cementite, counted, basis, level)
        else:
            document = leversheet.forward(named, at, soak)
    if as_json:
        head = {"schema_version": SCHEMA_VERSION, **document}
        click.echo(json.dumps(head, indent=1, allow_nan=False))
        return
    tell = leversheet.carbon_lines if asks_carbon else leversheet.forward_lines
    for line in tell(document):
        click.echo(printable(line))


def _check_options(
    at: str | None,
    soak: str | None,
    ferrite: str | None,
    cementite: str | None,
    counted: str | None,
) -> None:
    from midradius.thermo.errors import InputFault

    if ferrite is not None and cementite is not None:
        remedy = "A steel sheds one of the two before pearlite."
        allowed = "left out where --ferrite is given"
        raise InputFault("--cementite", f'"{cementite}"', allowed, remedy)
    if ferrite is None and cementite is None:
        if counted is not None:
            allowed = "given beside --ferrite or --cementite"
            raise InputFault("--counted", f'"{counted}"', allowed)
        return
    for option, value in (("--at", at), ("--soak", soak)):
        if value is not None:
            allowed = "left out where carbon is asked for"
            raise InputFault(option, f'"{value}"', allowed, "Ask in two commands.")


def _steel(
    steel: str | None, composition: str | None, heat: str, *, needs_carbon: bool
) -> "SteelInput":
    from midradius.study import levertext, steelgiven
    from midradius.study.case import SteelInput
    from midradius.thermo.errors import InputFault

    if steel is not None and composition is not None:
        allowed = "left out where a grade or file is given"
        raise InputFault("--composition", f'"{composition}"', allowed)
    if steel is not None:
        return steelgiven.given(steel, heat=heat)
    if composition is not None:
        return SteelInput(levertext.composition(composition, needs_carbon=needs_carbon))
    if needs_carbon:
        remedy = 'Write for example: midradius lever C45E, or --composition "C 0.45, Mn 0.7".'
        raise InputFault("steel", "not given", "a grade, a file or --composition", remedy)
    return SteelInput(levertext.plain())
