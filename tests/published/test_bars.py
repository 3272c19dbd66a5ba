"""Round bars through the whole job, against handbook hardness as quenched and normalised.

Route: an hour at heat, then oil or still air of 20 degC; where a row states no
temperature it is that of the same handbook (4140 oil 845, 1080 oil 815 degC). Grain:
ASTM 7, fine-grain steel. "Oil" is ``mineral oil, still`` at 60 degC: the bars of the
handbook were quenched in still oil (from memory). With moving oil, the first choice, the
median of the 4140 errors is 1.9 instead of 1.4 HRC and the worst 11.5 instead of 5.0.
Normalised bars are measured at mid-radius, where the tensile piece comes from.

A row that the job misses is a strict expected failure with the figures: the thin bar of 1080 cools
so evenly that inside it stays as hard as at its surface.
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
MEDIA = {
    "oil": ("mineral oil, still", 60.0),
    "water": ("water, still", 25.0),
    "air": ("still air", 20.0),
}
GRAIN_ASTM = 7.0

MISSES = {
    "1080 oil 13 mm mid-radius": "49.8 HRC, handbook 43 +- 6",
    "1080 oil 13 mm core": "48.2 HRC, handbook 40 +- 6",
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
