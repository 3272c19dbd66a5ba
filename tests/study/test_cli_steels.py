"""Steels listed, filtered and held against limits; a works' own steel run by its heat."""

import json
import shutil
from pathlib import Path

import pytest
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.runner import run
from midradius.thermo.grades import rows

MESHES = Path(__file__).resolve().parents[2] / "meshes"
# invented certificates: chromium of H 4725 lies below the 0.90 % of EN ISO 683-2
OWN = "steels-hallgrund.toml"
BELOW = "limits of 42CrMo4, EN ISO 683-2"


@pytest.fixture
def works(tmp_path: Path) -> Path:
    for name in (OWN, "steels-hallgrund.csv"):
        shutil.copy(MESHES / name, tmp_path)
    return tmp_path


def names_of(out: str) -> list[str]:
    return [line.split()[0] for line in out.splitlines()]


def test_every_row_of_the_table_is_one_line_with_its_status(call) -> None:
    out = call("steels").out
    assert names_of(out) == [item.name for item in rows()]
    assert all(" remembered " in line or " read " in line for line in out.splitlines())


def test_a_doubt_about_a_row_stands_in_its_line(call) -> None:
    doubted = {item.name for item in rows() if item.note}
    lines = call("steels").out.splitlines()
    assert {line.split()[0] for line in lines if "[doubt: " in line} == doubted


def test_steels_are_filtered_by_text_family_and_carbon_together(call) -> None:
    out = call("steels", "683", "--family", "crmo", "--carbon", "0.4:0.5").out
    # EN ISO 683-2: C 0.38 to 0.45 and 0.46 to 0.54 (from memory), 42CrMoS4 as 42CrMo4
    assert names_of(out) == ["42CrMo4", "42CrMoS4", "50CrMo4"]
    assert "1095" in names_of(call("steels", "--carbon", "0.9:").out)
    assert "1010" in names_of(call("steels", "--carbon", ":0.12").out)


def test_a_family_as_text_is_answered_with_its_option(call) -> None:  # type: ignore[no-untyped-def]
    answer = call("steels", "Cast")
    assert answer.code == 2
    assert answer.err == (
        'TEXT = "Cast", but must be part of the name of a shipped grade. '
        "It is a family: write --family cast.\n"
    )


def test_a_steel_is_found_by_its_number(call) -> None:
    assert names_of(call("steels", "1.7225").out) == ["42CrMo4"]


def test_limits_stand_under_each_element_with_low_aim_and_high(call) -> None:
    lines = call("steels", "42CrMo4", "--limits").out.splitlines()
    at = next(i for i, line in enumerate(lines) if line.split()[0] == "42CrMo4")
    head, low, aim, high = (line.split() for line in lines[at + 1 : at + 5])
    place = head.index("C") - 1
    # EN ISO 683-2, from memory: 0.38 to 0.45 % C, 0.90 to 1.20 % Cr
    assert (low[place], aim[place], high[place]) == ("0.38", "0.41", "0.45")
    place = head.index("Cr") - 1
    assert (low[place], aim[place], high[place]) == ("0.9", "1.05", "1.2")


def test_an_h_steel_shows_whose_aim_it_takes(call) -> None:
    assert "aim of the plain grade 4140" in call("steels", "4140H", "--limits").out


def test_a_grade_outside_the_range_of_a_model_says_so(call) -> None:
    said = call("steels", "36NiCrMo16", "--limits").out
    assert "outside a range: alloy shifts of the phase boundaries: Ni" in said


def test_json_lists_the_same_grades_with_open_limits_as_null(call) -> None:
    document = json.loads(call("steels", "--json").out)
    assert [item["name"] for item in document["grades"]] == [item.name for item in rows()]
    (found,) = json.loads(call("steels", "1.7225", "--json").out)["grades"]
    assert found["limits_pct"]["Cr"] == {"low": 0.9, "high": 1.2}
    assert found["aim_pct"]["C"] == 0.41
    assert found["status"] == "remembered"


@pytest.mark.parametrize(
    ("words", "hint"),
    [
        (("37CrZz9",), "Nearest: 37Cr4. midradius steels lists all."),
        (("--family", "marble"), 'family = "marble", but must be one of carbon, Mn'),
        (("--carbon", "0.4"), "Write for example 0.35:0.45."),
        (("--carbon", "0.5:0.4"), "from the lower to the higher"),
        (("--carbon", "nan:1"), "two numbers in mass percent"),
        (("1.7225", "--carbon", "0.9:"), '"1.7225", carbon 0.9 to 100 %'),
        (("--against", "4140"), "given beside --file"),
        (("--file", "nowhere.toml"), "No such file or directory"),
        (("--file", OWN, "--family", "spring"), "certificates have no family"),
        (("--file", OWN, "--against", "42CrMo5"), "Nearest: 42CrMo4"),
        (("--file", OWN, "no such heat"), "a steel of steels-hallgrund.toml passes them"),
    ],
)
def test_what_cannot_be_listed_is_answered_in_one_message(
    call, works: Path, words: tuple[str, ...], hint: str
) -> None:
    answer = call("steels", *words)
    assert (answer.code, answer.out) == (2, "")
    assert hint in answer.err
    assert len(answer.err.splitlines()) == 1


# Certificates


