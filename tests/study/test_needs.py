"""Verdicts on an invented section whose numbers are known exactly.

A round of 100 mm: Vickers hardness falls by 4 HV a millimetre from 500 HV at the surface
to 300 HV at the core, martensite from 1 to 0. The coarser solutions are off by known
amounts, so that the numerical error is arithmetic.
"""

from dataclasses import dataclass, replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem import section as forms
from midradius.fem.section import Cut
from midradius.study import uncertainty
from midradius.study.case import Case, Need, Outputs, SectionInput, Stage, SteelInput, position
from midradius.study.needdepth import crossing, nearest_met
from midradius.study.needs import any_fails, judge
from midradius.study.result import Verdict
from midradius.study.scale import scales
from midradius.study.setup import coordinates_of
from midradius.study.uncertainty import ALLOY, AS_COOLED, widest
from midradius.study.worth import Worth
from midradius.thermo.austenite import soak
from midradius.thermo.conversion import hrc_to_hv
from midradius.thermo.grades import grade
from midradius.thermo.phases import CEMENTITE, FERRITE, MARTENSITE
from midradius.thermo.soaked import alike

RADIUS = 0.05
STEEL = grade("42CrMo4")
FACTORS = (2.0, 0.5)


@dataclass(frozen=True)
class Invented:
    cut: Cut
    worth: Worth


def solution(cells: int, shift_hv: float = 0.0) -> Invented:
    cut = forms.cut(forms.round_bar(2.0 * RADIUS), (cells,), strongest_film={"side": 500.0})
    depth = RADIUS - cut.body.points[:, 0]
    phases = np.zeros((6, len(depth)))
    phases[MARTENSITE] = 1.0 - depth / RADIUS
    phases[FERRITE] = 0.9 * (1.0 - phases[MARTENSITE])
    phases[CEMENTITE] = 0.1 * (1.0 - phases[MARTENSITE])
    hardness = 500.0 - 4e3 * depth + shift_hv
    sizes = scales(
        STEEL.composition,
        phases,
        rate_700=np.ones(len(depth)),
        pearlite_temp=np.full(len(depth), np.nan),
        grain_intercept=soak(STEEL, 1123.15, 3600.0).grain_mean_intercept,
        carbide_left=0.0,
    )
    soaked = alike(soak(STEEL, 1123.15, 3600.0), 1123.15, 3600.0, len(depth))
    return Invented(cut, Worth(phases, hardness, hardness, 2.0 * hardness, sizes, soaked, (), ()))


def case_of(need: Need, *, tempered: bool = False, grain: float | None = None) -> Case:
    stages = [Stage("soak", at=1123.15, time=3600.0)]
    if tempered:
        stages.append(Stage("temper", at=873.15, time=3600.0))
    return Case(
        title="Stud HF-0003",
        steel=SteelInput(STEEL, grain),
        section=SectionInput("round", diameter=2.0 * RADIUS),
        route=tuple(stages),
        outputs=Outputs((position("core"),)),
        needs=(need,),
    )


def verdict_on(
    need: Need, *, rough_hv: float = 0.0, sharp_hv: float = 0.0, tempered: bool = False
) -> Verdict:
    case = case_of(need, tempered=tempered)
    solved = [solution(64), solution(32, rough_hv), solution(32, sharp_hv)]
    placed = [
        (
            each,
            {
                name: forms.place(each.cut, coordinates_of(each.cut.section, place))
                for name, place in case.watched.items()
            },
        )
        for each in solved
    ]
    (verdict,) = judge(case, *placed, FACTORS)
    return verdict


def hardness(position: str, unit: str = "HV", **limits: float) -> Need:
    return Need(position, "hardness", unit, **limits)


def test_value_and_margin_stand_in_the_unit_asked() -> None:
    verdict = verdict_on(hardness("25 mm below surface", "HB", at_least=200.0))
    assert verdict.value is not None and verdict.margin is not None
    # Brinell is 0.95 of Vickers, 400 HV half way down
    assert_allclose(verdict.value, 380.0, rtol=1e-12, atol=0.0)
    assert_allclose(verdict.margin, 180.0, rtol=1e-12, atol=0.0)
    assert (verdict.unit, verdict.limit, verdict.outcome) == ("HB", 200.0, "holds")
    assert verdict.need == "hardness at 25 mm below surface: at least 200 HB"


@pytest.mark.parametrize(
    ("limit", "outcome"),
    [(20.0, "holds"), (37.0, "too close to call"), (45.0, "too close to call"), (50.0, "fails")],
)
def test_a_margin_within_the_measured_error_is_too_close_to_call(
    limit: float, outcome: str
) -> None:
    # ASTM E140, read: 392 HV is 40 HRC; 400 HV a little more
    measured = widest(ALLOY, "hardness", "HRC", AS_COOLED)
    assert measured is not None and measured.p90 is not None
    verdict = verdict_on(hardness("25 mm below surface", "HRC", at_least=limit))
    assert verdict.margin is not None
    assert abs(verdict.margin) < measured.p90 or outcome != "too close to call"
    assert verdict.model_uncertainty == measured.p90
    assert verdict.outcome == outcome


