"""Diagrams against the rate equations themselves, and as files."""

import csv
import json
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study.diagram import (
    DIFFUSIONAL,
    Cooling,
    Isothermal,
    Soaked,
    cooling,
    isothermal,
    soaked,
)
from midradius.study.diagramsheet import at_rates, shown_rates
from midradius.study.sectioncurves import SectionCurves, curves_of, since
from midradius.thermo import clocks
from midradius.thermo import kinetics as kin
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.martensite import rate as martensite_rate
from midradius.thermo.phases import MARTENSITE


@cache
def metal(name: str = "4140") -> Soaked:
    return soaked(grade(name), temp=1118.15, time=1800.0, grain_astm=7.0)


@cache
def held(name: str = "4140") -> Isothermal:
    return isothermal(metal(name))


@cache
def cooled(name: str = "4140") -> Cooling:
    return cooling(metal(name))


def test_bainite_alone_takes_the_time_of_its_rate_equation() -> None:
    # where nothing else forms: t = S(X) / rate, S by quadrature
    steel, diagram = metal(), held()
    column = steel.tables.value[0, :, kin.RATE_BAINITE]
    at = int(np.argmax(diagram.reached[4]))
    assert diagram.reached[4, at] > 0.999
    rate = np.interp(
        diagram.temp[at], steel.tables.first + np.arange(len(column)) * steel.tables.step, column
    )
    exact = clocks.integral(np.array([0.01, 0.5, 0.99])) / rate
    # time steps of 6 % between which the fraction is taken straight
    assert_allclose(diagram.times["bainite"][:, at], exact, rtol=0.01, atol=0.0)


def test_every_line_comes_after_the_one_before() -> None:
    for name in ("4140", "1045", "1080"):
        for product in DIFFUSIONAL:
            start, half, end = held(name).times[product]
            both = np.isfinite(half)
            assert np.all(start[both] <= half[both])
            assert np.all(half[both] <= end[both])


def test_nothing_forms_above_its_line() -> None:
    steel, diagram = metal(), held()
    for product, line in (("ferrite", "Ae3"), ("pearlite", "Ae1"), ("bainite", "Bs")):
        begun = np.isfinite(diagram.times[product][0])
        assert diagram.temp[begun].max() < steel.critical[line]
        assert diagram.temp.min() >= steel.critical["Ms"]


def test_the_fastest_cooling_leaves_the_martensite_of_its_equation() -> None:
    steel, diagram = metal(), cooled()
    left = steel.austenite
    speed = float(martensite_rate(left.composition, left.carbon_pct))
    exact = -np.expm1(-speed * (steel.critical["Ms"] - 293.15))
    assert_allclose(diagram.phases[MARTENSITE, 0], exact, rtol=1e-3, atol=0.0)


def test_slower_cooling_never_leaves_more_martensite() -> None:
    for name in ("4140", "1045", "1080"):
        assert np.all(np.diff(cooled(name).phases[MARTENSITE]) <= 1e-9)


def test_fractions_sum_to_one_and_hardness_is_known() -> None:
    diagram = cooled()
    assert_allclose(diagram.phases.sum(axis=0), 1.0, rtol=1e-12, atol=0.0)
    assert np.isfinite(diagram.hardness_hv).all()
    assert_allclose(at_rates(diagram, diagram.rate, diagram.rate[::7].tolist()), diagram.rate[::7],
                    rtol=1e-9, atol=0.0)  # fmt: skip


def test_between_critical_rates_products_are_there_and_beyond_they_are_not() -> None:
    diagram = cooled()
    own = diagram.phases[4]  # bainite
    assert np.all(own[diagram.rate > 1.05 * diagram.critical["bainite below"]] < 0.01)
    some = (diagram.rate < 0.95 * diagram.critical["bainite below"]) & (
        diagram.rate > 1.05 * diagram.critical["no bainite below"]
    )
    assert some.any()
    assert np.all(own[some] > 0.01)


def test_a_rate_that_is_not_among_those_drawn_is_not_known() -> None:
    assert np.isnan(cooled("1080").critical["ferrite below"])


def test_between_six_and_nine_round_rates_are_shown() -> None:
    for name in ("4140", "1045", "1080", "C15E"):
        given = shown_rates(cooling(soaked(grade(name), temp=1200.0, time=1800.0, grain_astm=7.0)))
        assert 6 <= len(given) <= 9
        assert given == sorted(given, reverse=True)


