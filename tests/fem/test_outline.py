"""Outlines of CAD to meshes: drawings made with ezdxf, solids made with gmsh itself.

Areas and volumes are exact geometry, worked out beside each test.
"""

import math
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import ezdxf
import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem import outline
from midradius.fem.meshguard import read_mesh
from midradius.fem.outline import MissingExtra, Slice, first_cell, mesh_outline
from midradius.fem.outlinedxf import read_dxf
from midradius.thermo.errors import InputFault

Draw = Callable[..., Path]


@pytest.fixture
def drawn(tmp_path: Path) -> Draw:
    """A drawing in mm from a function that fills its model space."""

    def make(fill: Callable, unit: int = 4, version: str = "R2010") -> Path:
        document = ezdxf.new(version)
        document.units = unit
        fill(document.modelspace())
        path = tmp_path / "part.dxf"
        document.saveas(path)
        return path

    return make


def stadium(space) -> None:
    """100 by 40 with half discs at both ends, as one polyline with bulges."""
    corners = [(0, 0, 0), (100, 0, 1), (100, 40, 0), (0, 40, 1)]
    space.add_lwpolyline(corners, format="xyb", close=True, dxfattribs={"layer": "outside"})


STADIUM = (100.0 * 40.0 + math.pi * 20.0**2) * 1e-6
HUB = """
import sys
import gmsh
gmsh.initialize()
gmsh.option.setNumber("General.Terminal", 0)
o = gmsh.model.occ
shaft = o.addCylinder(0, 0, 0, 0, 0, 200, 25)
flange = o.addCylinder(0, 0, 0, 0, 0, 50, 60)
bore = o.addCylinder(0, 0, -1, 0, 0, 300, 6)
whole = o.fuse([(3, shaft)], [(3, flange)])[0]
o.cut(whole, [(3, bore)])
o.synchronize()
gmsh.write(sys.argv[1])
gmsh.clear()
o.addDisk(50, 50, 7, 40, 30)
o.synchronize()
gmsh.write(sys.argv[2])
gmsh.finalize()
"""


@pytest.fixture(scope="module")
def step(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path]:
    """A stepped hub about z with a bore, and an elliptic face, written by gmsh."""
    folder = tmp_path_factory.mktemp("step")
    hub, face = folder / "hub.step", folder / "face.step"
    subprocess.run([sys.executable, "-c", HUB, str(hub), str(face)], check=True, timeout=120)
    return hub, face


# What a drawing holds


def test_a_polyline_with_bulges_bounds_the_area_of_the_stadium(drawn: Draw) -> None:
    found = read_dxf(drawn(stadium))
    assert_allclose(found.outline.area * found.metre**2, STADIUM, rtol=1e-4, atol=0.0)
    assert {piece.zone for piece in found.outline.outer.pieces} == {"outside"}


def test_circles_ellipses_and_splines_become_holes_with_their_areas(drawn: Draw) -> None:
    def fill(space) -> None:
        stadium(space)
        space.add_circle((50, 20), 8)
        space.add_ellipse((90, 20), major_axis=(10, 0), ratio=0.5)

    found = read_dxf(drawn(fill))
    assert len(found.outline.holes) == 2
    holes = sum(hole.area for hole in found.outline.holes)
    assert_allclose(holes, math.pi * (64.0 + 50.0), rtol=2e-4, atol=0.0)


def test_arcs_stay_within_a_ten_thousandth_of_their_radius(drawn: Draw) -> None:
    found = read_dxf(drawn(lambda space: space.add_circle((0, 0), 300.0)))
    corners = found.outline.outer.polygon
    middles = 0.5 * (corners + np.roll(corners, -1, axis=0))
    assert_allclose(np.linalg.norm(corners, axis=1), 300.0, rtol=1e-9, atol=0.0)
    assert np.linalg.norm(middles, axis=1).min() >= 300.0 * (1.0 - 1e-4)


def test_blocks_are_taken_apart_and_mirrored_arcs_lie_where_they_are_seen(drawn: Draw) -> None:
    def fill(space) -> None:
        block = space.doc.blocks.new("half")
        corners = [(0, 0, 0), (10, 0, 1), (10, 10, 0), (0, 10, 0)]
        block.add_lwpolyline(corners, format="xyb", close=True)
        space.add_blockref("half", (100, 0), dxfattribs={"xscale": -1.0})

    found = read_dxf(drawn(fill))
    assert_allclose(found.outline.area, 100.0 + math.pi * 12.5, rtol=1e-4, atol=0.0)
    assert_allclose(found.outline.outer.polygon[:, 0].min(), 85.0, rtol=1e-4, atol=0.0)


