"""From a mesh file to one section: nodes, cells, surface zones, findings.

Cells of second order keep their corners. Nodes stay in the order of the file;
what no cell of the section uses is left out, and ``raw_point`` leads back.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from midradius.fem import meshhealth as health
from midradius.fem.meshguard import read_mesh
from midradius.fem.meshhealth import Finding
from midradius.fem.meshraw import SHAPES, RawMesh, family
from midradius.fem.meshzones import ON_PLANE, Symmetry, zones_of
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault

MeshSense = Literal["plane", "axisymmetric", "solid"]
LENGTH_UNITS: Mapping[str, float] = {"m": 1.0, "cm": 0.01, "mm": 1e-3, "in": 0.0254, "ft": 0.3048}

Blocks = tuple[tuple[str, IntArray], ...]


@dataclass(frozen=True)
class MeshInput:
    """A section made of cells.

    ``points`` (n_node, dim) [m] are (x, y), (r, z) or (x, y, z); ``cells`` the
    cells of the section, all the same way round; ``facets`` (n_facet, 4) the
    boundary with the index of its zone, or ``INSULATED``.

    ``drawn_points`` (n_node, 3) [m] and ``drawn`` are the mesh as the file has it,
    cells of lower dimension included; ``raw_point`` (n_node,) and ``raw_cell``
    (n_drawn,) index the file's nodes and cells, ``point_ids`` and ``cell_ids``
    are its numbers. Data and groups belong to the drawn mesh.
    """

    name: str
    sense: MeshSense
    points: Array
    cells: Blocks
    facets: IntArray
    facet_zone: IntArray
    zones: tuple[str, ...]
    drawn_points: Array
    drawn: Blocks
    raw_point: IntArray
    raw_cell: IntArray
    point_ids: IntArray
    cell_ids: IntArray
    point_data: Mapping[str, NDArray[np.generic]]
    cell_data: Mapping[str, NDArray[np.generic]]
    findings: tuple[Finding, ...]

    @property
    def n_node(self) -> int:
        """Nodes of the section."""
        return len(self.points)

    @property
    def text(self) -> str:
        """File, sense, size and cells in one line."""
        size = " x ".join(f"{1e3 * extent:.4g}" for extent in np.ptp(self.points, axis=0))
        kinds = ", ".join(
            f"{len(block)} {_PLURAL.get(kind, kind + 's')}" for kind, block in self.cells
        )
        return f"{self.name}, {self.sense}, {size} mm; {self.n_node} nodes, {kinds}"


_PLURAL = {"hexahedron": "hexahedra", "tetra": "tetrahedra"}


class MeshFaults(InputFault):
    """A mesh that cannot be solved: ``findings`` are the errors, at least one."""

    def __init__(self, name: str, findings: Sequence[Finding]) -> None:
        self.findings = tuple(findings)
        first = findings[0]
        super().__init__("mesh file", f'"{name}"', f"sound: {first.what}", first.remedy)


def open_mesh(
    path: Path,
    *,
    length_unit: str,
    sense: MeshSense,
    symmetry: Symmetry | None = None,
    prefer: tuple[str, ...] = (),
) -> MeshInput:
    """The section of a mesh file.

    Parameters
    ----------
    path
        Any format of :mod:`midradius.fem.meshguard`.
    length_unit
        One of :data:`LENGTH_UNITS`.
    sense
        Plane, a body of revolution about x = 0, or solid.
    symmetry
        What no heat passes.
    prefer
        Groups that become zones before all others, where they are on the boundary.

    Raises
    ------
    InputFault
        The file cannot be read; :class:`MeshFaults` when it cannot be solved.
    """
    return section_of(
        read_mesh(path),
        path.name,
        length_unit=length_unit,
        sense=sense,
        symmetry=symmetry or Symmetry(),
        prefer=prefer,
    )


def section_of(
    raw: RawMesh,
    name: str,
    *,
    length_unit: str,
    sense: MeshSense,
    symmetry: Symmetry,
    prefer: tuple[str, ...] = (),
) -> MeshInput:
    """The section of a mesh that was read; see :func:`open_mesh`."""
    dim = 3 if sense == "solid" else 2
    findings: list[Finding] = []
    _refuse_wrong_dimension(raw, name, dim, sense)
    body = _body(raw, dim, findings)
    used = np.unique(np.concatenate([block.ravel() for _, block in body]))
    orphans = len(raw.points) - len(used) - _n_middle(raw)
    if orphans > 0:
        what = f"{orphans} nodes belong to no cell of the section"
        findings.append(Finding("warning", what, "They are left out."))
    node = np.full(len(raw.points), -1, dtype=np.int64)
    node[used] = np.arange(len(used))
    drawn_points = raw.points[used] * LENGTH_UNITS[length_unit]
    points = _coordinates(drawn_points, sense, name, findings)
    findings += health.size_findings(np.ptp(points, axis=0), length_unit)
    if sense == "axisymmetric":
        points = _on_axis(points)
        findings += health.axis_findings(points[:, 0])
    cells = tuple((kind, node[block]) for kind, block in body)
    findings += health.shape_findings(points, cells)
    cells, more = health.turned(points, cells)
    findings += more
    facets = health.facets_of(cells)
    findings += health.join_findings(points, cells, facets)
    _refuse_errors(name, findings)
    rim = facets.corners[facets.count == 1]
    zones, zone = zones_of(raw, node, rim, points, sense, symmetry, prefer, findings)
    _refuse_errors(name, findings)
    drawn, raw_cell = _drawn(raw, node)
    point_data = {key: values[used] for key, values in raw.point_data.items()}
    cell_data = {key: values[raw_cell] for key, values in raw.cell_data.items()}
    for key, group in raw.groups.items():
        if len(group.cells):
            cell_data[f"group {key}"] = _marks(raw.n_cell, group.cells)[raw_cell]
        corners = group.facets[group.facets >= 0]
        if len(group.points) or len(corners):
            marked = np.union1d(group.points, corners)
            point_data[f"group {key}"] = _marks(len(raw.points), marked)[used]
    return MeshInput(
        name=name,
        sense=sense,
        points=points,
        cells=cells,
        facets=rim,
        facet_zone=zone,
        zones=zones,
        drawn_points=drawn_points,
        drawn=drawn,
        raw_point=used,
        raw_cell=raw_cell,
        point_ids=raw.point_ids[used],
        cell_ids=raw.cell_ids[raw_cell],
        point_data=point_data,
        cell_data=cell_data,
        findings=(*(Finding("warning", note, "") for note in raw.notes), *findings),
    )


def _refuse_errors(name: str, findings: Sequence[Finding]) -> None:
    errors = [finding for finding in findings if finding.level == "error"]
    if errors:
        raise MeshFaults(name, errors)


def _refuse_wrong_dimension(raw: RawMesh, name: str, dim: int, sense: str) -> None:
    dims = {SHAPES[family(kind)].dim for kind, block in raw.cells if len(block)}
    if dim in dims and (dim == 3 or 3 not in dims):
        return
    if 3 in dims:
        what = f'it holds solid cells, and sense is "{sense}"'
        remedy = 'Write sense = "solid", or export the section as plane cells.'
    elif 2 in dims:
        what = 'it holds plane cells only, and sense is "solid"'
        remedy = 'Write sense = "plane" or "axisymmetric", or fill the body with solid cells.'
    else:
        what, remedy = "it holds no cells of a section", "Export cells, not their outline."
    raise MeshFaults(name, [Finding("error", what, remedy)])


def _body(raw: RawMesh, dim: int, findings: list[Finding]) -> Blocks:
    """Cells of the section by their corners, each once, none without volume."""
    merged: dict[str, list[IntArray]] = {}
    n_second = 0
    for kind, block in raw.cells:
        shape = SHAPES[family(kind)]
        if shape.dim != dim or not len(block):
            continue
        n_second += len(block) if block.shape[1] > shape.n_corner else 0
        merged.setdefault(family(kind), []).append(block[:, : shape.n_corner])
    if n_second:
        what = f"{n_second} cells are of second or higher order"
        findings.append(
            Finding("warning", what, "They are solved by their corner nodes, with straight edges.")
        )
    cells, n_double, n_flat = [], 0, 0
    for kind, blocks in merged.items():
        block = np.concatenate(blocks)
        _, first = np.unique(np.sort(block, axis=1), axis=0, return_index=True)
        n_double += len(block) - len(first)
        block = block[np.sort(first)]
        flat = health.without_volume(raw.points, kind, block, dim)
        n_flat += int(flat.sum())
        if not flat.all():
            cells.append((kind, block[~flat]))
    for count, text in ((n_double, "lie double"), (n_flat, "have no volume")):
        if count:
            findings.append(Finding("warning", f"{count} cells {text}", "They are left out."))
    if not cells:
        raise MeshFaults("mesh", [Finding("error", "no cell has a volume", "Mesh it again.")])
    return tuple(cells)


def _n_middle(raw: RawMesh) -> int:
    """Nodes that only cells of higher order use, between their corners."""
    corner, every = np.zeros(len(raw.points), dtype=bool), np.zeros(len(raw.points), dtype=bool)
    for kind, block in raw.cells:
        corner[block[:, : SHAPES[family(kind)].n_corner]] = True
        every[block] = True
    return int((every & ~corner).sum())


def _coordinates(points: Array, sense: str, name: str, findings: list[Finding]) -> Array:
    if sense == "solid":
        return points.copy()
    extent = np.ptp(points, axis=0)
    flat = [k for k in (2, 1, 0) if extent[k] <= ON_PLANE * extent.max()]
    if not flat:
        what = f'its nodes lie in no plane of two coordinates, and sense is "{sense}"'
        remedy = "Turn the section into the x-y plane."
        raise MeshFaults(name, [Finding("error", what, remedy)])
    kept = [k for k in range(3) if k != flat[0]]
    if flat[0] != 2:
        axes = " and ".join("xyz"[k] for k in kept)
        ours = "r and z" if sense == "axisymmetric" else "x and y"
        findings.append(Finding("warning", f"the section lies in {axes}", f"Taken as {ours}."))
    return np.ascontiguousarray(points[:, kept])


def _on_axis(points: Array) -> Array:
    """Nodes that miss the axis by rounding are put on it."""
    points = points.copy()
    points[np.abs(points[:, 0]) < 1e-9 * np.abs(points[:, 0]).max(), 0] = 0.0
    return points


def _drawn(raw: RawMesh, node: IntArray) -> tuple[Blocks, IntArray]:
    """The file's cells in their order, those left out that name unknown nodes."""
    blocks, kept, first = [], [], 0
    for kind, block in raw.cells:
        name = family(kind)
        corners = node[block[:, : SHAPES[name].n_corner]]
        whole = np.all(corners >= 0, axis=1)
        if whole.any():
            blocks.append((name, corners[whole]))
            kept.append(first + np.flatnonzero(whole))
        first += len(block)
    return tuple(blocks), np.concatenate(kept)


def _marks(n: int, members: IntArray) -> NDArray[np.generic]:
    marks = np.zeros(n, dtype=np.int8)
    marks[members] = 1
    return marks
