"""Control volumes of meshes: against another assembler, against grids, and never negative."""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.sparse import coo_array
from scipy.spatial import Delaunay

from midradius.fem.delaunay import Plane, positive
from midradius.fem.grids import Axis, rectangle
from midradius.fem.simplex import (
    Weights,
    negative_share,
    plane_skin,
    plane_weights,
    solid_skin,
    solid_weights,
)

NONE3, NONE4 = np.empty((0, 3), dtype=np.int64), np.empty((0, 4), dtype=np.int64)


def matrix(weights: Weights) -> np.ndarray:
    """The stiffness matrix that the edges make."""
    n = len(weights.volume)
    i, j = weights.edge.T
    off = coo_array((-weights.weight, (i, j)), shape=(n, n)).toarray()
    whole = off + off.T
    return whole - np.diag(whole.sum(axis=1))


def random_triangles(seed: int, n: int = 60) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    points = rng.uniform(0.0, 0.1, (n, 2)) + [0.02, 0.0]
    triangles = Delaunay(points).simplices.astype(np.int64)
    a, b, c = (points[triangles[:, k]] for k in range(3))
    cross = (b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0]
    triangles[cross < 0.0] = triangles[cross < 0.0][:, [0, 2, 1]]
    return points, triangles[np.abs(cross) > 1e-9]


def outline(triangles: np.ndarray) -> np.ndarray:
    ends = np.concatenate([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]])
    key = np.sort(ends, axis=1)
    _, first, count = np.unique(key, axis=0, return_index=True, return_counts=True)
    return ends[first[count == 1]]


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize("turned", [False, True])
def test_the_matrix_of_random_triangles_is_that_of_another_assembler(seed, turned):
    skfem = pytest.importorskip("skfem")
    from skfem.helpers import dot, grad

    points, triangles = random_triangles(seed)
    ours = plane_weights(Plane(points, triangles, NONE4, NONE3, NONE3, 0), turned=turned)
    basis = skfem.Basis(skfem.MeshTri(points.T, triangles.T), skfem.ElementTriP1(), intorder=3)

    def factor(w):
        return w.x[0] if turned else 1.0

    stiffness = skfem.BilinearForm(lambda u, v, w: factor(w) * dot(grad(u), grad(v)))
    volume = skfem.LinearForm(lambda v, w: factor(w) * v)
    theirs = stiffness.assemble(basis).toarray()
    scale = np.abs(theirs).max()
    assert_allclose(matrix(ours), theirs, rtol=1e-11, atol=1e-13 * scale)
    assert_allclose(ours.volume, volume.assemble(basis), rtol=1e-12, atol=1e-20)
    segments = outline(triangles)
    plane = Plane(points, triangles, NONE4, segments, np.zeros(len(segments), dtype=np.int64), 0)
    skin = plane_skin(plane, turned=turned)
    area = np.bincount(skin.node, skin.area, len(points))
    rim = skfem.FacetBasis(basis.mesh, skfem.ElementTriP1(), intorder=3)
    assert_allclose(area, volume.assemble(rim), rtol=1e-12, atol=1e-15)


@pytest.mark.parametrize("seed", [1, 2])
def test_the_matrix_of_random_tetrahedra_is_that_of_another_assembler(seed):
    skfem = pytest.importorskip("skfem")
    from skfem.models.poisson import laplace, unit_load

    rng = np.random.default_rng(seed)
    points = rng.uniform(0.0, 0.1, (40, 3))
    tetra = Delaunay(points).simplices.astype(np.int64)
    edges = points[tetra[:, 1:]] - points[tetra[:, :1]]
    tetra = tetra[np.abs(np.linalg.det(edges)) > 1e-8]
    ours = solid_weights(points, (("tetra", tetra),))
    basis = skfem.Basis(skfem.MeshTet(points.T, tetra.T), skfem.ElementTetP1())
    theirs = laplace.assemble(basis).toarray()
    assert_allclose(matrix(ours), theirs, rtol=1e-10, atol=1e-12 * np.abs(theirs).max())
    assert_allclose(ours.volume, unit_load.assemble(basis), rtol=1e-11, atol=1e-20)


def two_axes(nx: int = 6, ny: int = 5) -> tuple[Axis, Axis]:
    x = 0.03 + 0.07 * np.linspace(0.0, 1.0, nx) ** 1.5
    return Axis(x, "low", "high"), Axis(0.05 * np.linspace(0.0, 1.0, ny) ** 2, "foot", "top")


