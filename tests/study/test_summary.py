"""The summary in words and as JSON."""

import io
import json
from dataclasses import replace

import numpy as np
import pytest
from rich.console import Console

from midradius.study.result import Result
from midradius.study.summary import cautions, document, duration, jsonable, terminal
from midradius.thermo.phases import PHASE_NAMES


def printed(result: Result, width: int = 100) -> str:
    out = io.StringIO()
    terminal(result, Console(file=out, width=width, color_system=None, force_terminal=False))
    return out.getvalue()


def flat(text: str) -> str:
    return " ".join(text.split())


def refuse(token: str) -> float:
    raise AssertionError(f"{token} is no JSON")


def test_document_is_strict_json_with_the_promised_keys(result: Result) -> None:
    text = json.dumps(document(result), allow_nan=False)
    back = json.loads(text, parse_constant=refuse)
    assert back["schema_version"] == 1
    for key in ("heat_balance_relative", "time_error_K", "grid_error_K", "version", "stages"):
        assert key in back
    assert back["heat_balance_relative"] == 3.1e-9
    assert back["time_error_K"] == 0.7
    assert back["notes"][0]["model"] == "bainite start"
    surface = back["positions"][0]
    assert surface["name"] == "surface"
    assert surface["depth_mm"] == 0.0
    assert surface["hardness_hv"] == pytest.approx(result.positions[0].hardness_hv, rel=1e-15)
    assert list(surface["phases"]) == list(PHASE_NAMES)
    assert back["stages"][1]["medium"] == "mineral oil, agitated"


def test_what_is_not_available_is_null(result: Result) -> None:
    content = document(result)
    assert content["grid_error_K"] is None  # nan in the result
    assert content["critical_degC"]["Acm"] is None
    assert content["positions"][0]["time_800_500_s"] is None
    core = replace(result.positions[0], hardness_hrc=None)
    assert document(replace(result, positions=(core,)))["positions"][0]["hardness_hrc"] is None


def test_jsonable_turns_arrays_and_numpy_numbers_into_plain_ones() -> None:
    value = {
        "a": np.array([[1.0, np.nan], [np.inf, -np.inf]]),
        "b": np.float64(2.5),
        "c": np.int64(3),
        "d": np.bool_(True),
        "e": (1, "x", None),
    }
    plain = {"a": [[1.0, None], [None, None]], "b": 2.5, "c": 3, "d": True, "e": [1, "x", None]}
    assert jsonable(value) == plain
    assert json.dumps(jsonable(value), allow_nan=False)


def test_the_terminal_shows_answer_trust_and_limits(result: Result) -> None:
    text = flat(printed(result))
    for part in (
        "Pump shaft HF-4711",
        "42CrMo4 (C 0.41, Mn 0.75, Cr 1.05, Mo 0.22 % by mass)",
        "Ae3 762, Ae1 738, Ms 331 degC",
        "round, diameter 300 mm",
        "31 nodes, 412 time steps",
        "quench mineral oil, agitated 45 s 2 h 31 min core below 150 degC",
        "heat balance closes to 3.1e-09",
        "temperature, time steps 0.7 K",
        "temperature, grid not estimated",
        "hardness, time steps 1.2 HV",
        "hardness, grid 3.4 HV at most, at: core",
        "bainite start: Si = 2.1 %, source holds for up to 1.5 %",
        "ends insulated: the bar is long",
        "Hot oil burns",
        "local codes and licensed practice rule",
        "2 models; 1 from memory, 0 estimates",
    ):
        assert part in text, part


def test_a_position_row_carries_every_number(result: Result) -> None:
    p = replace(
        result.positions[1],
        name="here",
        depth_mm=8.0,
        hardness_hv=558.4,
        hardness_hrc=52.6,
        hardness_hb=None,
        tensile_mpa=1784.2,
        yield_mpa=1515.4,
        time_800_500_s=23.31,
        rate_700_K_per_s=None,
    )
    lines = [flat(line) for line in printed(replace(result, positions=(p,))).splitlines()]
    assert "here 8.0 558 52.6 - 1784 1515 23.3 -" in lines


def test_a_tempered_part_shows_its_hardness_before_and_after(tempered_result: Result) -> None:
    p = replace(
        tempered_result.positions[1],
        name="here",
        depth_mm=8.0,
        hardness_as_quenched_hv=558.4,
        hardness_hv=318.2,
        hardness_hrc=31.9,
        hardness_hb=302.0,
        tensile_mpa=1020.0,
        yield_mpa=824.4,
        time_800_500_s=23.31,
        rate_700_K_per_s=6.67,
    )
    result = replace(tempered_result, positions=(p,))
    lines = [flat(line) for line in printed(result).splitlines()]
    assert "temper 600 degC throughout - 6 h 00 min time" in lines
    assert "temper 580 degC throughout - 2 h 00 min time" in lines
    assert lines.index("As quenched") < lines.index("here 558 23.3 6.67")
    assert lines.index("Result, tempered") < lines.index("here 8.0 318 31.9 302 1020 824")
    back = document(result)
    assert back["tempers"][1] == {"at_degC": 580.0, "time_s": 7200.0}
    assert back["positions"][0]["hardness_as_quenched_hv"] == 558.4
    assert back["positions"][0]["yield_mpa"] == 824.4


def test_only_phases_that_appear_get_a_column(result: Result, slow_result: Result) -> None:
    assert "cementite" not in printed(result)
    assert "martensite" in printed(result)


def test_a_run_inside_all_ranges_says_so(result: Result) -> None:
    text = flat(printed(replace(result, notes=())))
    assert "every model was used inside the range of its source" in text
    assert "Models used outside" not in text


@pytest.mark.parametrize("width", [60, 80, 120])
def test_no_line_is_wider_than_the_terminal_and_nothing_is_cut_off(
    result: Result, width: int
) -> None:
    text = printed(result, width)
    assert max(map(len, text.splitlines())) <= width
    assert "…" not in text


def test_text_from_the_case_is_neither_markup_nor_terminal_command(result: Result) -> None:
    text = printed(replace(result, title="[red]x[/red] [/] :fire: \x1b[31m \x07"))
    assert "[red]x[/red] [/] :fire: ?[31m ?" in text
    assert "\x1b" not in text


@pytest.mark.parametrize(
    ("medium", "word"),
    [
        ("mineral oil, still", "half in"),
        ("water, agitated", "crack first"),
        ("brine", "crack first"),
        ("nitrate salt, agitated", "overheating"),
        ("nitrogen 10 bar", "suffocates"),
    ],
)
def test_each_medium_brings_its_caution(result: Result, medium: str, word: str) -> None:
    stages = (replace(result.stages[1], medium=medium),)
    chosen = cautions(replace(result, stages=stages))
    assert len(chosen) == 3
    assert word in chosen[0]
    assert "licensed practice" in chosen[-1]


def test_cautions_of_the_run_come_first_and_none_twice(result: Result) -> None:
    mine = "Bath warmer than its flash point less 50 K."
    chosen = cautions(replace(result, cautions=(mine, mine)))
    assert chosen[0] == mine
    assert len(chosen) == len(set(chosen))


@pytest.mark.parametrize(
    ("seconds", "words"),
    [
        (0.0, "0 s"),
        (0.25, "0.25 s"),
        (45.0, "45 s"),
        (59.97, "1 min 00 s"),
        (750.0, "12 min 30 s"),
        (3599.6, "1 h 00 min"),
        (14700.0, "4 h 05 min"),
    ],
)
def test_durations_read_as_people_say_them(seconds: float, words: str) -> None:
    assert duration(seconds) == words
