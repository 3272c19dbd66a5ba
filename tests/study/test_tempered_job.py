"""A case with tempers through the whole job."""

import json
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.case import Case, SteelInput
from midradius.study.job import solve
from midradius.study.result import Result
from midradius.study.summary import document
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.phases import AUSTENITE, BAINITE, PHASE_NAMES
from midradius.thermo.steel import Composition, Steel

TEMPER = '[[route]]\nstage = "temper"\nat = "{at}"\ntime = "{time}"\n\n[output]'


def tempered_case(small: str, at: str, time: str = "2 h") -> Case:
    case = casefile.loads(small.replace("[output]", TEMPER.format(at=at, time=time)))
    return replace(case, steel=SteelInput(grade("42CrMo4")))


@pytest.fixture(scope="module")
def quenched(small: str) -> Result:
    return solve(replace(casefile.loads(small), steel=SteelInput(grade("42CrMo4"))))


@pytest.fixture(scope="module")
def tempered(small: str) -> Result:
    return solve(tempered_case(small, "600 degC"))


def test_hardness_as_quenched_is_that_of_the_route_without_the_temper(
    quenched: Result, tempered: Result
) -> None:
    assert_allclose(
        tempered.hardness_as_quenched_hv, quenched.hardness_hv, rtol=0, atol=0, equal_nan=True
    )
    assert_allclose(quenched.hardness_as_quenched_hv, quenched.hardness_hv, rtol=0, atol=0)
    assert np.all(tempered.hardness_hv < quenched.hardness_hv - 100.0)
    for p, before in zip(tempered.positions, quenched.positions, strict=True):
        assert_allclose(p.hardness_as_quenched_hv, before.hardness_hv, rtol=1e-15, atol=0)
        assert p.tensile_mpa is not None and before.tensile_mpa is not None
        assert p.tensile_mpa < before.tensile_mpa
        assert p.hardness_time_error_hv <= before.hardness_time_error_hv + 1e-9


def test_yield_stays_below_tensile_strength(quenched: Result, tempered: Result) -> None:
    for p in tempered.positions:
        assert p.yield_mpa is not None and p.tensile_mpa is not None
        assert 0.5 * p.tensile_mpa < p.yield_mpa < p.tensile_mpa
    known = np.isfinite(quenched.yield_mpa)
    assert np.all(quenched.yield_mpa[known] < 3.5 * quenched.hardness_hv[known])


def test_phases_sum_to_one_and_decomposed_austenite_is_counted_as_bainite(
    quenched: Result, tempered: Result
) -> None:
    assert_allclose(tempered.phases.sum(axis=0), 1.0, rtol=0, atol=1e-9)
    assert_allclose(tempered.phases[AUSTENITE], 0.0, rtol=0, atol=1e-12)
    before = quenched.phases[AUSTENITE] + quenched.phases[BAINITE]
    assert_allclose(tempered.phases[BAINITE], before, rtol=0, atol=1e-12)
    assert list(tempered.positions[0].phases) == list(PHASE_NAMES)


def test_temperatures_and_times_end_with_the_cooling(quenched: Result, tempered: Result) -> None:
    assert_allclose(tempered.temp_degC, quenched.temp_degC, rtol=0, atol=0)
    assert [stage.kind for stage in tempered.stages] == ["quench"]
    assert [(t.at_degC, t.time_s) for t in tempered.tempers] == [(600.0, 7200.0)]


def test_what_the_temper_rests_on_is_said(quenched: Result, tempered: Result) -> None:
    assert any("hot throughout" in line for line in tempered.assumptions)
    assert not any("hot throughout" in line for line in quenched.assumptions)
    models = [source.model for source in tempered.sources]
    assert "hardness of tempered martensite" in models
    assert "yield strength from hardness" in models
    assert "hardness of tempered martensite" not in [s.model for s in quenched.sources]


def test_the_document_of_a_tempered_part_is_json_with_both_hardnesses(tempered: Result) -> None:
    back = json.loads(json.dumps(document(tempered), allow_nan=False))
    assert back["tempers"] == [{"at_degC": 600.0, "time_s": 7200.0}]
    core = back["positions"][-1]
    assert core["hardness_hv"] < core["hardness_as_quenched_hv"]
    assert core["yield_mpa"] < core["tensile_mpa"]


def test_a_temper_near_ae1_and_one_in_a_brittle_range_are_cautioned(small: str) -> None:
    hot = solve(tempered_case(small, "715 degC"))
    assert any("within 20 K of Ae1" in line for line in hot.cautions)
    mild = solve(tempered_case(small, "300 degC"))
    assert any("250 to 400 degC embrittles" in line for line in mild.cautions)
    assert any(note.quantity == "temper (as 2 h)" for note in mild.notes)


def test_a_case_made_in_python_of_a_secondary_hardening_steel_is_refused(small: str) -> None:
    steel = Steel("own", Composition(C=0.4, Cr=2.0, Mo=1.4), "here", "given")
    case = replace(tempered_case(small, "560 degC"), steel=SteelInput(steel))
    with pytest.raises(InputFault, match="Mo of a steel to be tempered = 1.4 %"):
        solve(case)
