"""A section out of a mesh: its places by trade terms, its depths, its whole.

Depth is the distance to the cooled surface: zones that some stage cools, not
those of symmetry or insulation. The core is the deepest point of the nodes,
and of those between them where they are few; of several as deep (within
:data:`AS_DEEP`) the one least open to the surface: in the middle of them, on the
axis or the plane of symmetry where they reach it. The surface is the point of it nearest
to the core; quarter thickness and mid-radius lie half way between the two, a
depth on the same line.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from midradius.fem.convection import Geometry
from midradius.fem.distance import exposure, nearest, pieces
from midradius.fem.meshfile import MeshInput
from midradius.fem.refine import refined
from midradius.fem.volumes import Sense
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

AS_DEEP = 0.02  # of the greatest depth
ENOUGH = 1000  # points among which the deepest is looked for
HALF_WAY = ("quarter thickness", "mid-radius")

_WHOLE: Mapping[str, tuple[float, str]] = {
    "plane": (1.0, "per metre of length, as meshed"),
    "axisymmetric": (2.0 * np.pi, "of the whole turn, as meshed"),
    "solid": (1.0, "of the part as meshed"),
}


@dataclass(frozen=True)
class MeshSection:
    """The section of a mesh; ``cooled`` are the zones that depths count from."""

    mesh: MeshInput
    cooled: tuple[str, ...]
    form = "mesh"

    @property
    def sense(self) -> Sense:
        """What a unit of it extends over."""
        return self.mesh.sense

    @property
    def n_dim(self) -> int:
        """How many coordinates a point has."""
        return int(self.mesh.points.shape[1])

    @property
    def zones(self) -> tuple[str, ...]:
        """Names of all surfaces."""
        return self.mesh.zones

    @property
    def whole(self) -> tuple[float, str]:
        """Factor from the solved extent to a whole that a person would name, and its name."""
        return _WHOLE[self.sense]

    @property
    def text(self) -> str:
        """What the section is, in one line."""
        return f"mesh {self.mesh.text}"

    def folded(self, same: Mapping[tuple[str, str], bool]) -> "MeshSection":
        """A mesh is solved as it is: its symmetry is what the case states."""
        del same
        return self

    def cooled_by(self, strongest_film: Mapping[str, float]) -> "MeshSection":
        """The section whose depths count from the zones that have a film.

        Raises
        ------
        InputFault
            No zone is cooled.
        """
        cooled = tuple(zone for zone in self.zones if strongest_film.get(zone, 0.0) > 0.0)
        if not cooled:
            raise InputFault(
                "medium", "insulated everywhere", "one that cools some surface of the mesh"
            )
        return replace(self, cooled=cooled)

    @property
    def gas_size(self) -> tuple[float, Geometry]:
        """Length [m] and shape by which a gas cools it: as free convection is known for."""
        if self.sense == "axisymmetric":
            return 2.0 * float(self.mesh.points[:, 0].max()), "horizontal cylinder"
        extent = np.sort(np.ptp(self.mesh.points, axis=0))
        return float(extent[-2] if self.sense == "solid" else extent[-1]), "vertical plate"

    @cached_property
    def surface(self) -> Array:
        """The cooled surface as segments or triangles."""
        numbers = [self.zones.index(zone) for zone in self.cooled]
        return pieces(self.mesh.points, self.mesh.facets[np.isin(self.mesh.facet_zone, numbers)])

    @cached_property
    def depths(self) -> Array:
        """Depth of every node of the mesh [m], (n_node,)."""
        return nearest(self.mesh.points, self.surface)[0]

    @cached_property
    def core(self) -> Array:
        """The deepest point [m], (dim,); of several the one least open to the surface.

        On an axis or a symmetry plane that is where the whole body has its middle.
        """
        # a coarse mesh may have no node inside: its edges are halved for the search
        mesh = self.mesh
        points, cells, facets, zone = mesh.points, mesh.cells, mesh.facets, mesh.facet_zone
        while len(points) < ENOUGH:
            points, cells, facets, zone = refined(points, cells, facets, zone)
        depths = nearest(points, self.surface)[0]
        points = points[depths >= (1.0 - AS_DEEP) * depths.max()]
        return np.asarray(points[int(np.argmin(exposure(points, self.surface)))])

    @cached_property
    def surface_point(self) -> Array:
        """The point of the cooled surface nearest to the core [m], (dim,)."""
        return np.asarray(nearest(self.core[None, :], self.surface)[1][0])

    def depth_of(self, coordinates: tuple[float, ...]) -> float:
        """Distance [m] from a point to the nearest cooled surface."""
        return float(nearest(np.array([coordinates], dtype=np.float64), self.surface)[0][0])

    def trade_place(self, term: str, depth: float | None = None) -> tuple[float, ...]:
        """Coordinates [m] of surface, core, mid-radius, quarter thickness or a depth.

        Raises
        ------
        InputFault
            The depth is beyond the core.
        """
        way = self.core - self.surface_point
        most = float(np.linalg.norm(way))
        share = {"surface": 0.0, "core": 1.0, **dict.fromkeys(HALF_WAY, 0.5)}.get(term)
        if share is None:
            share = (depth or 0.0) / most
        if share > 1.0 + 1e-9:
            raise InputFault(
                "depth",
                f"{1e3 * (depth or 0.0):.4g} mm",
                f"at most {1e3 * most:.4g} mm, the depth of the core of this mesh",
                'The deepest point is "core".',
            )
        return tuple(float(x) for x in self.surface_point + min(share, 1.0) * way)
