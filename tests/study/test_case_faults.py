"""Wrong case files: each of ``bad/*.toml`` ends with the answer that it must get.

Lines that begin with ``#>`` are the answer, word for word, but that ``FILE``
stands for the path and ``<...>`` for what the steel model or ``tomllib`` says.
"""

import math
import re
from pathlib import Path

import pytest

from midradius.study import casefile
from midradius.study.casefaults import shown_key, shown_value
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.grades import grade

BAD = Path(__file__).parent / "bad"
GOOD = """
[steel]
grade = "42CrMo4"
[section]
form = "round"
diameter = "300 mm"
[[route]]
stage = "soak"
at = "860 degC"
time = "4 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
until = "core below 150 degC"
"""


def faults_of(text: str) -> list[str]:
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(text, Path("shaft.toml"))
    return [str(fault) for fault in caught.value.faults]


@pytest.mark.parametrize("path", sorted(BAD.glob("*.toml")), ids=lambda path: path.stem)
def test_all_faults_of_a_file_are_answered_together_word_for_word(path: Path) -> None:
    lines = path.read_text(encoding="utf-8").splitlines()
    answer = "\n".join(line[3:] for line in lines if line.startswith("#>"))
    pattern = re.sub(r"<[^<>]*>", ".+", re.escape(answer).replace("FILE", "(?:.*/)?FILE"))
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.read(path)
    said = str(caught.value).replace(path.name, "FILE")
    assert re.fullmatch(pattern, said), f"\n{said}\n\nis not\n\n{answer}"


def test_every_bad_file_states_its_answer() -> None:
    for path in BAD.glob("*.toml"):
        assert "\n#> FILE" in path.read_text(encoding="utf-8"), path.name


def test_the_case_that_the_other_tests_spoil_is_good() -> None:
    assert casefile.loads(GOOD).section.diameter == 0.3


def test_a_bath_too_hot_for_its_medium_is_answered_with_line_range_and_remedy() -> None:
    assert faults_of(GOOD.replace('"60 degC"', '"640 degC"')) == [
        'shaft.toml, line 14: route[1].bath = "640 degC", '
        'but must be 10 to 200 degC for medium = "mineral oil, agitated".\n'
        "  Change the bath temperature, or choose another medium."
    ]


def test_a_bath_that_another_medium_can_have_is_answered_with_that_medium() -> None:
    assert faults_of(GOOD.replace('"60 degC"', '"300 degC"')) == [
        'shaft.toml, line 14: route[1].bath = "300 degC", '
        'but must be 10 to 200 degC for medium = "mineral oil, agitated".\n'
        '  Change the bath temperature, or choose medium = "nitrate salt, agitated".'
    ]


@pytest.mark.parametrize(
    ("diameter", "right"),
    [("0.49 mm", False), ("0.5 mm", True), ("10 m", True), ("10.01 m", False), ("0 mm", False)],
)
def test_a_dimension_lies_within_half_a_millimetre_and_ten_metres(
    diameter: str, right: bool
) -> None:
    text = GOOD.replace("300 mm", diameter)
    if right:
        casefile.loads(text)
    else:
        assert faults_of(text) == [
            f'shaft.toml, line 6: section.diameter = "{diameter}", but must be 0.5 mm to 10 m.'
        ]


@pytest.mark.parametrize(
    ("bore", "right"), [("199 mm", True), ("199.1 mm", False), ("200 mm", False)]
)
def test_a_wall_is_at_least_half_a_millimetre_thick(bore: str, right: bool) -> None:
    section = f'"tube"\noutside = "200 mm"\nbore = "{bore}"'
    text = GOOD.replace('"round"\ndiameter = "300 mm"', section)
    if right:
        casefile.loads(text)
    else:
        assert "section.bore" in faults_of(text)[0]


TEMPER = '[[route]]\nstage = "temper"\nat = "600 degC"\ntime = "6 h"\n'
QUENCH = '[[route]]\nstage = "quench"\nmedium = "still air"\ntime = "1 h"\n'


def test_tempers_follow_the_stages_that_cool() -> None:
    case = casefile.loads(GOOD + TEMPER + TEMPER.replace("600", "580"))
    assert [stage.kind for stage in case.cooling] == ["quench"]
    assert [(stage.at, stage.time) for stage in case.tempers] == [
        (873.15, 21_600.0),
        (853.15, 21_600.0),
    ]


