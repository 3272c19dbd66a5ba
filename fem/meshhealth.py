"""Looks a mesh over before it is solved: what is wrong, how bad, what to do.

An error keeps the mesh from being solved; a warning is stated and solved.
Repaired is only what has one meaning: cells that run the other way round are
turned, cells without volume and nodes that no cell uses are left out.

Source
------
Shape of a simplex: Liu & Joe, BIT 34 (1994) 268, mean ratio (remembered); the
limits below are engineering judgement.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from midradius.fem.meshraw import SHAPES, family
from midradius.fem.split import simplices_of
from midradius.thermo.arrays import Array, BoolArray, IntArray

SLIVER = 0.02  # mean ratio below which a simplex says little about its middle
SMALLEST, LARGEST = 0.5e-3, 20.0  # m over all, outside which the unit must be wrong
SMALL, LARGE = 5e-3, 5.0  # m over all, outside which it is suspected
FLAT = 1e-12  # share of the cube of its longest edge below which a cell has no volume
FOLDED = 0.02  # share of a cell that may lie the wrong way round in a warped hexahedron
BORE = 0.01  # of the largest radius: a smaller hole is rather a mesh beside its axis

Level = Literal["error", "warning"]


@dataclass(frozen=True)
class Finding:
    """One thing about a mesh: ``what`` is wrong, and the ``remedy``."""

    level: Level
    what: str
    remedy: str

    @property
    def text(self) -> str:
        """Both in one line."""
        return f"{self.what}. {self.remedy}".rstrip()


def size_findings(extent: Array, unit: str) -> list[Finding]:
    """Whether a body of this ``extent`` (dim,) [m] can be a part at all."""
    size = float(extent.max())
    shown = " x ".join(f"{1e3 * e:.4g}" for e in extent)
    what = f'with length_unit = "{unit}" the part measures {shown} mm'
    remedy = "Check length_unit: the file itself does not state it."
    if not SMALLEST <= size <= LARGEST:
        return [Finding("error", what, remedy)]
    if not SMALL <= size <= LARGE:
        return [Finding("warning", what, remedy)]
    return []


def turned(
    points: Array, cells: tuple[tuple[str, IntArray], ...]
) -> tuple[tuple[tuple[str, IntArray], ...], list[Finding]]:
    """Cells that all run the same way round, and what could not be turned."""
    out, findings, n_turned, n_folded = [], list[Finding](), 0, 0
    for kind, block in cells:
        split = simplices_of(kind)
        size = np.stack([volumes(points, block[:, row]) for row in split], axis=1)
        scale = _longest(points, block) ** points.shape[1]
        some = np.abs(size) > FLAT * scale[:, None]
        up, down = np.maximum(size, 0.0).sum(axis=1), np.maximum(-size, 0.0).sum(axis=1)
        folded = np.minimum(up, down) > FOLDED * (up + down)
        # one concave corner leaves a quad with one good diagonal
        if kind == "quad":
            folded &= ~_one_good_diagonal(size, some)
        backward = (down > up) & ~folded
        fixed = block.copy()
        fixed[backward] = block[backward][:, _MIRRORED[kind]]
        # all of them so: the order of vtk up to 9.6, which is no fault
        if not (kind == "wedge" and backward.all()):
            n_turned += int(backward.sum())
        n_folded += int(folded.sum())
        out.append((kind, fixed))
    if n_folded:
        findings.append(
            Finding(
                "error",
                f"{n_folded} cells are folded over themselves",
                "Mesh these places again; a bow-tie quad has two nodes in the wrong order.",
            )
        )
    total = sum(len(block) for _, block in cells)
    if 0 < n_turned < total:
        findings.append(
            Finding(
                "warning",
                f"{n_turned} of {total} cells run the other way round than the rest",
                "They are turned here; the mesh is solved as if they were right.",
            )
        )
    return tuple(out), findings


_MIRRORED = {
    "triangle": [0, 2, 1],
    "quad": [0, 3, 2, 1],
    "tetra": [0, 2, 1, 3],
    "hexahedron": [4, 5, 6, 7, 0, 1, 2, 3],
    "wedge": [3, 4, 5, 0, 1, 2],
    "pyramid": [0, 3, 2, 1, 4],
}


def _one_good_diagonal(size: Array, some: BoolArray) -> BoolArray:
    good = [
        np.all(some[:, k : k + 2], axis=1) & (np.sign(size[:, k]) == np.sign(size[:, k + 1]))
        for k in (0, 2)
    ]
    return np.asarray(good[0] | good[1])


def volumes(points: Array, simplices: IntArray) -> Array:
    """Signed areas or volumes of simplices (n, dim + 1) of any plane or solid mesh."""
    corner = points[simplices]
    edges = corner[:, 1:] - corner[:, :1]
    if edges.shape[1] == 2:
        cross = edges[:, 0, 0] * edges[:, 1, 1] - edges[:, 0, 1] * edges[:, 1, 0]
        return np.asarray(0.5 * cross)
    return np.asarray(np.einsum("ij,ij->i", edges[:, 0], np.cross(edges[:, 1], edges[:, 2])) / 6.0)


def without_volume(points: Array, kind: str, block: IntArray, dim: int) -> BoolArray:
    """Cells (n,) of which nothing is left: their corners lie in one line or plane."""
    corner = points[block]
    scale = np.ptp(corner, axis=1).max(axis=1) ** dim
    total = np.zeros(len(block))
    for row in simplices_of(kind):
        edges = corner[:, list(row[1:])] - corner[:, [row[0]]]
        cross = np.cross(edges[:, 0], edges[:, 1])
        size = np.linalg.norm(cross, axis=1)
        total += size if dim == 2 else np.abs(np.einsum("ij,ij->i", cross, edges[:, 2]))
    return np.asarray(total <= FLAT * scale)


def _longest(points: Array, block: IntArray) -> Array:
    corner = points[block]
    return np.asarray(np.ptp(corner, axis=1).max(axis=1))


def shape_findings(points: Array, cells: tuple[tuple[str, IntArray], ...]) -> list[Finding]:
    """Slivers: cells that are far from even-sided."""
    dim = points.shape[1]
    bad, total, worst = 0, 0, 1.0
    for kind, block in cells:
        if family(kind) not in ("triangle", "tetra") or not len(block):
            continue
        corner = points[block]
        squares = np.zeros(len(block))
        for i in range(dim + 1):
            for j in range(i):
                squares += ((corner[:, i] - corner[:, j]) ** 2).sum(axis=1)
        size = np.abs(volumes(points, block))
        ratio = (
            4.0 * np.sqrt(3.0) * size / squares
            if dim == 2
            else 12.0 * (3.0 * size) ** (2.0 / 3.0) / squares
        )
        bad += int((ratio < SLIVER).sum())
        total += len(block)
        worst = min(worst, float(ratio.min()))
    if not bad:
        return []
    what = f"{bad} of {total} cells are slivers (shape down to {worst:.1e}, 1 is even-sided)"
    return [Finding("warning", what, "Temperatures near them are poor: improve the mesh there.")]


@dataclass(frozen=True)
class Facets:
    """All facets of a mesh: corners (n, 4) filled with -1, and how many cells have each.

    ``n_part`` is the number of parts that no facet joins.
    """

    corners: IntArray
    count: IntArray
    n_part: int


def facets_of(cells: tuple[tuple[str, IntArray], ...]) -> Facets:
    """Facets of the cells, each once, as the first cell has it."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    rows, owners, n_cell = [], [], 0
    for kind, block in cells:
        for local in SHAPES[kind].facets:
            row = np.full((len(block), 4), -1, dtype=np.int64)
            row[:, : len(local)] = block[:, list(local)]
            rows.append(row)
            owners.append(n_cell + np.arange(len(block)))
        n_cell += len(block)
    table, owner = np.concatenate(rows), np.concatenate(owners)
    dim = SHAPES[cells[0][0]].dim
    key = facet_keys(table)
    real = (key >= 0).sum(axis=1) >= dim  # a collapsed cell has facets that are none
    table, key, owner = table[real], key[real], owner[real]
    _, first, facet, count = np.unique(
        key, axis=0, return_index=True, return_inverse=True, return_counts=True
    )
    n = n_cell + len(first)
    graph = coo_array((np.ones(len(owner)), (owner, n_cell + facet.ravel())), shape=(n, n))
    n_part, _ = connected_components(graph, directed=False)
    return Facets(table[first], count.astype(np.int64), int(n_part))


