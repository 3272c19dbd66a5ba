"""Cases on temperatures from elsewhere: our own runs read back, faults, the command."""

import csv
import io
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from rich.console import Console

from midradius.fem.record import read_record
from midradius.study import job
from midradius.study.casefile import CaseFaults, dumps, loads, loads_any, read_any
from midradius.study.result import Result
from midradius.study.schema import document
from midradius.study.seriescase import ALL_KEYS
from midradius.study.summary import terminal
from midradius.thermo.phases import PHASE_NAMES

STEEL = '[steel]\ngrade = "42CrMo4"\n'
SOAK = '[[route]]\nstage = "soak"\nat = "860 degC"\ntime = "2 h"\n'
TEMPER = '[[route]]\nstage = "temper"\nat = "600 degC"\ntime = "2 h"\n'
SHAFT = (
    'title = "Spindle HF-0120"\n'
    + STEEL
    + '[section]\nform = "round"\ndiameter = "120 mm"\n'
    + SOAK
    + '[[route]]\nstage = "quench"\nmedium = "mineral oil, agitated"\nbath = "60 degC"\n'
    + 'until = "core below 120 degC"\n'
    + '[output]\npositions = ["surface", "mid-radius", "core"]\nfields = 500\n'
    + '[grid]\ncells = 24\naccuracy = "2 K"\n'
)
TABLE = (
    '[temperatures]\nfile = "tc.csv"\ntime_unit = "s"\ntemperature_unit = "degC"\n'
    'columns = { time = "t", places = { core = "TC3", surface = "TC1" } }\n'
)


@pytest.fixture(scope="module")
def shaft(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Result]:
    """A round that we solved, with its folder."""
    folder = tmp_path_factory.mktemp("own")
    (folder / "shaft.toml").write_text(SHAFT)
    return folder, job.run(folder / "shaft.toml", folder / "shaft")


def case(folder: Path, temperatures: str, more: str = "") -> Path:
    path = folder / "case.toml"
    path.write_text('title = "again"\n' + STEEL + temperatures + SOAK + more)
    return path


def close(found: Result, own: Result) -> None:
    """Phases and hardness are those of the run within the stated error of the samples."""
    for here, there in zip(found.positions, own.positions, strict=True):
        # beside the samples' error: the run's own by its time steps
        allowed = here.hardness_time_error_hv + there.hardness_time_error_hv + 1.0
        assert_allclose(here.hardness_hv, there.hardness_hv, rtol=0.0, atol=allowed)
        for name in PHASE_NAMES:
            assert_allclose(here.phases[name], there.phases[name], rtol=0.0, atol=0.01)


def test_the_record_of_a_run_gives_the_structure_of_the_run(shaft: tuple[Path, Result]) -> None:
    folder, own = shaft
    found = job.solve(case(folder, '[temperatures]\nfile = "shaft/record.h5"\n'))
    assert [p.name for p in found.positions] == ["surface", "mid-radius", "core"]
    assert_allclose(found.phases, own.phases, rtol=0.0, atol=0.012)
    error = found.resampling and found.resampling.hardness_error_hv
    assert error is not None and error.max() < 6.0
    assert (np.abs(found.hardness_hv - own.hardness_hv) <= error + 1.5).all()
    assert_allclose(found.points_mm, own.points_mm, rtol=1e-14, atol=0.0)
    assert_allclose(found.profile.depth_mm, own.profile.depth_mm, rtol=1e-14, atol=0.0)


def test_the_table_of_histories_gives_the_structure_at_its_places(
    shaft: tuple[Path, Result],
) -> None:
    folder, own = shaft
    names = ("surface", "mid-radius", "core")
    columns = ", ".join(f'{n} = "{n}_degC"' for n in names)
    found = job.solve(
        case(
            folder,
            '[temperatures]\nfile = "shaft/histories.csv"\ntime_unit = "s"\n'
            'temperature_unit = "degC"\n'
            f'columns = {{ time = "time_s", places = {{ {columns} }} }}\n',
        )
    )
    close(found, own)


