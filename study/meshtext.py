"""A mesh in words for the one who writes its case: surface zones and where they lie."""

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from midradius.fem.meshfile import MeshInput

AXES = {"plane": "xy", "axisymmetric": "rz", "solid": "xyz"}
GROUP = "group "  # what marks the arrays that the file's groups became


def described_mesh(mesh: "MeshInput") -> tuple[str, ...]:
    """Lines: the mesh, each zone with its place [mm], what is insulated, other groups, findings."""
    lines = [f"mesh {mesh.text}"]
    width = max(len(name) for name in mesh.zones)
    n_facet = len(mesh.facets)
    for k, name in enumerate(mesh.zones):
        here = mesh.facet_zone == k
        lines.append(
            f"  zone {name:{width}}  {_where(mesh, here)}; {_count(mesh, int(here.sum()))}"
        )
    insulated = mesh.facet_zone < 0
    if insulated.any():
        count = f"{_count(mesh, int(insulated.sum()))} of {n_facet}"
        lines.append(f"  insulated (symmetry, axis)  {_where(mesh, insulated)}; {count}")
    others = [
        name.removeprefix(GROUP)
        for name in (*mesh.cell_data, *mesh.point_data)
        if name.startswith(GROUP)
    ]
    inside = [name for name in dict.fromkeys(others) if name not in mesh.zones]
    if inside:
        lines.append(f"  other groups: {', '.join(inside)}")
        lines.append(
            "  One of these that lies on the boundary becomes a zone where faces names it."
        )
    if len(mesh.zones) > 1:
        example = f'faces = {{ "{mesh.zones[0]}" = "still air" }}'
        lines.append(f"  A zone takes a medium of its own in a stage: {example}.")
    lines += [f"  {finding.text}" for finding in mesh.findings]
    return tuple(lines)


def _where(mesh: "MeshInput", here: "np.ndarray[tuple[int, ...], np.dtype[np.bool_]]") -> str:
    corners = mesh.facets[here]
    points = 1e3 * mesh.points[np.unique(corners[corners >= 0])]
    low, high = points.min(axis=0), points.max(axis=0)
    size = 1e3 * float(np.ptp(mesh.points, axis=0).max())
    spans = []
    for axis, a, b in zip(AXES[mesh.sense], low, high, strict=True):
        a, b = (0.0 if abs(x) < 1e-9 * size else float(x) for x in (a, b))
        flat = b - a < 1e-9 * size
        spans.append(f"{axis} = {a:.5g}" if flat else f"{axis} {a:.5g} to {b:.5g}")
    return ", ".join(spans) + " mm"


def _count(mesh: "MeshInput", n: int) -> str:
    word = "face" if mesh.sense == "solid" else "edge"
    return f"{n} {word}" + ("" if n == 1 else "s")
