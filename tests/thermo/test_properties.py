"""What must hold of heat content whatever the numbers."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import gibbs, properties
from midradius.thermo.gibbs import CEMENTITE_CARBON_PCT

TEMP = st.floats(250.0, 1500.0)
CARBON = st.floats(0.0, 1.5)
PAIRS = [
    (properties.enthalpy_austenite, properties.heat_capacity_austenite),
    (properties.enthalpy_martensite, properties.heat_capacity_martensite),
    (properties.enthalpy_ferrite_cementite, properties.heat_capacity_ferrite_cementite),
    (
        lambda temp, carbon: properties.enthalpy_cementite(temp),
        lambda temp, carbon: properties.heat_capacity_cementite(temp),
    ),
]


@pytest.mark.parametrize(("enthalpy", "heat_capacity"), PAIRS)
@given(temp=TEMP, carbon=CARBON)
def test_heat_capacity_is_the_slope_of_enthalpy(enthalpy, heat_capacity, temp, carbon) -> None:  # type: ignore[no-untyped-def]
    step = 0.05
    # the magnetic heat capacity jumps at a Curie temperature: no slope to speak of there
    assume(min(abs(temp - 1043.0), abs(temp - 485.0)) > step)
    slope = (enthalpy(temp + step, carbon) - enthalpy(temp - step, carbon)) / (2.0 * step)
    assert_allclose(slope, heat_capacity(temp, carbon), rtol=1e-5, atol=2e-3)


@pytest.mark.parametrize(("enthalpy", "heat_capacity"), PAIRS)
def test_every_phase_takes_up_heat_when_it_warms(enthalpy, heat_capacity) -> None:  # type: ignore[no-untyped-def]
    temp, carbon = np.linspace(250.0, 1500.0, 2501)[:, None], np.linspace(0.0, 1.5, 7)[None, :]
    values = np.broadcast_to(enthalpy(temp, carbon), (2501, 7))
    assert np.all(np.isfinite(values))
    assert np.all(np.diff(values, axis=0) > 0.0)
    assert np.all(heat_capacity(temp, carbon) > 300.0)


@given(temp=TEMP, carbon=CARBON)
def test_pearlite_is_exactly_the_mass_mix_of_ferrite_and_cementite(
    temp: float, carbon: float
) -> None:
    share = carbon / CEMENTITE_CARBON_PCT
    mix = (1.0 - share) * properties.enthalpy_ferrite(temp)
    mix = mix + share * properties.enthalpy_cementite(temp)
    ours = properties.enthalpy_ferrite_cementite(temp, carbon)
    assert_allclose(ours, mix, rtol=1e-12, atol=1e-6)


@given(carbon=CARBON)
def test_ferrite_with_cementite_at_20_degrees_is_the_zero(carbon: float) -> None:
    assert_allclose(properties.enthalpy_ferrite_cementite(293.15, carbon), 0.0, rtol=0.0, atol=1e-6)


def test_carbon_free_martensite_is_ferrite() -> None:
    temp = np.linspace(250.0, 1500.0, 50)
    martensite = properties.enthalpy_martensite(temp, 0.0)
    assert_allclose(martensite, properties.enthalpy_ferrite(temp), rtol=1e-12, atol=1e-6)


def test_cementite_carbon_follows_from_the_atomic_weights() -> None:
    # 12.011 / (12.011 + 3 * 55.845) = 6.6897 %: the customary 6.67 and 6.70 are rounded
    exact = 100.0 * 12.011 / (12.011 + 3.0 * 55.845)
    assert_allclose(CEMENTITE_CARBON_PCT, exact, rtol=0.0, atol=5e-4)


def test_the_enthalpy_of_a_magnet_follows_from_its_gibbs_energy() -> None:
    magnet = gibbs.Magnet(curie=1043.0, moment=2.22, p=0.4)
    temp = np.array([300.0, 900.0, 1042.0, 1044.0, 1400.0])
    step = 1e-3
    slope = (magnet.gibbs(temp + step) - magnet.gibbs(temp - step)) / (2.0 * step)
    assert_allclose(magnet.enthalpy(temp), magnet.gibbs(temp) - temp * slope, rtol=0, atol=1e-2)


def test_enthalpy_is_continuous_at_the_curie_temperatures() -> None:
    for curie in (485.0, 1043.0):
        temp = np.array([curie - 1e-6, curie + 1e-6])
        for enthalpy, _ in PAIRS:
            low, high = np.broadcast_to(enthalpy(temp, 0.5), (2,))
            assert_allclose(high - low, 0.0, rtol=0.0, atol=1.0)


def test_use_outside_the_temperature_range_is_noted() -> None:
    notes = properties.range_notes(np.array([200.0, 300.0]), 0.4)
    assert [str(note) for note in notes] == [
        "phase enthalpies: temperature = 200 to 300 K, source holds for 250 to 1500 K"
    ]
