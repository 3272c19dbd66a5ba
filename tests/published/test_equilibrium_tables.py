"""Phase boundaries against independent computation, a steel maker's card and the textbooks."""

import csv
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo.boundaries import boundaries
from midradius.thermo.equilibrium import (
    CUSTOMARY,
    cementite_limit,
    computed_invariants,
    equilibrium,
    ferrite_limit,
)
from midradius.thermo.grades import grade
from midradius.thermo.steel import Composition

ZERO = 273.15
Row = dict[str, str]
TABLE = Path(__file__).parent / "iron_carbon.csv"
ROWS: list[Row] = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))


def _ours(row: Row) -> float:
    quantity, name = row["quantity"], row["element_or_grade"]
    carbon = float(row["carbon_pct"] or "0.4")
    temp = float(row["temp_degC"] or "nan") + ZERO
    plain = equilibrium(Composition(C=carbon))
    point = computed_invariants()
    if quantity == "Acm of a grade":
        return equilibrium(grade(name).composition).acm - ZERO
    if quantity == "Ae3 shift per 1 wt%":
        return equilibrium(Composition(C=0.4, **{name: 1.0})).shift_a3
    if quantity == "Ae3 shift for 0.5 wt% Mo":
        return equilibrium(Composition(C=0.4, Mo=0.5)).shift_a3
    if quantity == "Acm shift per 1 wt%":
        alloyed = equilibrium(Composition(C=1.0, **{name: 1.0}))
        return alloyed.acm - equilibrium(Composition(C=1.0)).acm
    known = {
        "A3 pure Fe": lambda: float(boundaries().a3(0.0)) - ZERO,
        "eutectoid temperature": lambda: point.temp - ZERO,
        "eutectoid carbon": lambda: point.austenite_pct,
        "ferrite max carbon at eutectoid T": lambda: point.ferrite_pct,
        "carbon of cementite": lambda: point.cementite_pct,
        "austenite carbon at 1147 C": lambda: float(plain.austenite_vs_cementite(temp)),
        "Ae3": lambda: plain.ae3 - ZERO,
        "Acm": lambda: plain.acm - ZERO,
        "x gamma/Fe3C": lambda: float(plain.austenite_vs_cementite(temp)),
        "x gamma/alpha": lambda: float(plain.austenite_vs_ferrite(temp)),
        "max proeutectoid ferrite": lambda: float(ferrite_limit(plain, carbon, temp)),
        "max proeutectoid cementite": lambda: float(cementite_limit(plain, carbon, temp)),
    }
    return known[quantity]()


@pytest.mark.parametrize("row", ROWS, ids=[" ".join(list(r.values())[:4]) for r in ROWS])
def test_the_iron_carbon_diagram_agrees_with_its_source(row: Row) -> None:
    assert_allclose(_ours(row), float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))


def test_the_computed_eutectoid_meets_the_customary_numbers_as_far_as_it_does() -> None:
    # Customary, from memory: 727 degC, 0.76 % C, alpha 0.022 %, Fe3C 6.70 %.
    point = computed_invariants()
    # these two agree to the printed digit
    assert_allclose(point.temp, CUSTOMARY.temp, rtol=0.0, atol=0.5)
    assert_allclose(point.austenite_pct, CUSTOMARY.austenite_pct, rtol=0.0, atol=0.005)
    # these two do not: ferrite dissolves 0.019 %, and atomic weights give 6.69 %
    assert_allclose(point.ferrite_pct, CUSTOMARY.ferrite_pct, rtol=0.0, atol=0.003)
    assert not np.isclose(point.ferrite_pct, CUSTOMARY.ferrite_pct, rtol=0.0, atol=0.0005)
    assert_allclose(point.cementite_pct, CUSTOMARY.cementite_pct, rtol=0.0, atol=0.0105)


def test_chromium_manganese_and_nickel_lower_the_eutectoid_carbon() -> None:
    # Bain's chart (from memory), about -0.03 Mn, -0.05 Cr, -0.02 Ni per mass %
    plain = computed_invariants().austenite_pct
    for element, per_pct in (("Mn", -0.03), ("Cr", -0.05), ("Ni", -0.02)):
        alloyed = equilibrium(Composition(C=0.4, **{element: 1.0})).eutectoid_carbon_pct
        assert_allclose(alloyed - plain, per_pct, rtol=0.0, atol=0.025)
