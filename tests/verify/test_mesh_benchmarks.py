"""The published benchmarks of two dimensions, and exact solutions, on unstructured meshes.

Targets and sources as in ``test_benchmarks``; the meshes are gmsh's own, or made
of random triangles, or of hexahedra and tetrahedra that are not boxes.
"""

from collections.abc import Callable, Mapping
from pathlib import Path

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from test_benchmarks import COLD, STEEL, ring_exact, t4_exact
from trial import HELD, Face, around, constant, cooled, orders

from midradius.fem.grids import axis, rectangle
from midradius.fem.meshcut import MeshCut, cut_mesh
from midradius.fem.meshfile import MeshInput, section_of
from midradius.fem.meshraw import Group, RawMesh
from midradius.fem.meshsection import MeshSection
from midradius.fem.meshzones import Symmetry
from midradius.thermo.arrays import Array

Rows = Callable[..., list[tuple[str, float]]]
Corners = list[tuple[float, float]]


def meshed(path: Path, outline: Corners, sides: Mapping[str, list[int]], size: float) -> RawMesh:
    """An outline meshed by gmsh; ``sides`` name its edges by number."""
    gmsh = pytest.importorskip("gmsh")
    from midradius.fem.meshguard import read_mesh

    gmsh.initialize(interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 0)
        gmsh.option.setNumber("Mesh.MeshSizeMax", size)
        gmsh.model.add("part")
        geo = gmsh.model.geo
        corners = [geo.addPoint(x, y, 0.0) for x, y in outline]
        after = corners[1:] + corners[:1]
        edges = [geo.addLine(a, b) for a, b in zip(corners, after, strict=True)]
        geo.addPlaneSurface([geo.addCurveLoop(edges)])
        geo.synchronize()
        for name, numbers in sides.items():
            gmsh.model.addPhysicalGroup(1, [edges[k] for k in numbers], name=name)
        gmsh.model.addPhysicalGroup(2, [1], name="body")
        gmsh.model.mesh.generate(2)
        gmsh.write(str(path))
    finally:
        gmsh.finalize()
    return read_mesh(path)


def cut_of(raw: RawMesh, sense: str, level: int, insulated: tuple[str, ...] = ()) -> MeshCut:
    mesh = section_of(
        raw,
        "part",
        length_unit="m",
        sense=sense,  # type: ignore[arg-type]
        symmetry=Symmetry(insulated),
    )
    return cut_mesh(MeshSection(mesh, mesh.zones), level)


def at(cut: MeshCut, temp: Array, *place: float) -> float:
    found = cut.place(place)
    return float((temp[found.node] * found.share).sum())


def test_the_film_cooled_plate_meets_its_target_on_triangles(
    tmp_path: Path, published_heat: Rows
) -> None:
    # NAFEMS T4; the point (0.6, 0.2) is a corner of the outline here
    outline = [(0.0, 0.0), (0.6, 0.0), (0.6, 0.2), (0.6, 1.0), (0.0, 1.0)]
    sides = {"base": [0], "film": [1, 2, 3], "middle": [4]}
    raw = meshed(tmp_path / "t4.msh", outline, sides, 0.1)
    values = []
    for level in (0, 1, 2):
        cut = cut_of(raw, "plane", level, ("middle",))
        sees = {"film": Face(750.0, COLD), "base": Face(HELD, COLD + 100.0)}
        surroundings = around(*[sees[zone] for zone in cut.body.zones])
        run = cooled(cut.body, STEEL, COLD + 100.0, surroundings, 1e8, tolerance=1e-3)
        values.append(at(cut, run.progress.temp, 0.6, 0.2) - COLD)
    ((_, target),) = published_heat("NAFEMS T4 (2D steady convection)")
    # measured 0.036 K on the finest, order 1.9
    assert_allclose(values[-1], target, rtol=0.0, atol=0.05)
    errors = [abs(value - t4_exact()) for value in values]
    assert orders(errors)[-1] > 1.7


def test_the_ring_heated_in_its_bore_meets_its_target_on_triangles(
    tmp_path: Path, published_heat: Rows
) -> None:
    # NAFEMS 15(i): flux into the bore between z = 0.04 and 0.1
    outline = [(0.02, 0.0), (0.1, 0.0), (0.1, 0.14), (0.02, 0.14), (0.02, 0.1), (0.02, 0.04)]
    sides = {"cold": [0, 1, 2], "heated": [4], "rest": [3, 5]}
    raw = meshed(tmp_path / "ring.msh", outline, sides, 0.014)
    values = []
    for level in (0, 1, 2):
        cut = cut_of(raw, "axisymmetric", level, ("rest",))
        sees = {"cold": Face(HELD, COLD), "heated": Face(0.0, COLD, flux=5e5)}
        surroundings = around(*[sees[zone] for zone in cut.body.zones])
        run = cooled(cut.body, STEEL, COLD, surroundings, 1e7, tolerance=1e-3)
        values.append(at(cut, run.progress.temp, 0.04, 0.04) - COLD)
    ((_, target),) = published_heat("NAFEMS axisymmetric steady 15(i)")
    assert_allclose(values[-1], target, rtol=0.0, atol=0.1)
    errors = [abs(value - ring_exact()) for value in values]
    assert errors[2] < 0.5 * errors[1] < 0.5 * errors[0]


