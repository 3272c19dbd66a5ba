"""Film on the grain faces, its flag, and the impact transition of soft steel."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo import network, toughness
from midradius.thermo.phases import FERRITE, N_PHASE, PEARLITE
from midradius.thermo.steel import Composition

MILD = Composition(C=0.10, Mn=1.2, Si=0.20, N=0.0064)


def test_four_percent_on_grains_of_sixty_micrometres_is_a_film_of_twelve_tenths() -> None:
    # w = f l / 2: 0.04 x 60 um / 2
    film = network.film_thickness(np.array([0.04, -1e-9]), 60e-6)
    assert_allclose(film, [1.2e-6, 0.0], rtol=1e-12, atol=0.0)


def test_each_node_may_have_its_own_grain() -> None:
    film = network.film_thickness(np.array([0.04, 0.04]), np.array([60e-6, 30e-6]))
    assert_allclose(film, [1.2e-6, 0.6e-6], rtol=1e-12, atol=0.0)


@pytest.mark.parametrize(
    ("film_um", "name"),
    [(0.0, "none"), (0.049, "none"), (0.051, "broken"), (0.299, "broken"), (0.301, "continuous")],
)
def test_the_flag_changes_at_the_stated_limits(film_um: float, name: str) -> None:
    assert network.NAMES[int(network.network(np.array(1e-6 * film_um)))] == name


def test_chromium_and_carbide_left_make_the_film_an_upper_bound() -> None:
    film, none = np.array([0.2e-6]), np.array([0.01e-6])
    bearing, plain = Composition(C=1.0, Cr=1.45), Composition(C=1.0)
    assert [n.quantity for n in network.range_notes(bearing, film, carbide_left=0.05)] == [
        "Cr",
        "carbide left by the soak",
    ]
    assert network.range_notes(bearing, none, carbide_left=0.05) == ()
    assert network.range_notes(plain, film, carbide_left=0.0) == ()


def structure(pearlite: float, ferrite: float) -> np.ndarray:
    phases = np.zeros((N_PHASE, 1))
    phases[PEARLITE], phases[FERRITE] = pearlite, ferrite
    return phases


def test_the_transition_is_the_sum_of_its_five_printed_terms() -> None:
    # -19 + 44 x 0.20 + 700 x 0.08 + 2.2 x 15 - 11.5 / sqrt(0.010) = -36.2 degC
    found = toughness.impact_transition(structure(0.15, 0.85), MILD, grain=np.array([10e-6]))
    assert_allclose(found - 273.15, -36.2, rtol=0.0, atol=1e-9)


@pytest.mark.parametrize(
    ("pearlite", "ferrite", "steel"),
    [
        (0.25, 0.75, MILD),  # more pearlite than the relation knows
        (0.10, 0.80, MILD),  # a tenth of something else
        (0.15, 0.85, Composition(C=0.10, Mn=1.2, Cr=1.0)),
        (0.15, 0.85, Composition(C=0.45, Mn=0.7)),
    ],
)
def test_the_transition_is_nan_outside_its_range(
    pearlite: float, ferrite: float, steel: Composition
) -> None:
    found = toughness.impact_transition(structure(pearlite, ferrite), steel, grain=np.full(1, 1e-5))
    assert np.isnan(found).all()
