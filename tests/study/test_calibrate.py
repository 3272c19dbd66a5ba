"""A heat fitted to its measured end-quench curve: the command, its file, the case that uses it.

The known shifts of a made curve are the expected values; a curve in closed form stands for
the solver where only the command is looked at.
"""

import csv
import hashlib
import json
import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study import curvefit
from midradius.study.calibrationfile import HeatCalibration, dumps, read_calibration
from midradius.study.case import Case, SteelInput
from midradius.study.casefile import CaseFaults, loads, read
from midradius.study.casefile import dumps as case_text
from midradius.study.measuredcurve import read_curve
from midradius.study.runner import run
from midradius.thermo.arrays import Array
from midradius.thermo.calibration import NONE, Shifts
from midradius.thermo.conversion import hrc_to_hv, hv_to_hrc
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade

DISTANCES = (1.5, 3, 5, 7, 9, 11, 13, 15, 20, 25, 30, 35, 40, 45, 50)


def calibration(name: str, shifts: Shifts, path: Path = Path("heat-4711.toml")) -> HeatCalibration:
    return HeatCalibration(
        path=path,
        steel=name,
        composition=grade(name).composition,
        shifts=shifts,
        error=(0.1, None, None, 4.0),
        measured="curve.csv",
        measured_sha256="0" * 64,
        program="midradius 0",
    )


def formula(case: Case, shifts: Shifts) -> Array:
    """A made-up curve [HV] that each shift but that of martensite bends in its own way."""
    z = np.array([1e3 * (place.coordinates or (0.0, 0.0))[1] for place in case.outputs.positions])
    late, bainite = np.log(shifts.diffusional_time), np.log(shifts.bainite_time)
    step = 320.0 / (1.0 + np.exp(0.4 * (z - 15.0 - 4.0 * late)))
    tail = 60.0 * np.exp(-((z - 35.0 - 4.0 * bainite) ** 2) / 60.0)
    return np.asarray(280.0 + step + tail + shifts.hardness)


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(curvefit, "hardness_hv_of", formula)


@pytest.fixture
def curve(tmp_path: Path, quick: None) -> Path:
    """The curve of the formula with known shifts, and a point that is too soft."""
    from midradius.study.endquench import piece

    case = piece(SteelInput(grade("42CrMo4"), 7.0), temp=1123.15, time=1800.0)
    at = {p.name: hv for p, hv in zip(case.outputs.positions, formula(case, MADE), strict=True)}
    rows = [f"{z:g},{float(hv_to_hrc(at[f'{z:g} mm'])):.6f}" for z in DISTANCES]
    path = tmp_path / "curve.csv"
    path.write_text("\n".join(["distance [mm],HRC", *rows, "60,18", "70,", ""]), encoding="utf-8")
    return path


MADE = Shifts(diffusional_time=1.6, bainite_time=0.7, hardness=14.0)


# The command


def test_the_shifts_of_a_curve_in_closed_form_come_back(call, curve: Path) -> None:
    answer = call("calibrate", "42CrMo4", "--measured", "curve.csv", "--json")
    assert (answer.code, answer.err) == (0, "")
    found = json.loads(answer.out)
    shifts = found["shifts"]
    assert_allclose(shifts["ferrite_pearlite_time_factor"], 1.6, rtol=0.01, atol=0.0)
    assert_allclose(shifts["bainite_time_factor"], 0.7, rtol=0.01, atol=0.0)
    assert_allclose(shifts["hardness_HV"], 14.0, rtol=0.0, atol=0.2)
    assert found["standard_errors"]["martensite_start_K"] is None
    assert any(line.startswith("martensite start: ") for line in found["held"])
    assert found["rms_after_hrc"] < 0.05 < found["rms_before_hrc"]
    assert found["used"] == [True] * len(DISTANCES) + [False]
    assert found["measured_sha256"] == hashlib.sha256(curve.read_bytes()).hexdigest()


