"""What a temper leaves of a quenched structure."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import embrittlement, tempering
from midradius.thermo.arrays import Array
from midradius.thermo.conversion import hrc_to_hv
from midradius.thermo.errors import InputFault
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
from midradius.thermo.tempering import Temper, equivalent_temp, temper

ZERO = 273.15
HOUR = 3600.0
SHAFT = Composition(C=0.40, Si=0.25, Mn=0.75, Cr=1.05, Mo=0.22)


def temperable(steel: Composition) -> bool:
    try:
        tempering.refuse_secondary_hardening(steel)
    except InputFault:
        return False
    return True


STEELS = [steel.composition for steel in all_grades() if temperable(steel.composition)]
steels = st.sampled_from(STEELS)
stages = st.builds(
    Temper, temp=st.floats(50.0 + ZERO, 720.0 + ZERO), time=st.floats(60.0, 100.0 * HOUR)
)


def at(degc: float, hours: float = 2.0) -> list[Temper]:
    return [Temper(degc + ZERO, hours * HOUR)]


def mixture(shares: dict[int, float], n: int = 1) -> Array:
    fractions = np.zeros((N_PHASE, n))
    for phase, share in shares.items():
        fractions[phase] = share
    return fractions


def hardness_of(fractions: Array) -> tuple[Array, Array]:
    """Hardness by constituent as a quenched steel may have it, and the mean."""
    by_phase = np.empty_like(fractions)
    for phase, hv in (
        (AUSTENITE, 250.0),
        (FERRITE, 210.0),
        (CEMENTITE, 850.0),
        (PEARLITE, 210.0),
        (BAINITE, 350.0),
        (MARTENSITE, 640.0),
    ):
        by_phase[phase] = hv
    return by_phase, (fractions * by_phase).sum(axis=0)


# The parameter


def test_one_hour_is_worth_its_own_temperature() -> None:
    assert_allclose(equivalent_temp(at(600.0, 1.0), hold=HOUR), 873.15, rtol=1e-12, atol=0)


def test_the_parameter_is_that_of_maynier() -> None:
    # Pc = 1 / (1/T - 2.303 * 1.987 / 100000 * log10 t), by hand for 6 h at 600 degC:
    # 2.303 * 1.987 = 4.576061; log10 6 = 0.778151; 1/873.15 = 1.1452785e-3;
    # 1.1452785e-3 - 3.56087e-5 = 1.1096698e-3, so 901.17 K
    assert_allclose(equivalent_temp(at(600.0, 6.0), hold=HOUR), 901.17, rtol=0, atol=0.02)


def test_a_hundred_hours_agree_with_hollomon_and_jaffe() -> None:
    # T (20 + log10 t): 823.15 * 22 / 20 = 905.5 K for one hour instead of a hundred at 550 degC
    assert_allclose(equivalent_temp(at(550.0, 100.0), hold=HOUR), 905.5, rtol=0.02, atol=0)


@given(stages, st.floats(0.01, 0.99))
def test_a_stage_cut_in_two_is_worth_the_same(stage: Temper, share: float) -> None:
    halves = [Temper(stage.temp, share * stage.time), Temper(stage.temp, (1 - share) * stage.time)]
    whole = equivalent_temp([stage], hold=HOUR)
    assert_allclose(equivalent_temp(halves, hold=HOUR), whole, rtol=1e-12, atol=0)


@given(st.lists(stages, min_size=2, max_size=4))
def test_the_order_of_stages_does_not_matter(route: list[Temper]) -> None:
    forward = equivalent_temp(route, hold=HOUR)
    assert_allclose(equivalent_temp(route[::-1], hold=HOUR), forward, rtol=1e-12, atol=0)


def test_two_stages_count_as_the_equivalent_time_at_the_hotter() -> None:
    # exp(-H/R (1/T1 - 1/T2)) with H/R = 100000 / 1.987 = 50327 K: from 580 to 600 degC
    # 1/853.15 - 1/873.15 = 2.68486e-5, so exp(-1.35121) = 0.25893: 2 h count as 0.5179 h
    both = [Temper(873.15, 6.0 * HOUR), Temper(853.15, 2.0 * HOUR)]
    alone = equivalent_temp(at(600.0, 6.5179), hold=HOUR)
    assert_allclose(equivalent_temp(both, hold=HOUR), alone, rtol=0, atol=2e-3)


# Martensite


def test_spies_gives_the_worked_number_of_42crmo4() -> None:
    # by hand, 57 HRC, 600 degC: 2.84 * 57 = 161.88; 75 * 0.40 = 30; -0.78 * 0.25 = -0.195;
    # 14.24 * 0.75 = 10.68; 14.77 * 1.05 = 15.5085; 128.22 * 0.22 = 28.2084;
    # -0.55 * 600 = -330; + 435.66: 351.74 HB
    hard = hrc_to_hv(57.0)
    assert_allclose(tempering.spies_hb(hard, SHAFT, 873.15), 351.74, rtol=0, atol=0.01)
    # above 0.60 % C that alone is the tempered hardness, Brinell 0.95 of Vickers:
    # 75 * 0.70 + 161.88 - 330 + 435.66 = 320.04 HB
    rich = Composition(C=0.70)
    found = 0.95 * tempering.martensite_hv(hard, rich, at(600.0))
    assert_allclose(found, 320.04, rtol=0, atol=0.01)


def test_tempered_martensite_is_the_mean_of_spies_and_maynier() -> None:
    # Spies 351.74 HB = 370.25 HV; Maynier after 2 h, Pc = 1 / (1.1452785e-3
    # - 4.576061e-5 * 0.301030) = 883.78 K: 636790 / 883.78 - 432.05 = 288.48; mean 329.37
    found = tempering.martensite_hv(hrc_to_hv(57.0), SHAFT, at(600.0))
    assert_allclose(found, 329.37, rtol=0, atol=0.03)
    # nothing of Maynier from 0.60 % C on, half up to 0.50 %, no step between
    for carbon, weight in ((0.2, 0.5), (0.5, 0.5), (0.55, 0.25), (0.6, 0.0), (1.0, 0.0)):
        assert_allclose(tempering.maynier_weight(carbon), weight, rtol=0, atol=1e-12)


def test_each_element_moves_tempered_martensite_as_spies_says() -> None:
    hard = hrc_to_hv(50.0)
    plain = tempering.spies_hb(hard, Composition(C=0.3), 873.15)
    for steel, more in (
        (Composition(C=0.4), 7.5),
        (Composition(C=0.3, Si=1.0), -0.78),
        (Composition(C=0.3, Mn=1.0), 14.24),
        (Composition(C=0.3, Cr=1.0), 14.77),
        (Composition(C=0.3, Mo=0.5), 64.11),
        (Composition(C=0.3, V=0.1), -5.4),
    ):
        found = tempering.spies_hb(hard, steel, 873.15) - plain
        assert_allclose(found, more, rtol=0, atol=1e-9)


def test_maynier_alone_gives_the_worked_number_of_42crmo4() -> None:
    # -74 - 173.6 - 92 - 18.75 - 73.7 = -432.05; 260 + 246.4 + 80.25 - 15.75 - 11.55 + 77.44
    # = 636.79; 636.79 * 1000 / 873.15 = 729.30, together 297.25 HV
    found = tempering.maynier_martensite_hv(SHAFT, at(600.0, 1.0))
    assert_allclose(found, 297.25, rtol=0, atol=0.02)


@pytest.mark.parametrize("degc", [150.0, 450.0, 680.0])
@pytest.mark.parametrize("model", [tempering.martensite_hv, tempering.bainite_hv])
@pytest.mark.parametrize("hours", [1.0, 2.0])
def test_no_step_where_one_model_hands_over_to_the_next(degc: float, model, hours: float) -> None:
    hard = np.array([300.0, 450.0, 640.0])
    below, above = (model(hard, SHAFT, at(degc + d, hours)) for d in (-1e-4, 1e-4))
    assert_allclose(above, below, rtol=0, atol=1e-3)


@pytest.mark.parametrize("steel", STEELS[::7], ids=lambda s: f"{s.C} C")
def test_softening_per_degree_stays_that_of_a_curve_without_steps(steel: Composition) -> None:
    hard = np.full(1, 600.0)
    degc = np.arange(50.0, 720.0, 1.0)
    curve = np.array([tempering.martensite_hv(hard, steel, at(d))[0] for d in degc])
    assert np.all(np.diff(curve) > -2.0)


def test_below_150_degc_nothing_happens() -> None:
    fractions = mixture({MARTENSITE: 0.9, BAINITE: 0.05, AUSTENITE: 0.05})
    by_phase, mean = hardness_of(fractions)
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(140.0, 1.0))
    assert_allclose(left.hardness_hv, mean, rtol=1e-12, atol=0)
    assert_allclose(left.fractions, fractions, rtol=0, atol=0)


@pytest.mark.parametrize("model", [tempering.martensite_hv, tempering.bainite_hv])
def test_below_150_degc_each_constituent_is_exactly_as_quenched(model) -> None:
    hard = np.array([300.0, 640.0])
    assert_allclose(model(hard, SHAFT, at(80.0)), hard, rtol=0, atol=0)


# Bainite, ferrite-pearlite, austenite


def test_tempered_bainite_gives_the_worked_number_of_42crmo4() -> None:
    # 262 + 64.8 - 87.25 - 48 - 195.3 - 106.7 = -110.45; -149 + 17.2 + 84 + 59.25 + 205.8
    # + 109.56 = 326.81; 326.81 * 1000 / 873.15 = 374.29, together 263.84 HV
    found = tempering.bainite_hv(np.array([350.0]), SHAFT, at(600.0, 1.0))
    assert_allclose(found, 263.84, rtol=0, atol=0.02)


def test_bainite_of_a_steel_that_the_equation_would_harden_stays_as_cooled() -> None:
    plain = Composition(C=0.3, Mn=0.4, Si=0.1)
    found = tempering.bainite_hv(np.array([260.0]), plain, at(600.0))
    assert_allclose(found, 260.0, rtol=0, atol=0)


def test_ferrite_and_pearlite_do_not_change() -> None:
    fractions = mixture({FERRITE: 0.4, PEARLITE: 0.6})
    by_phase, mean = hardness_of(fractions)
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(640.0, 10.0))
    assert_allclose(left.hardness_hv, 210.0, rtol=1e-12, atol=0)


def test_retained_austenite_goes_between_200_and_300_degc() -> None:
    fractions = mixture({MARTENSITE: 0.85, AUSTENITE: 0.15})
    by_phase, mean = hardness_of(fractions)
    for degc, stays in ((200.0, 1.0), (225.0, 0.75), (250.0, 0.5), (300.0, 0.0), (600.0, 0.0)):
        left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(degc, 1.0))
        assert_allclose(left.fractions[AUSTENITE], 0.15 * stays, rtol=0, atol=1e-12)
        assert_allclose(left.fractions[BAINITE], 0.15 * (1.0 - stays), rtol=0, atol=1e-12)
        assert_allclose(left.fractions.sum(axis=0), 1.0, rtol=0, atol=1e-12)


def test_what_retained_austenite_becomes_keeps_its_hardness() -> None:
    fractions = mixture({MARTENSITE: 0.5, AUSTENITE: 0.5})
    by_phase, mean = hardness_of(fractions)
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(450.0))
    hard = tempering.martensite_hv(np.array([640.0]), SHAFT, at(450.0))
    # 250 HV is less than the tempered bainite of this steel, 341 HV
    assert_allclose(left.hardness_hv, 0.5 * hard + 0.5 * 250.0, rtol=1e-12, atol=0)


def test_a_trace_of_a_constituent_without_hardness_does_not_count() -> None:
    fractions = mixture({MARTENSITE: 1.0 - 1e-8, PEARLITE: 1e-8})
    by_phase, mean = hardness_of(fractions)
    by_phase[PEARLITE] = np.nan
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(600.0))
    hard = tempering.martensite_hv(np.array([640.0]), SHAFT, at(600.0))
    assert_allclose(left.hardness_hv, hard, rtol=1e-6, atol=0)


# Everything together


@given(
    steels,
    st.lists(st.floats(0.0, 1.0), min_size=N_PHASE, max_size=N_PHASE),
    st.lists(stages, min_size=1, max_size=3),
    stages,
    st.floats(0.0, 200.0),
)
def test_hotter_or_longer_or_once_more_is_never_harder(
    steel: Composition, shares: list[float], route: list[Temper], extra: Temper, hotter: float
) -> None:
    assume(sum(shares) > 0.1)
    fractions = np.array(shares)[:, None] / sum(shares)
    by_phase, mean = hardness_of(fractions)

    def hv(tempers: list[Temper]) -> float:
        left = temper(fractions, by_phase, mean, composition=steel, tempers=tempers)
        return float(left.hardness_hv[0])

    first, *rest = route
    before = hv(route)
    assert before <= float(mean[0]) * (1.0 + 1e-12)
    assert before > 80.0
    for more in (
        [Temper(first.temp + hotter, first.time), *rest],
        [Temper(first.temp, first.time * 3.0), *rest],
        [*route, extra],
    ):
        assert hv(more) <= before + 1e-9


@given(steels, st.floats(200.0, 940.0), st.floats(1.0, 100.0), stages)
def test_harder_as_quenched_is_never_softer_tempered(
    steel: Composition, hard: float, more: float, stage: Temper
) -> None:
    pair = np.array([hard, hard + more])
    for model in (tempering.martensite_hv, tempering.bainite_hv):
        soft, hard_too = model(pair, steel, [stage])
        assert soft <= hard_too + 1e-9


def test_a_mixture_is_the_mean_of_its_tempered_constituents_under_its_own_hardness() -> None:
    fractions = mixture({MARTENSITE: 0.6, BAINITE: 0.4})
    by_phase, mean = hardness_of(fractions)
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(600.0))
    hard = tempering.martensite_hv(np.array([640.0]), SHAFT, at(600.0))
    mild = tempering.bainite_hv(np.array([350.0]), SHAFT, at(600.0))
    assert_allclose(left.hardness_hv, 0.6 * hard + 0.4 * mild, rtol=1e-12, atol=0)
    # a mixture that was held lower as quenched stays under that
    left = temper(fractions, by_phase, mean * 0.4, composition=SHAFT, tempers=at(200.0))
    assert_allclose(left.hardness_hv, 0.4 * mean, rtol=1e-12, atol=0)


def test_no_temper_leaves_everything_as_it_is() -> None:
    fractions = mixture({MARTENSITE: 0.6, BAINITE: 0.4})
    by_phase, mean = hardness_of(fractions)
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=[])
    assert left.hardness_hv is mean and left.fractions is fractions


def test_a_node_without_hardness_has_none_after_the_temper_either() -> None:
    fractions = mixture({MARTENSITE: 1.0}, n=2)
    by_phase, mean = hardness_of(fractions)
    by_phase[:, 1] = np.nan
    mean[1] = np.nan
    left = temper(fractions, by_phase, mean, composition=SHAFT, tempers=at(600.0))
    assert np.isfinite(left.hardness_hv[0]) and np.isnan(left.hardness_hv[1])


# Ranges and warnings


@pytest.mark.parametrize(
    ("steel", "said"),
    [
        ({"Cr": 3.6}, "Cr of a steel to be tempered = 3.6 %, but must be at most 3.5 %."),
        ({"Mo": 1.3}, "Mo of a steel to be tempered = 1.3 %, but must be at most 1.2 %."),
        ({"V": 0.35}, "V of a steel to be tempered = 0.35 %, but must be at most 0.3 %."),
        ({"Mo": 0.5, "W": 1.6}, "Mo + W/2 of a steel to be tempered = 1.3 %, but must be"),
    ],
)
def test_steels_that_harden_a_second_time_are_refused(steel: dict[str, float], said: str) -> None:
    fractions = mixture({MARTENSITE: 1.0})
    by_phase, mean = hardness_of(fractions)
    with pytest.raises(InputFault) as caught:
        temper(
            fractions, by_phase, mean, composition=Composition(C=0.4, **steel), tempers=at(560.0)
        )
    assert str(caught.value).startswith(said)


def notes(steel: Composition, shares: dict[int, float], tempers: list[Temper]) -> list[str]:
    fractions = mixture(shares)
    return [
        str(n) for n in tempering.range_notes(steel, fractions, hardness_of(fractions)[0], tempers)
    ]


def test_a_temper_inside_all_ranges_leaves_no_note() -> None:
    shares = {MARTENSITE: 0.6, BAINITE: 0.3, PEARLITE: 0.1}
    assert notes(SHAFT, shares, at(600.0)) == []
    assert notes(SHAFT, shares, []) == []


def test_tempers_and_steels_outside_the_sources_are_noted() -> None:
    assert notes(SHAFT, {MARTENSITE: 1.0}, at(200.0)) == [
        "hardness of tempered martensite: temper (as 2 h) = 200 degC, source holds for "
        "500 to 650 degC (below 450 degC straight to the hardness as quenched)"
    ]
    assert "nothing is changed" in notes(SHAFT, {MARTENSITE: 1.0}, at(120.0))[0]
    assert "Maynier's slope" in notes(SHAFT, {MARTENSITE: 1.0}, at(700.0))[0]
    assert notes(SHAFT, {BAINITE: 1.0}, at(300.0, 1.0)) == [
        "tempering parameter, tempered martensite and bainite: temper (as 1 h) = 300 degC, "
        "source holds for above 400 degC"
    ]
    assert "spheroids" in notes(SHAFT, {PEARLITE: 1.0}, at(690.0))[0]
    rich = Composition(C=0.6, Si=1.8, Mn=0.9)
    assert [
        n.partition(",")[0].rpartition(": ")[2] for n in notes(rich, {MARTENSITE: 1.0}, at(600.0))
    ] == [
        "C = 0.6 %",
        "Si = 1.8 %",
        "Cr = 0 %",
    ]
    spring = notes(rich, {MARTENSITE: 0.8, AUSTENITE: 0.2}, at(600.0))
    assert spring[-1].startswith("retained austenite on tempering: Si = 1.8 %")


def test_embrittling_ranges_are_warned_of() -> None:
    def said(name: str, degc: float) -> str:
        return " ".join(embrittlement.cautions(grade(name).composition, at(degc), ae1=725.0 + ZERO))

    assert said("42CrMo4", 600.0) == ""
    assert "when held at 350 to 575" in said("41Cr4", 500.0)
    assert "cool this steel fast" in said("41Cr4", 620.0)
    assert "blue brittleness" in said("42CrMo4", 300.0)
    assert "blue brittleness" not in said("42CrMo4", 200.0)
    assert "within 20 K of Ae1 (725 degC)" in said("42CrMo4", 710.0)
    assert embrittlement.cautions(SHAFT, [], ae1=725.0 + ZERO) == ()