def test_ends_that_nearly_meet_are_joined_and_lines_drawn_twice_taken_once(drawn: Draw) -> None:
    def fill(space) -> None:
        space.add_line((0, 0), (30, 0))
        space.add_line((30, 0), (0, 0))
        space.add_line((30, 0.0001), (0, 40))
        space.add_line((0, 40), (0, 0))

    found = read_dxf(drawn(fill))
    assert_allclose(found.outline.area, 600.0, rtol=1e-5, atol=0.0)
    assert any("drawn twice" in note for note in found.notes)
    assert any("were joined" in note for note in found.notes)


def test_dimensions_and_hidden_layers_are_passed_over_and_named(drawn: Draw) -> None:
    def fill(space) -> None:
        stadium(space)
        space.doc.layers.add("centre").off()
        space.add_line((0, 20), (100, 20), dxfattribs={"layer": "centre"})
        space.add_text("Hallgrund Forge")

    found = read_dxf(drawn(fill))
    assert found.notes == ("passed over: 1 TEXT, 1 curves on layers that are off",)


def test_only_the_layers_that_are_named_are_read(drawn: Draw) -> None:
    def fill(space) -> None:
        stadium(space)
        space.add_line((-50, 20), (150, 20), dxfattribs={"layer": "centre"})

    path = drawn(fill)
    with pytest.raises(InputFault, match=r"A curve ends alone at \(-50, 20\), \(150, 20\)"):
        read_dxf(path)
    assert len(read_dxf(path, layers=("Outside",)).outline.outer.pieces) == 4
    with pytest.raises(InputFault, match='layers = "inside", but must be layers of the drawing'):
        read_dxf(path, layers=("inside",))


# Units


def test_the_unit_is_the_one_that_the_drawing_states(drawn: Draw) -> None:
    found = read_dxf(drawn(stadium, unit=1))
    assert_allclose(found.metre, 0.0254, rtol=0.0, atol=0.0)


@pytest.mark.parametrize("version", ["R12", "R2010"])
def test_a_drawing_without_unit_must_be_given_one(drawn: Draw, version: str) -> None:
    def fill(space) -> None:
        space.add_circle((0, 0), 10.0)

    path = drawn(fill, unit=0, version=version)
    with pytest.raises(InputFault, match="does not state its unit, and it is not guessed"):
        read_dxf(path)
    assert_allclose(read_dxf(path, unit="in").metre, 0.0254, rtol=0.0, atol=0.0)


def test_a_unit_that_contradicts_the_drawing_is_refused(drawn: Draw) -> None:
    with pytest.raises(InputFault, match='length_unit = "in", but must be "mm", which'):
        read_dxf(drawn(stadium), unit="in")


# What is refused


def refused(path: Path, words: str) -> None:
    with pytest.raises(InputFault, match=words):
        read_dxf(path)


def test_an_empty_drawing_is_refused(drawn: Draw, tmp_path: Path) -> None:
    refused(drawn(lambda space: None), "There is none")
    empty = tmp_path / "empty.dxf"
    empty.write_bytes(b"")
    refused(empty, "The file is empty")
    refused(tmp_path / "none.dxf", "There is no such file")


def test_a_file_that_is_no_drawing_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "notes.dxf"
    path.write_text("this is no drawing\n" * 40)
    with pytest.raises(InputFault, match="outline file"):
        read_dxf(path)


def test_an_open_outline_is_refused_with_the_places(drawn: Draw) -> None:
    def fill(space) -> None:
        space.add_lwpolyline([(0, 0), (30, 0), (30, 20), (0.5, 20)])

    refused(drawn(fill), r"A curve ends alone at \(0, 0\), \(0.5, 20\)")


def test_an_outline_that_crosses_itself_is_refused_with_the_place(drawn: Draw) -> None:
    def bow(space) -> None:
        space.add_lwpolyline([(0, 0), (30, 20), (30, 0), (0, 20)], close=True)

    refused(drawn(bow), r"cross or touch itself. It does near \(15, 10\)")

    def overlapping(space) -> None:
        stadium(space)
        space.add_circle((50, 40), 8)

    refused(drawn(overlapping), "cross or touch itself")


def test_branches_are_refused(drawn: Draw) -> None:
    def fill(space) -> None:
        space.add_lwpolyline([(0, 0), (30, 0), (30, 20), (0, 20)], close=True)
        space.add_line((0, 0), (30, 20))

    refused(drawn(fill), r"More than two meet at")


