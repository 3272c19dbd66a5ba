"""The end-quench test piece as a case of the main job.

Geometry and practice: ISO 642 and ASTM A255 (from memory): round of 25.4 mm, 100 mm
long, 30 min at heat, the near end under a water jet of 20 degC for at least 10 min,
hardness on flats 0.4 mm deep. Of the part of the side that the jet leaves dry the
standards say nothing but that it must not scale in the furnace: still air of the medium
list and a bright surface, emissivity 0.4 (0.35 to 0.5, an estimate), unless asked otherwise.
The few seconds between furnace and jet are left out.
"""

import csv
from functools import cache
from pathlib import Path

import numpy as np
from scipy.interpolate import CubicSpline

from midradius.study.case import (
    Case,
    Grid,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
)
from midradius.study.result import Position, Result
from midradius.study.runner import run
from midradius.thermo.grades import grade

ZERO = 273.15
DIAMETER, LENGTH, FLAT = 25.4e-3, 0.1, 0.4e-3
SIXTEENTH_MM = 25.4 / 16.0
# Austenitising temperature [degC]: ASTM A255 for the SAE grades, EN ISO 683-2 (from memory)
SOAK_DEGC = {"1045": 845.0, "4130": 870.0, "4140": 845.0, "4340": 845.0, "42CrMo4": 850.0}
# Both band standards hold for fine-grain steel; A255 computes with ASTM 7
GRAIN_ASTM = 7.0
# Against (8, 192) cells and a quarter of a kelvin the hardness moves by 0.3 HRC at most
BRIGHT = 0.4
CELLS, ACCURACY = (4, 96), 1.0

Row = dict[str, str]


def rows(name: str) -> list[Row]:
    """Rows of ``tests/published/NAME.csv``."""
    text = (Path(__file__).parent / f"{name}.csv").read_text(encoding="utf-8")
    return list(csv.DictReader(text.splitlines()))


def distances() -> tuple[float, ...]:
    """Every distance [mm] of the bands and of the chart of rates, ascending."""
    asked = [
        row["distance_mm"] for name in ("bands", "rates") for row in rows(f"end_quench_{name}")
    ]
    return tuple(sorted({float(text) for text in asked}))


def piece(
    steel: str, *, side: str, cells: tuple[int, ...] = CELLS, accuracy: float = ACCURACY
) -> Case:
    """The test piece; ``side`` is the medium of the side and of the far end.

    One count of ``cells`` makes it a slab 100 mm thick with an insulated far face.
    """
    jet, dry = MediumUse("end-quench water jet"), MediumUse(side)
    if len(cells) == 1:
        section = SectionInput("slab", thickness=LENGTH)
        faces = {"near face": jet, "far face": MediumUse("insulated")}
    else:
        section = SectionInput("round", diameter=DIAMETER, length=LENGTH, emissivity=BRIGHT)
        faces = {"near end": jet, "side": dry, "far end": dry}
    radius = () if len(cells) == 1 else (DIAMETER / 2.0 - FLAT,)
    places = tuple(
        PositionInput(f"{z:g} mm", "coordinates", coordinates=(*radius, 1e-3 * z))
        for z in distances()
    )
    return Case(
        title=f"end quench of {steel}",
        steel=SteelInput(grade(steel), GRAIN_ASTM),
        section=section,
        route=(
            Stage("soak", at=SOAK_DEGC[steel] + ZERO, time=1800.0),
            Stage("quench", time=600.0, faces=faces),
        ),
        outputs=Outputs(places, n_field=4),
        grid=Grid(cells, accuracy),
    )


@cache
def quenched(steel: str, side: str = "still air", cells: tuple[int, ...] = CELLS) -> Result:
    """The test piece after its quench."""
    return run(piece(steel, side=side, cells=cells))


def at(result: Result, distance_mm: float) -> Position:
    """The position at a distance from the quenched end."""
    return result.positions[distances().index(distance_mm)]


def rate_at(result: Result, distance_mm: float, temp_degC: float) -> float:
    """Cooling rate [K/s] when a distance cools through a temperature, from its history."""
    temp = result.history_temp_degC[:, distances().index(distance_mm)]
    below = int(np.argmax(temp < temp_degC))
    near = slice(max(0, below - 4), below + 4)
    curve = CubicSpline(result.history_times_s[near], temp[near])
    moment = curve.solve(temp_degC, extrapolate=False)[0]
    return -float(curve(moment, 1))