def test_a_soak_below_ae1_is_refused() -> None:
    with pytest.raises(InputFault, match="soak temperature"):
        soaked(grade("4140"), temp=900.0, time=1800.0, grain_astm=7.0)


def test_section_curves_count_from_the_line_where_clocks_begin() -> None:
    time = np.array([0.0, 10.0, 20.0, 30.0])
    temp = np.array([[1100.0, 900.0], [1000.0, 800.0], [900.0, 700.0], [800.0, 600.0]])
    curves = SectionCurves("t", "s", {}, 1100.0, 60.0, None, ("core", "skin"), time, temp)
    (first, first_time, first_temp), (second, second_time, _) = since(curves, 950.0)
    assert (first, second) == ("core", "skin")
    assert_allclose(first_time, [5.0, 15.0], rtol=1e-12, atol=0.0)  # 950 K is crossed at 15 s
    assert_allclose(first_temp, [900.0, 800.0], rtol=1e-12, atol=0.0)
    assert_allclose(second_time, time, rtol=1e-12, atol=0.0)
    assert since(curves, 500.0) == []


# The command


@pytest.mark.parametrize("kind", ["isothermal", "cooling"])
def test_a_diagram_is_a_table_and_a_picture_with_the_section_on_top(
    call, small: str, tmp_path: Path, kind: str
) -> None:
    (tmp_path / "stud.toml").write_text(small, encoding="utf-8")
    assert call("run", "stud.toml", "--out", "stud", "--quiet").code == 0
    answer = call("diagram", "C45E", "--kind", kind, "--result", "stud")
    assert (answer.code, answer.err) == (0, "")
    assert "C45E: 850 degC, 60 min" in answer.out  # the soak of the section
    assert f"Written to C45E-{kind}" in answer.out
    folder = tmp_path / f"C45E-{kind}"
    assert (folder / f"{kind}.png").read_bytes().startswith(b"\x89PNG")
    with (folder / f"{kind}.csv").open(encoding="utf-8", newline="") as file:
        heads, *lines = csv.reader(file)
    assert heads[0] == ("hold_degC" if kind == "isothermal" else "rate_K_per_s")
    assert len(lines) > 50
    assert all(len(line) == len(heads) for line in lines)


def test_a_record_and_its_case_give_the_same_curves(call, small: str, tmp_path: Path) -> None:
    (tmp_path / "stud.toml").write_text(small, encoding="utf-8")
    assert call("run", "stud.toml", "--out", "stud", "--quiet").code == 0
    kept, solved = curves_of(tmp_path / "stud"), curves_of(tmp_path / "stud.toml")
    assert (kept.names, kept.soak_temp, kept.grain_astm) == (
        solved.names, solved.soak_temp, solved.grain_astm,
    )  # fmt: skip
    assert kept.composition_pct == solved.composition_pct
    assert_allclose(kept.temp, solved.temp, rtol=1e-12, atol=0.0)


def test_json_is_one_document_and_writes_no_folder(call, tmp_path: Path) -> None:
    answer = call("diagram", "4140", "--kind", "cooling", "--json")
    assert (answer.code, answer.err) == (0, "")
    said = json.loads(answer.out)
    assert said["grade"] == "4140"
    assert set(said["critical_degC"]) == {"Ae3", "Ae1", "Bs", "Ms"}
    assert len(said["table"]["hardness_HV"]) == len(said["table"]["rate_K_per_s"])
    assert list(tmp_path.iterdir()) == []


def test_curves_of_another_composition_are_told_apart(call, small: str, tmp_path: Path) -> None:
    (tmp_path / "stud.toml").write_text(small, encoding="utf-8")
    assert call("run", "stud.toml", "--out", "stud", "--quiet").code == 0
    answer = call("diagram", "42CrMo4", "--kind", "cooling", "--result", "stud/record.h5")
    assert "the section's curves are those of C45E, another composition" in answer.out


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("4140",), "--kind"),
        (("4140", "--kind", "both"), "'isothermal', 'cooling'"),
        (("4140", "--kind", "cooling", "--result", "nowhere"), "a whole midradius record"),
        (("4140", "--kind", "cooling", "--time", "1 s 2"), "--time"),
    ],
)
def test_bad_input_of_a_diagram_is_answered(call, words: tuple[str, ...], said: str) -> None:
    answer = call("diagram", *words)
    assert (answer.code, answer.out) == (2, "")
    assert said in answer.err
