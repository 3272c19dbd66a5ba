"""``midradius endquench``: the end-quench test of a steel."""

import json
import logging
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.endquench import EndQuench

_EPILOG = """\b
Examples:
  midradius endquench 42CrMo4
  midradius endquench heat.toml --austenitize "860 degC" --out heat-end-quench
  midradius endquench 4140 --json > 4140.json
  midradius endquench 42CrMo4 --section shaft

\b
A file is the [steel] table of a case (TOML) or a works' certificate (TOML, CSV).
The folder holds end-quench.csv, end-quench.png and end-quench.json.
"""


@click.command(epilog=_EPILOG, short_help="Simulate the end-quench test of a steel.")
@click.argument("steel", metavar="GRADE_OR_FILE")
@click.option("--austenitize", metavar="TEMP", help='Such as "850 degC". Default: by the steel.')
@click.option("--time", "soak_time", default="30 min", show_default=True, help="Time at heat.")
@click.option(
    "--grain", help='"ASTM 7", or "soak" for the grain it grows. Default: the file\'s, or ASTM 7.'
)
@click.option("--heat", default="", help="Which steel of a certificate that holds several.")
@click.option(
    "--kinetics", metavar="NAME", help="Set of rates. Default: the file's, or Li 1998, extended."
)
@click.option(
    "--calibration",
    type=click.Path(path_type=Path),
    help="What midradius calibrate saved for this heat, TOML.",
)
@click.option(
    "--section",
    type=click.Path(path_type=Path),
    help="A result folder: also say which distance cools like its positions.",
)
@click.option("--out", "folder", type=click.Path(path_type=Path), help="Write files there.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def endquench(
    steel: str,
    austenitize: str | None,
    soak_time: str,
    grain: str | None,
    heat: str,
    kinetics: str | None,
    calibration: Path | None,
    section: Path | None,
    folder: Path | None,
    as_json: bool,
) -> None:
    """Simulate the end-quench test of a steel with the solver.

    The test piece of ISO 642 and ASTM A255: hardness over distance from the quenched
    end, beside two estimates from the composition alone and the standard's band.
    """
    with answered():
        from midradius.study import steelgiven
        from midradius.study.casekeys import SOAK_RANGE, STAGE_TIME_RANGE

        named = steelgiven.with_kinetics(steelgiven.given(steel, heat=heat), kinetics)
        named = steelgiven.calibrated(named, calibration)
        temp = steelgiven.quantity("--austenitize", austenitize, "temperature", SOAK_RANGE)
        time = steelgiven.quantity("--time", soak_time, "duration", STAGE_TIME_RANGE)
        assert time is not None, "it has a default"

        from midradius.study import endquench as solver

        if grain is not None:
            named = solver.with_grain(named, steelgiven.grain_of(grain))
        elif named.grain_astm is None:
            named = solver.with_grain(named, solver.GRAIN_ASTM)
        logging.getLogger("matplotlib").setLevel(logging.ERROR)
        from midradius.study.endquenchsheet import document, write_sheet
        from midradius.study.sheetfile import written

        def tested() -> "tuple[EndQuench, dict[str, Any]]":
            test = solver.endquench(named, temp=temp, time=time)
            return test, {} if section is None else {"equivalents": _equivalents(section, test)}

        if folder is None:
            test, extra = tested()
        else:
            with written(folder) as work:
                test, extra = tested()
                write_sheet(test, work, extra)
    if as_json:
        click.echo(json.dumps({**document(test), **extra}, indent=1, allow_nan=False))
        return
    for line in (*_head(test), "", *_table(test), "", *_estimates(test), *_places(extra)):
        click.echo(line)
    if test.notes:
        click.echo("\nModels used outside the range of their source")
    for note in test.notes:
        click.echo(f"- {printable(note)}")
    if folder is not None:
        click.echo(f"\nWritten to {printable(folder)}")


def _equivalents(section: Path, test: "EndQuench") -> list[dict[str, object]]:
    import numpy as np

    from midradius.fem.record import read_record
    from midradius.study.endquench import distance_of
    from midradius.study.sheetfile import record_path
    from midradius.study.summary import jsonable

    record = read_record(record_path(section))
    names = [item["name"] for item in json.loads(record.text["positions_json"])]
    times = record.data["positions/time_800_500_s"].values
    away = distance_of(np.asarray(times, dtype=np.float64), test)
    rows = [
        {"position": name, "time_800_500_s": time, "distance_mm": place}
        for name, time, place in zip(names, times.tolist(), away.tolist(), strict=True)
    ]
    plain: list[dict[str, object]] = jsonable(rows)
    return plain


