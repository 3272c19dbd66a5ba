"""End-quench bands of boron steels; without boron's factor 11 of the 41 distances lie inside."""

import csv
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from midradius.study.case import SteelInput
from midradius.study.endquench import GRAIN_ASTM, SIXTEENTH_MM, EndQuench, endquench
from midradius.thermo.grades import grade

with (Path(__file__).parent / "boron_bands.csv").open(encoding="utf-8", newline="") as file:
    ROWS = list(csv.DictReader(file))


@cache
def piece(name: str) -> EndQuench:
    return endquench(SteelInput(grade(name), GRAIN_ASTM))


def hardness_hrc(row: dict[str, str]) -> float:
    test = piece(row["grade"])
    at = float(row["sixteenths"]) * SIXTEENTH_MM
    return float(np.interp(at, test.distance_mm, test.hardness_hrc))


@pytest.mark.slow
@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['grade']} J{row['sixteenths']}")
def test_a_boron_steel_lies_in_its_band(row: dict[str, str]) -> None:
    found, either = hardness_hrc(row), float(row["tolerance_hrc"])
    assert float(row["low"]) - either <= found <= float(row["high"]) + either, f"{found:.1f}"


@pytest.mark.slow
def test_nearly_every_distance_lies_in_the_band_as_it_is_remembered() -> None:
    inside = [float(row["low"]) <= hardness_hrc(row) <= float(row["high"]) for row in ROWS]
    assert sum(inside) >= 0.95 * len(ROWS)
