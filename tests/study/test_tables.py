"""The tables, read back by a strict reader."""

import csv
import re
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study.result import Result
from midradius.study.tables import write_tables
from midradius.thermo.phases import PHASE_NAMES


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, strict=True))


def column(table: list[dict[str, str]], name: str) -> np.ndarray:
    return np.array([float(row[name]) if row[name] else np.nan for row in table])


@pytest.fixture
def folder(tmp_path: Path, result: Result) -> Path:
    paths = write_tables(result, tmp_path)
    assert [p.name for p in paths] == ["histories.csv", "profile.csv", "positions.csv"]
    return tmp_path


def test_lines_end_as_rfc_4180_says_and_all_have_the_same_number_of_cells(folder: Path) -> None:
    for path in folder.iterdir():
        content = path.read_bytes()
        assert content.endswith(b"\r\n")
        assert content.count(b"\n") == content.count(b"\r\n")
        with path.open(encoding="utf-8", newline="") as file:
            assert len({len(row) for row in csv.reader(file, strict=True)}) == 1


def test_histories_hold_every_step_of_every_position(folder: Path, result: Result) -> None:
    table = rows(folder / "histories.csv")
    assert list(table[0]) == ["time_s", *(f"{p.name}_degC" for p in result.positions)]
    assert_allclose(column(table, "time_s"), result.history_times_s, rtol=1e-8, atol=0)
    for k, p in enumerate(result.positions):
        expected = result.history_temp_degC[:, k]
        assert_allclose(column(table, f"{p.name}_degC"), expected, rtol=1e-8, atol=0)


def test_profile_runs_from_the_surface_to_the_core(folder: Path, result: Result) -> None:
    table = rows(folder / "profile.csv")
    depth = column(table, "depth_mm")
    assert_allclose(depth[[0, -1]], [0.0, 150.0], rtol=0, atol=1e-9)
    assert np.all(np.diff(depth) > 0.0)
    # the invented part is solved from its middle out
    assert_allclose(column(table, "hardness_HV"), result.hardness_hv[::-1], rtol=1e-8, atol=0)
    for k, name in enumerate(PHASE_NAMES):
        expected = result.phases[k, ::-1]
        assert_allclose(column(table, f"{name}_fraction"), expected, rtol=1e-8, atol=1e-12)


def test_both_tables_hold_hardness_before_and_after_the_temper_and_yield(
    tmp_path: Path, tempered_result: Result
) -> None:
    r = tempered_result
    write_tables(r, tmp_path)
    table = rows(tmp_path / "profile.csv")
    assert_allclose(column(table, "hardness_HV"), r.hardness_hv[::-1], rtol=1e-8, atol=0)
    as_quenched = column(table, "hardness_as_quenched_HV")
    assert_allclose(as_quenched, r.hardness_as_quenched_hv[::-1], rtol=1e-8, atol=0)
    core = rows(tmp_path / "positions.csv")[-1]
    p = r.positions[-1]
    for heading, value in (
        ("hardness_HV", p.hardness_hv),
        ("hardness_as_quenched_HV", p.hardness_as_quenched_hv),
        ("yield_strength_MPa", p.yield_mpa),
    ):
        assert_allclose(float(core[heading]), value, rtol=1e-8, atol=0)


def test_what_is_not_available_is_an_empty_cell(folder: Path, result: Result) -> None:
    table = rows(folder / "profile.csv")
    assert table[0]["time_800_500_s"] == ""
    assert table[0]["cooling_rate_700degC_K_per_s"] == ""
    assert table[1]["time_800_500_s"] != ""
    surface = rows(folder / "positions.csv")[0]
    assert (surface["position"], surface["tensile_strength_MPa"]) == ("surface", "")
    everything = b"".join(p.read_bytes() for p in folder.iterdir()).lower()
    for word in (b"nan", b"none", b"inf"):
        assert not re.search(rb"(^|,)" + word + rb"(,|\r)", everything)


def test_conversions_outside_their_range_are_empty(tmp_path: Path, slow_result: Result) -> None:
    write_tables(slow_result, tmp_path)
    # 205 HV is below 20 HRC, where the scale begins
    assert {row["hardness_HRC"] for row in rows(tmp_path / "profile.csv")} == {""}


def test_every_heading_but_the_name_ends_with_a_unit(folder: Path) -> None:
    units = (
        "_s",
        "_degC",
        "_mm",
        "_um",
        "_astm",
        "_network",
        "_fraction",
        "_HV",
        "_HRC",
        "_HB",
        "_MPa",
        "_pct",
    )
    for path in folder.iterdir():
        headings = path.read_text(encoding="utf-8").splitlines()[0].split(",")
        assert all(h == "position" or h.endswith(units) for h in headings)


def test_a_name_with_comma_and_quotes_survives(tmp_path: Path, result: Result) -> None:
    from dataclasses import replace

    name = '1/4 "thick", Ø 300'
    renamed = replace(result.positions[0], name=name)
    write_tables(replace(result, positions=(renamed, *result.positions[1:])), tmp_path)
    assert rows(tmp_path / "positions.csv")[0]["position"] == name
    assert f"{name}_degC" in rows(tmp_path / "histories.csv")[0]