def _head(test: "EndQuench") -> list[str]:
    from midradius.study.endquench import ZERO_DEGC

    mass = ", ".join(f"{k} {v:.3g}" for k, v in vars(test.steel.composition).items() if v)
    return [
        f"End-quench test of {printable(test.steel.name)} ({mass} % by mass)",
        f"austenitised at {test.austenitize - ZERO_DEGC:.0f} degC ({test.reason})",
        f"soak: {test.result.soak}",
        f"rates: {test.kinetics.name}",
        *(printable(line) for line in test.result.assumptions if line.startswith("calibration ")),
    ]


def _table(test: "EndQuench") -> list[str]:
    """The distances of the steel's own standard, sixteenths for the American one."""
    from midradius.study.endquench import A255, ISO_MM, JUST, SIXTEENTH_MM
    from midradius.study.endquenchsheet import band_at

    american = test.steel.standard.startswith(("SAE", "ASTM"))
    low, high = band_at(test)
    hv, martensite = test.column("hardness_hv"), 100.0 * test.column("martensite")
    rate, spent = test.column("rate_700_K_per_s"), test.column("time_800_500_s")
    heads = (
        "mm",
        "1/16 in",
        "HV",
        "HRC",
        "martensite",
        "K/s at",
        "800-500",
        "Just",
        "A255",
        "band",
    )
    units = ("", "", "", "", "%", "700 degC", "degC, s", "HRC", "HRC", "HRC")
    lines = [_line(heads), _line(units)]
    for i, z in enumerate(test.distance_mm):
        position = z / SIXTEENTH_MM
        is_sixteenth = abs(position - round(position)) < 1e-6
        if is_sixteenth != american and not (not american and z in ISO_MM):
            continue
        limits = f"{low[i]:.0f}-{high[i]:.0f}" if low[i] == low[i] else ""
        cells = (
            *(f"{z:.1f}", f"{position:.4g}", f"{hv[i]:.0f}", _number(test.hardness_hrc[i], 1)),
            *(_number(martensite[i], 1), _brief(rate[i]), _brief(spent[i])),
            *(_number(test.estimates[name][i], 1) for name in (JUST, A255)),
            limits,
        )
        lines.append(_line(cells))
    return lines


def _line(cells: Sequence[str]) -> str:
    widths = (6, 8, 5, 6, 11, 9, 8, 6, 6, 7)
    return " ".join(f"{cell:>{width}}" for cell, width in zip(cells, widths, strict=True)).rstrip()


def _number(value: float, digits: int) -> str:
    return f"{value:.{digits}f}" if value == value else "-"


def _brief(value: float) -> str:
    return f"{value:.3g}" if value == value else "-"


def _estimates(test: "EndQuench") -> list[str]:
    beyond = "none, its source does not reach this composition"
    ideal = f"{1e3 * test.ideal_diameter:.0f} mm ({test.ideal_diameter / 0.0254:.2f} in)"
    critical = f"{test.critical.full:.2f} K/s for all martensite, {test.critical.half:.2f} for half"
    ideal = ideal if test.ideal_diameter == test.ideal_diameter else beyond
    critical = critical if test.critical.full == test.critical.full else beyond
    lines = [
        "Just and A255 are independent estimates from the composition alone, not from the solver.",
        f"ideal diameter (ASTM A255): {ideal}",
        f"critical cooling rate at 700 degC (Maynier): {critical}",
    ]
    if test.band is not None:
        memory = " (from memory, 3 HRC either way)" if test.band.status == "remembered" else ""
        lines.append(f"band: {test.band.name}, {test.band.source}{memory}")
    return lines


def _places(extra: "dict[str, Any]") -> list[str]:
    if not extra:
        return []
    lines = ["", "Positions of the section, by time from 800 to 500 degC"]
    for row in extra["equivalents"]:
        away, spent = row["distance_mm"], row["time_800_500_s"]
        said = (
            f"{away:.1f} mm from the quenched end" if away is not None else "no equivalent distance"
        )
        time = f"{spent:.3g} s" if spent is not None else "not crossed"
        lines.append(f"  {printable(row['position']):24} {time:>12}   {said}")
    return lines
