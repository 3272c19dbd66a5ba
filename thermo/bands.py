"""Hardenability bands that standards print for a grade, where one is at hand.

Source
------
EN ISO 683-2 H band of 42CrMo4 (read on a supplier's page); SAE J1268 / ASTM A304 bands of
1045H, 4130H, 4140H, 4340H (remembered: 3 HRC either way). ``bands.csv`` names both by row.

Holds for
---------
Heats within the limits of the H grade, fine-grain, tested as the standard says.
"""

import csv
from dataclasses import dataclass
from functools import cache
from importlib import resources

from midradius.thermo.errors import InputFault
from midradius.thermo.grades import row
from midradius.thermo.source import Source

SOURCES = (
    Source("hardenability band of 42CrMo4", "EN ISO 683-2", "via a supplier's page", "read"),
    Source("hardenability bands", "SAE J1268, ASTM A304", "bands.csv", "remembered"),
)

UNSURE_HRC = {"read": 0.0, "remembered": 3.0}


@dataclass(frozen=True)
class BandPoint:
    """Lowest and highest hardness [HRC] at one ``distance`` [m] from the quenched end."""

    distance: float
    low_hrc: float
    high_hrc: float


@dataclass(frozen=True)
class Band:
    """A band, with rising distances; ``status`` as in `thermo.source`."""

    name: str
    points: tuple[BandPoint, ...]
    source: str
    status: str


def band(grade: str) -> Band | None:
    """The band of a grade, named as in `thermo.grades.row`; None where none is at hand."""
    try:
        name = row(grade).steel.name
    except InputFault:
        return None
    return _bands().get(name)


@cache
def _bands() -> dict[str, Band]:
    text = resources.files("midradius.thermo").joinpath("bands.csv").read_text(encoding="utf-8")
    found: dict[str, Band] = {}
    for line in csv.DictReader(text.splitlines()):
        point = BandPoint(
            1e-3 * float(line["distance_mm"]), float(line["low_hrc"]), float(line["high_hrc"])
        )
        before = found.get(line["grade"])
        points = (*before.points, point) if before else (point,)
        found[line["grade"]] = Band(line["band"], points, line["source"], line["status"])
    return found
