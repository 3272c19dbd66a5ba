"""The one structure under every section: control volumes and what joins them.

A section of any form, structured or meshed, in one to three dimensions, becomes
nodes with volumes, edges with a face area over a distance, and surface faces by
named zone. The solver, the transformation step, the heat balance and the field
writers see nothing else.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from midradius.thermo.arrays import Array, IntArray

Sense = Literal["slab", "cylinder", "ball", "plane", "axisymmetric", "solid"]

EXTENT = {
    "slab": "per square metre of face",
    "cylinder": "per radian and metre of length",
    "ball": "per steradian",
    "plane": "per metre of length",
    "axisymmetric": "per radian",
    "solid": "as meshed",
}


@dataclass(frozen=True)
class ControlVolumes:
    """A section cut into control volumes.

    Parameters
    ----------
    points
        Node positions [m], shape (n_node, dim): depth, radius, (x, y), (r, z) or
        (x, y, z).
    volume
        Volume of each node's cell, shape (n_node,), in m3 per the unit that
        :data:`EXTENT` names for the sense.
    edge
        Pairs of neighbours, shape (n_edge, 2). In one dimension edge ``e`` joins
        the nodes ``e`` and ``e + 1``, which lets the solver eliminate directly.
    conductance_length
        Face area over node distance, shape (n_edge,); times a conductivity it
        is a conductance. On meshes it is the weight of P1 elements, which may be
        negative where cells of a solid mesh are obtuse.
    face_node, face_area, face_zone
        Where heat leaves: node, area and index into ``zones``, (n_face,) each.
    """

    points: Array
    volume: Array
    edge: IntArray
    conductance_length: Array
    face_node: IntArray
    face_area: Array
    face_zone: IntArray
    zones: tuple[str, ...]
    sense: Sense

    @property
    def n_node(self) -> int:
        """How many nodes the section has."""
        return len(self.volume)

    @property
    def is_chain(self) -> bool:
        """Whether the nodes form one line, so that a direct sweep solves it."""
        n = self.n_node
        return len(self.edge) == n - 1 and bool(
            np.array_equal(self.edge[:, 0], np.arange(n - 1))
            and np.array_equal(self.edge[:, 1], np.arange(1, n))
        )
