"""``midradius diagram``: how a steel transforms, held or cooled."""

import json
import logging
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.study.case import SteelInput
    from midradius.study.diagram import Cooling, Isothermal, Soaked
    from midradius.study.sectioncurves import SectionCurves

_EPILOG = """\b
Examples:
  midradius diagram 42CrMo4 --kind cooling
  midradius diagram heat.toml --kind isothermal --grain "ASTM 8" --out heat-isothermal
  midradius diagram 42CrMo4 --kind cooling --result shaft

\b
A file is the [steel] table of a case (TOML) or a works' certificate (TOML, CSV).
The folder holds a table and a picture, named after the kind of diagram.
"""


@click.command(epilog=_EPILOG, short_help="Draw how a steel transforms, held or cooled.")
@click.argument("steel", metavar="GRADE_OR_FILE")
@click.option("--kind", type=click.Choice(["isothermal", "cooling"]), required=True)
@click.option(
    "--result",
    "section",
    type=click.Path(path_type=Path),
    help="A result folder, its record.h5, or a case to solve: its cooling curves on top.",
)
@click.option(
    "--austenitize", metavar="TEMP", help='Such as "850 degC". Default: the result\'s, or by steel.'
)
@click.option("--time", "soak_time", help="Time at heat. Default: the result's, or 30 min.")
@click.option(
    "--grain",
    help='"ASTM 7", or "soak" for what it grows. Default: the result\'s or file\'s, or ASTM 7.',
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
    "--out", "folder", type=click.Path(path_type=Path), help="Default: named by steel and kind."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def diagram(
    steel: str,
    kind: str,
    section: Path | None,
    austenitize: str | None,
    soak_time: str | None,
    grain: str | None,
    heat: str,
    kinetics: str | None,
    calibration: Path | None,
    folder: Path | None,
    as_json: bool,
) -> None:
    """Draw the isothermal or the continuous-cooling diagram of a steel.

    From the same rate equations as every run, for one heat and one soak; with the
    cooling curves of a section on top. Writes a table and a picture.
    """
    with answered():
        from midradius.study import steelgiven
        from midradius.study.casekeys import SOAK_RANGE, STAGE_TIME_RANGE

        named = steelgiven.with_kinetics(steelgiven.given(steel, heat=heat), kinetics)
        named = steelgiven.calibrated(named, calibration)
        temp = steelgiven.quantity("--austenitize", austenitize, "temperature", SOAK_RANGE)
        time = steelgiven.quantity("--time", soak_time, "duration", STAGE_TIME_RANGE)
        asked_grain = None if grain is None else (steelgiven.grain_of(grain),)
        logging.getLogger("matplotlib").setLevel(logging.ERROR)

        from midradius.study import diagram as solver
        from midradius.study.diagramsheet import cooling_picture, isothermal_picture
        from midradius.study.diagramtable import table
        from midradius.study.sectioncurves import curves_of
        from midradius.study.sheetfile import write_picture, write_table, written
        from midradius.thermo.austenitizing import SOAK_TIME, austenitizing

        curves = None if section is None else curves_of(section)
        if asked_grain is not None:
            (grain_astm,) = asked_grain
        elif curves is not None:
            grain_astm = curves.grain_astm
        else:
            grain_astm = 7.0 if named.grain_astm is None else named.grain_astm
        if temp is None:
            temp = curves.soak_temp if curves else austenitizing(named.steel).temp
        if time is None:
            time = curves.soak_time if curves else SOAK_TIME
        metal = solver.soaked(
            named.steel,
            temp=temp,
            time=time,
            grain_astm=grain_astm,
            shifts=named.shifts,
            kinetics=named.kinetics,
        )
        found = solver.isothermal(metal) if kind == "isothermal" else solver.cooling(metal)
        target = folder
        if target is None and not as_json:
            target = Path(f"{_file_name(named.steel.name)}-{kind}")
        if target is not None:
            with written(target) as work:
                write_table(work / f"{kind}.csv", table(metal, found))
                if isinstance(found, solver.Isothermal):
                    figure = isothermal_picture(metal, found, curves)
                else:
                    figure = cooling_picture(metal, found, curves)
                write_picture(work / f"{kind}.png", figure)
        notes = [*_of_calibration(named, metal), *_notes(metal, curves, kind)]
    if as_json:
        click.echo(json.dumps(_document(metal, found, notes), indent=1, allow_nan=False))
        return
    for line in _summary(metal, found):
        click.echo(line)
    for note in notes:
        click.echo(f"- {printable(note)}")
    if target is not None:
        click.echo(f"\nWritten to {printable(target)}")


def _file_name(name: str) -> str:
    kept = "".join(c if c.isalnum() or c in "+-." else "-" for c in name).strip("-.")
    return kept or "steel"


def _notes(metal: "Soaked", curves: "SectionCurves | None", kind: str) -> list[str]:
    notes = [str(note) for note in metal.notes]
    if curves is not None and kind == "isothermal":
        notes.append("what forms along a cooling curve is read from --kind cooling, not from holds")
    own = {k: v for k, v in vars(metal.steel.composition).items() if v}
    if curves is not None and curves.composition_pct != own:
        notes.append(f"the section's curves are those of {curves.steel}, another composition")
    return notes


def _of_calibration(named: "SteelInput", metal: "Soaked") -> list[str]:
    if named.calibration is None:
        return []
    from midradius.study.basis import calibration_notes
    from midradius.study.calibrationfile import CalibratedSoak
    from midradius.study.diagram import ZERO_DEGC

    left = metal.austenite
    soak = CalibratedSoak(
        metal.soak_temp - ZERO_DEGC, metal.soak_time, left.grain_astm, left.carbon_pct
    )
    apart = calibration_notes(named, soak)
    return [named.calibration.text, *(str(note) for note in apart)]


def _document(metal: "Soaked", found: "Isothermal | Cooling", notes: list[str]) -> dict[str, Any]:
    from midradius.study.diagram import ZERO_DEGC
    from midradius.study.diagramtable import table
    from midradius.study.summary import SCHEMA_VERSION, jsonable

    heads, *rows = table(metal, found)
    content = {
        "schema_version": SCHEMA_VERSION,
        "grade": metal.steel.name,
        "austenitize_degC": round(metal.soak_temp - ZERO_DEGC, 6),
        "soak_time_s": metal.soak_time,
        "grain_astm": metal.austenite.grain_astm,
        "kinetics": metal.kinetics.name,
        "transformation": metal.kinetics.measured and metal.kinetics.measured.name,
        "critical_degC": {name: t - ZERO_DEGC for name, t in metal.critical.items()},
        "critical_rates_K_per_s": getattr(found, "critical", None),
        "table": {str(h): [row[k] for row in rows] for k, h in enumerate(heads)},
        "notes": notes,
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def _summary(metal: "Soaked", found: "Isothermal | Cooling") -> list[str]:
    from midradius.study.diagram import DIFFUSIONAL, ZERO_DEGC, Cooling

    left = metal.austenite
    critical = ", ".join(f"{n} {t - ZERO_DEGC:.0f}" for n, t in metal.critical.items())
    lines = [
        f"{printable(metal.steel.name)}: {metal.soak_temp - ZERO_DEGC:.0f} degC, "
        f"{metal.soak_time / 60.0:.3g} min, {left.carbon_pct:.3f} % C in solution, "
        f"grain ASTM {left.grain_astm:.1f}",
        f"{critical} degC",
        printable(metal.kinetics.text),
    ]
    if isinstance(found, Cooling):
        for name, rate in found.critical.items():
            said = f"{rate:.3g} K/s" if rate == rate else "not among the rates drawn"
            lines.append(f"  {name:22} {said}")
        return lines
    for name in DIFFUSIONAL:
        temp, time = found.nose(name)
        if time == time:
            lines.append(
                f"  {name:12} starts earliest at {temp - ZERO_DEGC:.0f} degC, {time:.3g} s"
            )
    return lines
