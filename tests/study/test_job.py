"""The whole job: from a case to a folder that others can open, and from Python."""

import csv
import json
import os
import re
import subprocess
import sys
from dataclasses import FrozenInstanceError, fields, is_dataclass, replace
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.record import read_record, verify_record
from midradius.study import casefile, starter
from midradius.study.archive import write_fields
from midradius.study.case import Case, Grid
from midradius.study.job import run, solve, write
from midradius.study.result import Result
from midradius.thermo.phases import PHASE_NAMES

ROOT = Path(__file__).resolve().parents[2]
SHIPPED = sorted(
    path for path in (ROOT / "meshes").glob("*.toml") if "[section]" in path.read_text("utf-8")
)
AT_END = [
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
]

# What a person sees of each form [mm]: lowest and highest x and y of the drawing.
FORMS = {
    'form = "slab"\nthickness = "40 mm"': (0.0, 40.0, None, None),
    'form = "round"\ndiameter = "30 mm"': (-15.0, 15.0, -15.0, 15.0),
    'form = "round"\ndiameter = "30 mm"\nlength = "50 mm"': (-15.0, 15.0, 0.0, 50.0),
    'form = "tube"\noutside = "60 mm"\nbore = "30 mm"': (-30.0, 30.0, -30.0, 30.0),
    'form = "tube"\noutside = "60 mm"\nbore = "30 mm"\nbore_medium = "insulated"': (
        *(-30.0, 30.0),
        *(-30.0, 30.0),
    ),
    'form = "ball"\ndiameter = "30 mm"': (-15.0, 15.0, -15.0, 15.0),
    'form = "bar"\nwidth = "20 mm"\nheight = "35 mm"': (0.0, 20.0, 0.0, 35.0),
    'form = "ring"\noutside = "80 mm"\nbore = "40 mm"\nheight = "25 mm"': (
        *(-40.0, 40.0),
        *(0.0, 25.0),
    ),
}


def of_form(small: str, form: str) -> str:
    plane = "length" in form or "width" in form or "height" in form
    text = small.replace('form = "round"\ndiameter = "30 mm"', form)
    return text.replace("cells = 16", "cells = [8, 8]" if plane else "cells = 8")


@pytest.fixture(scope="module")
def solved(small: str) -> Result:
    return solve(casefile.loads(small))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory, solved: Result) -> Path:
    return write(solved, tmp_path_factory.mktemp("job") / "out")


# The folder


def test_the_folder_holds_what_the_readme_names(folder: Path) -> None:
    names = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()}
    assert names == {
        *("fields.pvd", "fields/step_0000.vtu", "fields/step_0001.vtu", "final.vtu"),
        *("histories.csv", "profile.csv", "positions.csv"),
        *("cooling.png", "profile.png", "section.png"),
        *("record.h5", "case.toml", ".midradius-result"),
    }
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    table = readme[readme.index("## What a run leaves") : readme.index("The folder appears")]
    for named in re.findall(r"`([^`]+)`", table):
        # these stand there only where the case asks for something, or heats the part
        missing = named in (
            *("needs.csv", "heating.csv", "paths.csv", "fields.vtkhdf"),
            *("hardness.png", "phases.png", "temperature.png", "cooling.gif"),
        )
        assert missing or any(Path(name).match(named) for name in names), named


