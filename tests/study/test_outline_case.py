"""A drawing or a solid of CAD as the section of a case.

Areas are exact geometry of what each test draws.
"""

import subprocess
import sys
from pathlib import Path

import ezdxf
import pytest
from numpy.testing import assert_allclose

from midradius.fem import outline, outlinecache
from midradius.study import casefile
from midradius.study.case import Case
from midradius.study.casemesh import mesh_of

CASE = """
[steel]
grade = "42CrMo4"
[section]
form = "{form}"
file = "{file}"
sense = "{sense}"
{more}
[[route]]
stage = "soak"
at = "860 degC"
time = "2 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
time = "1 min"
"""
SHAFT = """
import sys
import gmsh
gmsh.initialize()
gmsh.option.setNumber("General.Terminal", 0)
gmsh.model.occ.addCylinder(0, 0, 0, 0, 0, 60, 20)
gmsh.model.occ.synchronize()
gmsh.write(sys.argv[1])
gmsh.finalize()
"""


@pytest.fixture(autouse=True)
def kept(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The user's cache, here."""
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    document = ezdxf.new()
    document.units = 4
    document.modelspace().add_circle((0, 0), 20.0, dxfattribs={"layer": "rim"})
    document.saveas(tmp_path / "disc.dxf")
    return tmp_path / "cache"


def text_of(file: str = "disc.dxf", sense: str = "plane", more: str = "", form="outline") -> str:
    return CASE.format(form=form, file=file, sense=sense, more=more)


def read(folder: Path, text: str) -> Case:
    return casefile.loads(text, folder / "case.toml")


def test_an_outline_gives_the_mesh_that_the_command_makes(call, tmp_path: Path) -> None:
    direct = read(tmp_path, text_of(more='finest = "2 mm"'))
    assert call("mesh", "disc.dxf", "--sense", "plane", "--finest", "2 mm").code == 0
    beside = read(tmp_path, text_of("disc.msh", more='length_unit = "mm"', form="mesh"))
    assert direct.section.mesh and beside.section.mesh
    assert direct.section.zones == beside.section.zones == ("rim",)
    ours, theirs = mesh_of(direct.section.mesh), mesh_of(beside.section.mesh)
    assert_allclose(ours.points, theirs.points, rtol=0.0, atol=0.0)


def test_the_mesh_of_an_outline_is_told_by_the_name_of_the_drawing(tmp_path: Path) -> None:
    mesh = read(tmp_path, text_of(more='finest = "2 mm"')).section.mesh
    assert mesh is not None
    assert mesh_of(mesh).text.startswith("of disc.dxf, plane, 40 x 40 mm")


def test_a_second_read_does_not_mesh(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    case = read(tmp_path, text_of())
    monkeypatch.setattr(outlinecache, "mesh_outline", None)
    again = read(tmp_path, text_of())
    assert again == case
    assert again.section.mesh and again.section.mesh.outline and case.section.mesh
    assert again.section.mesh.outline.statements == case.section.mesh.outline.statements


def test_a_torn_mesh_is_made_again(tmp_path: Path) -> None:
    case = read(tmp_path, text_of())
    assert case.section.mesh
    whole = case.section.mesh.file.read_bytes()
    case.section.mesh.file.write_bytes(whole[:100])
    read(tmp_path, text_of())
    assert case.section.mesh.file.read_bytes() == whole


def test_a_sliced_solid_comes_back_with_its_own_keys(tmp_path: Path) -> None:
    step = tmp_path / "shaft.step"
    subprocess.run([sys.executable, "-c", SHAFT, str(step)], check=True, timeout=120)
    cut = 'slice = { point = ["0 mm", "0 mm", "0 mm"], normal = [0, 1, 0], axis = [0, 0, 1] }'
    case = read(tmp_path, text_of("shaft.step", "axisymmetric", cut + '\nfinest = "2 mm"'))
    assert case.section.mesh
    assert_allclose(case.section.mesh.high, (0.02, 0.06), rtol=1e-9, atol=0.0)
    told = casefile.dumps(case)
    assert 'form = "outline"' in told
    assert "slice = {" in told
    assert read(tmp_path, told) == case


def test_all_faults_come_together(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(outline.importlib.util, "find_spec", lambda name: None)
    with pytest.raises(casefile.CaseFaults) as caught:
        text = text_of(sense="solid", more='finest = "2"\nwidth = "1 mm"\nlayers = [3]')
        read(tmp_path, text.replace("42CrMo4", "42CrMo99x"))
    said = str(caught.value)
    for words in ("pip install 'midradius[cad]'", "finest", "width", "layers[0]", "grade", "sense"):
        assert words in said, said