def facet_keys(table: IntArray) -> IntArray:
    """Corners of facets (n, 4), each once, in falling order: the same for both sides."""
    key = -np.sort(-table, axis=1)
    repeated = np.zeros(key.shape, dtype=bool)
    repeated[:, 1:] = (key[:, 1:] == key[:, :-1]) & (key[:, 1:] >= 0)
    key[repeated] = -1
    return np.asarray(-np.sort(-key, axis=1))


def join_findings(
    points: Array, cells: tuple[tuple[str, IntArray], ...], facets: Facets
) -> list[Finding]:
    """Whether the cells form one body, each facet between two of them at most."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    findings = []
    many = int((facets.count > 2).sum())
    if many:
        what = f"{many} edges or faces belong to more than two cells"
        findings.append(
            Finding("error", what, "Take out cells that lie double, or walls inside the body.")
        )
    n = len(points)
    ends = np.concatenate(
        [block[:, [0, k]] for _, block in cells for k in range(1, block.shape[1])]
    )
    graph = coo_array((np.ones(len(ends)), (ends[:, 0], ends[:, 1])), shape=(n, n))
    n_body, _ = connected_components(graph, directed=False)
    size = float(np.ptp(points, axis=0).max())
    key = np.round(points / (1e-9 * size)).astype(np.int64)
    double = n - len(np.unique(key, axis=0))
    if double:
        findings.append(
            Finding(
                "error",
                f"{double} nodes lie on others",
                "They make a slit that no heat crosses: merge coincident nodes in the mesher.",
            )
        )
    elif n_body > 1:
        findings.append(
            Finding(
                "error",
                f"the mesh holds {n_body} separate bodies",
                "One case is one part: export one body, or give each a case of its own.",
            )
        )
    elif facets.n_part > 1:
        findings.append(
            Finding(
                "error",
                f"{facets.n_part} parts of the mesh touch at single nodes or edges only",
                "Hardly any heat crosses there: mesh the joint again, or export one body.",
            )
        )
    return findings


def axis_findings(radius: Array) -> list[Finding]:
    """Whether the axis of rotation is where the sense says: at x = 0."""
    least, most = float(radius.min()), float(radius.max())
    if least < 0.0:
        return [
            Finding(
                "error",
                f"nodes lie beyond the axis, down to r = {1e3 * least:.4g} mm",
                "The axis of rotation is x = 0: move the mesh, or cut the half beyond it away.",
            )
        ]
    if 0.0 < least < BORE * most:
        return [
            Finding(
                "warning",
                f"the mesh ends {1e3 * least:.3g} mm beside the axis",
                "That is taken as a bore and cooled: move these nodes to x = 0 if it is none.",
            )
        ]
    return []
