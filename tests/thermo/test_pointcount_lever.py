"""From a counted fraction back to carbon, and forth."""

import math

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import lever
from midradius.thermo.equilibrium import (
    CUSTOMARY,
    Invariants,
    equilibrium,
    slow_cooling,
)
from midradius.thermo.errors import InputFault
from midradius.thermo.lever import Basis, CarbonEstimate, Product
from midradius.thermo.pointcount import CountedFraction, from_fields, from_totals
from midradius.thermo.steel import HARD_BOUNDS, Composition, check

PLAIN = Composition(C=0.4)
# eutectoid and solvus as computed independently from published Gibbs energies
OURS = Invariants(temp=726.5 + 273.15, austenite_pct=0.762, ferrite_pct=0.0191, cementite_pct=6.690)
PRODUCTS: tuple[Product, ...] = ("ferrite", "cementite")


@st.composite
def alloys(draw: st.DrawFn) -> Composition:
    """Any composition that the package admits."""
    names = ("C", "Mn", "Si", "Cr", "Ni", "Mo", "V", "Cu")
    composition = Composition(**{name: draw(st.floats(*HARD_BOUNDS[name])) for name in names})
    assume(not check(composition))
    return composition


def _counted(fraction: float, low: float, high: float) -> CountedFraction:
    half = 0.5 * (high - low)
    return CountedFraction(fraction, low, high, 0.95, half / fraction, 30, 3e3, "fields", ())


def _estimate(
    fraction: float,
    product: str | None = "ferrite",
    *,
    composition: Composition = PLAIN,
    basis: Basis = "mass",
    half: float = 0.02,
) -> CarbonEstimate:
    counted = _counted(fraction, fraction - half, fraction + half)
    return lever.estimate(counted, composition=composition, product=product, basis=basis)


@pytest.mark.parametrize(
    ("carbon", "product", "customary", "computed"),
    [
        # (0.76 - C) / 0.738 and (C - 0.76) / 5.94; (0.762 - C) / 0.7429 and (C - 0.762) / 5.928
        (0.2, "ferrite", 0.758808, 0.756495),
        (0.45, "ferrite", 0.420054, 0.419976),
        (0.6, "ferrite", 0.216802, 0.218064),
        (1.1, "cementite", 0.0572391, 0.0570175),
    ],
)
def test_the_lever_rule_is_that_of_hand_arithmetic_both_ways(
    carbon: float, product: Product, customary: float, computed: float
) -> None:
    for point, fraction in ((CUSTOMARY, customary), (OURS, computed)):
        forth = lever.mass_fraction(carbon, product=product, invariants=point)
        assert_allclose(forth, fraction, rtol=2e-6, atol=0.0)
        back = lever.carbon_of_fraction(fraction, product=product, invariants=point)
        assert_allclose(back, carbon, rtol=2e-6, atol=0.0)


@pytest.mark.parametrize("carbon", [0.2, 0.45, 0.6, 1.1])
def test_the_own_eutectoid_of_plain_steel_gives_the_fractions_of_the_independent_one(
    carbon: float,
) -> None:
    product: Product = "ferrite" if carbon < 0.762 else "cementite"
    own = lever.eutectoid(equilibrium(Composition(C=carbon)))
    ours, other = (
        lever.mass_fraction(carbon, product=product, invariants=point) for point in (own, OURS)
    )
    # 0.0005 % C of the last printed figure of 0.762 is 0.0007 of ferrite
    assert_allclose(ours, other, rtol=0.0, atol=1e-3)


def test_a_steel_of_thirty_five_points_of_carbon_is_that_of_the_textbook() -> None:
    # Callister, example with 0.35 % C: 0.56 proeutectoid ferrite, 0.44 pearlite (from memory)
    ferrite = lever.mass_fraction(0.35, product="ferrite", invariants=CUSTOMARY)
    assert_allclose(ferrite, 0.56, rtol=0.0, atol=0.005)


@given(composition=alloys())
def test_forth_is_what_slow_cooling_gives_and_back_is_the_carbon(composition: Composition) -> None:
    eq, carbon = equilibrium(composition), composition.C
    for product, fraction in zip(PRODUCTS, slow_cooling(eq, carbon), strict=True):
        if 0.0 < fraction < 1.0:
            point = lever.eutectoid(eq)
            forth = lever.mass_fraction(carbon, product=product, invariants=point)
            assert_allclose(forth, fraction, rtol=0.0, atol=1e-12)
            back = lever.carbon_of_fraction(fraction, product=product, invariants=point)
            assert_allclose(back, carbon, rtol=0.0, atol=1e-12)


