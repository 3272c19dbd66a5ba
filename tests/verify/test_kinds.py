"""Several austenites in one section: each node transforms as if its kind were alone."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo import kinetics as kin
from midradius.thermo.assemble import initial_state, stacked, steel_tables
from midradius.thermo.austenite import Austenite, soak
from midradius.thermo.grades import grade
from midradius.thermo.steel import Steel

HOT, COLD = 1103.15, 293.15
STEEL, PLAIN = grade("100Cr6"), grade("1095")


def left(temp: float, grain_astm: float, steel: Steel = STEEL) -> Austenite:
    return soak(steel, temp, 1800.0, grain_astm)


def cooled(states: np.ndarray, scales: np.ndarray, tables: kin.Tables, rate: float) -> np.ndarray:
    """All nodes cooled together from HOT to COLD at ``rate`` [K/s], in steps of 4 K."""
    states = states.copy()
    for step, temp in enumerate(np.arange(HOT, COLD, -4.0)):
        for node in range(len(states)):
            kin.advance(states, node, temp, temp - 4.0, 4.0 / rate, scales, tables, step % 2 == 0)
    return states


@pytest.mark.parametrize("rate", [0.05, 1.0, 30.0])
def test_a_node_of_the_second_kind_transforms_as_if_its_austenite_were_alone(rate: float) -> None:
    austenites = [left(1103.15, 8.0), left(1153.15, 8.0)]
    alone = [steel_tables(STEEL, each) for each in austenites]
    states = [initial_state(each, STEEL.composition.C, HOT, 1) for each in austenites]
    scales = np.ones((2, kin.N_SCALE))
    expected = np.concatenate(
        [cooled(s, scales, t, rate) for s, t in zip(states, alone, strict=True)]
    )
    together = np.concatenate(states)
    together[1, kin.KIND] = 1
    found = cooled(together, scales, stacked(alone), rate)
    assert_allclose(found[:, : kin.KIND], expected[:, : kin.KIND], rtol=0.0, atol=0.0)


@pytest.mark.parametrize("rate", [0.02, 0.3, 5.0])
def test_factors_on_the_clocks_stand_for_another_grain(rate: float) -> None:
    # 2^(0.41 G), 2^(0.32 G), 2^(0.29 G) of Li et al. 1998; the cementite film takes
    # carbon from a sphere: 1/R^2, with R going as 2^(-G/2) by ASTM E112.
    coarse, fine = left(HOT, 4.0, PLAIN), left(HOT, 8.0, PLAIN)
    start = initial_state(fine, PLAIN.composition.C, HOT, 1)
    radius = coarse.grain_mean_intercept / fine.grain_mean_intercept
    scales = np.array([[2.0 ** (0.41 * 4), 2.0 ** (0.32 * 4), 2.0 ** (0.29 * 4), radius**2]])
    scaled = cooled(start, scales, steel_tables(PLAIN, coarse), rate)
    own = cooled(start, np.ones((1, kin.N_SCALE)), steel_tables(PLAIN, fine), rate)
    assert own[0, kin.CEMENTITE] > 1e-4
    assert_allclose(scaled, own, rtol=1e-9, atol=1e-10)