def test_the_screen_says_shifts_what_was_held_and_what_was_left_out(call, curve: Path) -> None:
    answer = call("calibrate", "42CrMo4", "--measured", "curve.csv", "--out", "folder")
    assert (answer.code, answer.err) == (0, "")
    for part in (
        "Calibration of 42CrMo4 to curve.csv",
        "15 points, scatter 1 HRC",
        "ferrite and pearlite time x 1.60 +- ",
        "hardness +14.0 +- ",
        "Held at none\n  martensite start: the data do not depend on it",
        "Root mean square deviation: ",
        "left out",
        "1 point below 20 HRC left out of the fit",
        "belong to this heat",
    ):
        assert part in answer.out
    folder = curve.parent / "folder"
    assert sorted(item.name for item in folder.glob("[!.]*")) == [
        *("calibration.csv", "calibration.json", "calibration.png")
    ]
    with (folder / "calibration.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert [float(row["distance_mm"]) for row in rows] == [*DISTANCES, 60.0]
    for row in rows[:-1]:
        assert_allclose(float(row["after_HRC"]), float(row["measured_HRC"]), rtol=0.0, atol=0.1)


def test_a_curve_and_a_diagram_may_stand_together(call, curve: Path) -> None:
    text = "temperature_degC,time_s,product,fraction\n450,9,bainite,start\n480,9,bainite,start\n"
    (curve.parent / "holds.csv").write_text(text, encoding="utf-8")
    answer = call("calibrate", "42CrMo4", "--measured", "curve.csv", "--measured", "holds.csv")
    assert (answer.code, answer.err) == (0, "")
    assert "scatter 1 HRC; holds.csv: 2 times of holds" in answer.out
    assert "HRC before" in answer.out and "times of holds by a factor" in answer.out


def test_what_is_saved_is_what_was_fitted_and_a_case_takes_it(
    call, curve: Path, small: str
) -> None:
    words = ("calibrate", "42CrMo4", "--measured", "curve.csv", "--save", "heat-4711.toml")
    found = json.loads(call(*words, "--json").out)
    kept = read_calibration(curve.parent / "heat-4711.toml")
    assert kept.shifts.bainite_time == found["shifts"]["bainite_time_factor"]
    assert kept.error[2] is None
    assert kept.error[3] == found["standard_errors"]["hardness_HV"]
    assert (kept.steel, kept.measured) == ("42CrMo4", "curve.csv")
    assert kept.composition == grade("42CrMo4").composition
    wanted = 'grade = "42CrMo4"\ncalibration = "heat-4711.toml"'
    (curve.parent / "case.toml").write_text(small.replace('grade = "C45E"', wanted))
    assert read(curve.parent / "case.toml").steel.shifts == kept.shifts
    # an earlier calibration is replaced, another file is not touched
    assert call(*words).code == 0
    answer = call(*words[:-1], "case.toml")
    assert answer.code == 2
    assert "It holds something else and was not touched." in answer.err


@pytest.mark.slow
def test_the_shifts_of_a_simulated_heat_come_back_through_the_whole_command(
    call, tmp_path: Path
) -> None:
    made = Shifts(diffusional_time=1.5, bainite_time=1.5, hardness=10.0)
    (tmp_path / "made.toml").write_text(dumps(calibration("8620", made)), encoding="utf-8")
    steel = '[steel]\ngrade = "8620"\ncalibration = "made.toml"\n'
    (tmp_path / "steel.toml").write_text(steel, encoding="utf-8")
    assert call("endquench", "steel.toml", "--out", "test").code == 0
    answer = call("calibrate", "8620", "--measured", "test/end-quench.csv", "--json")
    assert (answer.code, answer.err) == (0, "")
    found = json.loads(answer.out)
    shifts = found["shifts"]
    assert_allclose(shifts["ferrite_pearlite_time_factor"], 1.5, rtol=0.02, atol=0.0)
    assert_allclose(shifts["bainite_time_factor"], 1.5, rtol=0.02, atol=0.0)
    assert_allclose(shifts["hardness_HV"], 10.0, rtol=0.0, atol=1.0)
    assert found["rms_after_hrc"] < 0.1 < 1.0 < found["rms_before_hrc"]


# The curve's file


def test_positions_in_sixteenths_and_decimal_commas_are_read(tmp_path: Path) -> None:
    path = tmp_path / "j.csv"
    path.write_text("# heat 4711\nJ;HRC\n4;50,5\n1;56\n\n32;\n", encoding="utf-8")
    found = read_curve(path)
    # 1/16 in is 1.5875 mm
    assert_allclose(found.distance_mm, [1.5875, 6.35], rtol=1e-12, atol=0.0)
    assert_allclose(found.hardness_hrc, [56.0, 50.5], rtol=1e-12, atol=0.0)
    assert found.blank == 1


BAD = {
    "no such file": (None, "there is no such file"),
    "empty": ("", "the file holds no rows"),
    "no head": ("1.5,57\n3,56\n", "line 1: distance column is missing"),
    "distance without a unit": ("distance,hrc\n3,56\n", "distance_mm or distance_sixteenths_in"),
    "unit missing": ("depth,hrc\n3,56\n", "distance_mm or distance_sixteenths_in"),
    "no hardness": ("mm,hv\n3,556\n", "line 1: hardness column is missing"),
    "word": ("mm,hrc\n3,soft\n", 'line 2: hardness = "soft", but must be 0 to 68 HRC'),
    "not a number": ("mm,hrc\n3,nan\n", 'line 2: hardness = "nan"'),
    "beyond the scale": ("mm,hrc\n3,50\n5,556\n", 'line 3: hardness = "556"'),
    "beyond the piece": ("mm,hrc\n300,50\n", 'line 2: distance = "300", but must be 1.5 to 80'),
    "only a head": ("mm,hrc\n", "the file holds no measured point"),
    "too few": ("mm,hrc\n3,50\n5,45\n7,40\n9,19\n", "3 points of 20 HRC or more"),
}


@pytest.mark.parametrize("name", BAD)
def test_a_bad_curve_ends_with_2_and_its_line(call, quick: None, tmp_path: Path, name: str) -> None:
    text, said = BAD[name]
    if text is not None:
        (tmp_path / "bad.csv").write_text(text, encoding="utf-8")
    answer = call("calibrate", "42CrMo4", "--measured", "bad.csv", "--save", "heat.toml")
    assert (answer.code, answer.out) == (2, "")
    assert said in answer.err
    assert not (tmp_path / "heat.toml").exists()


def test_all_faults_of_a_curve_come_together(tmp_path: Path) -> None:
    path = tmp_path / "bad.csv"
    path.write_text("mm,hrc\n0,50\n3,x\n5,99\n", encoding="utf-8")
    with pytest.raises(CaseFaults) as raised:
        read_curve(path)
    assert [fault.line for fault in raised.value.faults] == [2, 3, 4]


@pytest.mark.parametrize("scatter", ["1", "0 HRC", "1 HV", "much", "nan HRC"])
def test_a_scatter_needs_a_number_and_its_unit(call, curve: Path, scatter: str) -> None:
    answer = call("calibrate", "42CrMo4", "--measured", "curve.csv", "--scatter", scatter)
    assert answer.code == 2
    assert "0.1 to 10 HRC" in answer.err


# The scale beyond its ends


def test_the_scale_goes_on_where_rockwell_ends() -> None:
    hv = np.array([float(hrc_to_hv(20.0)), 300.0, float(hrc_to_hv(68.0))])
    assert_allclose(curvefit._rockwell(hv), hv_to_hrc(hv), rtol=0.0, atol=1e-12)
    slope = 1.0 / (float(hrc_to_hv(21.0)) - float(hrc_to_hv(20.0)))
    assert_allclose(curvefit._rockwell(hv[:1] - 30.0), 20.0 - 30.0 * slope, rtol=1e-12, atol=0.0)


# The saved calibration and the case that uses it


def test_a_calibration_reads_back_as_it_was_written(tmp_path: Path) -> None:
    path = tmp_path / 'heat "4711".toml'
    made = calibration("42CrMo4", Shifts(1 / 3, 6.0, -math.pi, 60.0), path)
    path.write_text(dumps(made, ("a remark",)), encoding="utf-8")
    assert read_calibration(path) == made


@pytest.fixture
def calibrated(tmp_path: Path, small: str) -> Path:
    """A case beside a calibration of its steel."""
    shifts = Shifts(diffusional_time=3.0, hardness=12.0)
    (tmp_path / "heat-4711.toml").write_text(dumps(calibration("C45E", shifts)), encoding="utf-8")
    text = small.replace('grade = "C45E"', 'grade = "C45E"\ncalibration = "heat-4711.toml"')
    path = tmp_path / "case.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_a_calibrated_case_writes_and_reads_back(calibrated: Path) -> None:
    case = read(calibrated)
    text = case_text(case)
    assert 'calibration = "heat-4711.toml"' in text
    assert loads(text, calibrated) == case


def test_a_calibration_changes_the_hardness_and_the_result_names_it(
    calibrated: Path, small: str
) -> None:
    case = read(calibrated)
    plain, shifted = run(loads(small)), run(case)
    # alone, the offset of hardness is added to every node as quenched
    only = replace(case, steel=replace(case.steel, shifts=replace(NONE, hardness=12.0)))
    offset = run(only)
    assert_allclose(offset.hardness_hv, plain.hardness_hv + 12.0, rtol=0.0, atol=1e-9)
    # pearlite three times later leaves more martensite: harder by more than the offset
    assert np.all(shifted.hardness_hv[:-1] > plain.hardness_hv[:-1] + 12.0)
    assert shifted.hardness_hv[0] > plain.hardness_hv[0] + 20.0
    said = [line for line in shifted.assumptions if line.startswith("calibration heat-4711.toml")]
    assert len(said) == 1
    for part in ("x 3.00 +- 10 %", "hardness +12.0 +- 4.0 HV", "one heat of C45E", "curve.csv"):
        assert part in said[0]
    assert any(source.model == "calibration to a heat" for source in shifted.sources)
    assert not any("calibration" in line for line in plain.assumptions)


def test_a_martensite_start_that_is_shifted_is_the_one_that_is_said(small: str) -> None:
    case = loads(small)
    moved = replace(case, steel=replace(case.steel, shifts=replace(NONE, martensite_start=-20.0)))
    plain, shifted = run(case).critical_degC["Ms"], run(moved).critical_degC["Ms"]
    assert_allclose(shifted, plain - 20.0, rtol=0.0, atol=1e-9)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('grade = "C45E"', 'grade = "42CrMo4"', "42CrMo4 instead of C45E"),
        ('grade = "C45E"', "composition = { C = 0.4, Mn = 0.65 }", "C 0.4 instead of 0.4"),
        ("heat-4711.toml", "heat-4712.toml", "There is no such file"),
        ('"heat-4711.toml"', "7", "a text in quotes"),
    ],
)
def test_a_calibration_that_cannot_serve_is_refused(
    call, calibrated: Path, old: str, new: str, said: str
) -> None:
    calibrated.write_text(calibrated.read_text().replace(old, new), encoding="utf-8")
    answer = call("check", "case.toml")
    assert (answer.code, answer.out) == (2, "")
    assert said in answer.err


