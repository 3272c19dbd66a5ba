"""What the models rest on: all of it, and what one run used."""

import importlib
import json
import pkgutil
from pathlib import Path

import pytest

import midradius.fem
import midradius.thermo
from midradius.fem.media import medium, names
from midradius.study import sources
from midradius.thermo.source import Source

STATUSES = {"read", "derived", "remembered", "estimate"}


def stated() -> set[Source]:
    """Every source that a module of the two lower floors holds, found by importing all."""
    found: set[Source] = set()
    for floor in (midradius.thermo, midradius.fem):
        for info in pkgutil.iter_modules(floor.__path__, f"{floor.__name__}."):
            module = importlib.import_module(info.name)
            found.update(getattr(module, "SOURCES", ()))
            found.update([module.SOURCE] if hasattr(module, "SOURCE") else [])
    return found


def test_no_source_of_any_module_or_medium_is_left_out() -> None:
    shown = {source for sheet in sources.sheets() for source in sheet.sources}
    assert stated() <= shown
    assert {medium(name).source for name in names()} <= shown


def test_every_model_says_work_locator_status_and_range() -> None:
    for sheet in sources.sheets():
        assert sheet.title, sheet.module
        assert sheet.holds, sheet.module
        for source in sheet.sources:
            assert source.model and source.work and source.locator, sheet.module
            assert source.status in STATUSES


def test_the_range_of_a_model_is_that_of_its_docstring() -> None:
    (sheet,) = (sheet for sheet in sources.sheets() if sheet.module == "thermo.heating")
    assert sheet.holds.startswith("Below 0.6 % C.")
    assert "----" not in sheet.holds


def test_what_is_from_memory_is_marked(call) -> None:
    out = call("sources", "--model", "Lee & Lee").out
    assert "  * austenite grain growth: Lee & Lee 2008; Mater. Des. 29, 1840 [remembered]" in out
    assert "* from memory" in out
    assert "holds for: Grain growth 850 to 1200 degC" in out
    assert out.startswith("thermo.austenite: ")


def test_no_line_is_too_wide_for_a_page(call) -> None:
    out = call("sources").out
    assert max(map(len, (line for line in out.splitlines() if line.startswith(" ")))) <= 100


def test_json_holds_every_model_with_its_range(call) -> None:
    models = json.loads(call("sources", "--json").out)["models"]
    assert {item["module"] for item in models} == {sheet.module for sheet in sources.sheets()}
    assert all(item["holds"] and item["sources"] for item in models)


def test_a_case_names_the_sources_that_its_run_names(call, tmp_path: Path, small: str) -> None:
    (tmp_path / "case.toml").write_text(small, encoding="utf-8")
    before = json.loads(call("sources", "--case", "case.toml", "--json").out)["sources"]
    answer = call("run", "case.toml", "--out", "out", "--sources", "--json")
    assert json.loads(answer.out)["sources"] == before
    assert any(item["work"] == "EN ISO 683-1" for item in before)
    assert any("mineral oil, agitated" in item["model"] for item in before)
    assert not any("still air" in item["model"] for item in before)
    oil = call("sources", "--case", "case.toml", "--model", "mineral oil").out
    assert "mineral oil, agitated" in oil
    assert "martensite" not in oil


def test_run_prints_its_sources_with_ranges_only_when_asked(
    call, tmp_path: Path, small: str
) -> None:
    (tmp_path / "case.toml").write_text(small, encoding="utf-8")
    assert "holds for:" not in call("run", "case.toml", "--out", "out").out
    out = call("run", "case.toml", "--out", "out", "--sources").out
    assert "\nSources\n" in out
    assert "holds for:" in out
    assert "* from memory" in out
    assert out.endswith("Written to out\n")


@pytest.mark.parametrize(
    ("words", "hint"),
    [
        (("--model", "phlogiston"), "midradius sources lists all."),
        (("--case", "nowhere.toml"), "there is no such file"),
    ],
)
def test_what_is_not_known_is_one_message(call, words: tuple[str, ...], hint: str) -> None:
    answer = call("sources", *words)
    assert (answer.code, answer.out) == (2, "")
    assert hint in answer.err
