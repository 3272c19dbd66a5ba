"""A heat fitted to its measured transformation diagram, alone and beside an end-quench curve.

The known shifts that made the points are the expected values; the points themselves come
from `study.diagram` through its own tables, not through what the fit computes.
"""

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study import diagram
from midradius.study.calibrationfile import read_calibration
from midradius.study.casefaults import CaseFaults
from midradius.study.casefile import loads
from midradius.study.job import solve
from midradius.study.measureddiagram import Point, read_diagram
from midradius.thermo.calibration import Shifts
from midradius.thermo.grades import grade

SOAK = {"temp": 850.0 + 273.15, "time": 1800.0, "grain_astm": 7.0}
MADE = Shifts(diffusional_time=2.2, bainite_time=0.6, martensite_start=12.0, hardness=15.0)
HEAD = "temperature_degC,time_s,product,fraction"


@pytest.fixture(scope="module")
def holds() -> str:
    """Starts and ends of pearlite and bainite from the drawn isothermal diagram."""
    metal = diagram.soaked(grade("42CrMo4"), **SOAK, shifts=MADE)
    drawn = diagram.isothermal(metal)
    rows = [HEAD]
    for k in range(4, len(drawn.temp), 12):
        for product in ("ferrite", "bainite"):
            start = drawn.times[product][0][k]
            if np.isfinite(start) and start < 1e5:
                rows.append(f"{drawn.temp[k] - 273.15:.4f},{start:.6g},{product},start")
        half = drawn.total[1][k]
        if np.isfinite(half) and half < 1e5:
            rows.append(f"{drawn.temp[k] - 273.15:.4f},{half:.6g},all,half")
    return "\n".join(rows) + "\n"


@pytest.fixture(scope="module")
def coolings() -> str:
    """Starts and hardness from the drawn diagram of cooling, with t8/5 in place of the rate."""
    metal = diagram.soaked(grade("42CrMo4"), **SOAK, shifts=MADE)
    drawn = diagram.cooling(metal)
    rows = ["time_800_500_s;temperature_degC;product;fraction;hardness_HV"]
    for k in range(8, len(drawn.rate), 6):
        spent = 300.0 / drawn.rate[k]
        rows.append(f"{spent:.6g};;;;{drawn.hardness_hv[k] + MADE.hardness:.3f}")
        for product in ("ferrite", "bainite", "martensite"):
            start = drawn.temps[product][0][k]
            if np.isfinite(start):
                rows.append(f"{spent:.6g};{start - 273.15:.3f};{product};start;")
    return "\n".join(rows).replace(".", ",") + "\n"