@given(composition=alloys(), share=st.floats(0.0, 1.0), product=st.sampled_from(PRODUCTS))
def test_back_and_forth_is_the_fraction(
    composition: Composition, share: float, product: Product
) -> None:
    point = lever.eutectoid(equilibrium(composition))
    carbon = lever.carbon_of_fraction(share, product=product, invariants=point)
    carbon = np.clip(carbon, point.ferrite_pct, point.cementite_pct)  # rounding at the ends
    forth = lever.mass_fraction(carbon, product=product, invariants=point)
    assert_allclose(forth, share, rtol=0.0, atol=1e-12)


@given(share=st.floats(0.0, 1.0), pearlite=st.floats(0.4, 0.9), product=st.sampled_from(PRODUCTS))
def test_volume_of_mass_and_back(share: float, pearlite: float, product: Product) -> None:
    volume = lever.volume_of_mass(share, product=product, pearlite_pct=pearlite)
    mass = lever.mass_of_volume(volume, product=product, pearlite_pct=pearlite)
    assert_allclose(mass, share, rtol=0.0, atol=1e-12)


def test_densities_turn_volume_into_mass_as_worked_by_hand() -> None:
    # pearlite of 0.76 %: w = 0.76 / 6.69 = 0.113602; 0.886398 / 7870 + 0.113602 / 7680
    #   = 1.1263e-4 + 0.147919e-4, 7847.94 kg/m3
    # 50 % ferrite: 7870 / (7870 + 7847.94) = 0.500702
    # 6 % cementite: 0.06 x 7680 / (460.8 + 0.94 x 7847.94) = 0.058791
    assert_allclose(lever.pearlite_density(0.76), 7847.94, rtol=2e-6, atol=0.0)
    ferrite = lever.mass_of_volume(0.5, product="ferrite", pearlite_pct=0.76)
    assert_allclose(ferrite, 0.500702, rtol=2e-6, atol=0.0)
    cementite = lever.mass_of_volume(0.06, product="cementite", pearlite_pct=0.76)
    assert_allclose(cementite, 0.058791, rtol=1e-5, atol=0.0)


def test_the_interval_of_the_count_becomes_that_of_carbon() -> None:
    # customary: C = 0.76 - 0.738 f: 0.4648 for 0.40, 0.5017 and 0.4279 for 0.35 and 0.45
    counted = _counted(0.40, 0.35, 0.45)
    carbon = lever.estimate(
        counted, composition=PLAIN, product="ferrite", basis="mass", invariants=CUSTOMARY
    )
    assert_allclose(carbon.carbon_pct, 0.4648, rtol=1e-9, atol=0.0)
    assert_allclose([carbon.low_pct, carbon.high_pct], [0.4279, 0.5017], rtol=1e-9, atol=0.0)
    assert_allclose(carbon.relative_accuracy, 0.0369 / 0.4648, rtol=1e-9, atol=0.0)
    # what the eutectoid leaves: 0.60 x 0.01 + 0.40 x 0.003
    assert_allclose(carbon.invariants_pct, 0.0072, rtol=1e-9, atol=0.0)
    assert (carbon.level, carbon.product, carbon.notes) == (0.95, "ferrite", ())
    # C = 0.76 + 5.94 f; 0.95 x 0.01 + 0.05 x 0.02
    carbon = lever.estimate(
        _counted(0.05, 0.04, 0.06),
        composition=PLAIN,
        product="cementite",
        basis="mass",
        invariants=CUSTOMARY,
    )
    assert_allclose(carbon.carbon_pct, 1.057, rtol=1e-9, atol=0.0)
    assert_allclose([carbon.low_pct, carbon.high_pct], [0.9976, 1.1164], rtol=1e-9, atol=0.0)
    assert_allclose(carbon.invariants_pct, 0.0105, rtol=1e-9, atol=0.0)


def test_a_volume_is_weighed_before_it_is_read() -> None:
    volume, mass = (_estimate(0.5, basis=basis) for basis in ("volume", "mass"))
    # 0.0007 more ferrite by mass: 0.0005 % less carbon
    assert_allclose(volume.mass_fraction, 0.5007, rtol=0.0, atol=1e-5)
    assert_allclose(mass.carbon_pct - volume.carbon_pct, 0.00052, rtol=0.0, atol=1e-5)


