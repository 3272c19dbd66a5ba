"""The set of 1984: its equations by hand, its noses against an atlas."""

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo import kirkaldy
from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import KIRKALDY, LI, named
from midradius.thermo.steel import Composition

STEEL = Composition(C=0.4, Mn=0.8, Ni=1.0, Cr=0.9, Mo=0.2, Si=0.25)


def test_the_three_times_are_those_of_the_printed_equations() -> None:
    # worked with a pocket calculator's arithmetic at 600 degC, ASTM 5 (2^2 = 4):
    # Ae3 = 780 degC, Ae1 = 720 degC; RT = 1.987 * 873.15 = 1734.949 cal/mol
    found = kirkaldy.rates(STEEL, np.array([873.15]), grain_astm=5.0, ae3=1053.15, ae1=993.15)
    thermal = 1734.94905
    ferrite = (47.68 + 1.45 + 60.93 + 48.8) / (4.0 * 180.0**3 * math.exp(-23500.0 / thermal))
    slow = math.exp(27500.0 / thermal) + (0.009 + 0.104) * math.exp(37500.0 / thermal)
    pearlite = (1.79 + 5.42 * (0.9 + 0.2 + 0.8)) * slow / (4.0 * 120.0**3)
    assert_allclose(1.0 / found.ferrite, [ferrite], rtol=1e-9, atol=0.0)
    assert_allclose(1.0 / found.pearlite, [pearlite], rtol=1e-9, atol=0.0)
    # Bs = 656 - 23.08 - 28 - 18.75 - 15.3 - 30.6 - 8.24 = 532.03 degC; at 450 degC
    assert_allclose(kirkaldy.bainite_start(STEEL) - 273.15, 532.03, rtol=0.0, atol=1e-9)
    held = kirkaldy.rates(STEEL, np.array([723.15]), grain_astm=5.0, ae3=1053.15, ae1=993.15)
    bainite = 1e-4 * (2.34 + 4.04 + 3.42 + 3.8) / (4.0 * 82.03**2)
    bainite /= math.exp(-27500.0 / (1.987 * 723.15))
    assert_allclose(1.0 / held.bainite, [bainite], rtol=1e-9, atol=0.0)


def test_the_bend_of_bainite_is_that_of_its_alloys_and_never_negative() -> None:
    *_, bent = kirkaldy.shapes(STEEL)
    assert_allclose(bent.bend, 0.76 + 2.0 + 0.9 + 1.53 + 0.8 - 2.6, rtol=1e-12, atol=0.0)
    assert kirkaldy.shapes(Composition(C=0.4, Mn=0.3))[2].bend == 0.0


def test_a_steel_without_any_alloy_is_refused() -> None:
    with pytest.raises(InputFault, match="Give the manganese"):
        kirkaldy.rates(
            Composition(C=0.4), np.array([900.0]), grain_astm=7.0, ae3=1050.0, ae1=1000.0
        )


def test_a_set_is_found_whatever_its_case_and_blanks() -> None:
    assert named("kirkaldy venugopalan 1984") == KIRKALDY
    assert named("LI1998") == LI
    with pytest.raises(InputFault, match='Write "Li 1998" if that is meant'):
        named("Li 1989")


def test_the_range_of_the_source_is_told() -> None:
    notes = kirkaldy.range_notes(Composition(C=0.4, Mn=0.8, Ni=1.8, Cr=0.8, Mo=0.25), 0.4)
    assert [note.quantity for note in notes] == ["Mn + Si + Ni + Cr + Mo"]
