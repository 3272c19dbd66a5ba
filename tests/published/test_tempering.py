"""Tempered bars through the whole job, against a steel maker's card and handbook tables.

The sources state neither time nor oil: two hours, and the still oil of ``bars.csv``;
ASTM 7, fine-grain steel. Tensile rows are those of a 25 mm bar. Read at mid-radius.

A row that the job misses is a strict expected failure with the figures. The sources do
not agree: at 540 to 550 degC the card gives 362 HB to 42CrMo4, the handbook 341 HB to
4140 of 13 mm and 311 HB to 25 mm (all but martensite throughout), the third table 951
MPa, about 285 HB, to the same steel. The model follows the card and the thin bar; the
misses of 4140 are what the sources differ by, and no constant was moved to close them.

``tempered_table.csv`` is the table of hardness after two hours that handbooks print for
common steels, from memory; it only ranks the equations that the model may rest on.
"""

from functools import cache

import numpy as np
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
from midradius.study.result import Position
from midradius.study.runner import run
from midradius.thermo import conversion, hardenability, tempering
from midradius.thermo.arrays import Array
from midradius.thermo.grades import grade
from midradius.thermo.tempering import Temper

GRAIN_ASTM = 7.0
PLACE = "mid-radius"

MISSES = {
    "4140 25 mm 540 HB": "345 HB, handbook 311 +- 25",
    "4140 25 mm 315 MPa": "1667 MPa, table 1551 +- 100",
    "4140 25 mm 425 MPa": "1454 MPa, table 1248 +- 100",
    "4140 25 mm 540 MPa": "1166 MPa, table 951 +- 100",
    "4140 25 mm 650 MPa": "921 MPa, table 758 +- 100",
}
YIELD_MISSES = {
    "4140 25 mm": "821 MPa, table 655 +- 90",
    "4140 100 mm": "384 MPa, table 485 +- 90",
}


@cache
def treated(
    steel: str,
    soak_degC: float,
    diameter_mm: float,
    medium: str,
    temper: tuple[float, float] | None,
) -> Position:
    """The place of the answer; ``temper`` in degC and hours."""
    bath = MediumUse(medium, bath=(20.0 if medium == "still air" else 60.0) + ZERO)
    route = [
        Stage("soak", at=soak_degC + ZERO, time=3600.0),
        Stage("quench", medium=bath, until=Until("core", 100.0 + ZERO)),
    ]
    if temper:
        route.append(Stage("temper", at=temper[0] + ZERO, time=3600.0 * temper[1]))
    case = Case(
        title=f"{steel} tempered",
        steel=SteelInput(grade(steel), GRAIN_ASTM),
        section=SectionInput("round", diameter=1e-3 * diameter_mm),
        route=tuple(route),
        outputs=Outputs((PositionInput(PLACE, PLACE),), n_field=4),
    )
    return run(case).positions[0]


def _param(row: Row, name: str, misses: dict[str, str]) -> object:
    marks = []
    if name in misses:
        marks = [pytest.mark.xfail(strict=True, raises=AssertionError, reason=misses[name])]
    return pytest.param(row, marks=marks, id=name)


def _tempered() -> list[object]:
    return [
        _param(
            row,
            f"{row['steel']} {row['diameter_mm']} mm {row['temper_degC']} {row['unit']}",
            MISSES,
        )
        for row in rows("tempered_bars")
    ]


@pytest.mark.parametrize("row", _tempered())
def test_a_tempered_bar_has_the_published_hardness_or_strength(row: Row) -> None:
    temper = float(row["temper_degC"]), float(row["temper_h"])
    place = treated(
        row["steel"],
        float(row["soak_degC"]),
        float(row["diameter_mm"]),
        "mineral oil, still",
        temper,
    )
    ours = {"HB": place.hardness_hb, "MPa": place.tensile_mpa}[row["unit"]]
    assert ours is not None
    assert_allclose(ours, float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))
    assert place.hardness_hv <= place.hardness_as_quenched_hv


def _normalised() -> list[object]:
    return [
        _param(row, f"{row['steel']} {row['diameter_mm']} mm", YIELD_MISSES)
        for row in rows("normalised_yield")
    ]


@pytest.mark.parametrize("row", _normalised())
def test_a_normalised_bar_has_the_published_yield_strength(row: Row) -> None:
    place = treated(
        row["steel"], float(row["soak_degC"]), float(row["diameter_mm"]), "still air", None
    )
    assert place.yield_mpa is not None
    assert_allclose(place.yield_mpa, float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))


def _errors_hrc(weight: float) -> Array:
    """Of the rows of the table from 480 degC on, martensite throughout as quenched."""
    found = []
    for row in rows("tempered_table"):
        temps = [Temper(float(row["temper_degC"]) + ZERO, 7200.0)]
        steel = grade(row["steel"]).composition
        hrc = hardenability.martensite_hardness(steel.C, martensite=np.array([0.99]))
        hard = conversion.hrc_to_hv(hrc)
        spies = tempering.spies_hb(hard, steel, temps[0].temp) / conversion.BRINELL_RATIO
        maynier = tempering.maynier_martensite_hv(steel, temps)
        hv = np.minimum(weight * maynier + (1.0 - weight) * spies, hard)
        found.append(float(conversion.hv_to_hrc(hv)[0]) - float(row["hardness_hrc"]))
    return np.array(found)


def test_the_mean_of_spies_and_maynier_is_nearer_to_the_handbooks_than_spies_alone() -> None:
    spies, mean = (np.abs(_errors_hrc(weight)) for weight in (0.0, 0.5))
    assert np.nanmedian(mean) < np.nanmedian(spies)
    assert np.nanmean(_errors_hrc(0.0)) > np.nanmean(_errors_hrc(0.5)) > 0.0
    assert np.nanmean(_errors_hrc(1.0)) < np.nanmean(_errors_hrc(0.5))
