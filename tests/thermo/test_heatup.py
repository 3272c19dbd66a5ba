"""A steel on heating: where it takes up the heat of its transformation."""

import csv
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.heatup import PEARLITE_SPAN, austenite_share, conductivity, enthalpy
from midradius.thermo.steel import Composition

ZERO = 273.15
TABLE = Path(__file__).parents[1] / "published" / "heat_content_by_phase.csv"
ROWS = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))
TEMP = np.arange(250.0, 1500.5, 1.0)


def of_table(phase: str) -> list[object]:
    """Rows where a plain steel is of one phase alone: to 700, or above its Ae3."""
    found = []
    for row in ROWS:
        carbon, degc = float(row["carbon_pct"]), float(row["temp_degC"])
        hot = degc >= 900.0 or (degc >= 850.0 and carbon >= 0.45)
        if hot if phase == "austenite" else degc <= 700.0:
            found.append(pytest.param(carbon, degc, float(row[phase]), id=f"{carbon}-{degc:.0f}"))
    return found


@pytest.mark.parametrize(("carbon", "degc", "value"), of_table("ferrite_cementite"))
def test_below_ae1_it_has_the_heat_content_of_ferrite_and_cementite(
    carbon: float, degc: float, value: float
) -> None:
    found = enthalpy(Composition(C=carbon), np.array([degc + ZERO]))[0]
    assert_allclose(1e-3 * found, value, rtol=0.0, atol=0.06)


@pytest.mark.parametrize(("carbon", "degc", "value"), of_table("austenite"))
def test_above_ae3_it_has_the_heat_content_of_austenite(
    carbon: float, degc: float, value: float
) -> None:
    # 2 kJ/kg: the tolerance suggested with the table
    found = enthalpy(Composition(C=carbon), np.array([degc + ZERO]))[0]
    assert_allclose(1e-3 * found, value, rtol=0.0, atol=2.0)


@pytest.mark.parametrize("steel", all_grades(), ids=lambda steel: steel.name)
def test_on_heating_the_heat_content_of_every_grade_rises(steel: object) -> None:
    composition = steel.composition  # type: ignore[attr-defined]
    heat = np.diff(enthalpy(composition, TEMP))
    # ferrite at room temperature has about 450 J/(kg K) and nothing here has less than 400
    assert heat.min() > 400.0
    assert conductivity(composition, TEMP).min() > 15.0


@pytest.mark.parametrize("name", ["C45E", "42CrMo4", "100Cr6", "1095"])
def test_austenite_and_its_carbon_grow_from_nothing_at_ae1_to_all(name: str) -> None:
    eq = equilibrium(grade(name).composition)
    share, held = austenite_share(eq, TEMP)
    assert (np.diff(share) > -1e-12).all() and (np.diff(held) > -1e-9).all()
    assert share[eq.ae1 > TEMP].max() == 0.0
    top = eq.acm if eq.eutectoid_carbon_pct < eq.composition.C else eq.ae3
    whole = max(top, eq.ae1 + PEARLITE_SPAN) < TEMP
    assert_allclose(share[whole], 1.0, rtol=0.0, atol=1e-12)
    assert_allclose(held[whole], eq.composition.C, rtol=0.0, atol=1e-12)


def test_pearlite_takes_the_measured_heat_when_it_turns_into_austenite() -> None:
    # Hagel, Pound & Mehl: 19.6 cal/g = 82.0 kJ/kg, 5 % (read: title page and abstract); what
    # the ten kelvin take up beyond it is their heat capacity, 0.65 kJ/(kg K) there
    eutectoid = Composition(C=0.7655)
    ae1 = equilibrium(eutectoid).ae1
    below, above = enthalpy(eutectoid, np.array([ae1, ae1 + PEARLITE_SPAN]))
    taken = 1e-3 * (above - below) - 0.65 * PEARLITE_SPAN
    assert_allclose(taken, 82.0, rtol=0.05, atol=0.0)
