"""From the cells of a file to a section: zones, findings, order of nodes, places."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.distance import nearest, pieces
from midradius.fem.meshcut import cut_mesh
from midradius.fem.meshfile import MeshFaults, MeshInput, open_mesh, section_of
from midradius.fem.meshraw import Group, RawMesh, facet_table
from midradius.fem.meshsection import MeshSection
from midradius.fem.meshzones import Symmetry
from midradius.thermo.errors import InputFault

WHOLE = Symmetry()


def sheet(nx: int = 5, ny: int = 4, low: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Points [mm] and quads of a plate of 80 x 60 mm from ``low`` on."""
    x, y = np.meshgrid(np.linspace(low, low + 80, nx), np.linspace(0, 60, ny), indexing="ij")
    points = np.stack([x.ravel(), y.ravel(), np.zeros(nx * ny)], axis=1)
    number = np.arange(nx * ny).reshape(nx, ny)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    return points, np.stack([c.ravel() for c in corners], axis=1)


def raw_of(points, *cells, groups=None, ids=None, **more) -> RawMesh:
    n_cell = sum(len(block) for _, block in cells)
    return RawMesh(
        points=np.asarray(points, dtype=float),
        cells=tuple((kind, np.asarray(block, dtype=np.int64)) for kind, block in cells),
        point_ids=np.arange(1, len(points) + 1) if ids is None else ids,
        cell_ids=np.arange(1, n_cell + 1),
        point_data=more.get("point_data", {}),
        cell_data=more.get("cell_data", {}),
        groups=groups or {},
        notes=(),
        format="made here",
    )


def taken(raw: RawMesh, sense="plane", unit="mm", symmetry=WHOLE, prefer=()) -> MeshInput:
    return section_of(
        raw, "part.x", length_unit=unit, sense=sense, symmetry=symmetry, prefer=prefer
    )


def said(mesh: MeshInput) -> str:
    return " | ".join(finding.text for finding in mesh.findings)


def test_without_groups_the_whole_free_boundary_is_one_zone():
    points, quads = sheet()
    mesh = taken(raw_of(points, ("quad", quads)))
    assert mesh.zones == ("surface",)
    assert len(mesh.facets) == 2 * (4 + 3)
    assert mesh.findings == ()
    assert_allclose(mesh.points.max(axis=0), [0.08, 0.06], rtol=1e-12, atol=0.0)


def test_groups_of_facets_cells_and_points_become_zones_and_the_rest_is_surface():
    points, quads = sheet()
    lines = np.stack([np.arange(3), np.arange(1, 4)], axis=1)  # x = 0
    groups = {
        "left": Group(cells=len(quads) + np.arange(3)),
        "top": Group(points=np.flatnonzero(points[:, 1] == 60)),
        "foot": Group(facets=facet_table([(0, 4), (8, 4)])),
        "body": Group(cells=np.arange(len(quads))),
    }
    mesh = taken(raw_of(points, ("quad", quads), ("line", lines), groups=groups))
    assert mesh.zones == ("foot", "left", "top", "surface")
    count = np.bincount(mesh.facet_zone, minlength=4)
    np.testing.assert_array_equal(count, [2, 3, 4, 2 + 3])
    assert {"group body", "group left"} <= set(mesh.cell_data)
    assert "group foot" in mesh.point_data and "group top" in mesh.point_data


def test_a_group_that_the_route_names_wins_over_another_with_the_same_facets():
    points, quads = sheet()
    edge = Group(points=np.flatnonzero(points[:, 0] == 0))
    every = Group(points=np.arange(len(points)))
    raw = raw_of(points, ("quad", quads), groups={"every": every, "edge": edge})
    assert taken(raw).zones == ("edge", "surface")
    assert taken(raw, prefer=("every",)).zones == ("every",)
    assert taken(raw, prefer=("edge", "every")).zones == ("edge", "every")


def test_symmetry_insulates_groups_and_planes():
    points, quads = sheet()
    edge = {"cut": Group(points=np.flatnonzero(points[:, 0] == 80))}
    raw = raw_of(points, ("quad", quads), groups=edge)
    mesh = taken(raw, symmetry=Symmetry(("cut",), ((1, 0.0),)))
    assert mesh.zones == ("surface",)
    assert int((mesh.facet_zone < 0).sum()) == 3 + 4
    with pytest.raises(MeshFaults, match='no part of the boundary is in a group "cvt"'):
        taken(raw, symmetry=Symmetry(("cvt",)))
    with pytest.raises(MeshFaults, match="lies on x = 3 mm"):
        taken(raw, symmetry=Symmetry((), ((0, 3e-3),)))