def quads_of(nx: int, ny: int) -> np.ndarray:
    number = np.arange(nx * ny).reshape(nx, ny)
    corners = (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:])
    return np.stack([c.ravel() for c in corners], axis=1)


def rim_of(quads: np.ndarray) -> np.ndarray:
    ends = np.concatenate([quads[:, [k, (k + 1) % 4]] for k in range(4)])
    key = np.sort(ends, axis=1)
    _, first, count = np.unique(key, axis=0, return_index=True, return_counts=True)
    return ends[first[count == 1]]


def test_rectangles_give_the_conductances_and_volumes_of_the_grid():
    across, along = two_axes()
    grid = rectangle(across, along, "plane")
    quads = quads_of(6, 5)
    segments = rim_of(quads)
    zone = np.zeros(len(segments), dtype=np.int64)
    plane = positive(grid.points, NONE3, quads, segments, zone)
    assert len(plane.points) == grid.n_node and len(plane.quads) == len(quads)
    ours = plane_weights(plane, turned=False)
    theirs = Weights(grid.edge, grid.conductance_length, grid.volume)
    assert_allclose(matrix(ours), matrix(theirs), rtol=1e-12, atol=1e-12)
    assert_allclose(ours.volume, grid.volume, rtol=1e-12, atol=0.0)
    skin = plane_skin(plane, turned=False)
    area = np.bincount(skin.node, skin.area, grid.n_node)
    theirs_area = np.bincount(grid.face_node, grid.face_area, grid.n_node)
    assert_allclose(area, theirs_area, rtol=1e-12, atol=1e-15)


def test_a_body_of_revolution_of_rectangles_has_the_volume_and_surface_of_the_grid():
    across, along = two_axes()
    grid = rectangle(across, along, "axisymmetric")
    quads = quads_of(6, 5)
    segments = rim_of(quads)
    plane = positive(grid.points, NONE3, quads, segments, np.zeros(len(segments), dtype=np.int64))
    ours = plane_weights(plane, turned=True)
    assert_allclose(ours.volume.sum(), grid.volume.sum(), rtol=1e-12, atol=0.0)
    skin = plane_skin(plane, turned=True)
    assert_allclose(skin.area.sum(), grid.face_area.sum(), rtol=1e-12, atol=0.0)


def box(nx: int, ny: int, nz: int) -> tuple[np.ndarray, np.ndarray]:
    axes = (0.03 * np.linspace(0, 1, nx) ** 2, np.linspace(0, 0.2, ny), np.linspace(0, 0.05, nz))
    points = np.stack([g.ravel() for g in np.meshgrid(*axes, indexing="ij")], axis=1)
    number = np.arange(nx * ny * nz).reshape(nx, ny, nz)
    n = number
    corners = (
        *(n[:-1, :-1, :-1], n[1:, :-1, :-1], n[1:, 1:, :-1], n[:-1, 1:, :-1]),
        *(n[:-1, :-1, 1:], n[1:, :-1, 1:], n[1:, 1:, 1:], n[:-1, 1:, 1:]),
    )
    return points, np.stack([c.ravel() for c in corners], axis=1)


def test_boxes_give_the_seven_conductances_of_a_grid():
    points, cells = box(4, 4, 3)
    ours = solid_weights(points, (("hexahedron", cells),))
    assert ours.weight.min() > 0.0
    gap = np.abs(points[ours.edge[:, 0]] - points[ours.edge[:, 1]])
    assert np.all((gap > 0.0).sum(axis=1) == 1)  # along one axis only
    middle = np.flatnonzero(np.all(np.isclose(points[:, 1:], [0.2 / 3, 0.025]), axis=1))
    x = points[middle, 0]
    for a, b, k in zip(middle[:-1], middle[1:], range(3), strict=True):
        weight = ours.weight[np.all(ours.edge == [a, b], axis=1)]
        # face of a control volume in y and z over the distance in x
        assert_allclose(weight, (0.2 / 3) * 0.025 / (x[k + 1] - x[k]), rtol=1e-12, atol=0.0)
    assert_allclose(ours.volume.sum(), 0.03 * 0.2 * 0.05, rtol=1e-12, atol=0.0)