def test_the_same_composition_without_a_name_may_use_it(calibrated: Path) -> None:
    amounts = grade("C45E").composition.as_dict().items()
    inner = ", ".join(f"{element} = {amount!r}" for element, amount in amounts if amount)
    text = calibrated.read_text().replace('grade = "C45E"', f"composition = {{ {inner} }}")
    assert loads(text, calibrated).steel.shifts.hardness == 12.0


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("format = 1", "format = 2", "calibration.format = 2"),
        ("hardness_HV = 12.0", "hardness_HV = 120.0", "a number, -60 to 60"),
        ("hardness_HV = 12.0", "hardness_HV = nan", "shifts.hardness_HV = nan"),
        ("hardness_HV = 12.0", "", "shifts.hardness_HV = missing"),
        ("[shifts]", "[shift]", "shifts = missing"),
        ("bainite_time_factor", "bainite", "shifts = bainite"),
        ("C = 0.", "Q = 0.", "calibration.composition = Q"),
        ("format", "= format", "Not TOML"),
    ],
)
def test_a_damaged_calibration_is_refused(calibrated: Path, old: str, new: str, said: str) -> None:
    path = calibrated.parent / "heat-4711.toml"
    path.write_text(path.read_text().replace(old, new, 1), encoding="utf-8")
    with pytest.raises(InputFault) as raised:
        read_calibration(path)
    assert said in str(raised.value)
    with pytest.raises(CaseFaults, match="calibration"):
        read(calibrated)
