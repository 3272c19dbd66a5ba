"""``midradius mesh``: a mesh file from an outline of CAD."""

import json
import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from midradius.study.cli_answer import answered, printable

if TYPE_CHECKING:
    from midradius.fem.outline import Meshed

SCHEMA_VERSION = 1

_EPILOG = """\b
Examples:
  midradius mesh rail.dxf --out rail.msh --sense plane --film "1200 W/(m2 K)"
  midradius mesh blank.dxf --out blank.msh --sense axisymmetric --finest "0.5 mm"
  midradius mesh bracket.step --out bracket.msh --sense solid --finest "1 mm"
  midradius mesh hub.step --out hub.msh --sense axisymmetric --finest "0.5 mm"
      --point "0, 0, 0 mm" --normal "0, 1, 0" --axis "0, 0, 1"

\b
Layers of a drawing name the surface zones of the mesh; layer 0 is "surface", and
what lies on x = 0 of an axisymmetric section is "axis". A section is drawn with x
as radius, y along the axis. The mesh is written in mm, as .msh 4.1.
"""


@click.command(epilog=_EPILOG, short_help="A mesh from a DXF or STEP outline.")
@click.argument("outline", type=click.Path(path_type=Path))
@click.option("--out", "target", type=click.Path(path_type=Path), help="Default: OUTLINE.msh.")
@click.option(
    "--sense",
    type=click.Choice(["plane", "axisymmetric", "solid"]),
    required=True,
    help="A long bar, a body of revolution, or the solid itself.",
)
@click.option("--film", metavar="TEXT", help='Strongest film, for the cells: "2000 W/(m2 K)".')
@click.option("--accuracy", metavar="TEXT", default="0.5 K", show_default=True)
@click.option("--finest", metavar="TEXT", help='Surface cells, instead of --film: "0.5 mm".')
@click.option("--nodes", "most", type=click.IntRange(100, 10_000_000), help="At most so many.")
@click.option("--length-unit", metavar="UNIT", help="Of a drawing that states none: mm, in, ...")
@click.option("--layers", metavar="TEXT", default="", help='Of a drawing: "outside, bore".')
@click.option("--point", metavar="TEXT", help='Of the slicing plane: "0, 0, 100 mm".')
@click.option("--normal", metavar="TEXT", help='Of the slicing plane: "0, 1, 0".')
@click.option("--axis", metavar="TEXT", help='Direction up in the slice: "0, 0, 1".')
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def mesh(
    outline: Path,
    target: Path | None,
    sense: Any,
    film: str | None,
    accuracy: str,
    finest: str | None,
    most: int | None,
    length_unit: str | None,
    layers: str,
    point: str | None,
    normal: str | None,
    axis: str | None,
    as_json: bool,
) -> None:
    """Mesh OUTLINE: cells fine at the cooled surface, area compared with CAD.

    Needs the extra: pip install 'midradius[cad]'.
    """
    with answered():
        from midradius.fem.outline import Slice, first_cell, mesh_outline
        from midradius.thermo.errors import InputFault
        from midradius.thermo.units import parse

        if (film is None) == (finest is None):
            value = "not given" if film is None else "both given"
            raise InputFault("--film or --finest", value, "one of the two")
        if finest is not None:
            first = parse(finest, "length")
        else:
            assert film is not None
            strength = parse(film, "heat-transfer coefficient")
            if not 1.0 <= strength <= 1e6:
                raise InputFault("--film", f'"{film}"', "1 to 1e6 W/(m2 K)")
            first = first_cell(strength, _accuracy(parse(accuracy, "temperature difference")))
        if not 1e-6 <= first <= 1.0:
            raise InputFault("--finest", f'"{finest}"', "1 um to 1 m")
        if (point is None) != (normal is None) or (axis is not None and normal is None):
            raise InputFault("--point and --normal", "one given", "both given, or neither")
        cut = None
        if point is not None and normal is not None:
            up = None if axis is None else _direction("--axis", axis)
            cut = Slice(_place(point), _direction("--normal", normal), up)
        path = target if target is not None else outline.with_suffix(".msh")
        if path.suffix.lower() != ".msh":
            raise InputFault("--out", f'"{printable(path)}"', "a file that ends with .msh")
        made = mesh_outline(
            outline,
            path,
            sense=sense,
            first=first,
            length_unit=length_unit,
            layers=tuple(part.strip() for part in layers.split(",") if part.strip()),
            cut=cut,
            most_nodes=most,
        )
    if as_json:
        click.echo(json.dumps(_document(made), indent=1, allow_nan=False))
        return
    for line in _lines(made):
        click.echo(printable(line))


def _accuracy(value: float) -> float:
    from midradius.study.casekeys import ACCURACY_RANGE
    from midradius.thermo.errors import InputFault

    low, high = ACCURACY_RANGE
    if not low <= value <= high:
        raise InputFault("--accuracy", f'"{value:g} K"', f"{low:g} to {high:g} K")
    return value


def _numbers(option: str, text: str) -> tuple[float, float, float]:
    from midradius.thermo.errors import InputFault

    parts = [part for part in re.split(r"[,\s]+", text.strip()) if part]
    try:
        x, y, z = (float(part) for part in parts)
    except ValueError:
        raise InputFault(option, f'"{text}"', 'three numbers, such as "0, 1, 0"') from None
    return x, y, z


def _direction(option: str, text: str) -> tuple[float, float, float]:
    return _numbers(option, text)


def _place(text: str) -> tuple[float, float, float]:
    """Three numbers and one unit of length, or one unit each."""
    from midradius.thermo.errors import InputFault
    from midradius.thermo.units import parse

    parts = [part.strip() for part in text.split(",")]
    unit = re.search(r"[A-Za-zμ]+$", parts[-1])
    if len(parts) != 3 or unit is None:
        raise InputFault("--point", f'"{text}"', 'three lengths, such as "0, 0, 100 mm"')
    x, y, z = (
        parse(part if part[-1:].isalpha() else f"{part} {unit[0]}", "length") for part in parts
    )
    return x, y, z


def _document(made: "Meshed") -> dict[str, Any]:
    return {
        "schema_version": SCHEMA_VERSION,
        "mesh": str(made.path),
        "length_unit": "mm",
        "sense": made.sense,
        "nodes": made.n_node,
        "cells": made.n_cell,
        "surface_cell_mm": made.first * 1e3,
        "content": made.content,
        "content_of_cad": made.cad_content,
        "content_unit": "m3" if made.sense == "solid" else "m2",
        "worst_cell_quality": made.worst,
        "size_mm": [v * 1e3 for v in made.size],
        "zones": list(made.zones),
        "notes": list(made.notes),
    }


def _lines(made: "Meshed") -> list[str]:
    solid = made.sense == "solid"
    what, unit, scale = ("volume", "cm3", 1e6) if solid else ("area", "cm2", 1e4)
    sizes = " x ".join(f"{v * 1e3:.6g}" for v in made.size[: 3 if solid else 2])
    lines = [
        f"{made.path}: {made.n_node} nodes, {made.n_cell} cells, {sizes} mm, written in mm",
        f"surface cells {made.first * 1e3:.3g} mm, lowest cell quality {made.worst:.2f}",
        f"{what} {made.content * scale:.7g} {unit}; CAD states {made.cad_content * scale:.7g} "
        f"({-100.0 * made.missing_share:+.3f} %)",
        f"surface zones: {', '.join(made.zones)}",
    ]
    return lines + [f"Note: {note}" for note in made.notes]
