"""Round bars through the whole job, against handbook hardness as quenched and normalised.

Route: an hour at heat, then oil or still air of 20 degC; where a row states no
temperature it is that of the same handbook (4140 oil 845, 1080 oil 815 degC). Grain:
ASTM 7, fine-grain steel. "Oil" of the handbook is a works tank with moving oil:
``mineral oil, agitated`` at 60 degC, chosen before the outcome was known. Error of the
twelve 4140 values: median 2.6, nine in ten within 14.2, worst 16.9 HRC; in still oil 1.7,
8.0 and 12.2. Of 1080: 7.0, 20.8, 24.1; still 4.6, 19.7, 23.4. Normalised bars are
measured at mid-radius, where the tensile piece comes from.

A row that the job misses is a strict expected failure with the figures. 4140: the core
of 50 mm cools at 13 K/s (equivalence charts: J10 to J12 in oil, 12 to 9 K/s), but comes
out 83 % martensite, and mixtures are too hard (see ``test_endquench``). 1080: the
pearlite rate falls with the exponential of 4.36 Mn and ends in a long tail, so that a
pearlitic bar comes out martensitic; thick bars are soft by 5 to 7 HRC.
"""

from functools import cache

import pytest
from endquench import ZERO, Row, rows
from numpy.testing import assert_allclose

from midradius.study.case import (
    Case,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
    Until,
)
from midradius.study.result import Result
from midradius.study.runner import run
from midradius.thermo.conversion import hv_to_hrc
from midradius.thermo.grades import grade

PLACES = ("surface", "mid-radius", "core")
MEDIA = {"oil": ("mineral oil, agitated", 60.0), "air": ("still air", 20.0)}
GRAIN_ASTM = 7.0

MISSES = {
    "4140 oil 25 mm core": "57.2 HRC, handbook 50 +- 4",
    "4140 oil 50 mm surface": "56.3 HRC, handbook 49 +- 6",
    "4140 oil 50 mm mid-radius": "55.2 HRC, handbook 43 +- 6",
    "4140 oil 50 mm core": "54.9 HRC, handbook 38 +- 6",
    "4140 oil 100 mm surface": "50.4 HRC, handbook 36 +- 6",
    "1080 oil 13 mm mid-radius": "64.2 HRC, handbook 43 +- 6",
    "1080 oil 13 mm core": "64.1 HRC, handbook 40 +- 6",
    "1080 oil 25 mm surface": "62.1 HRC, handbook 45 +- 6",
    "1080 oil 25 mm mid-radius": "51.7 HRC, handbook 42 +- 6",
    "1080 oil 25 mm core": "49.0 HRC, handbook 39 +- 6",
    "1080 oil 50 mm surface": "49.6 HRC, handbook 43 +- 6",
    "1080 oil 50 mm mid-radius": "32.7 HRC, handbook 40 +- 6",
}


@cache
def cooled(steel: str, soak_degC: float, route: str, diameter_mm: float) -> Result:
    medium, bath_degC = MEDIA[route]
    stages = (
        Stage("soak", at=soak_degC + ZERO, time=3600.0),
        Stage(
            "quench",
            medium=MediumUse(medium, bath=bath_degC + ZERO),
            until=Until("core", 100.0 + ZERO),
        ),
    )
    return run(
        Case(
            title=f"{steel} in {medium}",
            steel=SteelInput(grade(steel), GRAIN_ASTM),
            section=SectionInput("round", diameter=1e-3 * diameter_mm),
            route=stages,
            outputs=Outputs(tuple(PositionInput(p, p) for p in PLACES), n_field=4),
        )
    )


def _cases(route: str) -> list[object]:
    cases = []
    for row in rows("bars"):
        if row["route"] != route:
            continue
        name = f"{row['steel']} {route} {row['diameter_mm']} mm {row['position']}"
        marks = []
        if name in MISSES:
            marks = [pytest.mark.xfail(strict=True, raises=AssertionError, reason=MISSES[name])]
        cases.append(pytest.param(row, marks=marks, id=f"{name} {row['unit']}"))
    return cases


def _check(row: Row) -> None:
    result = cooled(row["steel"], float(row["soak_degC"]), row["route"], float(row["diameter_mm"]))
    place = result.positions[PLACES.index(row["position"])]
    ours = {
        "HRC": float(hv_to_hrc(place.hardness_hv)),
        "HB": place.hardness_hb,
        "MPa": place.tensile_mpa,
    }[row["unit"]]
    assert ours is not None
    assert_allclose(ours, float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))


@pytest.mark.parametrize("row", _cases("oil"))
def test_a_bar_quenched_in_oil_has_the_hardness_of_the_handbook(row: Row) -> None:
    _check(row)


@pytest.mark.parametrize("row", _cases("air"))
def test_a_bar_normalised_in_air_has_the_hardness_and_strength_of_the_handbook(row: Row) -> None:
    _check(row)