def test_the_case_in_the_folder_asks_for_the_same_again(folder: Path, small: str) -> None:
    assert casefile.read(folder / "case.toml") == casefile.loads(small)


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_the_tables_hold_the_numbers_of_the_result(folder: Path, solved: Result) -> None:
    histories = rows_of(folder / "histories.csv")
    assert_allclose(
        [float(row["time_s"]) for row in histories], solved.history_times_s, rtol=1e-8, atol=1e-12
    )
    for k, position in enumerate(solved.positions):
        column = [float(row[f"{position.name}_degC"]) for row in histories]
        assert_allclose(column, solved.history_temp_degC[:, k], rtol=1e-8, atol=0)
    profile = rows_of(folder / "profile.csv")
    assert_allclose(
        [float(row["hardness_HV"]) for row in profile],
        solved.hardness_hv[solved.profile.node],
        rtol=1e-8,
        atol=0,
    )
    depth = [float(row["depth_mm"]) for row in profile]
    assert_allclose([depth[0], depth[-1]], [0.0, 15.0], rtol=0, atol=1e-9)
    positions = {row["position"]: row for row in rows_of(folder / "positions.csv")}
    for position in solved.positions:
        row = positions[position.name]
        assert_allclose(float(row["hardness_HV"]), position.hardness_hv, rtol=1e-8, atol=0)
        shares = [float(row[f"{name}_fraction"]) for name in PHASE_NAMES]
        assert_allclose(shares, list(position.phases.values()), rtol=1e-7, atol=1e-12)


def test_the_record_verifies_and_holds_what_it_takes_to_do_it_again(
    folder: Path, solved: Result, small: str
) -> None:
    checked = verify_record(folder / "record.h5")
    assert checked.faults == ()
    record = read_record(folder / "record.h5")
    assert record.text["case_toml"] == small
    again = solve(casefile.loads(record.text["case_toml"]))
    for path, values in (
        ("fields/temperature", again.temp_degC),
        ("fields/phases", again.phases),
        ("fields/hardness", again.hardness_hv),
        ("histories/temperature", again.history_temp_degC),
    ):
        assert_allclose(record.data[path].values, values, rtol=1e-12, atol=1e-12)
    assert record.data["balance/closure"].values == solved.heat_balance_relative
    assert set(record.data) >= {"grid/points", "grid/volume", "errors/time", "errors/grid"}
    assert json.loads(record.text["notes_json"]) is not None
    assert {"midradius", "numpy", "numba"} <= {
        name for key in record.provenance for name in re.findall(r"[a-z0-9]+", key)
    }


# What a viewer sees


@pytest.mark.parametrize("form", FORMS, ids=lambda form: re.sub(r"[^a-z]+", " ", form).strip())
def test_every_form_opens_in_the_vtk_library_with_the_whole_part_in_view(
    tmp_path: Path, small: str, form: str
) -> None:
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridReader

    result = solve(casefile.loads(of_form(small, form)))
    assert result.heat_balance_relative < 1e-6
    assert_allclose(result.phases.sum(axis=0), 1.0, rtol=0, atol=1e-9)
    assert np.all(result.phases > -1e-9)
    index = write_fields(result, tmp_path)
    sets = list(ElementTree.parse(index).getroot().iter("DataSet"))
    assert_allclose([float(s.get("timestep", "")) for s in sets], result.times_s, rtol=0, atol=0)
    assert sets[-1].get("file") == "final.vtu"
    for number, one in enumerate(sets):
        reader = vtkXMLUnstructuredGridReader()
        reader.SetFileName(str(tmp_path / str(one.get("file"))))
        reader.Update()
        grid = reader.GetOutput()
        bounds = np.array(grid.GetBounds()) * 1e3
        for found, wanted in zip(bounds, FORMS[form], strict=False):
            if wanted is not None:
                assert_allclose(found, wanted, rtol=0, atol=0.05)
        assert bounds[3] - bounds[2] >= 0.2 * (bounds[1] - bounds[0])  # no mere line
        data = grid.GetPointData()
        names = [data.GetArrayName(k) for k in range(data.GetNumberOfArrays())]
        assert set(names) == {"temperature_degC", "position_mm", *AT_END}
        temp = vtk_to_numpy(data.GetArray("temperature_degC"))
        assert_allclose(temp, result.temp_degC[number][result.view.node], rtol=0, atol=0)
    hardness = vtk_to_numpy(data.GetArray("hardness_HV"))
    assert_allclose(hardness, result.hardness_hv[result.view.node], rtol=0, atol=0)


