"""A case on a mesh, from its file to results on the same mesh."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.record import read_record
from midradius.study import casefile, job
from midradius.study.case import Case
from midradius.study.casefaults import CaseFaults
from midradius.study.result import Result

PLATE = Path(__file__).parent / "bad" / "plate.inp"
CASE = """
title = "Plate of quads"
[steel]
grade = "42CrMo4"
[section]
form = "mesh"
file = "{file}"
length_unit = "mm"
sense = "{sense}"
{more}
[[route]]
stage = "soak"
at = "860 degC"
time = "2 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
time = "4 min"
{faces}
[output]
fields = 4
paths = [{{ name = "across", from = {at}, to = {end}, points = 9 }}]
positions = ["surface", "core", {{ name = "here", at = {at} }}]
[grid]
accuracy = "5 K"
"""


def case_of(folder: Path, file: str, sense: str, at: str, more: str = "", faces: str = "") -> Case:
    end = '["30 mm", "30 mm", "10 mm"]' if sense == "solid" else '["30 mm", "30 mm"]'
    text = CASE.format(file=file, sense=sense, at=at, more=more, faces=faces, end=end)
    path = folder / "case.toml"
    path.write_text(text)
    return casefile.read(path)


def mixed(folder: Path) -> tuple[np.ndarray, list[tuple[str, np.ndarray]]]:
    """A plate of quads and triangles, its nodes in no order, with data and groups."""
    meshio = pytest.importorskip("meshio")
    x, y = np.meshgrid(np.linspace(0, 80, 9), np.linspace(0, 60, 7), indexing="ij")
    points = np.stack([x.ravel(), y.ravel(), np.zeros(63)], axis=1)
    number = np.arange(63).reshape(9, 7)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    quads = np.stack([c.ravel() for c in corners], axis=1)
    order = np.random.default_rng(4).permutation(63)
    place = np.empty(63, dtype=int)
    place[order] = np.arange(63)
    points, quads = points[order], place[quads]
    halves = np.concatenate([quads[40:, [0, 1, 2]], quads[40:, [0, 2, 3]]])
    cells = [("quad", quads[:20]), ("triangle", halves), ("quad", quads[20:40])]
    count = [len(block) for _, block in cells]
    data = {
        "hardness_HV": np.arange(63.0) / 7.0,
        "layer": np.arange(63, dtype=np.int32),
        "flux": np.random.default_rng(1).normal(size=(63, 3)),
    }
    material = np.split(np.arange(sum(count), dtype=np.int16), np.cumsum(count)[:-1])
    meshio.write(
        folder / "mixed.vtu",
        meshio.Mesh(points, cells, point_data=data, cell_data={"material": material}),
    )
    return points, cells


@pytest.fixture(scope="module")
def solved(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Result, object]:
    folder = tmp_path_factory.mktemp("mixed")
    truth = mixed(folder)
    case = case_of(folder, "mixed.vtu", "plane", '["48 mm", "12 mm"]')
    return folder, job.run(case, folder / "out"), truth


def test_the_fields_stand_on_the_files_own_mesh_to_the_bit(solved) -> None:
    import meshio

    folder, result, (points, cells) = solved
    back = meshio.read(folder / "out" / "final.vtu")
    np.testing.assert_array_equal(back.points, points * 1e-3)
    assert [block.type for block in back.cells] == [kind for kind, _ in cells]
    for block, (_, want) in zip(back.cells, cells, strict=True):
        np.testing.assert_array_equal(block.data, want)
    given = meshio.read(folder / "mixed.vtu")
    for name in ("layer", "flux"):
        np.testing.assert_array_equal(back.point_data[name], given.point_data[name])
        assert back.point_data[name].dtype == given.point_data[name].dtype
    # a name of ours is not taken by the file's array
    np.testing.assert_array_equal(
        back.point_data["given hardness_HV"], given.point_data["hardness_HV"]
    )
    assert_allclose(back.point_data["hardness_HV"], result.hardness_hv[:63], rtol=1e-12, atol=0.0)
    for got, want in zip(back.cell_data["material"], given.cell_data["material"], strict=True):
        np.testing.assert_array_equal(got, want)


def test_vtk_itself_opens_the_fields(solved) -> None:
    vtk = pytest.importorskip("vtkmodules.vtkIOXML")
    folder, _, (points, cells) = solved
    reader = vtk.vtkXMLUnstructuredGridReader()
    reader.SetFileName(str(folder / "out" / "final.vtu"))
    reader.Update()
    grid = reader.GetOutput()
    assert grid.GetNumberOfPoints() == len(points)
    assert grid.GetNumberOfCells() == sum(len(block) for _, block in cells)
    assert grid.GetPointData().HasArray("hardness_HV")


def test_the_record_keeps_the_files_arrays_and_the_cells(solved) -> None:
    folder, _, (_, cells) = solved
    record = read_record(folder / "out" / "record.h5")
    flat = np.concatenate([block.ravel() for _, block in cells])
    np.testing.assert_array_equal(record.data["view/connectivity"].values, flat)
    np.testing.assert_array_equal(record.data["given/layer"].values, np.arange(63))
    assert record.data["profile/share"].values.shape == record.data["profile/node"].values.shape


def test_a_mesh_and_a_bar_of_the_same_size_get_the_same_answer(solved, tmp_path: Path) -> None:
    _, result, _ = solved
    # all four faces alike: the bar folds itself, the mesh does not
    at = '["48 mm", "12 mm"]'
    text = CASE.format(file="", sense="", at=at, end='["30 mm", "30 mm"]', more="", faces="")
    start = text.index("form =")
    end = text.index("[[route]]")
    bar = text[:start] + 'form = "bar"\nwidth = "80 mm"\nheight = "60 mm"\n' + text[end:]
    other = job.solve(casefile.loads(bar.replace('"surface", "core", ', "")))
    ours = next(p for p in result.positions if p.name == "here")
    theirs = other.positions[0]
    assert_allclose(ours.depth_mm, 12.0, rtol=1e-9, atol=0.0)
    # both state their errors; the mesh of 63 nodes is the coarser
    error = 3.0 * (ours.hardness_grid_error_hv + theirs.hardness_grid_error_hv) + 1.0
    assert_allclose(ours.hardness_hv, theirs.hardness_hv, rtol=0.0, atol=error)
    assert ours.time_800_500_s is not None and theirs.time_800_500_s is not None
    assert_allclose(ours.time_800_500_s, theirs.time_800_500_s, rtol=0.03, atol=0.0)


def test_the_result_states_what_was_done_to_the_mesh(solved) -> None:
    _, result, _ = solved
    text = " ".join(result.assumptions)
    assert "Mesh: every edge was halved" in text
    assert "the core is the deepest point" in text
    assert result.heat_balance_relative < 1e-6
    assert np.isfinite(result.grid_error_K)


def test_a_path_runs_from_point_to_point_in_a_table(solved) -> None:
    import csv

    folder, result, _ = solved
    with (folder / "out" / "paths.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert [row["path"] for row in rows] == ["across"] * 9
    assert_allclose(
        [float(row["x_mm"]) for row in rows], np.linspace(48.0, 30.0, 9), rtol=1e-9, atol=0.0
    )
    length = float(np.hypot(18.0, 18.0))
    assert_allclose(float(rows[-1]["distance_mm"]), length, rtol=1e-8, atol=0.0)
    here = next(p for p in result.positions if p.name == "here")
    assert_allclose(float(rows[0]["hardness_HV"]), here.hardness_hv, rtol=1e-8, atol=0.0)


def test_a_zone_of_the_mesh_sees_its_own_medium(tmp_path: Path) -> None:
    (tmp_path / "plate.inp").write_text(PLATE.read_text())
    faces = 'faces = { "top face" = "insulated" }'
    more = 'symmetry = ["left face"]'
    case = case_of(tmp_path, "plate.inp", "plane", '["70 mm", "10 mm"]', more, faces)
    assert case.section.zones == ("top face", "surface")
    result = job.solve(case)
    # insulated at x = 0 and y = 60: all of the top up to x = 20 mm is 60 mm from below,
    # and the middle of the whole, of which the mesh is the right half, is at x = 0
    core = next(p for p in result.positions if p.name == "core")
    assert_allclose(core.depth_mm, 60.0, rtol=0.02, atol=0.0)
    assert_allclose(core.coordinates_mm, [0.0, 60.0], rtol=0.0, atol=2.0)
    assert result.stages[0].medium == "insulated; surface: mineral oil, agitated, 60 degC"


def test_a_solid_of_hexahedra_goes_the_whole_way(tmp_path: Path) -> None:
    meshio = pytest.importorskip("meshio")
    axes = [np.linspace(0, size, 5) for size in (40.0, 30.0, 20.0)]
    points = np.stack([g.ravel() for g in np.meshgrid(*axes, indexing="ij")], axis=1)
    n = np.arange(125).reshape(5, 5, 5)
    corners = [
        layer[a : a + 4, b : b + 4]
        for layer in (n[:, :, :-1], n[:, :, 1:])
        for a, b in ((0, 0), (1, 0), (1, 1), (0, 1))
    ]
    cells = np.stack([c.ravel() for c in corners], axis=1)
    meshio.write(tmp_path / "block.vtu", meshio.Mesh(points, [("hexahedron", cells)]))
    case = case_of(tmp_path, "block.vtu", "solid", '["10 mm", "10 mm", "10 mm"]')
    result = job.run(case, tmp_path / "out")
    assert result.sense == "solid"
    core = next(p for p in result.positions if p.name == "core")
    assert_allclose(core.depth_mm, 10.0, rtol=1e-9, atol=0.0)
    back = meshio.read(tmp_path / "out" / "final.vtu")
    np.testing.assert_array_equal(back.cells[0].data, cells)
    assert not (tmp_path / "out" / "section.png").exists()
    assert result.heat_extent == "of the part as meshed"


def test_a_mesh_too_large_to_halve_says_that_its_grid_error_is_not_measured(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from midradius.study import meshrun

    monkeypatch.setattr(meshrun, "MOST_FIRST", {2: 10, 3: 10})
    mixed(tmp_path)
    case = case_of(tmp_path, "mixed.vtu", "plane", '["48 mm", "12 mm"]')
    need = casefile.loads(
        (tmp_path / "case.toml").read_text()
        + '\n[[need]]\nposition = "core"\nquantity = "hardness"\nat_least = "20 HRC"\n',
        tmp_path / "case.toml",
    ).needs
    result = job.solve(replace(case, needs=need))
    assert np.isnan(result.grid_error_K)
    assert all(np.isnan(p.hardness_grid_error_hv) for p in result.positions)
    assert any("grid error is not measured" in line for line in result.assumptions)
    assert "error of the grid not measured" in result.verdicts[0].note


def test_a_case_on_a_mesh_reads_back_as_it_was(tmp_path: Path) -> None:
    (tmp_path / "plate.inp").write_text(PLATE.read_text())
    case = case_of(
        tmp_path, "plate.inp", "plane", '["70 mm", "10 mm"]', 'symmetry = ["left face", "y = 0"]'
    )
    again = casefile.loads(casefile.dumps(case), tmp_path / "case.toml")
    assert again == case
    assert again.section.zones == case.section.zones


def test_temperatures_beyond_bath_and_start_are_stated_for_obtuse_cells(tmp_path: Path) -> None:
    from types import SimpleNamespace

    from midradius.study.meshrun import mesh_notes
    from midradius.study.runner import _first
    from midradius.study.setup import prepare

    mixed(tmp_path)
    case = case_of(tmp_path, "mixed.vtu", "plane", '["48 mm", "12 mm"]')
    setup = prepare(case)
    cut = _first(case, setup)
    start = np.full(cut.body.n_node, 1133.15)
    field = np.full((2, cut.body.n_node), 400.0)
    field[1, 7] = 329.15  # the oil has 333.15 K
    history = SimpleNamespace(field=field, times=np.array([0.0, 3.0]))
    assert mesh_notes(cut, history, setup.stages, start) == ()  # type: ignore[arg-type]
    obtuse = replace(cut, negative=0.2)  # type: ignore[type-var]
    (note,) = mesh_notes(obtuse, history, setup.stages, start)  # type: ignore[arg-type]
    assert note.value == "4 K"
    assert "coldest 56.0 degC at 3 s" in note.allowed


def test_check_lists_the_zones_of_a_mesh_with_their_places(tmp_path: Path) -> None:
    from click.testing import CliRunner

    from midradius.study.cli import cli

    (tmp_path / "strip.inp").write_text(
        "*NODE\n1,0,0\n2,30,0\n3,30,40\n4,0,40\n5,60,0\n6,60,40\n"
        "*ELEMENT,TYPE=CPS4,ELSET=body\n1,1,2,3,4\n2,2,5,6,3\n"
        "*ELEMENT,TYPE=T3D2,ELSET=top\n3,4,3\n4,3,6\n*ELSET,ELSET=roof\n4\n"
    )
    more = 'symmetry = ["x = 0"]'
    case_of(tmp_path, "strip.inp", "plane", '["20 mm", "20 mm"]', more=more)
    answer = CliRunner().invoke(cli, ["check", str(tmp_path / "case.toml")])
    assert answer.exit_code == 0
    assert answer.output.splitlines()[1:] == [
        "mesh strip.inp, plane, 60 x 40 mm; 6 nodes, 2 quads",
        "  zone top      x 0 to 60, y = 40 mm; 2 edges",
        "  zone surface  x 0 to 60, y 0 to 40 mm; 3 edges",
        "  insulated (symmetry, axis)  x = 0, y 0 to 40 mm; 1 edge of 6",
        "  other groups: body, roof",
        "  One of these that lies on the boundary becomes a zone where faces names it.",
        '  A zone takes a medium of its own in a stage: faces = { "top" = "still air" }.',
    ]


TANK = """
[load]
pieces = 12
{size}
[tank]
volume = "10 m3"
cooler = "200 kW"
bath_limit = "95 degC"
"""


@pytest.mark.parametrize(
    ("symmetry", "size", "said"),
    [
        ("", "", 'load.length is missing, but must be given for form = "mesh"'),
        ("", 'length = "1.6 m"', ""),
        ('symmetry = ["x = 0"]', 'length = "1.6 m"', "load.piece_mass is missing"),
        ('symmetry = ["x = 0"]', 'piece_mass = "60 kg"', ""),
    ],
)
def test_a_load_of_a_plane_mesh_says_how_much_a_piece_is(
    tmp_path: Path, symmetry: str, size: str, said: str
) -> None:
    (tmp_path / "plate.inp").write_text(PLATE.read_text())
    path = tmp_path / "case.toml"
    text = CASE.format(file="plate.inp", sense="plane", more=symmetry, faces="", at=0, end=0)
    path.write_text(text.split("[output]")[0] + TANK.format(size=size))
    if not said:
        assert casefile.read(path).load is not None
        return
    with pytest.raises(CaseFaults) as caught:
        casefile.read(path)
    assert said in str(caught.value)


def test_a_large_error_of_the_grid_is_explained_with_what_lowers_it(tmp_path: Path) -> None:
    from midradius.fem.meshcut import cut_mesh
    from midradius.fem.meshfile import open_mesh
    from midradius.fem.meshsection import MeshSection
    from midradius.study.meshrun import mesh_statements

    mesh = open_mesh(PLATE, length_unit="mm", sense="plane")
    cut = cut_mesh(MeshSection(mesh, mesh.zones), 0)
    said = (
        "Mesh: the error of the grid, 73 K, is the largest of all nodes and times, as a rule near"
        " the cooled surface when the quench begins. Smaller cells there lower it; how far it"
        " moves the hardness is stated beside the results."
    )
    assert said in mesh_statements(cut, 73.2)
    assert not any("largest of all" in line for line in mesh_statements(cut, 4.0))
    assert not any("largest of all" in line for line in mesh_statements(cut, float("nan")))
