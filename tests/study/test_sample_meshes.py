"""The sample meshes of ``meshes/``: small, whole, with the zones that their cases name."""

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.meshguard import read_mesh
from midradius.fem.outlinedxf import read_dxf

MESHES = Path(__file__).resolve().parents[2] / "meshes"
ZONES = {
    "stepped-shaft": {"axis", "body", "end", "side"},
    "gear-blank": {"body", "bore", "faces", "rim"},
    "forged-hub": {"body", "bore", "bottom", "outside"},
    "crane-rail": {"body", "foot", "head", "side"},
    "bracket": {"base", "body", "holes", "surface"},
}


@pytest.mark.parametrize("name", ZONES)
def test_a_sample_is_small_and_has_its_zones(name: str) -> None:
    path = MESHES / f"{name}.msh"
    assert path.stat().st_size < 300_000
    assert set(read_mesh(path).groups) == ZONES[name]
    assert path.with_suffix(".toml").is_file()


def test_the_mesh_of_the_rail_fills_its_drawing() -> None:
    drawing = read_dxf(MESHES / "crane-rail.dxf").outline
    mesh = read_mesh(MESHES / "crane-rail.msh")
    triangles = np.concatenate([block for kind, block in mesh.cells if kind == "triangle"])
    a, b, c = (mesh.points[triangles[:, k]] for k in range(3))
    area = 0.5 * np.linalg.norm(np.cross(b - a, c - a), axis=1).sum()
    assert_allclose(area, drawing.area, rtol=1e-3, atol=0.0)
