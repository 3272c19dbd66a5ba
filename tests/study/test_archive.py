"""A whole result in field files and record: nothing lost, every number named."""

import json
from pathlib import Path

import numpy as np
import pyvista
from numpy.testing import assert_allclose

from midradius.fem.record import read_record, verify_record
from midradius.study.archive import write_fields, write_result_record
from midradius.study.result import Result
from midradius.thermo.phases import PHASE_NAMES


def test_the_last_file_of_the_series_carries_every_final_field(
    tmp_path: Path, result: Result
) -> None:
    reader = pyvista.get_reader(write_fields(result, tmp_path))
    assert_allclose(reader.time_values, result.times_s, rtol=0, atol=0)
    reader.set_active_time_value(reader.time_values[-1])
    point_data = reader.read()[0].point_data
    assert set(point_data.keys()) == {
        "temperature_degC",
        "position_mm",
        *(f"{name}_fraction" for name in PHASE_NAMES),
        "hardness_HV",
        "hardness_as_quenched_HV",
        "yield_strength_MPa",
        "time_800_500_s",
        "cooling_rate_700degC_K_per_s",
        "austenite_carbon_pct",
        "pearlite_formed_at_degC",
        "ferrite_grain_um",
        "pearlite_spacing_um",
        "impact_transition_degC",
        "soak_reached_degC",
        "carbon_in_solution_pct",
        "undissolved_ferrite_fraction",
        "undissolved_cementite_fraction",
        "austenite_grain_astm",
        "austenite_grain_um",
    }
    total = sum(point_data[f"{name}_fraction"] for name in PHASE_NAMES)
    assert_allclose(total, 1.0, rtol=0, atol=1e-12)


def test_a_round_is_drawn_as_a_disc_with_each_node_on_its_ring(
    tmp_path: Path, result: Result
) -> None:
    write_fields(result, tmp_path)
    mesh = pyvista.read(tmp_path / "final.vtu")
    radius = np.linalg.norm(mesh.points, axis=1) * 1e3
    order = np.argsort(result.points_mm[:, 0])
    expected = np.interp(radius, result.points_mm[order, 0], result.hardness_hv[order])
    assert_allclose(mesh.point_data["hardness_HV"], expected, rtol=1e-9, atol=0)
    # polygon of 48 corners: area n/2 R^2 sin(2 pi/n)
    area = 24.0 * 0.15**2 * np.sin(2.0 * np.pi / 48.0)
    assert_allclose(mesh.compute_cell_sizes()["Area"].sum(), area, rtol=1e-12, atol=0)


def test_the_record_holds_what_is_needed_to_redo_and_check_the_run(
    tmp_path: Path, result: Result
) -> None:
    root = write_result_record(result, tmp_path)
    check = verify_record(tmp_path / "record.h5")
    assert (check.faults, check.root_sha256) == ((), root)
    record = read_record(tmp_path / "record.h5")
    assert record.text["case_toml"] == result.case_text
    assert json.loads(record.text["inputs_json"]) == result.inputs
    assert json.loads(record.text["notes_json"])[0]["quantity"] == "Si"
    assert json.loads(record.text["sources_json"])[1]["status"] == "remembered"
    assert json.loads(record.text["stages_json"])[1]["ended_by"] == "core below 150 degC"
    assert [p["name"] for p in json.loads(record.text["positions_json"])] == [
        p.name for p in result.positions
    ]
    for name, expected in (
        ("grid/points", result.points_mm),
        ("fields/time", result.times_s),
        ("fields/temperature", result.temp_degC),
        ("fields/phases", result.phases),
        ("fields/hardness", result.hardness_hv),
        ("fields/hardness_as_quenched", result.hardness_as_quenched_hv),
        ("fields/yield_strength", result.yield_mpa),
        ("fields/rate_700", result.rate_700_K_per_s),
        ("histories/temperature", result.history_temp_degC),
        ("balance/closure", result.heat_balance_relative),
    ):
        assert_allclose(record.data[name].values, expected, rtol=0, atol=0, equal_nan=True)
    assert record.data["grid/volume"].units == "m3 per radian and metre of length"
    assert np.isnan(record.data["positions/tensile_mpa"].values[0])


def test_the_record_of_a_tempered_part_keeps_its_tempers_and_both_hardnesses(
    tmp_path: Path, tempered_result: Result
) -> None:
    write_result_record(tempered_result, tmp_path)
    record = read_record(tmp_path / "record.h5")
    tempers = [{"at_degC": 600.0, "time_s": 21600.0}, {"at_degC": 580.0, "time_s": 7200.0}]
    assert json.loads(record.text["tempers_json"]) == tempers
    hardness = record.data["fields/hardness"].values
    as_quenched = record.data["fields/hardness_as_quenched"].values
    assert_allclose(hardness, 0.8 * as_quenched, rtol=1e-15, atol=0)
    as_quenched = record.data["positions/hardness_as_quenched_hv"].values
    assert_allclose(as_quenched[-1], tempered_result.hardness_hv[0] / 0.8, rtol=1e-15, atol=0)


def test_the_same_result_gives_the_same_root_digest(tmp_path: Path, result: Result) -> None:
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
    first = write_result_record(result, tmp_path / "a")
    assert write_result_record(result, tmp_path / "b") == first