def test_the_series_of_fields_gives_the_structure_on_its_own_mesh(
    shaft: tuple[Path, Result], tmp_path: Path
) -> None:
    folder, own = shaft
    path = case(
        folder,
        '[temperatures]\nfile = "shaft/fields.pvd"\narray = "temperature_degC"\n'
        'time_unit = "s"\ntemperature_unit = "degC"\nlength_unit = "m"\n',
        '[output]\npositions = [{ name = "middle", at = ["0 mm", "0 mm"] },'
        ' { name = "a node", node = 5 }]\n',
    )
    found = job.run(path, tmp_path / "again")
    node = own.view.node
    assert_allclose(found.phases, own.phases[:, node], rtol=0.0, atol=0.012)
    assert_allclose(found.points_mm, own.view.points_mm, rtol=1e-14, atol=0.0)
    middle, _ = found.positions
    core = own.positions[2]
    assert_allclose(middle.hardness_hv, core.hardness_hv, rtol=0.0, atol=2.0)
    import pyvista

    seen = pyvista.read(tmp_path / "again" / "final.vtu")
    before = pyvista.read(folder / "shaft" / "final.vtu")
    assert_array_equal(seen.points, before.points)
    assert_array_equal(seen.cell_connectivity, before.cell_connectivity)
    for name in before.point_data:  # what was there is there, to the bit
        assert_array_equal(seen.point_data[name], before.point_data[name])
    assert_array_equal(seen.point_data["computed_hardness_HV"], found.hardness_hv)
    assert not (tmp_path / "again" / "profile.csv").exists()
    assert (tmp_path / "again" / "section.png").stat().st_size > 10_000


def record(folder: Path, *, step: float = 20.0, mark: str = ",", comma: bool = False) -> None:
    """An invented record of a part in still oil: exact exponentials."""
    times = np.concatenate([np.arange(0.0, 1200.0, step), [1200.0]])
    rows = [["t", "TC1", "TC3"]]
    for time in times:
        temps = [60.0 + 800.0 * np.exp(-time / pace) for pace in (90.0, 260.0)]
        rows.append([f"{x:.6f}" for x in (time, *temps)])
    text = "\n".join(mark.join(row) for row in rows)
    (folder / "tc.csv").write_text(text.replace(".", ",") if comma else text)


def test_thermocouples_with_decimal_commas_are_read_where_the_case_says_so(
    tmp_path: Path,
) -> None:
    record(tmp_path, mark=";", comma=True)
    with pytest.raises(CaseFaults, match=r'write decimal = "comma" in \[temperatures\]'):
        job.solve(case(tmp_path, TABLE))
    found = job.solve(case(tmp_path, TABLE + 'decimal = "comma"\n'))
    record(tmp_path, mark="\t")
    same = job.solve(case(tmp_path, TABLE))
    assert_array_equal(found.hardness_hv, same.hardness_hv)
    assert [p.name for p in found.positions] == ["core", "surface"]


def test_units_are_those_that_the_case_names(tmp_path: Path) -> None:
    record(tmp_path)
    found = job.solve(case(tmp_path, TABLE))
    rows = list(csv.reader((tmp_path / "tc.csv").read_text().splitlines()))
    for row in rows[1:]:
        row[0] = repr(float(row[0]) / 60.0)
        row[1:] = [repr(float(x) * 1.8 + 32.0) for x in row[1:]]
    (tmp_path / "tc.csv").write_text("\n".join(",".join(row) for row in rows))
    other = TABLE.replace('"s"', '"min"').replace("degC", "degF")
    same = job.solve(case(tmp_path, other))
    assert_allclose(same.hardness_hv, found.hardness_hv, rtol=0.0, atol=1e-6)
    with pytest.raises(CaseFaults, match="Check temperature_unit"):
        job.solve(case(tmp_path, other.replace("degF", "degC")))


def test_samples_too_far_apart_are_refused_with_place_interval_and_remedy(
    tmp_path: Path,
) -> None:
    record(tmp_path, step=150.0)
    with pytest.raises(CaseFaults) as caught:
        job.solve(case(tmp_path, TABLE))
    text = str(caught.value)
    assert ", line 5: temperatures.file = samples too far apart at " in text
    assert "from 0 to 150 s it falls from 860 to " in text
    assert "Write samples at most " in text


