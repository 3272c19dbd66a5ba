"""``midradius calibrate``: fit a heat to its measured end-quench curve or diagram."""

import json
import logging
from pathlib import Path
from typing import TYPE_CHECKING

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.calibrate import Fitted
    from midradius.study.curvefit import CurveFit

_EPILOG = """\b
Examples:
  midradius calibrate 42CrMo4 --measured curve.csv
  midradius calibrate heat.toml --measured curve.csv --save heat-4711.toml
  midradius calibrate 4140 --measured curve.csv --grain "ASTM 8" --out heat-4711
  midradius calibrate 4140 --measured curve.csv --measured holds.csv --save heat-4711.toml

\b
A file is CSV with a head. End-quench curve: distance_mm (or distance_sixteenths_in for J
positions) and hardness_hrc. Holds: temperature_degC, time_s, product, fraction. Cooling:
rate_K_per_s (or time_800_500_s) with temperature_degC, product, fraction, or with the
final hardness_HV. Product: ferrite, pearlite, bainite, martensite, all; fraction: start,
half, finish or percent. All files are of one heat, austenitised in one way.

\b
A case uses what was saved with calibration = "heat-4711.toml" in its [steel] table,
endquench and diagram with --calibration heat-4711.toml. The folder holds tables,
pictures and calibration.json.
"""


@click.command(epilog=_EPILOG, short_help="Fit a heat to its measured end-quench curve or diagram.")
@click.argument("steel", metavar="GRADE_OR_FILE")
@click.option(
    "--measured",
    "files",
    required=True,
    multiple=True,
    type=click.Path(path_type=Path),
    help="A measured curve or diagram, CSV; up to four.",
)
@click.option("--austenitize", metavar="TEMP", help='Such as "850 degC". Default: by the steel.')
@click.option("--time", "soak_time", default="30 min", show_default=True, help="Time at heat.")
@click.option(
    "--grain", help='"ASTM 7", or "soak" for the grain it grows. Default: the file\'s, or ASTM 7.'
)
@click.option("--heat", default="", help="Which steel of a certificate that holds several.")
@click.option(
    "--kinetics", metavar="NAME", help="Set of rates. Default: the file's, or Li 1998, extended."
)
@click.option("--scatter", default="1 HRC", show_default=True, help="Of one point of the curve.")
@click.option("--save", type=click.Path(path_type=Path), help="Write the calibration, TOML.")
@click.option("--out", "folder", type=click.Path(path_type=Path), help="Write files there.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def calibrate(
    steel: str,
    files: tuple[Path, ...],
    austenitize: str | None,
    soak_time: str,
    grain: str | None,
    heat: str,
    kinetics: str | None,
    scatter: str,
    save: Path | None,
    folder: Path | None,
    as_json: bool,
) -> None:
    """Fit named shifts of a heat to its measured end-quench curve or diagram.

    Factors on the times of ferrite with pearlite and of bainite, offsets of the
    martensite start and of hardness, each with its standard error. What the data
    cannot tell is held at none.
    """
    with answered():
        from midradius.study import steelgiven
        from midradius.study.casekeys import SOAK_RANGE, STAGE_TIME_RANGE
        from midradius.study.measured import read_measured

        named = steelgiven.with_kinetics(steelgiven.given(steel, heat=heat), kinetics)
        temp = steelgiven.quantity("--austenitize", austenitize, "temperature", SOAK_RANGE)
        time = steelgiven.quantity("--time", soak_time, "duration", STAGE_TIME_RANGE)
        assert time is not None, "it has a default"
        spread = _rockwell(scatter)
        measured = read_measured(files)
        if save is not None:
            _check_target(save)

        from midradius.study import calibrate as fit
        from midradius.study.calibratesheet import document, head, remarks, save_file, write_sheet
        from midradius.study.endquench import GRAIN_ASTM, with_grain
        from midradius.study.sheetfile import written

        if grain is not None:
            named = with_grain(named, steelgiven.grain_of(grain))
        elif named.grain_astm is None:
            named = with_grain(named, GRAIN_ASTM)
        logging.getLogger("matplotlib").setLevel(logging.ERROR)

        def found() -> "Fitted":
            return fit.fitted(named, measured, temp=temp, time=time, scatter=spread)

        if folder is None:
            heat_fit = found()
        else:
            with written(folder) as work:
                heat_fit = found()
                write_sheet(heat_fit, work)
        if save is not None:
            save_file(heat_fit, save)
    if as_json:
        click.echo(json.dumps(document(heat_fit), indent=1, allow_nan=False))
        return
    for line in (*head(heat_fit), "", *_table(heat_fit), "", *remarks(heat_fit)):
        click.echo(printable(line))
    if folder is not None:
        click.echo(f"\nWritten to {printable(folder)}")
    if save is not None:
        click.echo(f"\nSaved as {printable(save)}; a case takes it by its [steel] table:")
        click.echo(f"  calibration = {json.dumps(printable(save.name))}")


def _rockwell(text: str) -> float:
    """The scatter [HRC]: a number with its unit."""
    from midradius.thermo.errors import InputFault

    number, _, unit = text.strip().partition(" ")
    try:
        value = float(number)
    except ValueError:
        value = 0.0
    if unit.strip().upper() == "HRC" and 0.1 <= value <= 10.0:
        return value
    raise InputFault("--scatter", f'"{text}"', '0.1 to 10 HRC, such as "1 HRC"')


def _check_target(path: Path) -> None:
    """Refuse before the long work what could not be written after it."""
    from midradius.study.calibrationfile import read_calibration
    from midradius.thermo.errors import InputFault

    if path.suffix.lower() != ".toml":
        raise InputFault("--save", f'"{path}"', "a file name that ends in .toml")
    if not path.parent.is_dir():
        raise InputFault("--save", f'"{path}"', "in a folder that exists")
    if path.exists():
        try:
            read_calibration(path)
        except InputFault:
            allowed = "a new name, or that of an earlier calibration"
            remedy = "It holds something else and was not touched."
            raise InputFault("--save", f'"{path}"', allowed, remedy) from None


def _table(found: "Fitted") -> list[str]:
    from midradius.study.calibratepoints import table_lines

    lines = [] if found.curve is None else _curve_lines(found.curve)
    if found.diagrams:
        lines += [*([""] if lines else []), *table_lines(found.diagrams)]
    return lines


def _curve_lines(curve: "CurveFit") -> list[str]:
    lines = ["    mm  1/16 in   measured    before     after   HRC"]
    rows = zip(
        curve.measured.distance_mm,
        curve.measured.hardness_hrc,
        curve.before_hrc,
        curve.after_hrc,
        curve.used,
        strict=True,
    )
    for z, measured, before, after, used in rows:
        said = "" if used else "   left out"
        computed = " ".join(f"{v:9.1f}" if v == v else f"{'-':>9}" for v in (before, after))
        lines.append(f"{z:6.1f} {z / 1.5875:8.4g}  {measured:9.1f} {computed}{said}")
    return lines
