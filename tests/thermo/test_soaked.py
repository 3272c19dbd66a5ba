"""The austenite of each node from its own temperature path."""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import initial_state, stacked, steel_tables
from midradius.thermo.austenite import grown_intercept, soak
from midradius.thermo.calibration import NONE
from midradius.thermo.equilibrium import CEMENTITE_CARBON_PCT, equilibrium
from midradius.thermo.grades import grade
from midradius.thermo.nodeclocks import clock_factors
from midradius.thermo.ratechoice import DEFAULT, KIRKALDY, LI, Kinetics
from midradius.thermo.soaked import MOST_KINDS, Paths, Soaked, alike, initial_states

ZERO = 273.15
RATES = [kin.RATE_FERRITE, kin.RATE_PEARLITE, kin.RATE_BAINITE, kin.RATE_CEMENTITE]
STEEL = grade("42CrMo4")
EQ = equilibrium(STEEL.composition)


def held(temps_degC: list[float], time: float, name: str = "42CrMo4", **kwargs: float) -> Soaked:
    """Nodes that jump to their temperatures at once and stay."""
    temps = np.array(temps_degC) + ZERO
    paths = Paths(grade(name), np.full(temps.size, 293.15))
    paths.follow(0.0, temps)
    paths.follow(time, temps)
    return paths.end(**kwargs)


@pytest.mark.parametrize("name", ["42CrMo4", "C45E", "100Cr6", "1095"])
@pytest.mark.parametrize("degc", [770.0, 860.0, 950.0])
def test_a_node_held_at_one_temperature_is_soaked_as_the_whole_section_was(
    name: str, degc: float
) -> None:
    whole = soak(grade(name), degc + ZERO, 5400.0)
    node = held([degc], 5400.0, name)
    assert_allclose(node.carbon_pct, whole.carbon_pct, rtol=1e-12, atol=0.0)
    assert_allclose(node.ferrite, whole.ferrite, rtol=1e-12, atol=1e-15)
    assert_allclose(node.cementite, whole.cementite, rtol=1e-12, atol=1e-15)
    assert_allclose(node.grain_mean_intercept, whole.grain_mean_intercept, rtol=1e-9, atol=0.0)
    assert_allclose(node.grain_astm, whole.grain_astm, rtol=1e-9, atol=0.0)
    assert len(node.kinds) == 1
    # and it then transforms alike: same carbon in the tables, its own grain on the clocks
    for chosen in (DEFAULT, Kinetics(KIRKALDY)):
        own = steel_tables(grade(name), node.kinds[0], chosen=chosen)
        today = steel_tables(grade(name), whole, chosen=chosen)
        scaled = own.value[0][:, RATES] * clock_factors(node, own, NONE, chosen)[0]
        assert_allclose(scaled, today.value[0][:, RATES], rtol=1e-9, atol=0.0)
    states = initial_states(node, np.array([degc + ZERO]), EQ.ae1)
    expected = initial_state(whole, grade(name).composition.C, degc + ZERO, 1)
    assert_allclose(states, expected, rtol=1e-12, atol=1e-15)


def test_growth_adds_up_in_the_variable_that_time_enters_linearly() -> None:
    # l^(1/n) of a path is the sum of those of its parts
    paths = Paths(STEEL, np.array([1123.15]))
    paths.follow(3600.0, np.array([1123.15]))
    paths.follow(3600.0, np.array([1223.15]))
    paths.follow(5400.0, np.array([1223.15]))
    parts = [
        grown_intercept(STEEL.composition, 1123.15, 3600.0),
        grown_intercept(STEEL.composition, 1223.15, 1800.0),
    ]
    summed = sum(part ** (1.0 / 0.211) for part in parts) ** 0.211
    assert_allclose(paths.end().grain_mean_intercept, summed, rtol=1e-9, atol=0.0)


@pytest.mark.parametrize("steps", [60, 240])
def test_a_steady_rise_is_worth_the_integral_over_its_temperatures(steps: int) -> None:
    first, last, span = 1073.15, 1173.15, 7200.0
    paths = Paths(STEEL, np.array([first]))
    for share in np.linspace(0.0, 1.0, steps + 1)[1:]:
        paths.follow(float(share * span), np.array([first + share * (last - first)]))
    c = STEEL.composition
    # Lee & Lee 2008 as the module states it
    activation = 89098.0 + 3581.0 * c.C + 1443.0 * c.Cr + 4031.0 * c.Mo

    def worth(time: float) -> float:
        temp = first + time / span * (last - first)
        return float(np.exp(-activation / (0.211 * 8.314) * (1.0 / temp - 1.0 / last)))

    expected = quad(worth, 0.0, span, epsrel=1e-10)[0]
    assert_allclose(paths.end().time, expected, rtol=1e-4, atol=0.0)


def test_grain_numbers_are_those_of_the_standards_table_of_intercepts() -> None:
    # ASTM E112, mean lineal intercept of G 4 to 9 (remembered)
    for number, micrometre in ((4, 80.0), (5, 56.6), (6, 40.0), (7, 28.3), (8, 20.0), (9, 14.1)):
        node = held([860.0], 60.0, grain_astm=float(number))
        assert_allclose(1e6 * node.grain_mean_intercept, micrometre, rtol=5e-3, atol=0.0)


