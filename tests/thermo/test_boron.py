"""The factor of boron on the times of the diffusional products."""

from numpy.testing import assert_allclose

from midradius.thermo import boron
from midradius.thermo import kinetics as kin
from midradius.thermo.assemble import steel_tables
from midradius.thermo.austenite import soak
from midradius.thermo.steel import Composition, Steel


def test_the_time_goes_with_the_square_of_the_diameter() -> None:
    # 1 + 1.5 (0.9 - 0.3) = 1.9 (Llewellyn & Cook, memory); t ~ D^2
    factor = boron.time_factor(Composition(C=0.3, Mn=1.2, B=0.002))
    assert_allclose(factor, 3.61, rtol=1e-12, atol=0.0)


def test_boron_does_nothing_to_eutectoid_steel_and_a_trace_does_nothing_at_all() -> None:
    assert boron.time_factor(Composition(C=0.95, B=0.002)) == 1.0
    assert boron.time_factor(Composition(C=0.3, B=0.0004)) == 1.0
    assert not boron.range_notes(Composition(C=0.3, B=0.0004))


def test_the_clocks_of_a_boron_steel_are_those_of_the_plain_one_slower_by_it() -> None:
    made = []
    for amount in (0.0, 0.002):
        steel = Steel("x", Composition(C=0.3, Mn=1.2, B=amount), "a test", "given")
        left = soak(steel, 1143.15, 1800.0, grain_astm=7.0)
        made.append(steel_tables(steel, left).value[0])
    plain, slow = made
    for column in (kin.RATE_FERRITE, kin.RATE_PEARLITE, kin.RATE_BAINITE):
        some = plain[:, column] > 0.0
        assert some.any()
        assert_allclose(plain[some, column] / slow[some, column], 3.61, rtol=1e-9, atol=0.0)
    assert_allclose(plain[:, kin.RATE_CEMENTITE], slow[:, kin.RATE_CEMENTITE], rtol=1e-12, atol=0)


def test_boron_that_counts_is_told_with_its_factor() -> None:
    (note,) = boron.range_notes(Composition(C=0.3, Mn=1.2, B=0.002))
    assert note.value == "0.002 %, times x 3.61"
    assert [n.quantity for n in boron.range_notes(Composition(C=0.1, B=0.002))] == ["B", "C"]
