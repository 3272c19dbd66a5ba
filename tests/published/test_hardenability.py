"""Hardenability regressions against worked numbers, chart readings and hardenability bands.

``hardenability.csv``: where a worked number came without its composition, the row says
that it was inferred.
"""

import numpy as np
import pytest
from endquench import GRAIN_ASTM, SIXTEENTH_MM, Row, rows
from numpy.testing import assert_allclose

from midradius.thermo import hardenability as a255
from midradius.thermo import regressions
from midradius.thermo.grades import grade
from midradius.thermo.steel import Composition

TABLE = rows("hardenability")
BANDS = rows("end_quench_bands")
ZERO = 273.15
SOFT = {
    "1045 J6": "21.1 HRC, band from 25: ideal diameter 0.94 in, factors hold from 1 in",
    "1045 J8": "below 20 HRC, band from 24: ideal diameter 0.94 in, factors hold from 1 in",
}


def _named(quantity: str, rows_of: list[Row] = TABLE) -> list[object]:
    return [
        pytest.param(row, id=f"{row['steel']} {row['composition']} {row['at']} {row['value']}")
        for row in rows_of
        if row["quantity"] == quantity
    ]


def _amounts(row: Row) -> dict[str, float]:
    pairs = (item.split("=") for item in row["composition"].split())
    return {name: float(value) for name, value in pairs}


def _position(row: Row) -> np.ndarray:
    return np.array([float(row["at"]) * 1e-3 * SIXTEENTH_MM])


def _marks(row: Row) -> list[pytest.MarkDecorator]:
    name = f"{row['grade']} {row['distance']}"
    if name not in SOFT:
        return []
    return [pytest.mark.xfail(strict=True, raises=AssertionError, reason=SOFT[name])]


def _within(ours: object, row: Row) -> None:
    assert_allclose(ours, float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))


@pytest.mark.parametrize("row", _named("ideal diameter"))
def test_the_ideal_diameter_is_that_of_the_worked_example(row: Row) -> None:
    ideal = a255.ideal_diameter(Composition(**_amounts(row)), grain_astm=7.0)
    _within(ideal.diameter / 0.0254, row)


@pytest.mark.parametrize("row", _named("A255 hardness"))
def test_the_dividing_factors_give_the_worked_hardness(row: Row) -> None:
    given = _amounts(row)
    factor = a255.dividing_factor(0.0254 * given["DI"], _position(row))
    _within(a255.initial_hardness(given["C"]) / factor, row)


@pytest.mark.parametrize("row", _named("Just hardness"))
def test_the_regression_of_just_gives_the_worked_hardness(row: Row) -> None:
    ours = regressions.just_curve(Composition(**_amounts(row)), _position(row), grain_astm=7.0)
    _within(ours.hardness_hrc, row)


@pytest.mark.parametrize("kind", ["full", "half"])
@pytest.mark.parametrize("steel", ["4140", "4340", "5140"])
def test_maynier_gives_the_worked_critical_rate(steel: str, kind: str) -> None:
    (row,) = (
        row
        for row in TABLE
        if row["quantity"] == f"critical rate {kind}"
        and row["steel"] == steel
        and row["tolerance"] == "10 %"
    )
    rates = regressions.critical_rates(
        Composition(**_amounts(row)), austenitising_temp=float(row["at"]) + ZERO
    )
    # the last figure of 0.7 is worth 7 %
    assert_allclose(getattr(rates, kind), float(row["value"]), rtol=0.10, atol=0.0)


def test_maynier_and_the_chart_of_4340_agree_within_a_factor_of_four() -> None:
    # read value 8.3 K/s; Maynier gives 2.3, so a regression is no more than that
    (row,) = (row for row in TABLE if row["tolerance"] == "factor 4")
    rates = regressions.critical_rates(
        Composition(**_amounts(row)), austenitising_temp=float(row["at"]) + ZERO
    )
    assert_allclose(np.log(rates.full / float(row["value"])), 0.0, rtol=0.0, atol=np.log(4.0))


@pytest.mark.parametrize("row", [*_named("99.9 % martensite"), *_named("50 % martensite")])
def test_hardened_steel_has_the_hardness_of_its_carbon(row: Row) -> None:
    share = {"99.9 % martensite": 0.999, "50 % martensite": 0.5}[row["quantity"]]
    _within(a255.martensite_hardness(_amounts(row)["C"], martensite=share), row)


@pytest.mark.parametrize("row", _named("90 % martensite"))
def test_nine_tenths_of_martensite_have_the_hardness_of_the_chart(row: Row) -> None:
    _within(a255.martensite_hardness(_amounts(row)["C"], martensite=0.9), row)


@pytest.mark.parametrize("row", _named("hardest martensite by Just"))
def test_just_limits_the_hardness_by_carbon(row: Row) -> None:
    _within(regressions.just_hardest(_amounts(row)["C"]), row)


@pytest.mark.parametrize(
    "row",
    [
        pytest.param(row, id=f"{row['grade']} {row['distance']}")
        for row in BANDS
        if float(row["distance_mm"]) >= 5.0 and "reading" not in row["band"]
    ],
)
def test_just_lies_in_the_band_of_the_middle_composition(row: Row) -> None:
    at = np.array([1e-3 * float(row["distance_mm"])])
    composition = grade(row["grade"]).composition
    (ours,) = regressions.just_curve(composition, at, grain_astm=GRAIN_ASTM).hardness_hrc
    margin = float(row["tolerance_hrc"])
    assert float(row["low"]) - margin <= ours <= float(row["high"]) + margin, f"{ours:.1f} HRC"


@pytest.mark.parametrize(
    "row",
    [
        pytest.param(row, marks=_marks(row), id=f"{row['grade']} {row['distance']}")
        for row in BANDS
        if SIXTEENTH_MM <= float(row["distance_mm"]) <= 12.0 * SIXTEENTH_MM
        and "reading" not in row["band"]
    ],
)
def test_a255_lies_in_the_band_of_the_middle_composition(row: Row) -> None:
    at = np.array([1e-3 * float(row["distance_mm"])])
    composition = grade(row["grade"]).composition
    (ours,) = a255.a255_curve(composition, at, grain_astm=GRAIN_ASTM).hardness_hrc
    margin = float(row["tolerance_hrc"])
    assert float(row["low"]) - margin <= ours <= float(row["high"]) + margin, f"{ours:.1f} HRC"
