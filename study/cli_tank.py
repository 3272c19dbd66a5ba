"""``midradius tank``: how large a tank and a cooler must be."""

import json
import logging
import sys
from pathlib import Path

import click

from midradius.study.cli_answer import NOT_MET, answered, printable

_EPILOG = """\b
Examples:
  midradius tank shafts.toml
  midradius tank shafts.toml --out shafts-tank --json > tank.json

\b
The case needs [load] and [tank]; [[shift]] gives the loads of a day. The folder holds:
  bath.csv, loads.csv     the bath through the first and the periodic day, load by load
  load_heat.csv           what one load gives off, and its bath meanwhile
  sizing.csv              least cooler on volume
  tank.json               all of it, with checks, cautions and sources
  bath.png, load_heat.png, sizing.png

\b
Exit code 1: the design is not acceptable (limit, flash point, film, level, rise,
readiness), or what decides it could not be judged: give flash_point of the oil, and
length, width and depth of the tank.
"""


@click.command(epilog=_EPILOG, short_help="Size a quench tank and its cooler for a load.")
@click.argument("case", type=click.Path(path_type=Path))
@click.option(
    "--out",
    "folder",
    type=click.Path(path_type=Path),
    help="Result folder; an earlier midradius result there is replaced. Default: CASE-tank.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
@click.option("--quiet", is_flag=True, help="Print nothing but errors.")
def tank(case: Path, folder: Path | None, as_json: bool, quiet: bool) -> None:
    """Heat of the load, bath through the shift, least tank and cooler of CASE.

    Bath and load are solved as one; every figure comes with the effect of the film
    coefficients' uncertainty. The tool decides nothing about safety.
    """
    with answered():
        from midradius.study.casefile import read

        asked = read(case)
        logging.getLogger("matplotlib").setLevel(logging.ERROR)
        from midradius.study import tankjob

        target = folder if folder is not None else Path(f"{case.stem}-tank")
        found = tankjob.run(asked, target)
        if as_json:
            from midradius.study.tanksheet import document

            click.echo(json.dumps(document(found), indent=1, allow_nan=False))
        elif not quiet:
            from midradius.study.tanktext import lines

            for line in lines(found):
                click.echo(printable(line))
            click.echo(f"\nWritten to {printable(target)}")
    if not found.acceptable:
        sys.exit(NOT_MET)