def test_the_numerical_error_comes_from_the_three_solutions() -> None:
    verdict = verdict_on(hardness("core", at_least=100.0), rough_hv=6.0, sharp_hv=5.0)
    assert verdict.numerical_uncertainty is not None
    assert_allclose(verdict.numerical_uncertainty, 2.0 * 1.0 + 0.5 * 6.0, rtol=1e-9, atol=0.0)


def test_a_large_numerical_error_alone_makes_a_verdict_too_close_to_call() -> None:
    need = hardness("core", at_least=200.0)
    assert verdict_on(need).outcome == "holds"
    assert verdict_on(need, rough_hv=200.0, sharp_hv=200.0).outcome == "too close to call"


def test_a_value_without_the_unit_asked_is_compared_in_vickers() -> None:
    # tensile strength ends at 650 HV
    need = Need("surface", "tensile", "MPa", at_least=1000.0)
    solved = solution(64, 300.0)
    case = case_of(need)
    at = {"surface": forms.place(solved.cut, (RADIUS,))}
    one = (solved, at)
    (verdict,) = judge(case, one, one, one, FACTORS)
    assert (verdict.unit, verdict.value) == ("HV", 800.0)
    assert verdict.outcome == "holds"
    assert verdict.note == "800 HV has no MPa: compared in HV"


def test_between_holds_only_with_both_limits_clear() -> None:
    assert verdict_on(hardness("core", at_least=200.0, at_most=400.0)).outcome == "holds"
    close = verdict_on(hardness("core", at_least=200.0, at_most=320.0))
    assert (close.outcome, close.limit) == ("too close to call", 320.0)
    outside = verdict_on(hardness("core", at_least=400.0, at_most=500.0))
    assert (outside.outcome, outside.limit, outside.margin) == ("fails", 400.0, pytest.approx(-100))


def test_everywhere_is_judged_at_the_worst_node() -> None:
    soft = verdict_on(hardness("everywhere", at_least=100.0))
    assert soft.value is not None
    assert_allclose(soft.value, 300.0, rtol=1e-12, atol=0.0)
    hard = verdict_on(hardness("everywhere", at_most=100.0))
    assert hard.value is not None
    assert_allclose(hard.value, 500.0, rtol=1e-12, atol=0.0)
    assert hard.note == "worst 0.0 mm below the surface; met in 0 % of the section"


def test_a_failing_hardness_names_the_nearest_depth_where_it_is_reached() -> None:
    verdict = verdict_on(hardness("core", "HV", at_least=420.0))
    assert verdict.outcome == "fails"
    assert verdict.note == ("nearest place that meets it: 20.0 mm on the profile, surface to core")
    nowhere = verdict_on(hardness("core", "HV", at_least=700.0))
    assert nowhere.note == "met nowhere on the profile, surface to core"


@pytest.mark.parametrize(("to", "depth_mm"), [(400.0, 25.0), (460.0, 10.0), (520.0, 0.0)])
def test_a_hardened_depth_ends_where_the_profile_crosses(to: float, depth_mm: float) -> None:
    verdict = verdict_on(
        Need("everywhere", "hardened depth", "mm", at_least=1.0, to=to, to_unit="HV")
    )
    assert verdict.value is not None
    assert_allclose(verdict.value, depth_mm, rtol=0.0, atol=1e-9)
    assert verdict.position == "surface to core"


def test_a_hardened_depth_counts_to_a_share_of_martensite_and_in_inches() -> None:
    need = Need("everywhere", "hardened depth", "in", at_least=0.1, to=50.0, to_unit="% martensite")
    verdict = verdict_on(need)
    assert verdict.value is not None
    assert_allclose(verdict.value, 25.0 / 25.4, rtol=1e-9, atol=0.0)
    assert verdict.need == "hardened depth to 50 % martensite: at least 0.1 in"


def test_a_part_that_never_falls_below_is_hardened_through() -> None:
    need = Need("everywhere", "hardened depth", "mm", at_least=40.0, to=200.0, to_unit="HV")
    verdict = verdict_on(need)
    assert (verdict.value, verdict.note) == (pytest.approx(50.0), "hardened through")
    assert verdict.outcome == "holds"  # 200 HV and its error lie below the core


def test_the_model_error_of_a_depth_is_taken_along_the_profile() -> None:
    need = Need("everywhere", "hardened depth", "mm", at_least=1.0, to=400.0, to_unit="HV")
    verdict = verdict_on(need)
    wide = uncertainty.hardness(STEEL.composition, "HV", 400.0, condition=AS_COOLED)
    assert verdict.model_uncertainty is not None
    # 4 HV a millimetre
    assert_allclose(verdict.model_uncertainty, wide.below / 4.0, rtol=1e-9, atol=0.0)


