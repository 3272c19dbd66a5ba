"""Rates of a case: sets by name, measured curves of the heat, their faults."""

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study.case import Case
from midradius.study.casefaults import CaseFaults
from midradius.study.casefile import dumps, loads, read
from midradius.study.diagram import isothermal, soaked
from midradius.study.diagramsheet import isothermal_picture
from midradius.study.runner import run
from midradius.study.transformationfile import read_transformation
from midradius.thermo.ratechoice import DEFAULT, KIRKALDY, Kinetics
from midradius.thermo.steel import Composition, Steel

ATLAS = Path(__file__).parents[1] / "published" / "isothermal_1080.csv"
CASE = """
[steel]
composition = {{ C = 0.79, Mn = 0.76 }}
austenite_grain = "ASTM 6"
{steel}

[section]
form = "round"
diameter = "20 mm"

[[route]]
stage = "soak"
at = "900 degC"
time = "30 min"

[[route]]
stage = "quench"
medium = "{medium}"
time = "20 min"

[output]
positions = ["core"]

[grid]
cells = 8
"""


def case(folder: Path, steel: str, medium: str = "still air") -> Case:
    path = folder / "case.toml"
    path.write_text(CASE.format(steel=steel, medium=medium), encoding="utf-8")
    return read(path)


def faults_of(folder: Path, rows: str) -> list[str]:
    path = folder / "heat.csv"
    path.write_text(rows, encoding="utf-8")
    with pytest.raises(CaseFaults) as caught:
        read_transformation(path)
    return [str(fault).replace(str(path), "heat.csv") for fault in caught.value.faults]


def test_a_published_diagram_comes_out_of_the_kernel_as_it_went_in() -> None:
    steel = Steel("1080", Composition(C=0.79, Mn=0.76), "atlas", "remembered")
    metal = soaked(
        steel,
        temp=1173.15,
        time=1800.0,
        grain_astm=6.0,
        kinetics=Kinetics(measured=read_transformation(ATLAS)),
    )
    diagram = isothermal(metal)
    assert_allclose(metal.critical["Ms"] - 273.15, 230.0, rtol=0.0, atol=1e-9)
    for product, temp, begin, end in (
        ("pearlite", 650.0, 6.0, 50.0),
        ("pearlite", 600.0, 1.3, 10.0),
        ("bainite", 425.0, 3.5, 40.0),
        ("bainite", 350.0, 17.0, 250.0),
    ):
        first, _, last = diagram.times[product]
        # the holds are 2.5 K apart and the time steps 6 %
        at = np.interp(temp, diagram.temp - 273.15, np.arange(len(diagram.temp)))
        near = [int(np.floor(at)), int(np.ceil(at))]
        assert_allclose(np.exp(np.log(first[near]).mean()), begin, rtol=0.06, atol=0.0)
        assert_allclose(np.exp(np.log(last[near]).mean()), end, rtol=0.06, atol=0.0)
    figure = isothermal_picture(metal, diagram, None)
    marks = [line for line in figure.axes[0].lines if line.get_marker() == "o"]
    assert sum(len(line.get_xdata()) for line in marks) == 16


def test_a_case_transforms_as_its_heat_was_measured(tmp_path: Path) -> None:
    (tmp_path / "itd.csv").write_bytes(ATLAS.read_bytes())
    text = 'transformation = "itd.csv"'
    slow = run(case(tmp_path, text))
    assert slow.positions[0].phases["pearlite"] > 0.99
    assert_allclose(slow.critical_degC["Ms"], 230.0, rtol=0.0, atol=1e-9)
    said = "\n".join(slow.assumptions)
    assert "as measured in itd.csv: pearlite 540 to 680 degC, bainite 300 to 540 degC" in said
    assert "The rest: Li 1998, extended (the default)" in said
    assert "measured transformation" in [source.model for source in slow.sources]
    # Every time a thousandfold, the bar hardens in the same air: so it is the table that acts.
    head, *rows = [row for row in ATLAS.read_text().splitlines() if not row.startswith("#")]
    cells = [row.split(",") for row in rows]
    late = [",".join([t, s and f"{1e3 * float(s):g}", *rest]) for t, s, *rest in cells]
    (tmp_path / "itd.csv").write_text("\n".join([head, *late]))
    hard = run(case(tmp_path, text))
    assert hard.positions[0].phases["martensite"] > 0.8


def test_a_case_names_its_set_of_rates(tmp_path: Path) -> None:
    plain = case(tmp_path, "")
    assert plain.steel.kinetics == DEFAULT
    other = case(tmp_path, 'kinetics = "Kirkaldy-Venugopalan 1984"')
    assert other.steel.kinetics == Kinetics(KIRKALDY)
    result = run(replace(other, section=replace(other.section, diameter=0.01)))
    assert "Rates of ferrite, pearlite and bainite: Kirkaldy-Venugopalan 1984." in (
        result.assumptions
    )
    assert any("Saunders" in source.work for source in result.sources)