def test_two_bodies_are_refused(drawn: Draw) -> None:
    def beside(space) -> None:
        stadium(space)
        space.add_circle((200, 0), 8)

    refused(drawn(beside), "A second outline lies beside the first")

    def within(space) -> None:
        stadium(space)
        space.add_circle((50, 20), 8)
        space.add_circle((50, 20), 4)

    refused(drawn(within), "A loop lies inside a hole")


# Meshes


def test_a_meshed_drawing_has_its_layers_as_zones_and_its_area(drawn: Draw, tmp_path: Path) -> None:
    def fill(space) -> None:
        stadium(space)
        space.add_circle((50, 20), 8, dxfattribs={"layer": "bore"})
        space.add_ellipse((90, 20), major_axis=(10, 0), ratio=0.5)

    target = tmp_path / "part.msh"
    made = mesh_outline(drawn(fill), target, sense="plane", first=1e-3)
    exact = STADIUM - math.pi * (64.0 + 50.0) * 1e-6
    assert made.zones == ("bore", "outside", "surface")
    assert_allclose(made.cad_content, exact, rtol=1e-6, atol=0.0)
    assert_allclose(made.content, exact, rtol=2e-3, atol=0.0)
    mesh = read_mesh(target)
    assert {"bore", "outside", "surface", "body"} == set(mesh.groups)
    assert made.n_cell == len(mesh.groups["body"].cells)
    assert_allclose(np.ptp(mesh.points, axis=0), [140.0, 40.0, 0.0], rtol=0.0, atol=1e-6)


def test_cells_are_fine_at_the_surface_and_grow_with_depth(drawn: Draw, tmp_path: Path) -> None:
    def fill(space) -> None:
        space.add_lwpolyline([(0, 0), (80, 0), (80, 80), (0, 80)], close=True)

    made = mesh_outline(drawn(fill), tmp_path / "p.msh", sense="plane", first=0.5e-3)
    mesh = read_mesh(tmp_path / "p.msh")
    triangles = np.concatenate([cells for kind, cells in mesh.cells if kind == "triangle"])
    corner = mesh.points[triangles]
    longest = np.linalg.norm(corner - np.roll(corner, 1, axis=1), axis=2).max(axis=1)
    middle = corner.mean(axis=1)[:, :2]
    depth = np.minimum(middle, 80.0 - middle).min(axis=1)
    assert np.median(longest[depth < 0.3]) < 0.8
    assert np.all(longest <= 2.2 * (0.5 + outline.GROWTH * depth))
    assert np.median(longest[depth > 30.0]) > 1.2
    assert made.worst > 0.4


def test_what_lies_on_the_axis_is_no_surface(drawn: Draw, tmp_path: Path) -> None:
    def fill(space) -> None:
        space.add_lwpolyline([(0, 0), (40, 0), (40, 90), (0, 90)], close=True)

    made = mesh_outline(drawn(fill), tmp_path / "p.msh", sense="axisymmetric", first=2e-3)
    assert made.zones == ("axis", "surface")
    mesh = read_mesh(tmp_path / "p.msh")
    lines = np.concatenate([cells for kind, cells in mesh.cells if kind == "line"])
    on_axis = mesh.groups["axis"].cells
    assert_allclose(mesh.points[lines[on_axis]][..., 0], 0.0, rtol=0.0, atol=1e-9)


def test_a_section_across_the_axis_is_refused(drawn: Draw, tmp_path: Path) -> None:
    with pytest.raises(InputFault, match="on one side of the axis x = 0"):
        mesh_outline(drawn(stadium), tmp_path / "p.msh", sense="axisymmetric", first=2e-3)
    assert not (tmp_path / "p.msh").exists()


def test_a_cap_on_the_nodes_makes_the_cells_coarser_and_says_so(
    drawn: Draw, tmp_path: Path
) -> None:
    made = mesh_outline(
        drawn(stadium), tmp_path / "p.msh", sense="plane", first=0.1e-3, most_nodes=1500
    )
    assert made.n_node <= 1500
    assert made.first > 0.1e-3
    assert "instead of the 0.1 mm asked for, to stay below" in made.notes[0]


def test_a_stronger_film_asks_for_smaller_cells() -> None:
    assert_allclose(first_cell(2000.0, 0.5) / first_cell(500.0, 0.5), 0.25, rtol=1e-12, atol=0.0)
    assert_allclose(first_cell(500.0, 2.0) / first_cell(500.0, 0.5), 2.0, rtol=1e-12, atol=0.0)


# Solids


