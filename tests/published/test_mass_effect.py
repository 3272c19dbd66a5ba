"""Many steels at once: handbook bars and the bands of the H grades, both from memory.

The goal that users set: bars within 2.0 HRC in the median and 6 HRC at the 90th
percentile, 95 % of the distances inside their band. Each figure here is asserted whole, and a
miss is a strict expected failure with its figure.
"""

from collections import defaultdict
from functools import cache

import numpy as np
import pytest
from endquench import rows
from measure_uncertainty import end_quenched, rockwell
from test_bars import PLACES, cooled

from midradius.study.uncertainty import ALLOY, steel_class
from midradius.thermo.grades import grade

pytestmark = pytest.mark.slow
MEDIAN_HRC, P90_HRC, IN_BAND = 2.0, 6.0, 0.95


@cache
def bar_errors() -> dict[str, list[float]]:
    """Signed errors [HRC] of every reading by steel."""
    found: dict[str, list[float]] = defaultdict(list)
    bars = [row for row in rows("bars") if row["unit"] == "HRC"]
    for row in [*bars, *rows("mass_effect")]:
        result = cooled(
            row["steel"], float(row["soak_degC"]), row["route"], float(row["diameter_mm"])
        )
        hv = result.positions[PLACES.index(row["position"])].hardness_hv
        found[row["steel"]].append(rockwell(hv) - float(row["value"]))
    return dict(found)


@cache
def band_places() -> dict[str, list[float]]:
    """Where each distance lies in its band: -1 and +1 are its ends."""
    found: dict[str, list[float]] = defaultdict(list)
    for row in rows("more_bands"):
        low, high = float(row["low"]), float(row["high"])
        ours = rockwell(end_quenched(row["grade"])[f"{float(row['distance_mm']):g} mm"])
        found[row["grade"]].append((2.0 * ours - low - high) / (high - low))
    return dict(found)


def _of(kind: str) -> np.ndarray:
    return np.array(
        [
            abs(error)
            for name, errors in bar_errors().items()
            for error in errors
            if steel_class(grade(name).composition) == kind
        ]
    )


def test_the_bars_of_alloy_steel_meet_the_goal() -> None:
    errors = _of(ALLOY)
    assert len(errors) > 90
    assert np.median(errors) <= MEDIAN_HRC
    assert np.percentile(errors, 90.0) <= P90_HRC


@pytest.mark.xfail(strict=True, raises=AssertionError, reason="median 2.5, 90th percentile 7.9")
def test_all_bars_together_meet_the_goal() -> None:
    errors = np.abs(np.concatenate([np.array(e) for e in bar_errors().values()]))
    assert np.median(errors) <= MEDIAN_HRC and np.percentile(errors, 90.0) <= P90_HRC, (
        f"median {np.median(errors):.2f}, 90th percentile {np.percentile(errors, 90.0):.2f} HRC"
    )


def test_the_test_piece_of_many_steels_lies_in_their_bands() -> None:
    places = np.concatenate([np.array(place) for place in band_places().values()])
    inside = float(np.mean(np.abs(places) <= 1.0))
    assert inside >= IN_BAND, f"{100.0 * inside:.1f} % of {len(places)}"


def test_the_middle_of_the_bands_is_not_missed_to_one_side() -> None:
    # aim compositions belong to the middle; a fifth of the half width is 1 to 2 HRC
    places = np.concatenate([np.array(place) for place in band_places().values()])
    assert abs(float(places.mean())) < 0.2