def test_certificates_are_held_against_the_grade_that_each_names(call, works: Path) -> None:
    out = call("steels", "--file", OWN).out
    blocks = {block.splitlines()[0].split(",")[1].strip(): block for block in out.split("\n\n")}
    assert "within the limits of 42CrMo4" in blocks["heat H 4711"]
    assert f"outside the {BELOW}: Cr 0.86 %, must be 0.9 to 1.2 %" in blocks["heat H 4725"]
    assert "held against no limits" in blocks["Hallgrund Forge"]


def test_certificates_can_be_held_against_another_grade_in_json(call, works: Path) -> None:
    words = ("steels", "5119", "--file", "steels-hallgrund.csv", "--against", "C40E", "--json")
    (found,) = json.loads(call(*words).out)["certificates"]
    assert (found["heat"], found["grade"], found["held_against"]) == ("H 5119", "C45E", "C40E")
    # EN ISO 683-1, from memory: C40E has 0.37 to 0.44 % C
    (carbon,) = (item for item in found["deviations"] if item["element"] == "C")
    assert carbon == {"element": "C", "value": "0.47 %", "allowed": "0.37 to 0.44 %"}


# Own steels in a case


def own(small: str, *lines: str) -> str:
    return small.replace('grade = "C45E"', "\n".join(lines))


@pytest.mark.parametrize("key", ['heat = "H4725"', 'name = "Pump shaft, heat h 4725"'])
def test_a_case_runs_a_steel_of_a_file_by_heat_or_name_and_notes_where_it_leaves_its_grade(
    works: Path, small: str, key: str
) -> None:
    path = works / "case.toml"
    path.write_text(own(small, f'file = "{OWN}"', key), encoding="utf-8")
    case = casefile.read(path)
    assert_allclose(case.steel.steel.composition.Cr, 0.86, rtol=0.0, atol=0.0)
    assert casefile.loads(casefile.dumps(case), path) == case
    result = run(case)
    assert result.steel == "pump shaft, heat H 4725"
    assert [n.quantity for n in result.notes if n.model == BELOW] == ["Cr"]
    assert "certificate, Hallgrund Forge, heat H 4725" in {s.work for s in result.sources}


def test_a_file_of_one_steel_needs_no_name(tmp_path: Path, small: str) -> None:
    (tmp_path / "heat.csv").write_text("heat; C; Mn\nH 1; 0,46; 0,7\n", encoding="utf-8")
    case = casefile.loads(own(small, 'file = "heat.csv"'), tmp_path / "case.toml")
    assert (case.steel.steel.name, case.steel.steel.composition.C) == ("H 1", 0.46)
    assert case.steel.notes == ()


@pytest.mark.parametrize(
    ("lines", "answer"),
    [
        (
            ('file = "nowhere.toml"',),
            'case.toml, line 4: steel.file = "nowhere.toml", but must be a TOML or CSV file of '
            "certificates.\n  There is no such file; the path counts from the case file.",
        ),
        (
            ('file = "."',),
            'case.toml, line 4: steel.file = ".", but must be a TOML or CSV file of '
            "certificates.\n  This is a folder.",
        ),
        (
            (f'file = "{OWN}"', 'heat = "H 47111"'),
            'case.toml, line 5: steel.heat = "H 47111", but must be a heat of the file.\n'
            '  Nearest: "H 4711".',
        ),
        (
            (f'file = "{OWN}"',),
            "case.toml, line 3: steel.name is missing, but must be a name of the file.\n"
            '  It holds "pump shaft, heat H 4711", "pump shaft, heat H 4725", '
            '"Hallgrund 35 Special".',
        ),
        (
            ('grade = "C45E"', f'file = "{OWN}"'),
            f'case.toml, line 5: steel.file = "{OWN}", but must be left out where a grade is '
            "given.\n  Keep one of the two.",
        ),
        (
            ('grade = "C45E"', 'heat = "H 4711"'),
            'case.toml, line 5: steel.heat = "H 4711", but must be left out where no file is '
            'given.\n  Write file = "works.toml" beside.',
        ),
        (
            (f'file = "{OWN}"', 'heat = "H 4711"', 'name = "H 4711"'),
            'case.toml, line 6: steel.name = "H 4711", but must be left out where a heat is '
            "given.\n  Keep one of the two.",
        ),
    ],
)
def test_a_steel_of_a_file_that_is_not_meant_rightly_is_answered_with_its_line(
    works: Path, monkeypatch: pytest.MonkeyPatch, small: str, lines: tuple[str, ...], answer: str
) -> None:
    monkeypatch.chdir(works)
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(own(small, *lines), Path("case.toml"))
    assert str(caught.value) == answer


def test_all_faults_of_the_file_and_of_the_case_are_answered_together(
    tmp_path: Path, small: str
) -> None:
    (tmp_path / "bad.csv").write_text("heat; C; Mn\nH 1; 46; 0,7\nH 2; ; x\n", encoding="utf-8")
    text = own(small, 'file = "bad.csv"').replace("30 mm", "30")
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(text, tmp_path / "case.toml")
    said = str(caught.value)
    assert "line 4: bad.csv, line 2: C = 46 %, but must be 0.03 to 1.5 % by mass." in said
    assert 'line 4: bad.csv, line 3: Mn = "x", but must be a finite number' in said
    assert 'section.diameter = "30"' in said