def test_what_never_passed_ae1_keeps_ferrite_and_pearlite() -> None:
    section = held([700.0, EQ.ae1 - ZERO - 0.1, EQ.ae1 - ZERO + 0.1, 860.0], 3600.0)
    assert section.austenitised.tolist() == [False, False, True, True]
    assert np.isnan(section.grain_astm[:2]).all() and np.isfinite(section.grain_astm[2:]).all()
    # lever rule at Ae1 on the eutectoid composition, by hand
    solved = float(EQ.ferrite_solubility(EQ.ae1))
    ferrite = (EQ.eutectoid_carbon_pct - 0.41) / (EQ.eutectoid_carbon_pct - solved)
    assert_allclose(section.ferrite[0], ferrite, rtol=2e-3, atol=0.0)
    assert_allclose(section.pearlite[:2], 1.0 - section.ferrite[:2], rtol=1e-12, atol=0.0)
    # the share that the coldest austenite has is the pearlite that it came from
    assert_allclose(section.ferrite[2], ferrite, rtol=5e-3, atol=0.0)
    states = initial_states(section, np.full(4, 1000.0), EQ.ae1)
    austenite = 1.0 - states[:, :5].sum(axis=1)
    assert_allclose(austenite[:2], 0.0, rtol=0.0, atol=1e-12)
    assert_allclose(states[:2, kin.CARBON_AUSTENITE], 0.0, rtol=0.0, atol=0.0)
    (note,) = [note for note in section.notes if "not austenitised" in note.value]
    assert note.value == "not passed at 2 of 4 nodes: not austenitised"


def test_a_soak_below_the_range_of_growth_is_one_note_from_the_coldest_to_the_hottest() -> None:
    # grain growth is known from 850 degC on (Lee & Lee 2008, memory)
    for degc, said in (([830.0, 846.0], "830 to 846 degC"), ([840.0, 840.0], "840 degC")):
        notes = [note for note in held(degc, 3600.0).notes if "growth" in note.model]
        assert [note.value for note in notes] == [said]


def test_carbon_is_shared_out_without_loss_at_every_temperature() -> None:
    for name in ("42CrMo4", "100Cr6"):
        steel = grade(name)
        eq = equilibrium(steel.composition)
        section = held([eq.ae1 - ZERO + step for step in (2.0, 15.0, 40.0, 90.0)], 1800.0, name)
        temps = section.hottest
        left = 1.0 - section.ferrite - section.cementite
        total = left * section.carbon_pct + section.cementite * CEMENTITE_CARBON_PCT
        total += section.ferrite * eq.ferrite_solubility(temps)
        assert_allclose(total, steel.composition.C, rtol=1e-9, atol=0.0)


def test_the_hotter_a_node_the_more_austenite_and_the_coarser_its_grain() -> None:
    section = held(list(np.linspace(730.0, 950.0, 45)), 3600.0)
    assert (np.diff(section.ferrite) <= 0.0).all()
    assert (np.diff(section.grain_astm) < 0.0).all()


@pytest.mark.parametrize("name", ["42CrMo4", "100Cr6", "1095", "C22"])
def test_a_few_kinds_stand_for_all_austenites_of_a_section(name: str) -> None:
    eq = equilibrium(grade(name).composition)
    temps = list(np.linspace(eq.ae1 - ZERO + 5.0, 930.0, 200))
    section = held(temps, 3600.0, name)
    assert len(section.kinds) == MOST_KINDS == 12
    carbons = np.array([kind.carbon_pct for kind in section.kinds])
    step = np.abs(np.diff(carbons)).max()
    assert step <= 1.01 * np.ptp(carbons) / (MOST_KINDS - 1)
    off = np.abs(carbons[section.kind] - section.carbon_pct)
    assert off.max() <= 0.5 * step + 1e-4


@pytest.mark.parametrize("name", ["42CrMo4", "100Cr6", "1095"])
@pytest.mark.parametrize("set_name", [LI, KIRKALDY])
def test_each_nodes_clock_runs_as_its_own_austenite_asks(name: str, set_name: str) -> None:
    chosen, steel = Kinetics(set_name), grade(name)
    eq = equilibrium(steel.composition)
    temps = list(np.linspace(eq.ae1 - ZERO + 10.0, 900.0, 23))
    section = held(temps, 3600.0, name)
    tables = stacked([steel_tables(steel, kind, chosen=chosen) for kind in section.kinds])
    factors = clock_factors(section, tables, NONE, chosen)
    assert np.isfinite(factors).all() and (factors > 0.0).all()
    for node, temp in enumerate(section.hottest):
        own = steel_tables(steel, soak(steel, float(temp), 3600.0), chosen=chosen).value[0]
        of_kind = tables.value[section.kind[node]]
        for which, column in enumerate(RATES[:3]):
            at = int(np.argmax(of_kind[:, column]))
            found = of_kind[at, column] * factors[node, which]
            # at the nose of the kind; the chromium that carbide holds bends the logarithm
            assert_allclose(found, own[at, column], rtol=0.02, atol=1e-12)


def test_a_node_that_never_was_austenite_leaves_the_clocks_alone() -> None:
    section = held([650.0, 760.0, 860.0], 3600.0)
    tables = stacked([steel_tables(STEEL, kind) for kind in section.kinds])
    factors = clock_factors(section, tables, NONE, DEFAULT)
    assert_allclose(factors[0], 1.0, rtol=0.0, atol=0.0)
    assert (factors[1:, :3] != 1.0).any()


def test_a_measured_grain_stands_for_the_whole_section() -> None:
    section = held([780.0, 860.0], 3600.0, grain_astm=6.5)
    assert_allclose(section.grain_astm, 6.5, rtol=0.0, atol=0.0)


def test_a_section_taken_as_soaked_throughout_has_factors_of_one() -> None:
    whole: Soaked = alike(soak(STEEL, 1133.15, 3600.0), 1133.15, 3600.0, 7)
    tables = steel_tables(STEEL, whole.kinds[0])
    ones: Array = np.ones((7, kin.N_SCALE))
    assert_allclose(clock_factors(whole, tables, NONE, DEFAULT), ones, rtol=0.0, atol=0.0)
    assert whole.austenitised.all()
