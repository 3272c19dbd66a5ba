"""What must hold of the boundaries and the lever rule whatever the steel."""

import numpy as np
import pytest
from hypothesis import assume, example, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo.boundaries import boundaries
from midradius.thermo.equilibrium import (
    CEMENTITE_CARBON_PCT,
    cementite_limit,
    computed_invariants,
    equilibrium,
    ferrite_limit,
    lever_cementite,
    lever_ferrite,
    range_notes,
    slow_cooling,
)
from midradius.thermo.gibbs import AUSTENITE, FERRITE
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.steel import HARD_BOUNDS, Composition, Steel, check

ZERO = 273.15
ALL_TEMPS = np.linspace(230.0, 1500.0, 1271)


@st.composite
def steels(draw: st.DrawFn) -> Composition:
    """Any composition that the package admits."""
    amounts = {
        name: draw(st.floats(*HARD_BOUNDS[name]))
        for name in ("C", "Mn", "Si", "Cr", "Ni", "Mo", "V", "Cu")
    }
    composition = Composition(**amounts)
    assume(not check(composition))
    return composition


@given(composition=steels())
def test_every_admitted_steel_has_limits_between_nothing_and_all(composition: Composition) -> None:
    eq = equilibrium(composition)
    for limit in (ferrite_limit, cementite_limit):
        values = limit(eq, composition.C, ALL_TEMPS)
        assert values.shape == ALL_TEMPS.shape
        assert np.all((values >= 0.0) & (values <= 1.0))
    assert 800.0 < eq.ae1 < 1100.0
    assert 0.3 < eq.eutectoid_carbon_pct < 1.0
    assert np.isfinite(eq.ae3)


@given(composition=steels())
@example(composition=Composition(C=0.3, Mn=3.0, Ni=5.0))
@example(composition=Composition(C=0.3, Cr=4.0, Ni=4.0))
def test_the_boundaries_of_austenite_are_monotone(composition: Composition) -> None:
    eq = equilibrium(composition)
    assert np.all(np.diff(eq.a3_temps) > 0.0)
    assert np.all(np.diff(eq.austenite_vs_ferrite(ALL_TEMPS)) <= 1e-12)
    assert np.all(np.diff(eq.austenite_vs_cementite(ALL_TEMPS)) >= -1e-12)


@given(composition=steels())
def test_the_moved_lines_cross_at_ae1(composition: Composition) -> None:
    eq = equilibrium(composition)
    by_ferrite = eq.austenite_vs_ferrite(eq.ae1)
    by_cementite = eq.austenite_vs_cementite(eq.ae1)
    # 1e-3: the A3 line is inverted between points 1 K apart
    assert_allclose(by_ferrite, by_cementite, rtol=0.0, atol=1e-3)
    assert_allclose(by_cementite, eq.eutectoid_carbon_pct, rtol=0.0, atol=1e-9)


@given(composition=steels())
def test_nothing_forms_above_the_critical_temperature(composition: Composition) -> None:
    eq = equilibrium(composition)
    if eq.eutectoid_carbon_pct - 0.01 > composition.C:
        assert np.isnan(eq.acm)
        assert eq.ae3 > eq.ae1 - 0.1
        assert_allclose(ferrite_limit(eq, composition.C, eq.ae3 + 0.1), 0.0, rtol=0, atol=2e-3)
        assert ferrite_limit(eq, composition.C, eq.ae3 - 3.0) > 0.0 or eq.ae3 - eq.ae1 < 5.0
        assert np.all(cementite_limit(eq, composition.C, ALL_TEMPS) == 0.0)
    elif eq.eutectoid_carbon_pct + 0.01 < composition.C:
        assert eq.acm > eq.ae1
        assert_allclose(cementite_limit(eq, composition.C, eq.acm), 0.0, rtol=0.0, atol=1e-6)
        assert np.all(ferrite_limit(eq, composition.C, ALL_TEMPS) == 0.0)


@given(carbon=st.floats(0.05, 0.75))
def test_slow_cooling_leaves_the_lever_rule_of_ferrite(carbon: float) -> None:
    point = computed_invariants()
    ferrite, cementite = slow_cooling(equilibrium(Composition(C=carbon)), carbon)
    expected = (point.austenite_pct - carbon) / (point.austenite_pct - point.ferrite_pct)
    assert_allclose(ferrite, expected, rtol=0.0, atol=1e-6)
    assert cementite == 0.0


@given(carbon=st.floats(0.78, 1.5))
def test_slow_cooling_leaves_the_lever_rule_of_cementite(carbon: float) -> None:
    point = computed_invariants()
    ferrite, cementite = slow_cooling(equilibrium(Composition(C=carbon)), carbon)
    expected = (carbon - point.austenite_pct) / (CEMENTITE_CARBON_PCT - point.austenite_pct)
    assert_allclose(cementite, expected, rtol=0.0, atol=1e-6)
    assert ferrite == 0.0


def test_the_lever_rule_conserves_carbon() -> None:
    eq = equilibrium(grade("42CrMo4").composition)
    temp = np.linspace(eq.ae1 + 1.0, eq.ae3 - 1.0, 9)
    share = lever_ferrite(eq, 0.41, temp)
    ferrite = share * eq.ferrite_solubility(temp)
    total = ferrite + (1.0 - share) * eq.austenite_vs_ferrite(temp)
    assert_allclose(total, 0.41, rtol=0.0, atol=1e-12)
    eq = equilibrium(grade("100Cr6").composition)
    temp = np.linspace(eq.ae1 + 1.0, eq.acm - 1.0, 9)
    share = lever_cementite(eq, 0.99, temp)
    total = share * CEMENTITE_CARBON_PCT + (1.0 - share) * eq.austenite_vs_cementite(temp)
    assert_allclose(total, 0.99, rtol=0.0, atol=1e-12)


def test_both_phases_share_the_potentials_on_the_computed_boundary() -> None:
    lines = boundaries()
    inside = (lines.temp > 300.0) & (lines.temp < 1180.0)
    temp = lines.temp[inside]
    rich = AUSTENITE.site_fraction(lines.austenite_ferrite[inside])
    lean = FERRITE.site_fraction(lines.ferrite_austenite[inside])
    iron = AUSTENITE.iron_potential(temp, rich) - FERRITE.iron_potential(temp, lean)
    carbon = AUSTENITE.carbon_potential(temp, rich) - FERRITE.carbon_potential(temp, lean)
    assert_allclose(iron, 0.0, rtol=0.0, atol=1e-3)  # J/mol
    assert_allclose(carbon, 0.0, rtol=0.0, atol=1e-2)


def test_ferrite_holds_the_same_carbon_on_both_sides_of_ae1_of_plain_steel() -> None:
    eq = equilibrium(Composition(C=0.4))
    below, above = eq.ferrite_solubility(np.array([eq.ae1 - 1e-6, eq.ae1]))
    assert_allclose(below, above, rtol=0.0, atol=1e-5)


@pytest.mark.parametrize("steel", all_grades(), ids=lambda steel: steel.name)
def test_no_shipped_grade_leaves_the_range_of_the_shifts_but_by_nickel(steel: Steel) -> None:
    left = {note.quantity for note in range_notes(steel.composition)}
    assert left == ({"Ni"} if steel.composition.Ni > 3.0 else set())


def test_a_steel_beyond_the_range_of_the_shifts_is_noted() -> None:
    notes = range_notes(Composition(C=0.3, Mn=2.5))
    assert [note.quantity for note in notes] == ["Mn"]
