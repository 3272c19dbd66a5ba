"""Ideal diameter and end-quench curves from composition: arithmetic, limits, identities."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import hardenability as a255
from midradius.thermo import regressions
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.hardenability import SIXTEENTH
from midradius.thermo.steel import Composition

INCH = 0.0254
BY_HAND = Composition(C=0.30, Mn=1.50, Si=0.40, Ni=0.80, Cr=0.70, Mo=0.30, V=0.05, Cu=0.20)


def test_the_ideal_diameter_is_the_product_worked_by_hand() -> None:
    # C 0.54 x 0.30 = 0.162, Mn 5.10 x 1.50 - 1.12 = 6.53, Si 1.28, Ni 1.2904, Cr 2.512,
    # Mo 1.9, Cu 1.073, V 1.0865: 0.162 x 6.53 = 1.05786, x 1.28 = 1.354061,
    # x 1.2904 = 1.747280, x 2.512 = 4.389168, x 1.9 = 8.339419, x 1.073 = 8.948196,
    # x 1.0865 = 9.722215 in
    ideal = a255.ideal_diameter(BY_HAND, grain_astm=7.0)
    assert_allclose(ideal.diameter, 9.722215 * INCH, rtol=1e-6, atol=0.0)
    by_element = {
        "C": 0.162, "Mn": 6.53, "Si": 1.28, "Ni": 1.2904, "Cr": 2.512, "Mo": 1.9, "Cu": 1.073,
        "V": 1.0865, "B": 1.0, "grain": 1.0,
    }  # fmt: skip
    assert set(ideal.factors) == set(by_element)
    for name, factor in by_element.items():
        assert_allclose(ideal.factors[name], factor, rtol=1e-12, atol=0.0)


@pytest.mark.parametrize(
    ("carbon", "inches"),
    # 0.54 x 0.2; 0.171 + 0.00045 + 0.053663; 0.115 + 0.1608 - 0.01368; 0.143 + 0.14;
    # 0.062 + 0.3272 - 0.0864
    [(0.20, 0.108), (0.45, 0.2251125), (0.60, 0.26212), (0.70, 0.283), (0.80, 0.3028)],
)
def test_each_piece_of_the_carbon_factor_is_as_worked_by_hand(carbon: float, inches: float) -> None:
    assert_allclose(a255.carbon_factor(carbon), inches, rtol=1e-9, atol=0.0)


def test_the_carbon_factor_rises_without_a_step() -> None:
    factors = [a255.carbon_factor(carbon) for carbon in np.linspace(0.0, 0.9, 9001)]
    # the steepest piece: 0.54 in for 1 %, and 0.32 in for 1 % between two pieces
    assert np.all(np.diff(factors) > 0.0)
    assert np.all(np.diff(factors) < 0.55e-4)


def test_the_manganese_factor_has_one_bend() -> None:
    # 1 + 3.3333 x 1.2 = 4.99996 against 5.10 x 1.2 - 1.12 = 5.0; 5.10 x 1.95 - 1.12 = 8.825
    assert_allclose(a255.manganese_factor(1.2), 4.99996, rtol=1e-12, atol=0.0)
    assert_allclose(a255.manganese_factor(1.2 + 1e-12), 5.0, rtol=1e-9, atol=0.0)
    assert_allclose(a255.manganese_factor(1.95), 8.825, rtol=1e-12, atol=0.0)


def test_a_grain_four_numbers_coarser_adds_a_third_to_the_ideal_diameter() -> None:
    # 1.083^4 = 1.3757
    composition = grade("4140").composition
    fine, coarse = (a255.ideal_diameter(composition, grain_astm=g).diameter for g in (8.0, 4.0))
    assert_allclose(coarse / fine, 1.3757, rtol=1e-4, atol=0.0)


def test_boron_counts_from_five_parts_in_a_million_on() -> None:
    plain = Composition(C=0.3, Mn=1.0, Si=0.25)
    without = a255.ideal_diameter(plain, grain_astm=7.0)
    little = a255.ideal_diameter(replace(plain, B=0.0004), grain_astm=7.0)
    enough = a255.ideal_diameter(replace(plain, B=0.0005), grain_astm=7.0)
    assert_allclose(little.diameter, without.diameter, rtol=0.0, atol=0.0)
    # 1 + 1.5 (0.9 - 0.3) = 1.9
    assert_allclose(enough.diameter, 1.9 * without.diameter, rtol=1e-12, atol=0.0)
    assert without.notes == ()
    assert [str(note) for note in (*little.notes, *enough.notes)] == [
        "hardenability by ASTM A255: B = 0.0004 %, counted as none, source holds for "
        "0.0005 % and more",
        "hardenability by ASTM A255: B = 0.0005 %, source holds for boron that titanium protects",
    ]


@pytest.mark.parametrize("amounts", [{"C": 0.91}, {"C": 0.4, "Mn": 1.96}])
def test_where_a_factor_ends_there_is_no_ideal_diameter(amounts: dict[str, float]) -> None:
    composition = Composition(**{"Mn": 0.8, "Si": 0.25, **amounts})
    ideal = a255.ideal_diameter(composition, grain_astm=7.0)
    assert np.isnan(ideal.diameter)
    assert [note.quantity for note in ideal.notes] == [list(amounts)[-1]]


def test_the_first_sixteenth_is_martensite_whatever_the_steel() -> None:
    for steel in all_grades():
        if not 0.1 <= steel.composition.C <= 0.7:
            continue
        curve = a255.a255_curve(steel.composition, np.array([SIXTEENTH]), grain_astm=7.0)
        ours = a255.initial_hardness(steel.composition.C)
        assert_allclose(curve.hardness_hrc, ours, rtol=1e-12, atol=0.0)


def test_a_distance_between_two_rows_lies_halfway_in_its_factor() -> None:
    rows = a255.dividing_factor(2.0 * INCH, SIXTEENTH * np.array([4.0, 5.0, 6.0]))
    assert_allclose(rows[1], 0.5 * (rows[0] + rows[2]), rtol=1e-12, atol=0.0)


@given(inches=st.floats(0.5, 7.0), step=st.floats(0.0, 1.0))
def test_a_larger_ideal_diameter_is_never_softer_and_a_farther_distance_never_harder(
    inches: float, step: float
) -> None:
    distance = SIXTEENTH * np.linspace(1.0, 12.0, 89)
    small, large = (a255.dividing_factor(x * INCH, distance) for x in (inches, inches + step))
    assert np.all(small >= 1.0)
    assert np.all(large <= small + 1e-12)
    assert np.all(np.diff(small) >= -1e-12)


@pytest.mark.parametrize(
    ("position", "largest_in"),
    [(2, 2.1), (3, 3.1), (4, 4.1), (6, 5.0), (8, 5.6), (9, 5.8), (10, 6.1), (12, 6.6)],
)
def test_each_row_reaches_the_hardness_of_martensite_at_its_largest_diameter(
    position: int, largest_in: float
) -> None:
    # the standard goes over to a factor of 1 there; its polynomials end at 1.00 to 1.06
    # (from memory)
    at = np.array([SIXTEENTH * position])
    last = a255.dividing_factor(largest_in * INCH * (1.0 - 1e-9), at)
    assert 1.0 <= last[0] < 1.06
    assert a255.dividing_factor(largest_in * INCH * (1.0 + 1e-9), at) == 1.0


def test_beyond_the_last_known_row_the_standard_gives_nothing_and_says_so() -> None:
    composition = grade("4140").composition
    at = SIXTEENTH * np.array([0.5, 1.0, 12.0, 12.1, 16.0])
    curve = a255.a255_curve(composition, at, grain_astm=7.0)
    assert np.isnan(curve.hardness_hrc).tolist() == [True, False, False, True, True]
    assert [str(note) for note in curve.notes] == [
        "hardenability by ASTM A255: distance from the quenched end = 0.79 to 25.40 mm, "
        "source holds for 1.59 to 19.05 mm"
    ]


def test_a_steel_that_hardens_little_is_noted_and_ends_where_the_scale_ends() -> None:
    curve = a255.a255_curve(
        grade("1045").composition, SIXTEENTH * np.array([1.0, 2.0, 4.0, 12.0]), grain_astm=7.0
    )
    assert np.isnan(curve.hardness_hrc).tolist() == [False, False, False, True]
    # 0.171 + 0.00046 + 0.056074 = 0.227534, x 3.499975 x 1.175 = 0.93573 in
    assert [str(note) for note in curve.notes] == [
        "hardenability by ASTM A255: ideal diameter = 0.94 in, source holds for 1 to 7 in",
        "hardenability by ASTM A255: hardness = below 20 HRC from 19.05 mm on, "
        "source holds for 20 HRC and more",
    ]


def test_where_rows_would_cross_only_the_first_sixteenth_is_known() -> None:
    at = SIXTEENTH * np.array([1.0, 1.5, 2.0, 12.0])
    assert np.isnan(a255.dividing_factor(0.49 * INCH, at)).tolist() == [False, True, True, True]
    assert np.isfinite(a255.dividing_factor(0.51 * INCH, at)).all()


def test_a_boron_steel_is_told_whose_dividing_factors_it_gets() -> None:
    composition = Composition(C=0.3, Mn=1.2, Si=0.25, Cr=0.5, B=0.002)
    curve = a255.a255_curve(composition, np.array([SIXTEENTH]), grain_astm=7.0)
    assert "dividing factors of steels without boron" in [note.value for note in curve.notes]


def test_half_martensite_is_softer_than_nine_tenths_and_that_than_all() -> None:
    carbon = np.linspace(0.1, 0.7, 61)
    half, nine, whole = (
        a255.martensite_hardness(carbon, martensite=share) for share in (0.5, 0.9, 1.0)
    )
    assert np.all((half < nine) & (nine < whole))
    assert_allclose(half, a255.half_martensite_hardness(carbon), rtol=1e-12, atol=0.0)
    assert_allclose(whole, a255.initial_hardness(carbon), rtol=1e-12, atol=0.0)
    # 0.63 of the rise at nine tenths, half of that at seven
    seven = a255.martensite_hardness(carbon, martensite=0.7)
    assert_allclose((seven - half) / (whole - half), 0.315, rtol=1e-9, atol=0.0)


def test_hardness_of_martensite_is_unknown_outside_its_carbon_and_share() -> None:
    assert np.isnan(a255.initial_hardness(np.array([0.09, 0.71]))).all()
    assert np.isnan(a255.half_martensite_hardness(np.array([0.09, 0.71]))).all()
    assert np.isnan(a255.martensite_hardness(0.4, martensite=np.array([0.49, 1.01]))).all()


def test_just_gives_the_sum_worked_by_hand() -> None:
    # 0.36 C: root 0.6; 16 mm: 57 - 0.0028 x 256 x 0.6 = 56.56992; Cr 14, Mo 11.4, Mn 16.8,
    # Ni 4.4, Si 2.44, V 1.95; - 0.8 x 6 - 12 x 4 + 14.4 - 13: 107.55992 - 51.4
    steel = Composition(C=0.36, Mn=1.2, Si=0.4, Ni=0.8, Cr=0.7, Mo=0.3, V=0.05)
    curve = regressions.just_curve(steel, np.array([16e-3]), grain_astm=6.0)
    # but no more than 20 + 60 x 0.6
    assert_allclose(curve.hardness_hrc, 56.0, rtol=1e-12, atol=0.0)
    lean = replace(steel, Cr=0.0, Mo=0.0)
    curve = regressions.just_curve(lean, np.array([16e-3]), grain_astm=6.0)
    assert_allclose(curve.hardness_hrc, 30.75992, rtol=1e-9, atol=0.0)


def test_just_is_silent_beyond_the_end_of_the_scale() -> None:
    # 20 + 60 sqrt(1.04) = 81.2 at most: ISO 18265 ends at 68 HRC (memory)
    far = np.array([10e-3, 80e-3])
    curve = regressions.just_curve(grade("52100").composition, far, grain_astm=7.0)
    assert np.isnan(curve.hardness_hrc).tolist() == [True, False]
    assert "hardness = above 68 HRC to 10.00 mm" in " ".join(map(str, curve.notes))


def test_just_is_silent_outside_five_to_eighty_millimetres() -> None:
    at = 1e-3 * np.array([4.9, 5.0, 80.0, 80.1])
    curve = regressions.just_curve(grade("4340").composition, at, grain_astm=12.0)
    assert np.isnan(curve.hardness_hrc).tolist() == [True, False, False, True]
    assert [str(note) for note in curve.notes] == [
        "end-quench regression: austenite grain = ASTM 12, source holds for ASTM 1.5 to 11",
        "end-quench regression: distance from the quenched end = 4.90 to 80.10 mm, "
        "source holds for 5.00 to 80.00 mm",
    ]


def test_maynier_gives_the_rates_worked_by_hand() -> None:
    # 0.40 C 1.00 Mn 0.50 Ni 1.00 Cr 0.20 Mo, 850 degC: 9.81 - (1.848 + 1.05 + 0.27 + 0.5
    # + 0.132 + 1.5555) = 4.4545; 8.50 - (1.652 + 0.86 + 0.285 + 0.41 + 0.188 + 1.02) = 4.085
    steel = Composition(C=0.40, Mn=1.0, Ni=0.5, Cr=1.0, Mo=0.2)
    rates = regressions.critical_rates(steel, austenitising_temp=850.0 + 273.15)
    assert_allclose(rates.full, 10**4.4545 / 3600.0, rtol=1e-9, atol=0.0)
    assert_allclose(rates.half, 10**4.085 / 3600.0, rtol=1e-9, atol=0.0)
    assert rates.notes == ()


def test_maynier_gives_no_rate_for_a_high_carbon_steel() -> None:
    rates = regressions.critical_rates(grade("1080").composition, austenitising_temp=1100.0)
    assert np.isnan([rates.full, rates.half]).all()
    assert [note.quantity for note in rates.notes] == ["C"]


def test_the_regressions_without_a_term_for_boron_say_so() -> None:
    steel = Composition(C=0.3, Mn=1.2, Si=0.25, Cr=0.5, B=0.002)
    curve = regressions.just_curve(steel, np.array([10e-3]), grain_astm=7.0)
    rates = regressions.critical_rates(steel, austenitising_temp=1150.0)
    for notes in (curve.notes, rates.notes):
        assert [note.quantity for note in notes] == ["B"]