def test_a_temper_before_any_quench_is_refused() -> None:
    head, _, quench = GOOD.rpartition("[[route]]")
    first, *_ = faults_of(head + TEMPER + "[[route]]" + quench)
    assert first == (
        'shaft.toml, line 12: route[1].stage = "temper", '
        'but must be "transfer", "quench" or "hold" before the first temper.\n'
        "  A temper softens what a quench has hardened: put it last."
    )


def test_a_stage_that_cools_after_a_temper_is_refused() -> None:
    assert faults_of(GOOD + TEMPER + QUENCH) == [
        'shaft.toml, line 21: route[3].stage = "quench", '
        'but must be only "temper" after a temper.\n'
        "  Tempers come last: what cools the part after them changes nothing here."
    ]


def test_a_temper_from_ae1_on_is_refused_and_just_below_it_taken() -> None:
    ae1 = equilibrium(grade("42CrMo4").composition).ae1
    (fault,) = faults_of(GOOD + TEMPER.replace("600 degC", f"{ae1!r} K"))
    assert fault == (
        f'shaft.toml, line 18: route[2].at = "{ae1!r} K", but must be 50 to '
        f"{math.floor(ae1 - 273.15)} degC, below the Ae1 of 42CrMo4.\n"
        "  From Ae1 on austenite forms again: that is a soak, not a temper."
    )
    casefile.loads(GOOD + TEMPER.replace("600 degC", f"{ae1 - 0.01!r} K"))


def test_a_temper_of_a_secondary_hardening_steel_is_refused() -> None:
    text = GOOD.replace('grade = "42CrMo4"', "composition = { C = 0.4, Cr = 3.8 }") + TEMPER
    (fault,) = faults_of(text.replace("600 degC", "560 degC"))
    assert fault.startswith(
        "shaft.toml, line 17: Cr of a steel to be tempered = 3.8 %, but must be at most 3.5 %.\n"
    )


def test_a_soak_exactly_at_ae1_is_refused_and_just_above_it_taken() -> None:
    ae1 = equilibrium(grade("42CrMo4").composition).ae1
    (fault,) = faults_of(GOOD.replace("860 degC", f"{ae1!r} K"))
    assert fault.startswith("shaft.toml, line 9: route[0].at = ")
    casefile.loads(GOOD.replace("860 degC", f"{ae1 + 0.01!r} K"))


def test_faults_come_in_the_order_of_their_lines() -> None:
    text = GOOD.replace("42CrMo4", "none").replace("300 mm", "3").replace('"60 degC"', '"60"')
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(text)
    assert [fault.line for fault in caught.value.faults] == [3, 6, 14]


def test_a_fault_carries_its_parts() -> None:
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(GOOD.replace("300 mm", "-30 mm"), Path("shaft.toml"))
    (fault,) = caught.value.faults
    assert (fault.line, fault.key, fault.value) == (6, "section.diameter", '"-30 mm"')
    assert (fault.allowed, fault.remedy, fault.path) == ("0.5 mm to 10 m", "", "shaft.toml")


def test_a_key_with_blanks_is_shown_in_quotes() -> None:
    assert shown_key(("route", 2, "faces", "far face")) == 'route[2].faces."far face"'


def test_a_value_is_shown_on_one_short_line() -> None:
    assert shown_value('1"') == "'1\"'"
    assert shown_value("a\nb\x1b[31m") == '"a?b?[31m"'
    assert shown_value({"a": [True, {"b": 1.5}]}) == "{ a = [true, { b = 1.5 }] }"
    assert shown_value(1 << 40_000) == "a number of many digits"
    assert len(shown_value("x" * 10_000)) == 60


def test_a_file_with_very_many_faults_is_answered_briefly_and_soon() -> None:
    text = GOOD + "".join(f'[k{n}]\nx = "{n}"\n' for n in range(20_000))
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(text)
    assert len(caught.value.faults) == 20_000
    assert caught.value.faults[-1].line == 16 + 2 * 19_999
    assert str(caught.value).endswith("... and 19960 more.")


def test_a_route_of_very_many_stages_is_refused() -> None:
    text = GOOD + '[[route]]\nstage = "hold"\n' * 20_000
    assert faults_of(text) == ["shaft.toml, line 7: route has 20002 stages, at most 50 are read."]
