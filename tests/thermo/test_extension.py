"""The rates where their regression ends, against A255, a diagram and hand arithmetic."""

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo import clocks, diffusional, extension
from midradius.thermo.grades import grade
from midradius.thermo.steel import Composition

ZERO = 273.15


def test_up_to_the_straight_part_of_a255_carbon_acts_as_in_the_regression() -> None:
    assert extension.carbon_exponent(10.18, 0.30) == 10.18 * 0.30


@pytest.mark.parametrize("coefficient", [4.12, 6.31, 10.18])
def test_carbon_joins_without_a_step(coefficient: float) -> None:
    below, above = (extension.carbon_exponent(coefficient, 0.39 + e) for e in (-1e-9, 1e-9))
    assert_allclose(above, below, rtol=0.0, atol=1e-6)


def test_rich_carbon_slows_as_the_square_of_the_ideal_diameter() -> None:
    # ASTM A255 (from memory): 0.115 + 0.268 C - 0.038 C^2 at 0.60 %, 0.54 C at 0.39 %
    ratio = (0.115 + 0.268 * 0.60 - 0.038 * 0.36) / (0.54 * 0.39)
    rise = extension.carbon_exponent(4.12, 0.60) - extension.carbon_exponent(4.12, 0.39)
    assert_allclose(rise, 2.0 * math.log(ratio), rtol=1e-12, atol=0.0)


def test_carbon_above_the_last_piece_of_a255_is_held() -> None:
    assert extension.carbon_exponent(4.12, 1.10) == extension.carbon_exponent(4.12, 0.90)


def test_manganese_slows_pearlite_as_the_square_of_its_factor_and_agrees_at_its_anchor() -> None:
    # ASTM A255 (from memory): 1 + 3.3333 Mn
    fall = extension.manganese_exponent(4.36, 0.75) - extension.manganese_exponent(4.36, 0.30)
    assert_allclose(fall, 2.0 * math.log(3.5 / 2.0), rtol=1e-4, atol=0.0)
    assert_allclose(extension.manganese_exponent(4.36, 0.75), 4.36 * 0.75, rtol=1e-15, atol=0.0)
    more = extension.manganese_exponent(4.36, 2.45) - extension.manganese_exponent(4.36, 1.95)
    assert_allclose(more, 4.36 * 0.5, rtol=1e-12, atol=0.0)


def test_pearlite_of_1080_slows_towards_a1_as_its_diagram() -> None:
    # I-T diagram of 1080, U.S. Steel (from memory): half of it after sqrt(begin x end)
    known = np.array(extension.DIAGRAM)
    rate = diffusional.rates(
        Composition(C=0.79, Mn=0.76),
        727.0 + ZERO - known[:, 0],
        carbon_pct=0.79,
        grain_astm=7.0,
        ae3=727.0 + ZERO,
        ae1=727.0 + ZERO,
    ).pearlite
    half = np.sqrt(known[:, 1] * known[:, 2])
    assert_allclose(rate / rate[-1], half[-1] / half, rtol=1e-9, atol=0.0)


def test_alloy_steel_keeps_the_temperature_of_its_regression() -> None:
    under = np.array([20.0, 60.0, 100.0])
    share = extension.pearlite_share(
        under, grade("4140").composition, power=3, activation=27500.0 / 1.987
    )
    assert_allclose(share, 1.0, rtol=0.0, atol=0.0)


def test_the_share_is_monotone_in_the_undercooling() -> None:
    under = np.linspace(1.0, 200.0, 400)
    share = extension.pearlite_share(
        under, Composition(C=0.8, Mn=0.7), power=3, activation=27500.0 / 1.987
    )
    assert np.all(np.diff(share) >= 0.0)
    assert share[0] > 0.0


def test_the_clock_of_pearlite_spans_the_times_of_the_diagram() -> None:
    # 1080 at its nose, U.S. Steel (from memory): 0.7 s for 1 %, 7 s for 99 %
    begin, end = clocks.integral(np.array([0.01, 0.99]), extension.PEARLITE_SHAPE)
    assert_allclose(end / begin, 10.0, rtol=0.03, atol=0.0)


def test_half_of_the_pearlite_takes_the_time_of_the_regression() -> None:
    half = np.array([0.5])
    ours = clocks.integral(half, extension.PEARLITE_SHAPE) / extension.pearlite_pace()
    assert_allclose(ours, clocks.integral(half, clocks.LI), rtol=1e-14, atol=0.0)


def test_sulphur_takes_manganese_as_the_sulphide() -> None:
    # 1144: 1.5 % Mn, 0.285 % S; MnS binds 54.938 / 32.06 of the sulphur above 0.03 %
    left = extension.soluble_manganese(Composition(C=0.44, Mn=1.5, S=0.285))
    assert_allclose(left, 1.5 - 54.938 / 32.06 * 0.255, rtol=1e-12, atol=0.0)
    assert extension.soluble_manganese(Composition(C=0.45, Mn=0.75, S=0.02)) == 0.75
    assert extension.soluble_manganese(Composition(C=0.1, Mn=0.3, S=0.35)) == 0.0