def test_the_axis_of_rotation_is_insulated_and_must_not_be_crossed():
    points, quads = sheet()
    mesh = taken(raw_of(points, ("quad", quads)), "axisymmetric")
    assert int((mesh.facet_zone < 0).sum()) == 3
    points, quads = sheet(low=-10.0)
    with pytest.raises(MeshFaults, match="beyond the axis, down to r = -10 mm"):
        taken(raw_of(points, ("quad", quads)), "axisymmetric")
    points, quads = sheet(low=0.2)
    beside = taken(raw_of(points, ("quad", quads)), "axisymmetric")
    assert "0.2 mm beside the axis" in said(beside)


def test_second_order_cells_keep_their_corners_and_say_so():
    points, quads = sheet(5, 5)
    # every second node of a side is the middle of a larger cell
    number = np.arange(25).reshape(5, 5)
    rows = []
    for i in (0, 2):
        for j in (0, 2):
            n = number[i : i + 3, j : j + 3]
            rows.append([n[0, 0], n[2, 0], n[2, 2], n[0, 2], n[1, 0], n[2, 1], n[1, 2], n[0, 1]])
    mesh = taken(raw_of(points, ("quad8", rows), point_data={"t": np.arange(25.0)}))
    assert mesh.n_node == 9
    np.testing.assert_array_equal(mesh.raw_point, number[::2, ::2].ravel())
    np.testing.assert_array_equal(mesh.point_data["t"], number[::2, ::2].ravel())
    assert "4 cells are of second or higher order" in said(mesh)
    assert "4 nodes belong to no cell" in said(mesh)  # the middles of the cells


def test_orphans_doubles_and_flat_cells_are_left_out_and_named():
    points, quads = sheet()
    points = np.concatenate([[[500.0, 500.0, 0.0]], points])
    cells = np.concatenate([quads + 1, quads[:1] + 1])
    flat = [[1, 2, 3]]
    mesh = taken(raw_of(points, ("quad", cells), ("triangle", flat)))
    text = said(mesh)
    assert "1 nodes belong to no cell" in text
    assert "1 cells lie double" in text
    assert "1 cells have no volume" in text
    np.testing.assert_array_equal(mesh.raw_point, np.arange(1, len(points)))
    assert_allclose(mesh.drawn_points, points[1:] * 1e-3, rtol=0.0, atol=0.0)


def test_cells_that_run_backward_are_turned_and_named():
    points, quads = sheet()
    wrong = quads.copy()
    wrong[2] = wrong[2][::-1]
    mesh = taken(raw_of(points, ("quad", wrong)))
    assert "1 of 12 cells run the other way round" in said(mesh)
    # the drawing stays as the file has it
    np.testing.assert_array_equal(mesh.drawn[0][1], wrong)
    volume = cut_mesh(MeshSection(mesh, mesh.zones), 0).body.volume.sum()
    assert_allclose(volume, 0.08 * 0.06, rtol=1e-12, atol=0.0)
    backward = taken(raw_of(points, ("quad", quads[:, ::-1])))
    assert backward.findings == ()


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ("bow tie", "1 cells are folded"),
        ("two bodies", "2 separate bodies"),
        ("slit", "nodes lie on others"),
        ("three on an edge", "belong to more than two cells"),
        ("unit", "measures 8e\\+04 x 6e\\+04 mm"),
        ("not plane", "lie in no plane"),
        ("solid", 'sense is "solid"'),
    ],
)
def test_what_cannot_be_solved_is_refused_with_its_reason(change, message):
    points, quads = sheet()
    sense, unit, more = "plane", "mm", []
    if change == "bow tie":
        quads[5] = quads[5][[0, 2, 1, 3]]
    if change == "two bodies":
        points = np.concatenate([points, points + [200.0, 0.0, 0.0]])
        quads = np.concatenate([quads, quads + 20])
    if change == "slit":
        points = np.concatenate([points, points[8:12]])
        quads[6:] = np.where((quads[6:] >= 8) & (quads[6:] < 12), quads[6:] + 12, quads[6:])
    if change == "three on an edge":
        points = np.concatenate([points, [[10.0, 70.0, 0.0]]])
        more = [("triangle", [[1, 5, 20]])]
    if change == "unit":
        unit = "m"
    if change == "not plane":
        points[3, 2] = 20.0
    if change == "solid":
        sense = "solid"
    with pytest.raises(MeshFaults, match=message):
        taken(raw_of(points, ("quad", quads), *more), sense, unit)


