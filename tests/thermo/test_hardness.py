"""Hardness and strength of what has formed."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import hardness, strength
from midradius.thermo.arrays import Array
from midradius.thermo.conversion import hv_to_hrc
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.phases import (
    AUSTENITE,
    BAINITE,
    CEMENTITE,
    FERRITE,
    MARTENSITE,
    N_PHASE,
    PEARLITE,
)
from midradius.thermo.steel import Composition

ZERO = 273.15
GRAIN = 28.3e-6


def _pure(phase: int, n: int = 1) -> Array:
    fractions = np.zeros((N_PHASE, n))
    fractions[phase] = 1.0
    return fractions


def _vickers(
    fractions: Array,
    steel: Composition,
    rate: float = 10.0,
    pearlite_degc: float = 620.0,
    carbon: float | None = None,
) -> tuple[Array, Array]:
    n = fractions.shape[1]
    return hardness.vickers(
        fractions,
        steel,
        carbon_austenite_pct=np.full(n, steel.C if carbon is None else carbon),
        carbon_initial_pct=steel.C,
        rate_700=np.full(n, rate),
        pearlite_temp=np.full(n, pearlite_degc + ZERO),
        ae1=equilibrium(steel).ae1,
        grain_intercept=GRAIN,
    )


def test_maynier_gives_the_worked_numbers_of_42crmo4() -> None:
    # by hand from the printed equations for 0.40 C 0.25 Si 0.75 Mn 1.05 Cr 0.22 Mo and
    # 10000 degC/h (log 4):
    # 127 + 379.6 + 6.75 + 8.25 + 16.8 + 84 = 622.4
    # -323 + 74 + 82.5 + 114.75 + 151.2 + 42.02 = 141.47, slope 89 + 21.2 - 13.75 - 16.5
    #   - 21 - 7.26 = 51.69, together 348.23
    # 42 + 89.2 + 13.25 + 22.5 + 7.35 + 4.18 = 178.48, slope 10 - 4.75 + 8.4 = 13.65,
    #   together 233.08
    steel = Composition(C=0.40, Si=0.25, Mn=0.75, Cr=1.05, Mo=0.22)
    four = np.array(4.0)
    assert_allclose(hardness.martensite_hv(steel, np.array(0.40), four), 622.4, rtol=0, atol=0.01)
    assert_allclose(hardness.bainite_hv(steel, 0.40, four), 348.23, rtol=0, atol=0.01)
    assert_allclose(hardness.ferrite_pearlite_hv(steel, 0.40, four), 233.08, rtol=0, atol=0.01)
    # the same rate in kelvin per second
    total, _ = _vickers(_pure(BAINITE), steel, rate=1e4 / 3600.0)
    assert_allclose(total, 348.23, rtol=0.0, atol=0.01)


@pytest.mark.parametrize(
    ("carbon", "hv"), [(0.5, 752.0), (0.6, 817.0), (0.77, 885.0), (0.9, 900.0), (1.2, 900.0)]
)
def test_high_carbon_martensite_stays_under_its_bound(carbon: float, hv: float) -> None:
    # 150 + 1667 C - 926 C^2 to 0.9 % C (from memory); a fast quench lies on it
    steel = Composition(C=carbon, Mn=1.5, Si=0.25, Cr=1.0)
    ours = hardness.martensite_hv(steel, np.array(carbon), np.array(6.0))
    assert_allclose(ours, hv, rtol=0.0, atol=0.6)


@pytest.mark.parametrize(
    ("carbon", "hrc"), [(0.2, 44.2), (0.3, 50.3), (0.4, 56.1), (0.5, 60.9), (0.6, 64.3)]
)
def test_martensite_agrees_with_the_initial_hardness_of_a255(carbon: float, hrc: float) -> None:
    # 99.9 % martensite, ASTM A255 polynomial (from memory); 2 HRC is the spread between
    # published curves of martensite hardness on carbon
    steel = Composition(C=carbon, Mn=0.75, Si=0.25)
    hv = hardness.martensite_hv(steel, np.array(carbon), np.array(np.log10(3600.0 * 100.0)))
    assert_allclose(hv_to_hrc(hv), hrc, rtol=0.0, atol=2.0)


@pytest.mark.parametrize(
    ("spacing_um", "hv"), [(0.1, 335.0), (0.15, 315.0), (0.2, 303.0), (0.3, 289.0)]
)
def test_pearlite_alone_has_the_tabulated_hardness(spacing_um: float, hv: float) -> None:
    # Gladman, McIvor & Pickering 1972, tensile strength / 3.2 (from memory)
    tensile = strength.gladman_tensile(
        np.array(0.0),
        grain=np.array(np.nan),
        spacing=np.array(1e-6 * spacing_um),
        composition=Composition(C=0.8),
    )
    assert_allclose(tensile / 3.2, hv, rtol=0.0, atol=0.6)


@pytest.mark.parametrize(("at_degC", "hrc"), [(650.0, 32.0), (600.0, 38.0), (550.0, 40.0)])
def test_pearlite_of_eutectoid_steel_is_as_hard_as_the_atlas_says(
    at_degC: float, hrc: float
) -> None:
    # 1080 in the I-T diagrams of U.S. Steel, hardness at the edge (from memory)
    tensile = strength.ferrite_pearlite_tensile(
        np.array(0.0),
        grain=np.array(np.nan),
        spacing=strength.interlamellar_spacing(at_degC + ZERO, 727.0 + ZERO),
        pearlite_carbon_pct=np.array(0.79),
        composition=Composition(C=0.79, Mn=0.76, Si=0.20),
    )
    assert_allclose(hv_to_hrc(tensile / 3.2), hrc, rtol=0.0, atol=0.5)


def test_pearlite_with_less_carbon_is_softer_by_the_carbon_term_of_maynier() -> None:
    # 223 HV per % C (from memory), at 600 degC, where the measured pearlite rules
    found = [
        strength.ferrite_pearlite_tensile(
            np.array(0.0),
            grain=np.array(np.nan),
            spacing=strength.interlamellar_spacing(600.0 + ZERO, 727.0 + ZERO),
            pearlite_carbon_pct=np.array(carbon),
            composition=Composition(C=carbon, Mn=0.75, Si=0.20),
        )
        / 3.2
        for carbon in (0.69, 0.79, 0.89)
    ]
    assert_allclose(np.diff(found), 22.3, rtol=0.0, atol=1e-6)


def test_a_little_ferrite_does_not_make_diluted_pearlite_harder() -> None:
    steel = Composition(C=0.6, Mn=0.75, Si=0.25)
    shares = np.linspace(0.0, 0.2, 21)
    tensile = strength.ferrite_pearlite_tensile(
        shares,
        grain=np.full(21, 8e-6),
        spacing=np.full(21, 0.13e-6),
        pearlite_carbon_pct=0.6 / (1.0 - shares),
        composition=steel,
    )
    assert np.all(np.diff(tensile) <= 0.0)


def test_pearlite_formed_at_600_degrees_is_spaced_as_observed() -> None:
    # 0.14 um at 600 degC (from memory)
    spacing = strength.interlamellar_spacing(600.0 + ZERO, 726.5 + ZERO)
    assert_allclose(spacing, 0.14e-6, rtol=0.03, atol=0.0)


def test_fine_pearlite_is_harder_than_coarse_pearlite() -> None:
    steel = grade("1080").composition
    fine, _ = _vickers(_pure(PEARLITE), steel, pearlite_degc=560.0)
    coarse, _ = _vickers(_pure(PEARLITE), steel, pearlite_degc=680.0)
    assert fine[0] > coarse[0] + 20.0


def test_the_ferrite_grain_of_medium_carbon_steel_stops_at_the_last_steel_of_its_source() -> None:
    # by hand for an equivalent of 0.40, 1 K/s, d = 28.3 / 0.89 um:
    # 22.6 - 22.8 + 3 + 22 (1 - exp(-0.47697)) = 11.145 um
    grain = strength.ferrite_grain(Composition(C=0.6, Mn=0.75), np.array(1.0), GRAIN)
    assert_allclose(grain, 11.145e-6, rtol=1e-3, atol=0.0)


def test_a_pure_constituent_has_its_own_hardness() -> None:
    steel = grade("42CrMo4").composition
    for phase in range(N_PHASE):
        total, by_phase = _vickers(_pure(phase), steel)
        assert_allclose(total, by_phase[phase], rtol=1e-12, atol=0.0)
    assert _vickers(_pure(AUSTENITE), steel)[0] == 250.0
    assert _vickers(_pure(CEMENTITE), steel)[0] == 850.0


@pytest.mark.parametrize(("martensite", "hrc"), [(0.5, 42.4), (0.9, 51.0), (0.999, 56.1)])
def test_partly_martensitic_structures_are_as_hard_as_measured(
    martensite: float, hrc: float
) -> None:
    # 0.40 % C: Hodge & Orehoski 1946 via ASTM A255 at 50 and 99.9 % (from memory);
    # 51 HRC at 90 % (read, quoting the SAE handbook)
    fractions = _pure(MARTENSITE) * martensite + _pure(BAINITE) * (1.0 - martensite)
    total, _ = _vickers(fractions, grade("4140").composition, rate=12.0)
    assert_allclose(hv_to_hrc(total), hrc, rtol=0.0, atol=0.3)


def test_hardness_has_no_step_where_the_bound_of_mixtures_begins() -> None:
    share = np.linspace(0.0, 1.0, 2001)
    fractions = _pure(MARTENSITE) * share + _pure(BAINITE) * (1.0 - share)
    rate = np.full(share.shape, 12.0)
    for name in ("4140", "8620", "1045"):
        steel = grade(name).composition
        hv, _ = hardness.vickers(
            fractions,
            steel,
            carbon_austenite_pct=np.full(share.shape, steel.C),
            carbon_initial_pct=steel.C,
            rate_700=rate,
            pearlite_temp=np.full(share.shape, np.nan),
            ae1=1000.0,
            grain_intercept=GRAIN,
        )
        assert np.all(np.abs(np.diff(hv)) < 1.5)


@given(
    shares=st.lists(st.floats(0.0, 1.0), min_size=6, max_size=6).filter(lambda s: sum(s) > 0.1),
    rate=st.floats(1e-3, 1e3),
    name=st.sampled_from([steel.name for steel in all_grades()]),
)
def test_a_mixture_lies_between_its_softest_and_hardest_part(
    shares: list[float], rate: float, name: str
) -> None:
    fractions = (np.array(shares) / sum(shares))[:, None]
    total, by_phase = _vickers(fractions, grade(name).composition, rate=rate)
    held = by_phase[:, 0][fractions[:, 0] > 1e-6]
    assert np.all(np.isfinite(by_phase))
    assert held.min() - 1e-9 <= total[0] <= held.max() + 1e-9
    assert np.all((by_phase > 80.0) & (by_phase < 1000.0))


@given(low=st.floats(0.05, 1.4), step=st.floats(0.0, 0.05))
def test_carbon_never_makes_martensite_softer(low: float, step: float) -> None:
    steel = grade("34CrNiMo6").composition
    pair = hardness.martensite_hv(steel, np.array([low, low + step]), np.array(5.0))
    assert pair[1] >= pair[0] - 1e-9


def test_martensite_hardness_has_no_step_at_its_bound() -> None:
    steel = grade("30CrNiMo8").composition
    carbon = np.linspace(0.3, 0.7, 4001)
    assert np.all(np.abs(np.diff(hardness.martensite_hv(steel, carbon, np.array(5.5)))) < 0.2)


@pytest.mark.parametrize("rate", [np.nan, 0.0, -3.0])
def test_a_point_that_never_cooled_through_700_has_no_hardness(rate: float) -> None:
    steel = grade("42CrMo4").composition
    fractions = _pure(MARTENSITE, 2)
    fractions[:, 1] = 0.0
    fractions[AUSTENITE, 1] = 1.0
    total, _ = _vickers(fractions, steel, rate=rate)
    assert np.isnan(total[0])
    assert total[1] == 250.0
    notes = hardness.range_notes(steel, fractions, np.full(2, rate))
    assert [str(note) for note in notes] == [
        "hardness of martensite, bainite, ferrite-pearlite: cooling rate at 700 degC = "
        "unknown at 1 of 2 points: no hardness there, source holds for parts cooled through it"
    ]


def test_ferrite_without_pearlite_needs_no_pearlite_temperature() -> None:
    steel = grade("1020").composition
    total, _ = _vickers(_pure(FERRITE), steel, pearlite_degc=np.nan)
    assert np.isfinite(total[0])
    total, _ = _vickers(_pure(PEARLITE), steel, pearlite_degc=np.nan)
    assert np.isnan(total[0])


def test_composition_outside_mayniers_range_is_noted() -> None:
    fractions = _pure(BAINITE)
    rate = np.array([1.0])
    notes = hardness.range_notes(Composition(C=0.8, Si=2.0), fractions, rate)
    assert [note.quantity for note in notes] == ["C", "Si"]
    notes = hardness.range_notes(Composition(C=0.3, Ni=3.5, Cr=2.0), fractions, rate)
    assert [note.quantity for note in notes] == ["Mn + Ni + Cr + Mo"]


def test_yield_strength_of_hardened_steel_follows_its_hardness() -> None:
    # Pavlina & Van Tyne 2008 (coefficients from memory): -90.7 + 2.876 HV
    assert_allclose(strength.yield_of_hardness(300.0), 772.1, rtol=0.0, atol=0.01)
    assert np.isnan(strength.yield_of_hardness(np.array([140.0, 700.0]))).all()


def test_a_mixture_yields_between_its_parts() -> None:
    fractions = np.zeros((N_PHASE, 3))
    fractions[PEARLITE] = [1.0, 0.5, 0.0]
    fractions[BAINITE] = [0.0, 0.5, 1.0]
    by_phase = np.full((N_PHASE, 3), 300.0)
    ours = strength.yield_strength(fractions, by_phase, np.array([500.0, 500.0, np.nan]))
    assert_allclose(ours, [500.0, (500.0 + 772.1) / 2.0, 772.1], rtol=0.0, atol=0.01)


def test_gladman_yield_gives_the_worked_number() -> None:
    # by hand: half ferrite (cube root 0.79370), d 0.01 mm, S0 0.2e-3 mm, 0.8 Mn 0.25 Si,
    # 0.005 N: 0.79370 (35 + 46.8 + 174) + 0.20630 (178 + 272.236) + 15.775 + 30.123
    steel = Composition(C=0.4, Mn=0.8, Si=0.25)
    ours = strength.gladman_yield(
        np.array(0.5), grain=np.array(1e-5), spacing=np.array(2e-7), composition=steel
    )
    assert_allclose(ours, 341.81, rtol=0.0, atol=0.05)


@given(rate=st.floats(1e-3, 300.0), grain_um=st.floats(3.0, 300.0), carbon=st.floats(0.05, 1.0))
def test_faster_cooling_never_coarsens_ferrite(rate: float, grain_um: float, carbon: float) -> None:
    rates = np.array([rate, 1.5 * rate])
    grain = strength.ferrite_grain(Composition(C=carbon, Mn=0.6), rates, 1e-6 * grain_um)
    assert 1e-6 <= grain[1] <= grain[0] < 1e-3