def test_rates_survive_the_way_to_text_and_back(tmp_path: Path) -> None:
    (tmp_path / "itd.csv").write_bytes(ATLAS.read_bytes())
    one = case(tmp_path, 'kinetics = "kirkaldy venugopalan 1984"\ntransformation = "itd.csv"')
    text = dumps(one)
    assert 'transformation = "itd.csv"' in text
    assert loads(text, path=tmp_path / "case.toml") == one


def test_faults_of_a_case_name_the_key_and_the_line_of_the_table(tmp_path: Path) -> None:
    (tmp_path / "itd.csv").write_text(
        "temperature_degC,time_s,fraction_pct,product\n650,6,1,perlite\n"
    )
    with pytest.raises(CaseFaults) as caught:
        case(tmp_path, 'kinetics = "Li 1989"\ntransformation = "itd.csv"')
    said = str(caught.value)
    assert 'steel.kinetics = "Li 1989", but must be "Li 1998, extended" or "Li 1998"' in said
    assert 'itd.csv, line 2: product = "perlite", but must be ferrite, cementite' in said


def test_a_calibration_and_measured_curves_exclude_each_other(tmp_path: Path) -> None:
    with pytest.raises(CaseFaults, match="left out where a calibration is given"):
        case(tmp_path, 'calibration = "heat.toml"\ntransformation = "itd.csv"')


def test_all_faults_of_a_table_come_together(tmp_path: Path) -> None:
    found = faults_of(
        tmp_path,
        "temperature_degC,time_s,fraction_pct,product\n"
        "650,6,1,pearlite\n"
        "650,-2,99,pearlite\n"
        "6500,6,1,pearlite\n"
        "650,6,101,pearlite\n"
        "650,6,1,upper bainite\n"
        "230,5,0,martensite\n",
    )
    assert [said.partition(":")[0] for said in found] == [
        f"heat.csv, line {line}" for line in (3, 4, 5, 6, 7)
    ]
    assert 'time = "-2", but must be' in found[0]
    assert 'fraction = "101", but must be 0.01 to 99.99 %, start, half' in found[2]
    assert 'time = "5", but must be empty for martensite' in found[4]


def test_faults_of_the_curves_name_their_product(tmp_path: Path) -> None:
    head = "temperature_degC,time_s,fraction_pct,product\n"
    one = faults_of(tmp_path, head + "650,6,1,pearlite\n650,50,99,pearlite\n")
    assert "pearlite: temperatures of pearlite = 1, but must be two or more" in one[0]
    rows = "650,6,1,pearlite\n600,6,1,pearlite\n600,50,99,pearlite\n"
    assert "points at 650 degC = 1, but must be two or more" in faults_of(tmp_path, head + rows)[0]


def test_continuous_cooling_is_refused_in_words(tmp_path: Path) -> None:
    (said,) = faults_of(tmp_path, "rate_K_per_s,temperature_degC,fraction_pct,product\n1,600,1,b\n")
    assert "column rate_k_per_s: continuous cooling is not read" in said
    assert "midradius calibrate" in said


def test_units_in_cells_mean_the_same_as_in_the_head(tmp_path: Path) -> None:
    path = tmp_path / "cells.csv"
    path.write_text(
        "temperature;time;fraction;product\n"
        "650 degC;0,1 min;1 %;pearlite\n650 degC;50 s;99;pearlite\n"
        "1112 degF;1,3 s;1 %;pearlite\n600 degC;10 s;finish;pearlite\n"
    )
    head = tmp_path / "head.csv"
    head.write_text(
        "temperature_degC,time_s,fraction_pct,product\n"
        "650,6,1,pearlite\n650,50,99,pearlite\n600,1.3,1,pearlite\n600,10,99,pearlite\n"
    )
    (ours,), (theirs,) = (read_transformation(p).products for p in (path, head))
    assert_allclose(ours.temp, theirs.temp, rtol=1e-12, atol=0.0)
    assert_allclose(ours.time, theirs.time, rtol=1e-9, atol=0.0)


def test_the_commands_take_a_set_by_name(call: Callable[..., Any]) -> None:
    asked = ("diagram", "1045", "--json", "--kind", "isothermal", "--kinetics")
    assert json.loads(call(*asked, "Kirkaldy-Venugopalan 1984").out)["kinetics"] == KIRKALDY
    wrong = call(*asked, "Kirk 1984")
    assert wrong.code == 2
    assert 'kinetics = "Kirk 1984", but must be "Li 1998, extended" or' in wrong.err