def test_slivers_and_a_suspicious_size_are_warnings():
    points, quads = sheet()
    triangles = [[0, 4, 20], [4, 5, 20], [5, 1, 20], [1, 0, 20]]
    points = np.concatenate([points, [[10.0, 0.02, 0.0]]])
    raw = raw_of(points, ("quad", quads[1:]), ("triangle", triangles))
    assert "are slivers" in said(taken(raw))
    points, quads = sheet()
    small = taken(raw_of(points * 0.02, ("quad", quads)))
    assert "measures 1.6 x 1.2 mm" in said(small)


def test_a_section_in_another_plane_is_taken_and_said():
    points, quads = sheet()
    mesh = taken(raw_of(points[:, [0, 2, 1]], ("quad", quads)), "axisymmetric")
    assert "lies in x and z. Taken as r and z" in said(mesh)
    assert_allclose(mesh.points.max(axis=0), [0.08, 0.06], rtol=1e-12, atol=0.0)


def cut_sheet(symmetry=WHOLE, level=0):
    points, quads = sheet(9, 7)
    mesh = taken(raw_of(points, ("quad", quads)), symmetry=symmetry)
    return cut_mesh(MeshSection(mesh, mesh.zones), level)


def test_the_core_is_the_deepest_point_and_the_terms_lie_on_the_way_to_it():
    section = cut_sheet().section
    # of the ridge between x = 30 and 50 mm, as deep everywhere, the middle
    assert_allclose(section.core, [0.04, 0.03], rtol=0.0, atol=1e-12)
    assert_allclose(section.depth_of(section.trade_place("core")), 0.03, rtol=1e-12, atol=0.0)
    for term in ("quarter thickness", "mid-radius"):
        assert_allclose(section.depth_of(section.trade_place(term)), 0.015, rtol=1e-12, atol=0.0)
    assert_allclose(section.depth_of(section.trade_place("surface")), 0.0, rtol=0.0, atol=1e-15)
    deep = section.trade_place("depth", 0.004)
    assert_allclose(section.depth_of(deep), 0.004, rtol=1e-12, atol=0.0)
    with pytest.raises(InputFault, match="at most 30 mm, the depth of the core"):
        section.trade_place("depth", 0.05)


def test_of_a_flat_disc_and_of_a_half_the_core_is_the_middle_of_the_whole():
    # the ridge runs from the axis, or from the plane of symmetry, to 30 mm before the rim
    points, quads = sheet(9, 7)
    disc = taken(raw_of(points, ("quad", quads)), "axisymmetric")
    assert_allclose(MeshSection(disc, disc.zones).core, [0.0, 0.03], rtol=0.0, atol=1e-12)
    half = cut_sheet(Symmetry((), ((0, 0.0),))).section
    assert_allclose(half.core, [0.0, 0.03], rtol=0.0, atol=1e-12)


def test_the_core_of_one_layer_of_coarse_cells_is_the_middle_of_the_block():
    axes = np.meshgrid(np.linspace(0, 120, 4), np.linspace(0, 80, 3), [0, 60], indexing="ij")
    points = np.stack([axis.ravel() for axis in axes], axis=1)
    n = np.arange(24).reshape(4, 3, 2)
    corners = [
        layer[a : a + 3, b : b + 2]
        for layer in (n[:, :, :-1], n[:, :, 1:])
        for a, b in ((0, 0), (1, 0), (1, 1), (0, 1))
    ]
    block = np.stack([c.ravel() for c in corners], axis=1)
    mesh = taken(raw_of(points, ("hexahedron", block)), "solid")
    assert_allclose(MeshSection(mesh, mesh.zones).core, [0.06, 0.04, 0.03], rtol=0.0, atol=1e-12)


def test_a_mesh_without_a_node_inside_has_a_core_all_the_same():
    points, quads = sheet(3, 2)
    mesh = taken(raw_of(points, ("quad", quads)))
    section = MeshSection(mesh, mesh.zones)
    assert section.depths.max() == 0.0
    assert_allclose(section.core, [0.04, 0.03], rtol=0.0, atol=2e-3)
    assert_allclose(section.depth_of(tuple(section.core)), 0.03, rtol=0.03, atol=0.0)