def test_a_temper_and_requirements_work_on_given_temperatures(tmp_path: Path) -> None:
    record(tmp_path)
    needs = (
        '[[need]]\nposition = "core"\nquantity = "hardness"\nat_least = "20 HRC"\n'
        '[[need]]\nposition = "everywhere"\nquantity = "hardness"\nat_most = "25 HRC"\n'
    )
    hard = job.solve(case(tmp_path, TABLE))
    soft = job.solve(case(tmp_path, TABLE, TEMPER + needs))
    assert (soft.hardness_hv < hard.hardness_hv).all()
    assert_array_equal(soft.hardness_as_quenched_hv, hard.hardness_hv)
    core, everywhere = soft.verdicts
    assert core.outcome == "holds" and core.value and core.value > 25.0
    assert everywhere.outcome == "fails"
    assert everywhere.note == 'worst at "surface"; met at 0 of 2 nodes'
    assert core.numerical_uncertainty is not None


FAULTS = [
    (TABLE.replace("TC3", "TC9"), '"TC9", but must be headings of the file: "t", "TC1", "TC3"'),
    (TABLE.replace('"s"', '"sec"'), 'time_unit = "sec", but must be "ms", "s", "min" or "h"'),
    (TABLE.replace('time_unit = "s"\n', ""), "temperatures.time_unit is missing"),
    (TABLE.replace("tc.csv", "none.csv"), 'file = "none.csv", but must be a file that exists'),
    (TABLE.replace("tc.csv", "tc.dat"), "must be a file ending with .csv"),
    (TABLE + 'array = "T"\n', "A CSV has columns"),
    (TABLE + 'starts_at = "1 h"\n', "within the file, which runs from 0 to 1200 s"),
    (TABLE + '[section]\nform = "round"\n', "section does not go with temperatures"),
    (TABLE + "[grid]\ncells = 20\n", "grid does not go with temperatures"),
    (TABLE + '[output]\npositions = ["cor"]\n', 'Write "core" if that is meant.'),
    (TABLE + "[output]\nfields = 3\n", "Times and fields are those of the file"),
    (
        TABLE + '[output]\npositions = [{ name = "a", node = 1 }]\n',
        "A CSV has no points, only columns.",
    ),
]


@pytest.mark.parametrize(("block", "said"), FAULTS, ids=[said[:30] for _, said in FAULTS])
def test_each_fault_of_the_block_is_answered(block: str, said: str, tmp_path: Path) -> None:
    record(tmp_path)
    (tmp_path / "tc.dat").write_text("x")
    with pytest.raises(CaseFaults) as caught:
        job.solve(case(tmp_path, block))
    assert said in str(caught.value)


ROWS = [
    ("t,TC1,TC3\n0,860,860\n0,850,855\n", "time 0 after 0 (sample 2)"),
    ("t,TC1,TC3\n0,860,860\n10,,855\n", '"" in line 3, column "TC1"'),
    ("t,TC1,TC3\n0,860,nan\n", '"nan" in line 2, column "TC3"'),
    ("t,TC1,TC3\ns,degC,degC\n", '"s" in line 2, column "t"'),
    ("t,TC1,TC3\n", "no samples below the heading"),
    ("t,TC1,TC1,TC3\n0,1,2,3\n", "the heading of one column"),
    ("", '"t", "TC3", "TC1", but must be headings'),
    ("\0\0\0", "must be headings of the file"),
]


@pytest.mark.parametrize(("text", "said"), ROWS)
def test_each_fault_of_a_record_names_its_line(text: str, said: str, tmp_path: Path) -> None:
    (tmp_path / "tc.csv").write_text(text)
    with pytest.raises(CaseFaults) as caught:
        job.solve(case(tmp_path, TABLE))
    assert said in str(caught.value)


def test_lines_that_a_logger_writes_above_the_heading_are_skipped(tmp_path: Path) -> None:
    record(tmp_path)
    found = job.solve(case(tmp_path, TABLE))
    path = tmp_path / "tc.csv"
    path.write_text("Logger 7, Hallgrund Forge\nchannels,3\n\n" + path.read_text())
    assert_array_equal(job.solve(case(tmp_path, TABLE)).hardness_hv, found.hardness_hv)


