"""A mesh made into control volumes, and where its fields are read.

Level 0 is the mesh as the file has it; every level more halves all edges. The
nodes of the file keep their numbers on every level, so that two levels are
compared, and results are written, at nodes that both have.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from midradius.fem.delaunay import Plane, positive
from midradius.fem.drawing import Drawing
from midradius.fem.meshraw import SHAPES
from midradius.fem.meshsection import MeshSection
from midradius.fem.place import Line, Place
from midradius.fem.refine import refined
from midradius.fem.simplex import (
    Skin,
    Weights,
    negative_share,
    plane_skin,
    plane_weights,
    solid_skin,
    solid_weights,
)
from midradius.fem.split import n_splitting, simplices_of
from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

N_PROFILE = 61  # points from surface to core
BESIDE = 0.05  # of a cell: so far outside a point still counts as on the surface
MOST_SIMPLICES = 64  # candidates by their centres before all are tried
GROWTH = {2: 4, 3: 8}  # nodes of the next level over those of this one, about


@dataclass(frozen=True)
class MeshCut:
    """A mesh section cut into control volumes.

    ``body`` may hold nodes beyond those of the mesh (added on its boundary, or by
    a finer level); ``n_shared`` of them are those of the level below.
    """

    section: MeshSection
    level: int
    body: ControlVolumes
    simplices: IntArray
    n_shared: int
    negative: float
    n_turned: int

    def coarser(self) -> "MeshCut | None":
        """The level below; None for the mesh itself."""
        return cut_mesh(self.section, self.level - 1) if self.level else None

    def finer(self, strongest_film: Mapping[str, float], most: int) -> "MeshCut | None":
        """The level above; None where it would have more than ``most`` nodes."""
        del strongest_film
        if GROWTH[self.section.n_dim] * self.body.n_node > most:
            return None
        return cut_mesh(self.section, self.level + 1)

    def shared(self, field: Array) -> Array:
        """A field (n_time, n_node) on the nodes that the level below has too."""
        return field[:, : self.n_shared]

    @cached_property
    def _centres(self) -> Array:
        return np.asarray(self.body.points[self.simplices].mean(axis=1))

    def place(self, coordinates: tuple[float, ...]) -> Place:
        """The weights on nodes that read a field at a point [m].

        Raises
        ------
        InputFault
            The point lies outside the mesh.
        """
        node, share = self._weights(np.array([coordinates], dtype=np.float64))
        depth = self.section.depth_of(coordinates)
        return Place(node[0], share[0], tuple(coordinates), depth)

    def line(self, start: Array, end: Array, label: str, count: int = N_PROFILE) -> Line:
        """Evenly placed points from ``start`` to ``end`` [m]; depth counts from the start."""
        share = np.linspace(0.0, 1.0, count)
        node, weight = self._weights(start + share[:, None] * (end - start))
        return Line(share * float(np.linalg.norm(end - start)), node, label, weight)

    def profile(self) -> Line:
        """From the surface to the core."""
        return self.line(self.section.surface_point, self.section.core, "surface to core")

    def drawing(self) -> Drawing:
        """The mesh as the file has it, with its own data."""
        mesh = self.section.mesh
        return Drawing(
            points=mesh.drawn_points,
            cells=mesh.drawn,
            node=np.arange(mesh.n_node),
            point_data={**mesh.point_data, "file_point_id": mesh.point_ids},
            cell_data={**mesh.cell_data, "file_cell_id": mesh.cell_ids},
        )

    def _weights(self, places: Array) -> tuple[IntArray, Array]:
        """Nodes (n, dim + 1) and shares of points: the simplex that holds each."""
        from scipy.spatial import cKDTree

        near = min(MOST_SIMPLICES, len(self.simplices))
        _, index = cKDTree(self._centres).query(places, k=near)
        index = np.asarray(index).reshape(len(places), near)
        nodes, shares = [], []
        for place, candidates in zip(places, index, strict=True):
            share, best = self._best(place, candidates)
            if share.min() < -1e-9:
                share, best = self._best(place, np.arange(len(self.simplices)))
            if share.min() < -BESIDE:
                shown = ", ".join(f"{1e3 * x:.4g} mm" for x in place)
                raise InputFault(
                    "position", shown, "inside the mesh", "Give a point of the section."
                )
            share = np.maximum(share, 0.0)
            nodes.append(self.simplices[best])
            shares.append(share / share.sum())
        return np.array(nodes), np.array(shares)

    def _best(self, place: Array, candidates: IntArray) -> tuple[Array, int]:
        corner = self.body.points[self.simplices[candidates]]
        edges = np.moveaxis(corner[:, 1:] - corner[:, :1], 1, 2)
        flat = np.abs(np.linalg.det(edges)) <= 1e-14 * np.abs(edges).max(axis=(1, 2)) ** len(place)
        edges[flat] = np.eye(len(place))
        inner = np.linalg.solve(edges, (place - corner[:, 0])[:, :, None])[:, :, 0]
        share = np.concatenate([1.0 - inner.sum(axis=1, keepdims=True), inner], axis=1)
        share[flat] = -np.inf
        best = int(np.argmax(share.min(axis=1)))
        return np.asarray(share[best]), int(candidates[best])


def cut_mesh(section: MeshSection, level: int) -> MeshCut:
    """The control volumes of a mesh, every edge halved ``level`` times."""
    mesh = section.mesh
    points, cells, facets, zone = mesh.points, mesh.cells, mesh.facets, mesh.facet_zone
    n_shared = len(points)
    for _ in range(level):
        n_shared = len(points)
        points, cells, facets, zone = refined(points, cells, facets, zone)
    n_turned = 0
    if section.n_dim == 2:
        plane = _plane(points, dict(cells), facets, zone)
        turned = section.sense == "axisymmetric"
        weights, skin = plane_weights(plane, turned=turned), plane_skin(plane, turned=turned)
        simplices = np.concatenate(
            [plane.triangles, plane.quads[:, [0, 1, 2]], plane.quads[:, [0, 2, 3]]]
        )
        points, n_turned = plane.points, plane.n_turned
    else:
        weights, skin = solid_weights(points, cells), solid_skin(points, facets, zone)
        simplices = np.concatenate([_one_splitting(kind, block) for kind, block in cells])
    return MeshCut(
        section=section,
        level=level,
        body=_volumes(section, points, weights, skin),
        simplices=simplices,
        n_shared=n_shared,
        negative=negative_share(weights),
        n_turned=n_turned,
    )


def _plane(points: Array, cells: Mapping[str, IntArray], facets: IntArray, zone: IntArray) -> Plane:
    none: dict[int, IntArray] = {n: np.empty((0, n), dtype=np.int64) for n in (3, 4)}
    return positive(
        points, cells.get("triangle", none[3]), cells.get("quad", none[4]), facets[:, :2], zone
    )


def _one_splitting(kind: str, block: IntArray) -> IntArray:
    every = simplices_of(kind)
    first = every[: len(every) // n_splitting(kind)]
    return np.concatenate([block[:, list(local)] for local in first])


def _volumes(section: MeshSection, points: Array, weights: Weights, skin: Skin) -> ControlVolumes:
    assert all(SHAPES[kind].dim == section.n_dim for kind, _ in section.mesh.cells)
    return ControlVolumes(
        points=points,
        volume=weights.volume,
        edge=weights.edge,
        conductance_length=weights.weight,
        face_node=skin.node,
        face_area=skin.area,
        face_zone=skin.zone,
        zones=section.zones,
        sense=section.sense,
    )