def test_the_film_is_half_the_fraction_times_the_intercept() -> None:
    left = soak(STEEL, 1123.15, 3600.0)
    verdict = verdict_on(Need("core", "cementite film", "um", at_most=10.0))
    assert verdict.value is not None
    assert_allclose(
        verdict.value, 1e6 * 0.1 * left.grain_mean_intercept / 2.0, rtol=1e-12, atol=0.0
    )


def test_a_phase_is_judged_in_percent_and_yield_in_its_unit() -> None:
    ferrite = verdict_on(Need("core", "ferrite", "%", at_most=5.0))
    assert (ferrite.value, ferrite.outcome) == (pytest.approx(90.0), "fails")
    strong = verdict_on(Need("core", "yield", "ksi", at_least=10.0))
    assert strong.value is not None
    # 600 MPa; 1 ksi is 6.894757293168361 MPa (NIST SP 811)
    assert_allclose(strong.value, 600.0 / 6.894757293168361, rtol=1e-12, atol=0.0)


def test_what_no_model_gives_is_too_close_to_call() -> None:
    solved = solution(64)
    blind = replace(solved, worth=replace(solved.worth, yield_mpa=np.full(65, np.nan)))
    case = case_of(Need("core", "yield", "MPa", at_least=500.0))
    one = (blind, {"core": forms.place(blind.cut, (0.0,))})
    (verdict,) = judge(case, one, one, one, FACTORS)
    assert (verdict.value, verdict.margin) == (None, None)
    assert (verdict.outcome, verdict.note) == ("too close to call", "no model gives a value here")


def test_a_grain_of_the_soak_is_less_sure_than_one_that_the_case_gives() -> None:
    need = Need("everywhere", "grain", "ASTM", at_least=5.0)
    free = verdict_on(need)
    case = case_of(need, grain=8.0)
    left = alike(soak(STEEL, 1123.15, 3600.0, grain_astm=8.0), 1123.15, 3600.0, 65)
    free_of = solution(64)
    one = (replace(free_of, worth=replace(free_of.worth, soaked=left)), {})
    (given,) = judge(case, one, one, one, FACTORS)
    assert given.value == 8.0
    assert given.model_uncertainty is not None and free.model_uncertainty is not None
    assert given.model_uncertainty < free.model_uncertainty


def test_a_tempered_part_has_the_error_of_tempered_readings() -> None:
    need = hardness("core", "HRC", at_least=25.0)
    measured = widest(ALLOY, "hardness", "HRC", uncertainty.TEMPERED)
    assert measured is not None
    verdict = verdict_on(need, tempered=True)
    assert verdict.model_uncertainty == measured.p90
    assert "tempered bars" in verdict.model_basis


def test_only_a_failing_verdict_counts_as_failing() -> None:
    holds = verdict_on(hardness("core", at_least=100.0))
    close = verdict_on(hardness("core", at_least=299.0))
    fails = verdict_on(hardness("core", at_least=600.0))
    assert [v.outcome for v in (holds, close, fails)] == ["holds", "too close to call", "fails"]
    assert not any_fails((holds, close))
    assert any_fails((holds, close, fails))


def test_a_profile_that_dips_ends_the_depth_at_its_first_crossing() -> None:
    depth, values = np.array([0.0, 1.0, 2.0, 3.0]), np.array([500.0, 300.0, 500.0, 500.0])
    assert_allclose(crossing(depth, values, 400.0), 0.5, rtol=0.0, atol=1e-12)
    assert_allclose(crossing(depth, values, 200.0), 3.0, rtol=0.0, atol=0.0)
    assert_allclose(crossing(depth, values, 600.0), 0.0, rtol=0.0, atol=0.0)


def test_the_nearest_depth_that_meets_a_limit_lies_between_points() -> None:
    depth, margin = np.array([0.0, 1.0, 2.0, 3.0]), np.array([-1.0, 1.0, -1.0, -3.0])
    assert nearest_met(depth, margin, 3.0) == pytest.approx(1.5)
    assert nearest_met(depth, margin, 0.0) == pytest.approx(0.5)
    assert nearest_met(depth, margin - 5.0, 0.0) is None


def test_the_limit_in_rockwell_c_is_the_printed_vickers_hardness() -> None:
    # ASTM E140 table 1, read: 30 HRC is 302 HV: 2 HV above the core
    assert_allclose(float(hrc_to_hv(30.0)), 302.0, rtol=0.0, atol=0.0)
    verdict = verdict_on(hardness("core", "HRC", at_least=30.0))
    assert verdict.margin is not None
    assert -0.5 < verdict.margin < 0.0