def test_depth_counts_from_what_is_cooled():
    half = cut_sheet(Symmetry((), ((1, 0.0),))).section
    assert_allclose(half.core[1], 0.02, rtol=0.0, atol=0.021)
    assert_allclose(half.depths.max(), 0.04, rtol=1e-12, atol=0.0)
    points, quads = sheet(9, 7)
    edge = {"hot side": Group(points=np.flatnonzero(points[:, 0] == 0))}
    mesh = taken(raw_of(points, ("quad", quads), groups=edge))
    section = MeshSection(mesh, mesh.zones).cooled_by({"hot side": 1000.0, "surface": 0.0})
    assert_allclose(section.core[0], 0.08, rtol=0.0, atol=1e-12)
    with pytest.raises(InputFault, match="insulated everywhere"):
        section.cooled_by({})


@pytest.mark.parametrize("level", [0, 1])
def test_a_linear_field_is_read_exactly_anywhere_and_nothing_outside(level):
    cut = cut_sheet(level=level)
    field = 3.0 + cut.body.points @ [5.0, -7.0]
    rng = np.random.default_rng(1)
    for x, y in rng.uniform(0.0, [0.08, 0.06], (40, 2)):
        at = cut.place((float(x), float(y)))
        assert_allclose(at.share.sum(), 1.0, rtol=1e-12, atol=0.0)
        got = float((field[at.node] * at.share).sum())
        assert_allclose(got, 3.0 + 5.0 * x - 7.0 * y, rtol=1e-12, atol=0.0)
    line = cut.profile()
    assert_allclose(line.depth[[0, -1]], [0.0, 0.03], rtol=1e-12, atol=1e-15)
    assert line.of(np.stack([field, field])).shape == (2, len(line.depth))
    with pytest.raises(InputFault, match="inside the mesh"):
        cut.place((0.2, 0.2))


def test_the_distance_to_triangles_and_segments_is_that_of_every_pair():
    rng = np.random.default_rng(3)
    points = rng.uniform(0.0, 1.0, (60, 3))
    facets = np.concatenate(
        [rng.permuted(np.tile(np.arange(60), (25, 1)), axis=1)[:, :3], np.full((25, 1), -1)], axis=1
    )
    surface = pieces(points, facets)
    asked = rng.uniform(-0.2, 1.2, (30, 3))
    gap, foot = nearest(asked, surface)
    assert_allclose(np.linalg.norm(asked - foot, axis=1), gap, rtol=1e-12, atol=1e-15)
    # by brute force: many points of every triangle
    share = rng.dirichlet([0.7, 0.7, 0.7], 4000)
    cloud = np.concatenate([share @ points[row[:3]] for row in facets])
    brute = np.array([np.linalg.norm(cloud - a, axis=1).min() for a in asked])
    assert np.all(gap <= brute + 1e-12)
    assert_allclose(gap, brute, rtol=0.0, atol=0.03)


def test_wedges_that_all_run_as_in_older_files_of_vtk_are_turned_without_a_word():
    from midradius.fem.meshhealth import turned

    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 0, 1], [0, 1, 1]], float)
    tetra = ("tetra", np.array([[0, 1, 2, 3]]))
    old = np.array([[0, 2, 1, 3, 5, 4]])
    cells, findings = turned(points, (tetra, ("wedge", old)))
    assert findings == []
    np.testing.assert_array_equal(cells[1][1], [[3, 5, 4, 0, 2, 1]])
    _, findings = turned(points, (tetra, ("wedge", np.concatenate([old, [[0, 1, 2, 3, 4, 5]]]))))
    assert [finding.what for finding in findings] == [
        "1 of 3 cells run the other way round than the rest"
    ]


def test_parts_that_touch_at_one_node_only_are_no_body(tmp_path):
    meshio = pytest.importorskip("meshio")
    points = np.array([[0, 0], [30, 0], [30, 30], [0, 30], [60, 30], [60, 60], [30, 60]], float)
    quads = np.array([[0, 1, 2, 3], [2, 4, 5, 6]])
    meshio.write(
        tmp_path / "pinch.vtu", meshio.Mesh(np.c_[points, 0 * points[:, 0]], [("quad", quads)])
    )
    with pytest.raises(MeshFaults) as caught:
        open_mesh(tmp_path / "pinch.vtu", length_unit="mm", sense="plane")
    assert [finding.text for finding in caught.value.findings] == [
        "2 parts of the mesh touch at single nodes or edges only. "
        "Hardly any heat crosses there: mesh the joint again, or export one body."
    ]
