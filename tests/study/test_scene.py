"""Pictures of the part itself, rendered without a display by a process of its own."""

import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose
from PIL import Image

from midradius.study import scene, scenedraw
from midradius.study.result import Result, SectionView

NAMES = ("hardness.png", "phases.png", "temperature.png", "cooling.gif")


def block(result: Result) -> Result:
    """The invented run on a block of 60 x 40 x 30 mm, hard where x is small."""
    axes = [np.linspace(0.0, side, n) for side, n in ((60.0, 13), (40.0, 9), (30.0, 7))]
    points = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, 3)
    number = np.arange(len(points)).reshape(13, 9, 7)
    starts = ((0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0))
    corners = [(i, j, k + up) for up in (0, 1) for i, j, k in starts]
    cells = np.stack(
        [number[i : i + 12, j : j + 8, k : k + 6].ravel() for i, j, k in corners], axis=1
    )
    node = np.rint((1.0 - points[:, 0] / 60.0) * (result.n_node - 1)).astype(np.int64)
    view = SectionView(points, (("hexahedron", cells),), node)
    return replace(result, view=view, sense="solid", section="mesh, block.msh", positions=())


def colours(path: Path) -> np.ndarray:
    with Image.open(path) as picture:
        return np.asarray(picture.convert("RGB"), dtype=np.int64)


def test_a_flat_part_is_drawn_with_all_its_pictures(tmp_path: Path, result: Result) -> None:
    assert scene.write_scenes(result, tmp_path) == ""
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(NAMES)
    for name in NAMES[:3]:
        assert colours(tmp_path / name).shape[1] == 1200
    with Image.open(tmp_path / "cooling.gif") as film:
        assert 2 <= film.n_frames <= 26
    # the rim of the disc is the hardest: yellow on this map, the middle dark blue
    picture = colours(tmp_path / "hardness.png")
    yellow = (picture[..., 0] > 200) & (picture[..., 1] > 200) & (picture[..., 2] < 90)
    blue = (picture[..., 2] > picture[..., 0] + 60) & (picture[..., 0] < 40)
    assert yellow.mean() > 0.02
    assert blue.mean() > 0.05


def test_a_solid_is_shown_from_outside_and_cut_open(tmp_path: Path, result: Result) -> None:
    assert scene.write_scenes(block(result), tmp_path) == ""
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(NAMES)
    high, wide = colours(tmp_path / "hardness.png").shape[:2]
    assert wide == 1200 and high < 800


def test_pixels_of_the_camera_have_the_length_that_the_bar_states(
    tmp_path: Path, result: Result
) -> None:
    scene._hand_over(result, tmp_path / "scene.npz")
    found = scenedraw.read(tmp_path / "scene.npz")
    camera = scenedraw.Camera(found, {"hardness": found.hardness})
    picture = camera.view("hardness", "cividis", (0.0, 700.0))
    filled = np.flatnonzero((picture < 250).any(axis=(0, 2)))
    # the disc of 300 mm
    width = (filled[-1] - filled[0] + 1) * camera.mm_per_pixel
    # and its outline, two pixels wide and smoothed
    assert_allclose(width, 300.0, rtol=0.0, atol=6.0 * camera.mm_per_pixel)


def test_a_machine_that_cannot_render_gives_one_sentence(tmp_path: Path, result: Result) -> None:
    here = os.environ.get("VTK_DEFAULT_OPENGL_WINDOW")
    os.environ["VTK_DEFAULT_OPENGL_WINDOW"] = "vtkNoSuchWindow"
    try:
        said = scene.write_scenes(result, tmp_path)
    finally:
        os.environ.pop("VTK_DEFAULT_OPENGL_WINDOW")
        if here is not None:
            os.environ["VTK_DEFAULT_OPENGL_WINDOW"] = here
    assert said.startswith("Pictures of the part were not drawn: this machine does not render")
    assert said.endswith("All other results are complete.")
    assert "\n" not in said


def test_drawing_that_takes_too_long_gives_one_sentence(
    tmp_path: Path, result: Result, monkeypatch: pytest.MonkeyPatch
) -> None:
    def late(*args: object, **how: object) -> None:
        raise subprocess.TimeoutExpired("draw", 600.0)

    monkeypatch.setattr(scene.subprocess, "run", late)
    assert "they took more than 10 minutes" in scene.write_scenes(result, tmp_path)


def test_moments_of_the_strip_are_even_in_the_heat_given_off(
    tmp_path: Path, result: Result
) -> None:
    times = np.linspace(0.0, 100.0, 101)
    temps = np.linspace(900.0, 100.0, 101)[:, None] * np.ones(len(result.points_mm))
    even = replace(result, times_s=times, temp_degC=temps)
    scene._hand_over(even, tmp_path / "scene.npz")
    found = scenedraw.read(tmp_path / "scene.npz")
    assert scenedraw._moments(found, 6) == [0, 20, 40, 60, 80, 100]


def test_neither_the_parent_nor_the_import_loads_the_renderer() -> None:
    code = (
        "import sys, midradius.study.scene, midradius.study.scenedraw;"
        "sys.exit('pyvista' in sys.modules or 'vtkmodules' in sys.modules)"
    )
    subprocess.run([sys.executable, "-c", code], check=True)


def test_a_core_on_the_boundary_is_no_place_to_cut_at() -> None:
    points = np.array([[0.0, 0.0, 0.0], [60.0, 40.0, 30.0]])
    found = scene._inside(np.array([45.0, 40.0, 0.0]), points)
    assert_allclose(found, [45.0, 20.0, 15.0], rtol=0.0, atol=1e-12)