def test_the_series_opens_in_pyvista_with_its_times(folder: Path, solved: Result) -> None:
    import pyvista

    reader = pyvista.PVDReader(str(folder / "fields.pvd"))
    assert_allclose(reader.time_values, solved.times_s, rtol=0, atol=0)
    reader.set_active_time_value(reader.time_values[-1])
    (block,) = reader.read()
    assert np.all(np.isfinite(block["hardness_HV"]))
    # the disc itself, not a ring of it and nothing twice: pi r^2, less what 96 chords cut off
    area = block.compute_cell_sizes(length=False, volume=False)["Area"].sum()
    assert_allclose(area, np.pi * 0.015**2, rtol=2e-3, atol=0)


# From Python


def test_the_lines_of_the_readme_run_as_they_stand(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], small: str
) -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    (code,) = re.findall(r"```python\n(.*?)```", readme, re.DOTALL)
    assert len([line for line in code.splitlines() if line.strip()]) <= 5
    (tmp_path / "meshes").mkdir()
    (tmp_path / "meshes" / "pump-shaft.toml").write_text(small, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    exec(compile(code, "README.md", "exec"), {})
    hardness, phases, temp = re.fullmatch(
        r"(\S+) (\(.*?\)) (\(.*?\))\n", capsys.readouterr().out
    ).groups()
    assert 150.0 < float(hardness) < 900.0
    assert (phases, temp) == ("(6, 17)", "(3, 17)")
    assert (tmp_path / "pump-shaft" / "final.vtu").is_file()


def test_the_case_of_the_readme_is_sound() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    text, *others = re.findall(r"```toml\n(.*?)```", readme, re.DOTALL)
    need = next(other for other in others if other.startswith("[[need]]"))
    assert casefile.loads(text).title.startswith("Pump shaft")
    case = casefile.loads(f"{text}\n{need}")
    assert [stage.kind for stage in case.tempers] == ["temper"]
    assert len(case.needs) == 1


def frozen_parts(value: object) -> list[object]:
    if not is_dataclass(value):
        return []
    found = [value]
    for one in fields(value):
        part = getattr(value, one.name)
        for item in part if isinstance(part, tuple) else (part,):
            found += frozen_parts(item)
    return found


def test_a_result_is_frozen_in_all_its_parts(solved: Result) -> None:
    parts = frozen_parts(solved)
    assert len(parts) > 10
    for part in parts:
        with pytest.raises(FrozenInstanceError):
            setattr(part, fields(part)[0].name, None)


def test_arrays_have_the_documented_shapes(solved: Result) -> None:
    n_time, n_node, n_step, n_position = 3, 17, len(solved.history_times_s), 3
    assert solved.n_node == n_node
    assert solved.n_step == n_step - 1
    shapes = {
        "points_mm": (n_node, 1),
        "volume": (n_node,),
        "times_s": (n_time,),
        "temp_degC": (n_time, n_node),
        "phases": (len(PHASE_NAMES), n_node),
        "hardness_hv": (n_node,),
        "hardness_as_quenched_hv": (n_node,),
        "yield_mpa": (n_node,),
        "time_800_500_s": (n_node,),
        "rate_700_K_per_s": (n_node,),
        "austenite_carbon_pct": (n_node,),
        "pearlite_formed_at_degC": (n_node,),
        "ferrite_grain_um": (n_node,),
        "pearlite_spacing_um": (n_node,),
        "cementite_film_um": (n_node,),
        "impact_transition_degC": (n_node,),
        "history_times_s": (n_step,),
        "history_temp_degC": (n_step, n_position),
    }
    for name, shape in shapes.items():
        array = getattr(solved, name)
        assert array.shape == shape, name
        assert array.dtype == np.float64, name
    view = solved.view
    assert view.points_mm.shape == (len(view.node), 3)
    assert view.quads.shape[1] == 4
    assert view.triangles.shape[1] == 3
    assert solved.profile.depth_mm.shape == solved.profile.node.shape


def test_the_same_case_gives_the_same_numbers(solved: Result, small: str) -> None:
    again = solve(casefile.loads(small))
    assert_allclose(again.temp_degC, solved.temp_degC, rtol=0, atol=0)
    assert_allclose(again.hardness_hv, solved.hardness_hv, rtol=0, atol=0)


def test_the_asked_field_times_are_kept_and_the_history_starts_with_the_soak(small: str) -> None:
    text = small.replace("fields = 3", 'times = ["0 s", "5 s", "1 min"]')
    result = solve(casefile.loads(text))
    assert_allclose(result.times_s, [0.0, 5.0, 60.0], rtol=0, atol=1e-9)
    assert_allclose(result.temp_degC[0], 850.0, rtol=0, atol=1e-9)
    assert_allclose(result.history_temp_degC[0], 850.0, rtol=0, atol=1e-9)
    for k in range(3):
        column = result.history_temp_degC[:, k]
        at = np.interp(5.0, result.history_times_s, column)
        node = {0: 16, 1: None, 2: 0}[k]
        if node is not None:
            # linear between the steps of the history against the solver's parabola
            assert_allclose(result.temp_degC[1, node], at, rtol=0, atol=2.0)


def test_progress_rises_to_the_expected_end(small: str) -> None:
    told: list[tuple[float, float]] = []
    solve(casefile.loads(small), tell=lambda now, end: told.append((now, end)))
    assert told
    assert all(now <= end * (1.0 + 1e-9) for now, end in told)
    assert_allclose(told[-1][0], 100.0, rtol=1e-9, atol=0)


# Starter cases and shipped cases


def brief(case: Case) -> Case:
    """The same case on a coarse grid, for what does not hang on accuracy."""
    cells = (12,) * case.section.n_dim
    return replace(case, grid=Grid(cells, 5.0), outputs=replace(case.outputs, n_field=3))


@pytest.mark.parametrize("form", ["slab", "round", "tube", "ball", "bar", "ring"])
def test_new_writes_a_case_of_every_form_that_runs(call, tmp_path: Path, form: str) -> None:
    assert call("new", "part.toml", "--form", form).code == 0
    case = casefile.read(tmp_path / "part.toml")
    assert case.section.form == form
    assert casefile.loads(starter.text(form)) == case
    result = solve(brief(case))
    assert result.heat_balance_relative < 1e-6
    assert len(result.positions) == 4


def test_the_shipped_cases_show_every_form_and_state_that_they_are_invented() -> None:
    forms = set()
    for path in SHIPPED:
        assert (
            "invented"
            in path.read_text(encoding="utf-8").partition("\n\n")[0].partition("title")[0]
        ), path.name
        forms.add(casefile.read(path).section.form)
    assert forms == {"slab", "round", "tube", "ball", "bar", "ring", "mesh", "outline"}


# a solid and the fine mesh of an outline take minutes
QUICK = [path for path in SHIPPED if path.stem not in ("bracket", "crane-rail-drawing")]


@pytest.mark.parametrize("path", QUICK, ids=lambda path: path.stem)
def test_every_shipped_case_runs(path: Path) -> None:
    result = solve(brief(casefile.read(path)))
    assert result.heat_balance_relative < 1e-6
    assert all(p.hardness_hv > 150.0 for p in result.positions)


@pytest.mark.slow
@pytest.mark.parametrize("path", SHIPPED, ids=lambda path: path.stem)
def test_every_shipped_case_runs_as_it_stands(tmp_path: Path, path: Path) -> None:
    result = run(path, tmp_path / "out")
    assert result.heat_balance_relative < 1e-6
    assert (tmp_path / "out" / "record.h5").is_file()


# Where nothing can be kept

NO_CACHE = """
import sys
from midradius.thermo import compiled
compiled._writable = lambda folder: False
from midradius.study import job
assert compiled.cache_folder() is None
result = job.run("case.toml", "out")
assert result.heat_balance_relative < 1e-6
"""


@pytest.mark.slow
def test_it_runs_where_no_cache_folder_can_be_written(tmp_path: Path, small: str) -> None:
    (tmp_path / "case.toml").write_text(small, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-c", NO_CACHE],
        cwd=tmp_path,
        env={**os.environ, "HOME": "/proc/nowhere"},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert (tmp_path / "out" / "record.h5").is_file()
