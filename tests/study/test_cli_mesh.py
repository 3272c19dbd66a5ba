"""``midradius mesh`` at the command line."""

import json
import math
from pathlib import Path

import ezdxf
from numpy.testing import assert_allclose


def draw(path: Path, unit: int = 4) -> None:
    document = ezdxf.new()
    document.units = unit
    document.modelspace().add_circle((0, 0), 20.0, dxfattribs={"layer": "rim"})
    document.saveas(path)


def test_a_drawing_becomes_a_mesh_with_its_area_beside_that_of_cad(call, tmp_path: Path) -> None:
    draw(tmp_path / "disc.dxf")
    words = ("mesh", "disc.dxf", "--sense", "plane", "--film", "500 W/(m2 K)")
    answer = call(*words, "--json")
    assert (answer.code, answer.err) == (0, "")
    told = json.loads(answer.out)
    assert_allclose(told["content_of_cad"], math.pi * 0.02**2, rtol=1e-6, atol=0.0)
    assert_allclose(told["content"], math.pi * 0.02**2, rtol=0.01, atol=0.0)
    assert told["zones"] == ["rim"]
    assert (tmp_path / "disc.msh").exists()
    assert "CAD states 12.56637" in call(*words).out


def test_bad_input_is_one_message_and_nothing_is_written(call, tmp_path: Path) -> None:
    draw(tmp_path / "disc.dxf", unit=0)
    for words, said in (
        (("--finest", "1 mm"), "does not state its unit"),
        ((), "--film or --finest = not given"),
        (("--finest", "1 mm", "--film", "500 W/(m2 K)"), "both given"),
        (("--finest", "1 mm", "--out", "disc.vtu"), "ends with .msh"),
        (("--finest", "1 mm", "--normal", "0, 1, 0"), "both given, or neither"),
        (("--finest", "1 mm", "--point", "0 mm", "--normal", "0, 1, 0"), "three lengths"),
        (("--finest", "1 mm", "--point", "0, 0, 0 mm", "--normal", "up"), "three numbers"),
    ):
        answer = call("mesh", "disc.dxf", "--sense", "plane", *words)
        assert answer.code == 2, answer
        assert said in answer.err
        assert answer.out == ""
    assert [path.name for path in tmp_path.iterdir()] == ["disc.dxf"]