def test_a_solid_keeps_its_volume(step: tuple[Path, Path], tmp_path: Path) -> None:
    exact = math.pi * (60.0**2 * 50.0 + 25.0**2 * 150.0 - 6.0**2 * 200.0) * 1e-9
    made = mesh_outline(
        step[0], tmp_path / "hub.msh", sense="solid", first=5e-3, longest=10e-3, most_nodes=5000
    )
    assert_allclose(made.cad_content, exact, rtol=1e-9, atol=0.0)
    assert_allclose(made.content, exact, rtol=0.02, atol=0.0)
    assert made.n_node <= 5000


def test_a_slice_along_the_axis_gives_the_half_section(
    step: tuple[Path, Path], tmp_path: Path
) -> None:
    exact = ((60.0 - 6.0) * 50.0 + (25.0 - 6.0) * 150.0) * 1e-6
    along = Slice((0.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
    made = mesh_outline(step[0], tmp_path / "hub.msh", sense="axisymmetric", first=2e-3, cut=along)
    assert_allclose([made.cad_content, made.content], exact, rtol=1e-9, atol=0.0)
    mesh = read_mesh(tmp_path / "hub.msh")
    assert_allclose(mesh.points.min(axis=0), [6.0, 0.0, 0.0], rtol=0.0, atol=1e-6)
    assert_allclose(mesh.points.max(axis=0), [60.0, 200.0, 0.0], rtol=0.0, atol=1e-6)


def test_a_slice_across_the_axis_gives_the_ring(step: tuple[Path, Path], tmp_path: Path) -> None:
    across = Slice((0.0, 0.0, 0.02), (0.0, 0.0, 1.0))
    made = mesh_outline(step[0], tmp_path / "hub.msh", sense="plane", first=2e-3, cut=across)
    exact = math.pi * (60.0**2 - 6.0**2) * 1e-6
    assert_allclose(made.cad_content, exact, rtol=1e-9, atol=0.0)
    assert_allclose(made.content, exact, rtol=1e-3, atol=0.0)


def test_a_face_is_meshed_where_it_lies_in_x_and_y(step: tuple[Path, Path], tmp_path: Path) -> None:
    made = mesh_outline(step[1], tmp_path / "face.msh", sense="plane", first=2e-3)
    assert_allclose(made.cad_content, math.pi * 40.0 * 30.0 * 1e-6, rtol=1e-9, atol=0.0)
    assert_allclose(read_mesh(tmp_path / "face.msh").points[:, 2], 0.0, rtol=0.0, atol=1e-9)


def test_a_plane_that_misses_the_solid_is_refused(step: tuple[Path, Path], tmp_path: Path) -> None:
    beyond = Slice((0.0, 0.0, 0.5), (0.0, 0.0, 1.0))
    with pytest.raises(InputFault, match="The plane misses it"):
        mesh_outline(step[0], tmp_path / "hub.msh", sense="plane", first=2e-3, cut=beyond)


def test_a_solid_without_a_slice_is_refused_for_a_flat_sense(
    step: tuple[Path, Path], tmp_path: Path
) -> None:
    with pytest.raises(InputFault, match="It holds a solid: give slice"):
        mesh_outline(step[0], tmp_path / "hub.msh", sense="plane", first=2e-3)


@pytest.mark.parametrize(
    ("content", "words"),
    [(b"", "The file is empty"), (b"ISO-10303-21;\nHEADER;\nnothing", "gmsh: ")],
)
def test_a_broken_step_file_is_refused(tmp_path: Path, content: bytes, words: str) -> None:
    path = tmp_path / "broken.step"
    path.write_bytes(content)
    with pytest.raises(InputFault, match=words):
        mesh_outline(path, tmp_path / "p.msh", sense="solid", first=2e-3)
    assert not (tmp_path / "p.msh").exists()


def test_without_the_extra_one_sentence_says_how_to_get_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(outline.importlib.util, "find_spec", lambda name: None)
    with pytest.raises(MissingExtra) as raised:
        mesh_outline(tmp_path / "p.dxf", tmp_path / "p.msh", sense="plane", first=1e-3)
    assert str(raised.value) == (
        "Meshing an outline needs gmsh and ezdxf, which are not installed: "
        "pip install 'midradius[cad]'."
    )


def test_a_thin_part_gets_smaller_cells_than_asked_for_and_says_so(
    drawn: Draw, tmp_path: Path
) -> None:
    made = mesh_outline(drawn(stadium), tmp_path / "p.msh", sense="plane", first=20e-3)
    assert made.first < 20e-3
    assert made.notes[-1].endswith(
        "instead of the 20 mm asked for: the part is thin, and no cell is larger than its"
        " depth needs"
    )