def test_the_cylinder_in_a_held_skin_meets_its_target_on_triangles(
    tmp_path: Path, published_heat: Rows
) -> None:
    # NAFEMS axisymmetric transient, its axis insulated without being told
    outline = [(0.0, 0.0), (0.3, 0.0), (0.3, 0.4), (0.0, 0.4)]
    raw = meshed(tmp_path / "c.msh", outline, {"skin": [0, 1, 2]}, 0.05)
    ((_, target),) = published_heat("NAFEMS axisymmetric transient")
    values = []
    for level in (0, 1, 2):
        cut = cut_of(raw, "axisymmetric", level)
        assert cut.body.zones == ("skin",)
        held = around(Face(HELD, COLD + 1000.0))
        run = cooled(cut.body, STEEL, COLD, held, 190.0, tolerance=1e-2)
        values.append(at(cut, run.progress.temp, 0.1, 0.3) - COLD)
    errors = [abs(value - target) for value in values]
    assert errors[-1] < 1.3  # measured 1.06 K at 1000 K between skin and start
    assert orders(errors)[-1] > 1.6


SLIM = constant(k=30.0, density=7800.0, cp=600.0)


def product_of_slabs(points: Array, halves: tuple[float, ...], *, htc: float, time: float) -> Array:
    """Exact share of the starting excess in a bar or block cooled on all its faces."""
    fourier = 30.0 / (7800.0 * 600.0) * time
    out = np.ones(len(points))
    for k, half in enumerate(halves):
        place = np.minimum(np.abs(points[:, k] - half) / half, 1.0)
        biot, far = htc * half / 30.0, fourier / half**2
        out *= exact.theta("slab", biot=biot, fourier=far, place=place)
    return out


def plain(points: Array, kind: str, cells: np.ndarray) -> RawMesh:
    table = np.zeros((len(points), 3))
    table[:, : points.shape[1]] = points
    n = len(cells)
    return RawMesh(
        points=table,
        cells=((kind, cells.astype(np.int64)),),
        point_ids=np.arange(len(points)),
        cell_ids=np.arange(n),
        point_data={},
        cell_data={},
        groups={"all": Group(cells=np.arange(n))},
        notes=(),
        format="made here",
    )


def crooked_bar(n: int, seed: int) -> RawMesh:
    """Half a bar of 80 x 60 mm in quads whose inner nodes are moved at random."""
    x, y = np.meshgrid(np.linspace(0.0, 0.08, n + 1), np.linspace(0.0, 0.06, n + 1), indexing="ij")
    points = np.stack([x.ravel(), y.ravel()], axis=1)
    rng = np.random.default_rng(seed)
    inner = np.all((points > 1e-9) & (points < np.array([0.08, 0.06]) - 1e-9), axis=1)
    moved = rng.uniform(-0.25, 0.25, (int(inner.sum()), 2)) * [0.08 / n, 0.06 / n]
    points[inner] += moved
    number = np.arange((n + 1) ** 2).reshape(n + 1, n + 1)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    return plain(points, "quad", np.stack([c.ravel() for c in corners], axis=1))