@pytest.mark.parametrize("kind", ["hexahedron", "wedge", "pyramid", "tetra"])
def test_linear_temperatures_leave_the_inside_of_any_solid_mesh_at_rest(kind):
    points, cells = box(5, 4, 4)
    rng = np.random.default_rng(5)
    high = points.max(axis=0)
    inner = np.all((points > 0.0) & (points < high), axis=1)
    points[inner] += rng.uniform(-1e-3, 1e-3, (int(inner.sum()), 3))
    if kind == "wedge":
        cells = np.concatenate([cells[:, [0, 1, 2, 4, 5, 6]], cells[:, [0, 2, 3, 4, 6, 7]]])
    if kind in ("pyramid", "tetra"):
        centre = points[cells].mean(axis=1)
        top = len(points) + np.arange(len(cells))
        points = np.concatenate([points, centre])
        inner = np.concatenate([inner, np.ones(len(centre), dtype=bool)])
        faces = [[0, 1, 2, 3], [4, 7, 6, 5], [0, 4, 5, 1], [1, 5, 6, 2], [2, 6, 7, 3], [3, 7, 4, 0]]
        cells = np.concatenate([np.column_stack([cells[:, f], top]) for f in faces])
    if kind == "tetra":
        cells = Delaunay(points).simplices
    ours = solid_weights(points, ((kind, cells),))
    stiff = matrix(ours)
    for direction in np.eye(3):
        flux = stiff @ (points @ direction)
        scale = np.abs(stiff).max() * 0.05
        # warped faces are met to the square of their warp, plane ones to rounding
        tight = 1e-12 if kind == "tetra" else 2e-3
        assert np.abs(flux[inner]).max() < tight * scale


def test_linear_temperatures_leave_a_mesh_of_plane_faces_at_rest_to_rounding():
    points, cells = box(4, 4, 4)
    skew = points @ np.array([[1.0, 0.2, 0.1], [0.0, 1.0, 0.3], [0.0, 0.0, 1.0]])
    high = points.max(axis=0)
    inner = np.all((points > 0.0) & (points < high), axis=1)
    stiff = matrix(solid_weights(skew, (("hexahedron", cells),)))
    for direction in np.eye(3):
        flux = stiff @ (skew @ direction)
        assert_allclose(flux[inner], 0.0, rtol=0.0, atol=1e-13 * np.abs(stiff).max())


@pytest.mark.parametrize("seed", range(6))
def test_obtuse_meshes_become_positive_and_keep_area_and_nodes(seed):
    rng = np.random.default_rng(seed)
    # any triangulation that is far from Delaunay: a Delaunay one, squeezed in one direction
    points, triangles = random_triangles(seed, 150)
    points = points * [1.0, float(rng.uniform(0.05, 0.2))]
    segments = outline(triangles)
    zone = (points[segments].mean(axis=1)[:, 0] > 0.07).astype(np.int64)
    before = plane_weights(Plane(points, triangles, NONE4, segments, zone, 0), turned=False)
    assert negative_share(before) > 0.1
    plane = positive(points, triangles, NONE4, segments, zone)
    after = plane_weights(plane, turned=False)
    assert plane.n_turned > 0
    assert negative_share(after) < 1e-2
    np.testing.assert_array_equal(plane.points[: len(points)], points)
    assert_allclose(after.volume.sum(), before.volume.sum(), rtol=1e-12, atol=0.0)
    for k in (0, 1):
        length = [
            np.linalg.norm(np.diff(p[s[z == k]], axis=1), axis=2).sum()
            for p, s, z in (
                (points, segments, zone),
                (plane.points, plane.segments, plane.segment_zone),
            )
        ]
        assert_allclose(length[1], length[0], rtol=1e-12, atol=0.0)
    stiff = matrix(after)
    inner = np.ones(len(plane.points), dtype=bool)
    inner[plane.segments.ravel()] = False
    for k in range(2):
        flux = stiff @ plane.points[:, k]
        scale = np.abs(stiff).max() * np.ptp(plane.points[:, k])
        assert_allclose(flux[inner], 0.0, rtol=0.0, atol=1e-11 * scale)


def test_the_surface_of_a_solid_is_shared_among_its_nodes():
    points, _ = box(3, 3, 3)
    facet = np.array([[0, 3, 12, 9], [0, 3, 12, -1]])
    three = points[facet[1, :3]]
    area = 0.5 * np.linalg.norm(np.cross(three[1] - three[0], three[2] - three[0]))
    skin = solid_skin(points, facet[1:], np.zeros(1, dtype=np.int64))
    assert_allclose(skin.area, area / 3.0, rtol=1e-12, atol=0.0)
    square = solid_skin(points, facet[:1], np.zeros(1, dtype=np.int64))
    assert len(square.node) == 4