def test_holds_give_both_time_factors_back(call, tmp_path: Path, holds: str) -> None:
    (tmp_path / "holds.csv").write_text(holds, encoding="utf-8")
    words = ("calibrate", "42CrMo4", "--austenitize", "850 degC", "--measured", "holds.csv")
    answer = call(*words, "--json")
    assert (answer.code, answer.err) == (0, "")
    found = json.loads(answer.out)
    assert_allclose(found["shifts"]["ferrite_pearlite_time_factor"], 2.2, rtol=0.02, atol=0.0)
    assert_allclose(found["shifts"]["bainite_time_factor"], 0.6, rtol=0.02, atol=0.0)
    held = [line.partition(":")[0] for line in found["held"]]
    assert held == ["martensite start", "hardness"]
    deviation = found["diagrams"][0]["deviation"]["held"]
    assert deviation["after"] < 0.03 < deviation["before"]
    said = call(*words, "--out", "folder")
    assert "times of holds by a factor " in said.out
    assert "martensite start: nothing measured tells it" in said.out
    with (tmp_path / "folder" / "calibration-points.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == holds.count("\n") - 1
    assert (tmp_path / "folder" / "calibration-points.png").stat().st_size > 10_000
    assert not (tmp_path / "folder" / "calibration.csv").exists()


def test_cooling_gives_all_four_shifts_back(call, tmp_path: Path, coolings: str) -> None:
    (tmp_path / "cct.csv").write_text(coolings, encoding="utf-8")
    words = ("calibrate", "42CrMo4", "--austenitize", "850 degC", "--measured", "cct.csv")
    found = json.loads(call(*words, "--json").out)["shifts"]
    assert_allclose(found["ferrite_pearlite_time_factor"], 2.2, rtol=0.05, atol=0.0)
    assert_allclose(found["bainite_time_factor"], 0.6, rtol=0.05, atol=0.0)
    assert_allclose(found["martensite_start_K"], 12.0, rtol=0.0, atol=1.0)
    assert_allclose(found["hardness_HV"], 15.0, rtol=0.0, atol=1.5)


def test_two_files_of_one_heat_are_fitted_together(
    call, tmp_path: Path, holds: str, coolings: str
) -> None:
    (tmp_path / "holds.csv").write_text(holds, encoding="utf-8")
    (tmp_path / "cct.csv").write_text(coolings, encoding="utf-8")
    words = ("--measured", "holds.csv", "--measured", "cct.csv", "--save", "heat.toml")
    answer = call("calibrate", "42CrMo4", "--austenitize", "850 degC", *words)
    assert (answer.code, answer.err) == (0, "")
    assert "Calibration of 42CrMo4 to holds.csv and cct.csv" in answer.out
    kept = read_calibration(tmp_path / "heat.toml")
    assert_allclose(kept.shifts.bainite_time, 0.6, rtol=0.02, atol=0.0)
    assert kept.measured == "holds.csv, cct.csv"
    assert kept.soak is not None
    assert (kept.soak.austenitize_degC, kept.soak.grain_astm) == (pytest.approx(850.0), 7.0)
    # errors of both together are smaller than those of either
    alone = json.loads(
        call("calibrate", "42CrMo4", "--austenitize", "850 degC", *words[:2], "--json").out
    )
    error = kept.error[1]
    assert error is not None
    assert error < alone["standard_errors"]["bainite_time_factor"]


def test_points_that_the_computed_heat_never_meets_are_left_out_and_named(
    call, tmp_path: Path, holds: str
) -> None:
    text = holds + "900,10,pearlite,start\n200,10,bainite,start\n"
    (tmp_path / "holds.csv").write_text(text, encoding="utf-8")
    answer = call(*("calibrate", "42CrMo4", "--austenitize", "850 degC", "--measured", "holds.csv"))
    n = text.count("\n")
    assert f"holds.csv: lines {n - 1}, {n} left out of the fit" in answer.out
    assert answer.out.count("left out") == 3


def test_starts_of_one_product_tell_one_factor(call, tmp_path: Path) -> None:
    text = f"{HEAD}\n450,9,bainite,start\n480,9,bainite,start\n420,12,bainite,start\n"
    (tmp_path / "one.csv").write_text(text, encoding="utf-8")
    answer = call("calibrate", "42CrMo4", "--measured", "one.csv", "--json")
    found = json.loads(answer.out)
    assert found["standard_errors"]["bainite_time_factor"] is not None
    assert found["standard_errors"]["ferrite_pearlite_time_factor"] is None


def test_too_few_points_are_refused(call, tmp_path: Path) -> None:
    (tmp_path / "one.csv").write_text(f"{HEAD}\n450,9,bainite,start\n", encoding="utf-8")
    answer = call("calibrate", "42CrMo4", "--measured", "one.csv", "--save", "heat.toml")
    assert answer.code == 2
    assert "1 points that the computed heat can meet" in answer.err
    assert not (tmp_path / "heat.toml").exists()


def test_what_is_wrong_with_a_diagram_comes_together_with_its_lines(tmp_path: Path) -> None:
    path = tmp_path / "bad.csv"
    path.write_text(
        "\n".join(
            [
                "temperature_degC,time_s,rate_K_per_s,product,fraction,hardness_HV",
                "600,10,,perlite,start,",
                "600,10,,pearlite,begin,",
                "1300,10,,pearlite,start,",
                "600,10,5,pearlite,start,",
                "600,10,,cementite,start,",
                "600,10,,martensite,start,",
                ",10,,pearlite,start,",
                ",,5,,,2000",
            ]
        ),
        encoding="utf-8",
    )
    with pytest.raises(CaseFaults) as caught:
        read_diagram(path)
    said = str(caught.value)
    for line in range(2, 10):
        assert f"line {line}" in said
    assert "No shift of a heat moves cementite." in said


def test_words_percent_and_both_clocks_are_read(tmp_path: Path) -> None:
    path = tmp_path / "good.csv"
    path.write_text(
        "t85_s,temperature_degC,product,fraction,hardness_HRC\n30,650,ferrite,5 %,30\n",
        encoding="utf-8",
    )
    cooled, hard = read_diagram(path).points
    assert cooled == Point(2, "cooled", 10.0, 923.15, "ferrite", 0.05)
    # 30 HRC is 302 HV (ASTM E140)
    assert (hard.kind, hard.at) == ("hardness", 10.0)
    assert_allclose(hard.value, 302.0, rtol=0.01, atol=0.0)


CASE = """\
title = "Stud HF-0107"

[steel]
grade = "42CrMo4"
calibration = "heat.toml"
austenite_grain = "ASTM 7"

[section]
form = "round"
diameter = "20 mm"

[[route]]
stage = "soak"
at = "850 degC"
time = "30 min"

[[route]]
stage = "quench"
medium = "still air"
until = "core below 100 degC"
"""


def test_a_case_soaked_otherwise_than_its_calibration_says_so(
    call, tmp_path: Path, holds: str
) -> None:
    (tmp_path / "holds.csv").write_text(holds, encoding="utf-8")
    call(
        *("calibrate", "42CrMo4", "--austenitize", "850 degC"),
        *("--measured", "holds.csv", "--save", "heat.toml"),
    )
    place = tmp_path / "stud.toml"

    def notes(text: str) -> list[str]:
        found = solve(loads(text, place)).notes
        return [note.value for note in found if note.model == "calibration to a heat"]

    assert notes(CASE) == []
    other = CASE.replace("850", "930").replace("ASTM 7", "ASTM 4")
    assert notes(other) == ["soak 930 degC, not 850", "grain ASTM 4.0, not 7.0"]


def test_endquench_and_diagram_take_a_calibration_by_name(call, tmp_path: Path, holds: str) -> None:
    (tmp_path / "holds.csv").write_text(holds, encoding="utf-8")
    call(
        *("calibrate", "42CrMo4", "--austenitize", "850 degC"),
        *("--measured", "holds.csv", "--save", "heat.toml"),
    )
    words = ("diagram", "42CrMo4", "--kind", "isothermal", "--json", "--austenitize", "850 degC")
    plain = json.loads(call(*words).out)["table"]
    own = json.loads(call(*words, "--calibration", "heat.toml").out)
    ratio = np.array(own["table"]["bainite_start_s"], float) / np.array(
        plain["bainite_start_s"], float
    )
    # times of bainite alone, below where pearlite competes
    assert_allclose(np.nanmedian(ratio), 0.6, rtol=0.03, atol=0.0)
    assert any(note.startswith("calibration heat.toml") for note in own["notes"])
    refused = call("diagram", "C45E", "--kind", "cooling", "--calibration", "heat.toml")
    assert refused.code == 2 and "of 42CrMo4" in refused.err
    missing = call("endquench", "42CrMo4", "--calibration", "none.toml")
    assert missing.code == 2 and "There is no such file" in missing.err
