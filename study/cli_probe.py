"""``midradius probe``: a bath's film from the cooling curve of a probe."""

import json
import logging
from pathlib import Path
from typing import TYPE_CHECKING

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.probejob import ProbeFound

_EPILOG = """\b
Examples:
  midradius probe curve.csv --bath "60 degC" --out oil-7
  midradius probe curve.csv --bath "60 degC" --save oil-7.csv
  midradius probe dummy.csv --bath "40 degC" --material "stainless 1.4301" \\
    --diameter "80 mm" --depth "5 mm" --out dummy

\b
The curve is CSV with a head: time_s, temperature_degC. Time counts from the first reading,
or from --immersed. Without more it is the probe of ISO 9950 and ASTM D6200: alloy 600,
12.5 mm, thermocouple in the middle. A case uses the film with film = "oil-7.csv" and its
bath in place of a medium. The folder holds film.csv, probe.csv, probe.json and pictures.
"""


@click.command(epilog=_EPILOG, short_help="A bath's film from the cooling curve of a probe.")
@click.argument("curve", metavar="CURVE", type=click.Path(path_type=Path))
@click.option("--bath", required=True, metavar="TEMP", help='Of the measurement, "60 degC".')
@click.option("--material", default="alloy 600", show_default=True, help="Of the round.")
@click.option("--diameter", default="12.5 mm", show_default=True)
@click.option("--depth", help="Of the thermocouple below the surface. Default: the middle.")
@click.option("--immersed", help='When it went in, by the clock of the file, "12.4 s".')
@click.option("--future", help='Span of the future steps, "0.85 s". Default: by depth.')
@click.option("--sharpen/--no-sharpen", default=True, help="Fit the film to the whole curve.")
@click.option("--save", type=click.Path(path_type=Path), help="Write the film, CSV.")
@click.option("--out", "folder", type=click.Path(path_type=Path), help="Write files there.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def probe(
    curve: Path,
    bath: str,
    material: str,
    diameter: str,
    depth: str | None,
    immersed: str | None,
    future: str | None,
    sharpen: bool,
    save: Path | None,
    folder: Path | None,
    as_json: bool,
) -> None:
    """Say what a probe's cooling curve shows, and find the film of its bath.

    Highest cooling rate, rate at 300 degC, times; by inverse conduction the film
    coefficient over surface temperature, put back into the probe to show what is left.
    """
    with answered():
        from midradius.fem.probemetal import probe_metal
        from midradius.study import steelgiven
        from midradius.study.probecurve import read_probe
        from midradius.thermo.errors import InputFault

        wide = steelgiven.quantity("--diameter", diameter, "length", (2e-3, 1.0))
        temp = steelgiven.quantity("--bath", bath, "temperature", (253.15, 873.15))
        assert wide is not None and temp is not None, "both are given"
        deep = steelgiven.quantity("--depth", depth, "length", (1e-4, 0.5 * wide))
        start = None if immersed is None else _seconds("--immersed", immersed)
        span = None if future is None else _seconds("--future", future)
        metal = probe_metal(material)
        if save is not None:
            _check_target(save)
        read = read_probe(curve, immersed=start)
        logging.getLogger("matplotlib").setLevel(logging.ERROR)

        from midradius.study import probejob
        from midradius.study.probesheet import (
            CAUTIONS,
            document,
            head,
            remarks,
            save_film,
            write_sheet,
        )
        from midradius.study.sheetfile import written

        if span is not None and not span > 0.0:
            raise InputFault("--future", f'"{future}"', "more than 0 s")
        setting = probejob.ProbeSetting(
            metal=metal,
            diameter=wide,
            depth=0.5 * wide if deep is None else deep,
            bath=temp,
            span=span,
            sharpen=sharpen,
        )

        def found() -> "ProbeFound":
            return probejob.probed(read, setting)

        if folder is None:
            evaluated = found()
        else:
            with written(folder) as work:
                evaluated = found()
                write_sheet(evaluated, work)
        if save is not None:
            save_film(evaluated, save)
    if as_json:
        click.echo(json.dumps(document(evaluated), indent=1, allow_nan=False))
        return
    for line in (*head(evaluated), "", *remarks(evaluated), ""):
        click.echo(printable(line))
    click.echo("Caution")
    for line in CAUTIONS:
        click.echo(f"- {line}")
    if folder is not None:
        click.echo(f"\nWritten to {printable(folder)}")
    if save is not None:
        click.echo(f"\nSaved as {printable(save)}; a stage of a case takes it by")
        click.echo(f"  film = {json.dumps(printable(save.name))}")
        click.echo(f'  bath = "{temp - 273.15:.4g} degC"')


def _seconds(name: str, text: str) -> float:
    from midradius.study import steelgiven

    value = steelgiven.quantity(name, text, "duration", (0.0, 1e6))
    assert value is not None, "it is given"
    return value


def _check_target(path: Path) -> None:
    """Refuse before the work what could not be written after it."""
    from midradius.fem.filmfile import MEASURED
    from midradius.thermo.errors import InputFault

    if path.suffix.lower() != ".csv":
        raise InputFault("--save", f'"{path}"', "a file name that ends in .csv")
    if not path.parent.is_dir():
        raise InputFault("--save", f'"{path}"', "in a folder that exists")
    if path.exists():
        with path.open("r", encoding="utf-8", errors="replace") as file:
            own = file.readline().startswith(MEASURED)
        if not own:
            allowed = "a new name, or that of an earlier film of this command"
            remedy = "It holds something else and was not touched."
            raise InputFault("--save", f'"{path}"', allowed, remedy)
