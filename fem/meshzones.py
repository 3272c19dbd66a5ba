"""Which part of the boundary of a mesh is which surface zone.

Which facet of the boundary belongs to which zone: first the groups that the
case names, then the others in the order of the file; groups of facets before
groups of cells before groups of points (a facet belongs to a group of points
when all its corners do; one of all points names no zone by itself). The rest of
the boundary is the zone ``surface``. Symmetry planes and groups, and the axis of a
body of revolution, are insulated.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from midradius.fem import meshhealth as health
from midradius.fem.meshhealth import Finding
from midradius.fem.meshraw import SHAPES, Group, RawMesh, family
from midradius.thermo.arrays import Array, BoolArray, IntArray

REST = "surface"
INSULATED = -1
ON_PLANE = 1e-6  # of the size of the part: so near to a plane is on it


@dataclass(frozen=True)
class Symmetry:
    """What is insulated: groups by name, and planes as (coordinate, value [m])."""

    groups: tuple[str, ...] = ()
    planes: tuple[tuple[int, float], ...] = ()


def zones_of(
    raw: RawMesh,
    node: IntArray,
    rim: IntArray,
    points: Array,
    sense: str,
    symmetry: Symmetry,
    prefer: tuple[str, ...],
    findings: list[Finding],
) -> tuple[tuple[str, ...], IntArray]:
    """Names of the zones that are not empty, and the zone of each boundary facet."""
    members = boundary_groups(raw, node, rim, points.shape[1])
    free = np.ones(len(rim), dtype=bool)
    known = ", ".join(f'"{key}"' for key in members) or "none"
    for key in symmetry.groups:
        if key not in members and key != REST:
            what = f'no part of the boundary is in a group "{key}"'
            findings.append(Finding("error", what, f"Groups on the boundary: {known}."))
    for key in symmetry.groups:
        if key in members:
            free &= ~members[key]
    size = float(np.ptp(points, axis=0).max())
    for axis, value in symmetry.planes:
        on = np.abs(points[:, axis] - value) <= ON_PLANE * size
        here = np.all(np.where(rim >= 0, on[rim], True), axis=1)
        if not here.any():
            name = "xyz"[axis]
            what = f"no part of the boundary lies on {name} = {1e3 * value:.6g} mm"
            findings.append(Finding("error", what, "Give the plane where the part was cut."))
        free &= ~here
    if sense == "axisymmetric":  # no surface has an area there
        free &= ~np.all(np.where(rim >= 0, points[rim, 0] == 0.0, True), axis=1)
    zone = np.full(len(rim), INSULATED, dtype=np.int64)
    names: list[str] = []
    order = [key for key in prefer if key in members]
    order += [
        key
        for key in members
        if key not in order and key not in symmetry.groups and not _all_points(raw, key, members)
    ]
    for key in order:
        here = members[key] & free
        if here.any():
            zone[here] = len(names)
            names.append(key)
            free &= ~here
    if free.any():
        if REST not in names:
            names.append(REST)
        zone[free] = names.index(REST)
    if not names:
        what = "the whole boundary is insulated by symmetry"
        findings.append(Finding("error", what, "Leave the cooled surface out of symmetry."))
    return tuple(names), zone


def _all_points(raw: RawMesh, key: str, members: Mapping[str, BoolArray]) -> bool:
    """Whether a group is one of points that says nothing: it holds the whole boundary."""
    group = raw.groups[key]
    return bool(members[key].all()) and not len(group.facets) and not len(group.cells)


def boundary_groups(raw: RawMesh, node: IntArray, rim: IntArray, dim: int) -> dict[str, BoolArray]:
    """Which facets of the boundary each named group holds; empty ones are left out."""
    keys = health.facet_keys(rim)
    corners = [_padded(block[:, : SHAPES[family(kind)].n_corner]) for kind, block in raw.cells]
    table = np.concatenate(corners)
    thin = np.concatenate(
        [np.full(len(block), SHAPES[family(kind)].dim == dim - 1) for kind, block in raw.cells]
    )
    found: tuple[dict[str, BoolArray], ...] = ({}, {}, {})
    for name, group in raw.groups.items():
        for place, here in enumerate(_in_group(group, table, thin, node, keys)):
            if here.any():
                found[place][name] = here
                break
    return {**found[0], **found[1], **found[2]}


def _in_group(
    group: Group, table: IntArray, thin: BoolArray, node: IntArray, keys: IntArray
) -> tuple[BoolArray, ...]:
    inside = np.zeros(len(node) + 1, dtype=bool)  # the last place is for -1
    lines = table[group.cells[thin[group.cells]]]
    of_points = np.zeros(len(keys), dtype=bool)
    if len(group.points):
        own = node[group.points]
        inside[own[own >= 0]] = True
        inside[-1] = True
        of_points = np.all(inside[keys], axis=1)
    return _match(group.facets, node, keys), _match(lines, node, keys), of_points


def _padded(block: IntArray) -> IntArray:
    """Corners as a table of four columns; solid cells, which are no facets, are cut."""
    table = np.full((len(block), 4), -1, dtype=np.int64)
    width = min(block.shape[1], 4)
    table[:, :width] = block[:, :width]
    return table


def _match(facets: IntArray, node: IntArray, keys: IntArray) -> BoolArray:
    if not len(facets):
        return np.zeros(len(keys), dtype=bool)
    own = np.where(facets >= 0, node[facets], -1)
    wanted = health.facet_keys(own)
    both = np.concatenate([keys, wanted])
    _, inverse = np.unique(both, axis=0, return_inverse=True)
    inverse = inverse.ravel()
    return np.isin(inverse[: len(keys)], inverse[len(keys) :])
