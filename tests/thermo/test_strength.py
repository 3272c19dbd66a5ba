"""Where the yield strength of ferrite-pearlite says that it leaves its source."""

import numpy as np
import pytest

from midradius.thermo.arrays import Array
from midradius.thermo.grades import grade
from midradius.thermo.phases import FERRITE, MARTENSITE, N_PHASE, PEARLITE
from midradius.thermo.steel import Composition
from midradius.thermo.strength import range_notes


def structure(ferrite: float, pearlite: float) -> Array:
    """Of two nodes: all martensite, and what is asked with the rest of martensite."""
    shares = np.zeros((N_PHASE, 2))
    shares[FERRITE], shares[PEARLITE] = (0.0, ferrite), (0.0, pearlite)
    shares[MARTENSITE] = 1.0 - shares.sum(axis=0)
    return shares


def test_precipitates_of_a_microalloyed_steel_are_told_to_be_missing() -> None:
    (note,) = range_notes(grade("38MnVS6").composition, structure(0.3, 0.7))
    assert str(note) == (
        "yield strength of ferrite-pearlite: V + Nb = 0.14 %, source holds for steels without "
        "precipitates, whose share is not counted: stated too low"
    )


@pytest.mark.parametrize(("carbon", "count"), [(0.2, 1), (0.3, 0), (0.9, 0), (1.0, 1)])
def test_carbon_beyond_the_regression_is_noted(carbon: float, count: int) -> None:
    notes = range_notes(Composition(C=carbon, Mn=0.7, Si=0.25), structure(0.1, 0.9))
    assert len(notes) == count


def test_a_hardened_structure_has_nothing_to_note() -> None:
    assert not range_notes(grade("38MnVS6").composition, structure(0.02, 0.02))