def test_the_error_on_crooked_quads_falls_with_the_square_of_the_cell() -> None:
    # against the exact product of two slabs, at every node of the coarsest mesh
    errors = []
    for level in range(4):
        cut = cut_of(crooked_bar(6, 3), "plane", level)
        time, htc = 120.0, 1500.0
        run = cooled(cut.body, SLIM, 1100.0, around(Face(htc, 300.0)), time, tolerance=2e-3)
        theta = (run.progress.temp[:49] - 300.0) / 800.0
        want = product_of_slabs(cut.body.points[:49], (0.04, 0.03), htc=htc, time=time)
        errors.append(float(np.abs(theta - want).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.15)


def brick(n: int, seed: int) -> tuple[Array, np.ndarray]:
    """A block of 60 x 50 x 40 mm in hexahedra whose inner nodes are moved at random."""
    size = np.array([0.06, 0.05, 0.04])
    steps = [np.linspace(0.0, s, n + 1) for s in size]
    points = np.stack([g.ravel() for g in np.meshgrid(*steps, indexing="ij")], axis=1)
    rng = np.random.default_rng(seed)
    inner = np.all((points > 1e-9) & (points < size - 1e-9), axis=1)
    points[inner] += rng.uniform(-0.15, 0.15, (int(inner.sum()), 3)) * size / n
    number = np.arange((n + 1) ** 3).reshape((n + 1,) * 3)
    low, high = number[:, :, :-1], number[:, :, 1:]
    corners = [
        layer[a : a + n, b : b + n]
        for layer in (low, high)
        for a, b in ((0, 0), (1, 0), (1, 1), (0, 1))
    ]
    return points, np.stack([c.ravel() for c in corners], axis=1)


@pytest.mark.parametrize("kind", ["hexahedron", "tetra", "wedge"])
def test_a_block_of_any_solid_cells_cools_as_the_product_of_three_slabs(kind: str) -> None:
    points, cells = brick(4, 2)
    if kind == "wedge":
        cells = np.concatenate([cells[:, [0, 1, 2, 4, 5, 6]], cells[:, [0, 2, 3, 4, 6, 7]]])
    if kind == "tetra":
        # the six around one body diagonal, alike in every cell
        paths = ([0, 1, 2], [0, 3, 2], [0, 1, 5], [0, 4, 5], [0, 3, 7], [0, 4, 7])
        cells = np.concatenate([cells[:, [*path, 6]] for path in paths])
    errors = []
    for level in (0, 1, 2):
        cut = cut_of(plain(points, kind, cells), "solid", level)
        time, htc = 60.0, 2000.0
        run = cooled(cut.body, SLIM, 1100.0, around(Face(htc, 300.0)), time, tolerance=2e-3)
        n = len(points)
        theta = (run.progress.temp[:n] - 300.0) / 800.0
        want = product_of_slabs(points, (0.03, 0.025, 0.02), htc=htc, time=time)
        errors.append(float(np.abs(theta - want).max()))
    # measured 4.3e-4 to 5.2e-4 of the first excess, orders 1.6 (wedges) to 1.8: at the
    # edges of the block tetrahedra share the surface unevenly among their nodes
    assert errors[-1] < 7e-4
    assert_allclose(orders(errors)[-2:], 1.75, rtol=0.0, atol=0.3)


def test_a_mesh_and_a_grid_of_the_same_bar_cool_alike() -> None:
    # the same quads, once read as a mesh and once as the grid of a bar: the systems are
    # equal to rounding, so that only the last moves of Newton's method differ
    x, y = np.linspace(0.0, 0.08, 9), np.linspace(0.0, 0.06, 7)
    grid = rectangle(
        axis(0.0, 0.08, 8, fine="even", first=1.0, low="a", high="a"),
        axis(0.0, 0.06, 6, fine="even", first=1.0, low="a", high="a"),
        "plane",
    )
    number = np.arange(63).reshape(9, 7)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    points = np.stack([g.ravel() for g in np.meshgrid(x, y, indexing="ij")], axis=1)
    raw = plain(points, "quad", np.stack([c.ravel() for c in corners], axis=1))
    cut = cut_of(raw, "plane", 0)
    runs = [
        cooled(body, SLIM, 1100.0, around(Face(1500.0, 300.0)), 60.0, tolerance=1e-2)
        for body in (cut.body, grid)
    ]
    assert_allclose(runs[0].progress.temp, runs[1].progress.temp, rtol=0.0, atol=2e-3)


def test_an_obtuse_mesh_does_not_overshoot_where_its_own_elements_would() -> None:
    # a hard quench of triangles that are four times longer than high, run backward
    x, y = np.meshgrid(np.linspace(0.0, 0.08, 9), np.linspace(0.0, 0.02, 9), indexing="ij")
    points = np.stack([x.ravel() + 0.35 * y.ravel() * 8, y.ravel()], axis=1)
    number = np.arange(81).reshape(9, 9)
    a, b, c, d = number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]
    cells = np.concatenate(
        [
            np.stack([p.ravel() for p in (a, b, c)], axis=1),
            np.stack([p.ravel() for p in (a, c, d)], axis=1),
        ]
    )
    cut = cut_of(plain(points, "triangle", cells), "plane", 0)
    assert cut.n_turned > 0
    assert cut.negative < 1e-6
    run = cooled(cut.body, SLIM, 1100.0, around(Face(2e4, 300.0)), 0.2, tolerance=0.5)
    assert run.progress.temp.max() < 1100.0 + 0.01
    assert run.progress.temp.min() > 300.0


def test_the_nodes_of_a_mesh_keep_their_numbers_on_every_level() -> None:
    raw = crooked_bar(4, 1)
    first, second = cut_of(raw, "plane", 0), cut_of(raw, "plane", 2)
    n = first.section.mesh.n_node
    np.testing.assert_array_equal(second.body.points[:n], first.body.points[:n])
    below = second.coarser()
    assert below is not None and below.level == 1
    np.testing.assert_array_equal(
        below.body.points[: second.n_shared], second.body.points[: second.n_shared]
    )


def test_a_mesh_reports_what_it_is(tmp_path: Path) -> None:
    mesh: MeshInput = cut_of(crooked_bar(4, 1), "plane", 0).section.mesh
    assert mesh.zones == ("surface",)
    assert MeshSection(mesh, mesh.zones).text == (
        "mesh part, plane, 80 x 60 mm; 25 nodes, 16 quads"
    )
