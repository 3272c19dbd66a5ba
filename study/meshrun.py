"""What a run on a mesh adds: where it starts, what it states of its mesh.

Level 1 (every edge of the file halved) is the answer where it is not too large:
its difference from the mesh itself is three times its own error. A mesh that is
too large for that is solved as it is, and its grid error is stated as not measured.
"""

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from midradius.fem.cutting import AnyCut
from midradius.fem.media import ZERO_DEGC
from midradius.fem.meshcut import GROWTH, MeshCut, cut_mesh
from midradius.fem.meshsection import MeshSection
from midradius.fem.route import CoolingStage, History
from midradius.study.result import Verdict
from midradius.thermo.arrays import Array
from midradius.thermo.source import RangeNote

MOST_FIRST: Mapping[int, int] = {2: 40_000, 3: 60_000}  # nodes of level 1
COARSE = 10.0  # K of grid error, from which on the cells are said to be large
OVERSHOT = 0.5  # K beyond the bounds that heat flow alone keeps
ROUNDED = 1e-6  # share of negative conductance that rounding may make
NOT_MEASURED = "error of the grid not measured: numbers are those of the time steps"


def first_level(section: MeshSection) -> MeshCut:
    """The mesh with its edges halved once, or as it is where that is too large."""
    grown = GROWTH[section.n_dim] * section.mesh.n_node
    return cut_mesh(section, 1 if grown <= MOST_FIRST[section.n_dim] else 0)


def mesh_statements(cut: AnyCut, grid_error: float) -> tuple[str, ...]:
    """What a reader must know of a mesh and of how it was solved; nan [K] is not measured."""
    if not isinstance(cut, MeshCut):
        return ()
    mesh = cut.section.mesh
    lines = [f"Mesh: {finding.text}" for finding in mesh.findings]
    if cut.level:
        times = "once" if cut.level == 1 else f"{cut.level} times"
        lines.append(
            f"Mesh: every edge was halved {times} for the answer ({cut.body.n_node} nodes);"
            " results stand at the nodes of the file. Curved outlines are the polygon of the mesh."
        )
    else:
        lines.append(
            "Mesh: too large to be solved on a finer one as well; its grid error is not measured."
        )
    if grid_error > COARSE:
        lines.append(
            f"Mesh: the error of the grid, {grid_error:.2g} K, is the largest of all nodes and"
            " times, as a rule near the cooled surface when the quench begins. Smaller cells there"
            " lower it; how far it moves the hardness is stated beside the results."
        )
    if cut.n_turned:
        lines.append(
            f"Mesh: {cut.n_turned} edges between obtuse triangles were turned for the conduction,"
            " so that no heat flows towards the hotter node; nodes and cells stay as they are."
        )
    insulated = int((mesh.facet_zone < 0).sum())
    if insulated:
        lines.append(f"Mesh: {insulated} facets on symmetry or on the axis are insulated.")
    lines.append(
        "Mesh: depths count from the nearest cooled surface; the core is the deepest point,"
        f" {_shown(cut.section.core)}, the profile runs to it from the nearest surface."
    )
    return tuple(lines)


def with_grid(verdicts: tuple[Verdict, ...], *, measured: bool) -> tuple[Verdict, ...]:
    """Verdicts that say so where the grid error behind them is not known."""
    if measured:
        return verdicts
    return tuple(
        replace(v, note="; ".join(part for part in (v.note, NOT_MEASURED) if part))
        for v in verdicts
    )


def _shown(point: Array) -> str:
    return "(" + ", ".join(f"{1e3 * x:.4g}" for x in point) + ") mm"


def mesh_notes(
    cut: AnyCut, history: History, stages: tuple[CoolingStage, ...], start_temp: Array
) -> tuple[RangeNote, ...]:
    """Temperatures beyond what conduction allows, which obtuse cells can make."""
    if not isinstance(cut, MeshCut) or cut.negative <= ROUNDED:
        return ()
    ambient = [
        surface.ambient
        for stage in stages
        for surface in stage.surfaces.values()
        if surface.film.htc.max() > 0.0
    ]
    low = min(float(start_temp.min()), *ambient) - float(history.field.min())
    high = float(history.field.max()) - max(float(start_temp.max()), *ambient)
    over = max(low, high)
    if over <= OVERSHOT:
        return ()
    return (
        RangeNote(
            "conduction on this mesh",
            "temperatures beyond those of bath and start",
            f"{over:.2g} K",
            f"less than {OVERSHOT:g} K (obtuse cells: make the mesh finer and more even"
            f" near the surface; {low_at(history)})",
        ),
    )


def low_at(history: History) -> str:
    """When the field was coldest, for the note."""
    row = int(np.argmin(history.field.min(axis=1)))
    coldest = float(history.field.min()) - ZERO_DEGC
    return f"coldest {coldest:.1f} degC at {history.times[row]:.3g} s"