def test_faults_of_block_route_and_needs_come_together(tmp_path: Path) -> None:
    text = (
        STEEL
        + TABLE.replace('"s"', '"sec"')
        + SOAK
        + '[[route]]\nstage = "quench"\nmedium = "still air"\n'
        + '[[route]]\nstage = "heat"\nfurnace = "900 degC"\n'
        + '[[need]]\nquantity = "hardened depth"\nto = "50 HRC"\nat_least = "3 mm"\n'
    )
    (tmp_path / "tc.csv").write_text("")
    with pytest.raises(CaseFaults) as caught:
        loads_any(text, tmp_path / "case.toml")
    said = str(caught.value)
    assert len(caught.value.faults) == 4
    assert "[temperatures] says how the part cools" in said
    assert "a hardened depth needs a section" in said


def test_a_place_of_a_record_that_it_does_not_have_is_refused(shaft: tuple[Path, Result]) -> None:
    folder, _ = shaft
    need = '[[need]]\nposition = "quarter"\nquantity = "hardness"\nat_least = "28 HRC"\n'
    path = case(folder, '[temperatures]\nfile = "shaft/record.h5"\n', need)
    with pytest.raises(CaseFaults, match=r'need\[0\]\.position = "quarter", but must be a place'):
        job.solve(path)


def test_a_point_off_the_mesh_is_told_its_nearest_node(shaft: tuple[Path, Result]) -> None:
    folder, _ = shaft
    path = case(
        folder,
        '[temperatures]\nfile = "shaft/fields.pvd"\narray = "temperature_degC"\n'
        'time_unit = "s"\ntemperature_unit = "degC"\nlength_unit = "mm"\n',
        '[output]\npositions = [{ name = "middle", at = ["60 mm", "0 mm"] }]\n',
    )
    with pytest.raises(CaseFaults, match=r"(?s)its nearest node is \d+ at .* length_unit"):
        job.solve(path)


def test_what_needs_a_section_says_so(tmp_path: Path) -> None:
    record(tmp_path)
    path = case(tmp_path, TABLE)
    with pytest.raises(CaseFaults, match="temperatures from elsewhere have no section"):
        loads(path.read_text(), path)


BLOCKS = [
    TABLE,
    TABLE.replace("columns", 'starts_at = "90 s"\ndecimal = "comma"\ncolumns'),
    TABLE.replace(', places = { core = "TC3", surface = "TC1" }', ""),
    '[temperatures]\nfile = "shaft.e"\narray = "NT"\ntime_unit = "h"\ntemperature_unit = "K"\n'
    'length_unit = "in"\n[output]\npositions = [{ name = "a", node = 3 },'
    ' { name = "b", at = ["-3 mm", "4 mm", "0.5 in"] }]\n',
]


@pytest.mark.parametrize("block", BLOCKS)
def test_a_case_written_and_read_is_the_same_case(block: str, tmp_path: Path) -> None:
    (tmp_path / "tc.csv").write_text("")
    (tmp_path / "shaft.e").write_text("")
    path = case(tmp_path, block, TEMPER)
    found = read_any(path)
    again = loads_any(dumps(found), path)
    assert again == found
    assert dumps(again) == dumps(found)


def test_the_command_writes_a_whole_folder_and_one_document(call: Any, tmp_path: Path) -> None:
    record(tmp_path)
    need = '[[need]]\nposition = "core"\nquantity = "hardness"\nat_least = "60 HRC"\n'
    case(tmp_path, TABLE, need)
    assert call("check", "case.toml").out == "case.toml: sound (again)\n"
    done = call("run", "case.toml", "--out", "out", "--json")
    assert done.code == 1 and not done.err  # the requirement fails
    said = json.loads(done.out)
    assert said["heat_balance_relative"] is None and said["grid_error_K"] is None
    assert said["resampling"]["n_sample"] == 61
    assert said["stages"][0]["kind"] == "given"
    names = {path.name for path in (tmp_path / "out").iterdir()}
    assert names >= {"cooling.png", "histories.csv", "positions.csv", "needs.csv", "record.h5"}
    assert not names & {"final.vtu", "fields.pvd", "profile.csv", "section.png"}
    kept = read_record(tmp_path / "out" / "record.h5")
    assert kept.data["errors/resampling_hardness"].values.shape == (2,)
    assert call("run", "case.toml", "--out", "out", "--quiet").code == 1


