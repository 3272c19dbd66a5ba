"""Requirements through the command: exit codes, summary, JSON, table, record."""

import csv
import io
import json
import subprocess
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from rich.console import Console

from midradius.fem.record import read_record
from midradius.study.archive import write_result_record
from midradius.study.result import Result, Verdict
from midradius.study.summary import document, terminal
from midradius.study.tables import write_tables

Start = Callable[..., "subprocess.Popen[str]"]

CASE = """\
title = "Pin HF-0004"
[steel]
grade = "42CrMo4"
[section]
form = "round"
diameter = "20 mm"
[[route]]
stage = "soak"
at = "850 degC"
time = "1 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
time = "120 s"
[output]
positions = ["core"]
fields = 2
[grid]
cells = 16
accuracy = "4 K"
"""


def need(limit: str, position: str = "core", quantity: str = "hardness") -> str:
    return f'[[need]]\nposition = "{position}"\nquantity = "{quantity}"\n{limit}\n'


# 42CrMo4 of 20 mm in oil: 54 to 58 HRC in every handbook
HOLDS = need('at_least = "40 HRC"')
CLOSE = need('at_least = "55 HRC"')
FAILS = need('at_most = "40 HRC"', "3 mm below surface")


def run(
    start: Start, tmp_path: Path, *needs: str, options: tuple[str, ...] = ()
) -> tuple[int, str, str]:
    (tmp_path / "pin.toml").write_text(CASE + "".join(needs), encoding="utf-8")
    process = start("run", "pin.toml", "--out", "pin", *options)
    out, err = process.communicate(timeout=240)
    return process.returncode, out, err


@pytest.mark.parametrize(
    ("needs", "code"),
    [((), 0), ((HOLDS,), 0), ((HOLDS, CLOSE), 0), ((HOLDS, CLOSE, FAILS), 1)],
    ids=["none", "holds", "close", "fails"],
)
def test_the_command_ends_with_one_only_when_a_requirement_fails(
    start: Start, tmp_path: Path, needs: tuple[str, ...], code: int
) -> None:
    left, out, err = run(start, tmp_path, *needs, options=("--json",))
    assert (left, err) == (code, "")
    said = json.loads(out)
    assert [v["outcome"] for v in said["needs"]] == ["holds", "too close to call", "fails"][
        : len(needs)
    ]
    assert (tmp_path / "pin" / "record.h5").is_file()
    assert (tmp_path / "pin" / "needs.csv").is_file() == bool(needs)
    # the place of a need is an output position like the others
    places = ["core", "3 mm below surface"] if FAILS in needs else ["core"]
    assert [p["name"] for p in said["positions"]] == places


def test_a_quiet_run_tells_a_failing_requirement_by_its_exit_code_alone(
    start: Start, tmp_path: Path
) -> None:
    assert run(start, tmp_path, FAILS, options=("--quiet",)) == (1, "", "")


def test_the_verdict_of_a_run_is_arithmetic_on_its_position(
    call: Callable[..., Any], tmp_path: Path
) -> None:
    (tmp_path / "pin.toml").write_text(CASE + HOLDS, encoding="utf-8")
    said = json.loads(call("run", "pin.toml", "--json").out)
    (verdict,), (core,) = said["needs"], said["positions"]
    assert verdict["need"] == "hardness at core: at least 40 HRC"
    assert verdict["unit"] == "HRC" and verdict["limit"] == 40.0
    assert verdict["value"] == pytest.approx(core["hardness_hrc"], rel=1e-12)
    assert verdict["margin"] == pytest.approx(core["hardness_hrc"] - 40.0, rel=1e-12)
    assert verdict["model_measured"] is True
    assert "uncertainty.csv" in [source["work"] for source in said["sources"]]
    # the numerical error is that of the position, on the scale of the need
    error_hv = core["hardness_time_error_hv"] + core["hardness_grid_error_hv"]
    assert 0.0 < verdict["numerical_uncertainty"] < 0.2 * error_hv


VERDICTS = (
    Verdict(
        need="hardness at core: at least 28 HRC",
        position="core",
        quantity="hardness",
        unit="HRC",
        value=25.25,
        limit=28.0,
        margin=-2.75,
        numerical_uncertainty=0.04,
        model_uncertainty=5.1,
        model_measured=True,
        model_basis="measured: invented",
        outcome="too close to call",
    ),
    Verdict(
        need="yield at core: at least 900 MPa",
        position="core",
        quantity="yield",
        unit="MPa",
        value=None,
        limit=900.0,
        margin=None,
        numerical_uncertainty=None,
        model_uncertainty=None,
        model_measured=False,
        model_basis="not measured: invented",
        outcome="too close to call",
        note="no model gives a value here",
    ),
)


@pytest.fixture
def judged(result: Result) -> Result:
    return replace(result, verdicts=VERDICTS)


def test_the_summary_states_the_verdicts_before_everything_else(judged: Result) -> None:
    out = io.StringIO()
    terminal(judged, Console(file=out, width=140, color_system=None, force_terminal=False))
    text = out.getvalue()
    assert text.index("Requirements") < text.index("steel")
    lines = [line.split() for line in text.splitlines()]
    first = next(words for words in lines if words[:3] == ["hardness", "at", "core:"])
    assert first[-9:] == ["25.2", "HRC", "-2.8", "0.0", "5.1", "too", "close", "to", "call"]
    assert "2 of 2 too close to call: not shown to be met" in text
    assert "yield at core: at least 900 MPa: no model gives a value here" in text
    assert "model error of yield: not measured: invented" in text


def test_a_depth_that_holds_because_the_part_is_hard_throughout_says_so(result: Result) -> None:
    depth = {"need": "hardened depth", "quantity": "hardened depth", "unit": "mm"}
    verdict = replace(VERDICTS[0], **depth, outcome="holds", note="hardened through")  # type: ignore[arg-type]
    out = io.StringIO()
    wide = Console(file=out, width=140, color_system=None, force_terminal=False)
    terminal(replace(result, verdicts=(verdict,)), wide)
    assert "hardened depth: hardened through" in out.getvalue()


def test_a_run_without_requirements_has_no_such_block(result: Result) -> None:
    out = io.StringIO()
    terminal(result, Console(file=out, width=140, color_system=None, force_terminal=False))
    assert "Requirements" not in out.getvalue()
    assert document(result)["needs"] == []


def test_the_table_holds_one_row_for_each_requirement(judged: Result, tmp_path: Path) -> None:
    assert write_tables(judged, tmp_path)[-1].name == "needs.csv"
    with (tmp_path / "needs.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file, strict=True))
    assert [row["outcome"] for row in rows] == ["too close to call"] * 2
    assert (rows[0]["margin"], rows[0]["limit"], rows[0]["unit"]) == ("-2.75", "28", "HRC")
    assert rows[1]["value"] == ""


def test_the_record_keeps_the_verdicts(judged: Result, tmp_path: Path) -> None:
    write_result_record(judged, tmp_path)
    kept = json.loads(read_record(tmp_path / "record.h5").text["needs_json"])
    assert kept == document(judged)["needs"]
    assert kept[1]["value"] is None