def test_a_point_count_of_medium_carbon_steel_gives_its_carbon() -> None:
    # forward by hand for 0.45 % C and our invariants: 0.41998 by mass
    shares = 0.41998 + np.array([-0.06, -0.03, 0.0, 0.02, 0.07])
    counted = from_fields(shares, points_per_field=100)
    carbon = lever.estimate(counted, composition=PLAIN, product="ferrite", basis="volume")
    assert_allclose(carbon.carbon_pct, 0.45, rtol=0.0, atol=1.5e-3)
    assert carbon.low_pct < 0.45 < carbon.high_pct
    total = from_totals(210, points=500)
    again = lever.estimate(total, composition=PLAIN, product="ferrite", basis="volume")
    assert again.notes == total.notes


@given(composition=alloys(), low=st.floats(0.02, 0.4), step=st.floats(0.01, 0.4))
def test_more_ferrite_is_less_carbon_whatever_the_steel(
    composition: Composition, low: float, step: float
) -> None:
    less, more = (
        _estimate(fraction, composition=composition, basis="volume")
        for fraction in (low, low + step)
    )
    assert more.carbon_pct < less.carbon_pct
    for carbon in (less, more):
        assert carbon.low_pct < carbon.carbon_pct < carbon.high_pct
        assert carbon.invariants_pct > 0.0


def test_manganese_lowers_the_carbon_that_a_fraction_stands_for() -> None:
    # about - 0.03 (Bain's chart, from memory) to - 0.05 % C for 1 % Mn, times pearlite's share
    plain, alloyed = (_estimate(0.4, composition=Composition(C=0.4, Mn=mn)) for mn in (0.0, 1.0))
    assert -0.05 * 0.6 < alloyed.carbon_pct - plain.carbon_pct < -0.02 * 0.6
    # 0.6 x 0.02 more half-width
    widened = alloyed.invariants_pct - plain.invariants_pct
    assert_allclose(widened, 0.012, rtol=1e-9, atol=0.0)


def test_pearlite_formed_below_ae1_is_read_as_more_carbon() -> None:
    # 0.366 of ferrite at 700 degC in 0.45 % C, computed independently: 0.762 - 0.366 x 0.7429
    carbon = lever.carbon_of_fraction(0.366, product="ferrite", invariants=OURS)
    assert_allclose(carbon, 0.490, rtol=0.0, atol=5e-4)


@pytest.mark.parametrize("product", [None, "pearlite"])
def test_a_fraction_without_its_phase_is_refused_with_both_answers(product: str | None) -> None:
    with pytest.raises(InputFault) as caught:
        _estimate(0.05, product)
    # 0.762 - 0.05 x 0.743 and 0.762 + 0.05 x 5.928
    given_as = "not given" if product is None else '"pearlite"'
    assert str(caught.value) == (
        f"proeutectoid phase = {given_as}, but must be ferrite (below the eutectoid) or cementite "
        "(above it). This fraction means 0.72 % C if it is ferrite, 1.06 % C if it is cementite."
    )
    with pytest.raises(InputFault, match="This fraction means 0.39 % C if it is ferrite\\.$"):
        _estimate(0.5, product)


def test_a_fraction_that_no_steel_has_is_refused() -> None:
    with pytest.raises(InputFault, match="mass fraction of proeutectoid ferrite = 1.1, but must"):
        _estimate(1.1)
    with pytest.raises(InputFault, match="Give the share of the whole section"):
        _estimate(-0.01)
    with pytest.raises(InputFault, match="ferrite = nan"):
        _estimate(math.nan)
    # 2.05 % C, most that austenite holds at 1147 degC: (2.05 - 0.762) / 5.928 = 0.217
    with pytest.raises(InputFault, match="but must be 0 to 0.21.*More is cast iron"):
        _estimate(0.22, "cementite")
    assert_allclose(_estimate(0.21, "cementite").carbon_pct, 2.007, rtol=0.0, atol=2e-3)


def test_carbon_beyond_the_eutectoid_is_refused_forth() -> None:
    for carbon, product in ((0.8, "ferrite"), (0.01, "ferrite"), (0.7, "cementite")):
        phase: Product = "ferrite" if product == "ferrite" else "cementite"
        with pytest.raises(InputFault, match=f"carbon beside proeutectoid {product} = {carbon} %"):
            lever.mass_fraction(carbon, product=phase, invariants=CUSTOMARY)


def test_carbon_outside_the_range_of_the_package_is_noted() -> None:
    # 0.762 + 5.928 x 0.15 = 1.651
    assert [note.quantity for note in _estimate(0.15, "cementite").notes] == ["carbon"]
    assert [note.quantity for note in _estimate(0.99, half=0.005).notes] == ["carbon"]


def test_a_steel_beyond_the_range_of_the_shifts_is_noted() -> None:
    assert [n.quantity for n in _estimate(0.4, composition=Composition(C=0.4, Mn=2.5)).notes] == [
        "Mn"
    ]