def test_check_reads_the_columns_that_the_case_names_and_no_numerics(
    call: Any, start: Any, tmp_path: Path
) -> None:
    record(tmp_path)
    case(tmp_path, TABLE.replace("TC3", "TC9"))
    said = call("check", "case.toml")
    assert said.code == 2 and '"TC9", but must be headings of the file' in said.err
    case(tmp_path, TABLE)
    done = start("check", "case.toml", env={"PYTHONPROFILEIMPORTTIME": "1"})
    _, imported = done.communicate()
    assert done.returncode == 0
    assert not {"numba", "scipy", "meshio", "h5py"} & {
        line.rpartition("|")[2].strip() for line in imported.splitlines()
    }


SHIPPED = Path(__file__).resolve().parents[2] / "meshes" / "crank-block.toml"


def test_the_shipped_record_answers_as_it_says(call: Any) -> None:
    done = call("run", str(SHIPPED), "--out", "out", "--json")
    assert done.code == 0
    said = json.loads(done.out)
    assert [p["name"] for p in said["positions"]] == ["10 mm below surface", "mid-radius", "core"]
    # it begins at the end of the soak, not with the file
    assert said["stages"][0]["end_s"] == 2160.0
    assert said["resampling"]["hardness_as_quenched_error_hv"] < 5.0
    assert {v["outcome"] for v in said["needs"]} == {"holds"}


def test_the_sources_of_such_a_case_are_told_without_a_run(call: Any) -> None:
    done = call("sources", "--case", str(SHIPPED), "--model", "resampling")
    assert done.code == 0 and "resampling error" in done.out


def test_a_starter_without_a_section_names_the_one_file_to_bring(call: Any, tmp_path: Path) -> None:
    assert call("new", "--temperatures", "tc.toml").code == 0
    said = call("check", "tc.toml")
    assert said.code == 2
    assert said.err.count("must be") == 1 and "thermocouples.csv" in said.err
    rows = "\n".join(f"{t},{860 - t},{860 - t / 2}" for t in range(0, 700, 7))
    (tmp_path / "thermocouples.csv").write_text(f"seconds,TC1,TC2\n{rows}\n")
    assert call("check", "tc.toml").code == 0
    assert call("run", "tc.toml", "--quiet").code == 0


def test_every_series_case_fits_the_schema() -> None:
    # the schema's own checks are those of test_case_roundtrip: here only its keys
    known = document()["properties"]["temperatures"]["properties"]
    assert set(known) == set(ALL_KEYS)
    assert {"required": ["temperatures"]}.items() <= document()["oneOf"][1].items()


def test_a_refusal_leaves_nothing_behind(call: Any, tmp_path: Path) -> None:
    record(tmp_path, step=150.0)
    case(tmp_path, TABLE)
    done = call("run", "case.toml", "--out", "out")
    assert done.code == 2 and not done.out
    assert "samples too far apart" in done.err
    assert not (tmp_path / "out").exists()


def test_the_summary_says_what_the_samples_cost_and_what_does_not_apply(tmp_path: Path) -> None:
    record(tmp_path)
    stream = io.StringIO()
    terminal(job.solve(case(tmp_path, TABLE)), Console(file=stream, width=100))
    text = stream.getvalue()
    assert "heat balance, grid           not applicable: the temperatures were given" in text
    assert "without every 2nd sample" in text and "cubic instead of lines" in text
    assert "Temperatures are taken as given" in text


def test_a_late_start_is_noted_against_the_soak(tmp_path: Path) -> None:
    record(tmp_path, step=5.0)
    found = job.solve(case(tmp_path, TABLE + 'starts_at = "8 s"\n'))
    assert any("about 860 degC, the soak" in str(note) for note in found.notes)
    path = case(tmp_path, TABLE + 'starts_at = "60 s"\n')
    with pytest.raises(CaseFaults, match=r"above Ae1"):
        job.solve(path)
