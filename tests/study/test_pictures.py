"""The pictures: right size, units on axes, labels apart, colours told apart."""

import struct
import subprocess
import sys
from dataclasses import replace
from itertools import combinations, pairwise
from pathlib import Path

import matplotlib
import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study import palette
from midradius.study.chart import spread
from midradius.study.pictures import cooling, profile, section, write_pictures
from midradius.study.result import Result
from midradius.thermo.phases import PHASE_NAMES


def test_three_png_of_1200_pixels_width_are_written(tmp_path: Path, result: Result) -> None:
    paths = write_pictures(result, tmp_path)
    assert [p.name for p in paths] == ["cooling.png", "profile.png", "section.png"]
    for path in paths:
        content = path.read_bytes()
        assert content[:8] == b"\x89PNG\r\n\x1a\n"
        assert struct.unpack(">I", content[16:20]) == (1200,)


def test_the_same_result_gives_the_same_bytes(tmp_path: Path, result: Result) -> None:
    first = [p.read_bytes() for p in write_pictures(result, tmp_path)]
    assert [p.read_bytes() for p in write_pictures(result, tmp_path)] == first


def test_a_run_of_one_phase_without_any_crossing_is_drawn(
    tmp_path: Path, slow_result: Result
) -> None:
    assert len(write_pictures(slow_result, tmp_path)) == 3


def test_cooling_curves_show_the_histories_over_a_logarithmic_time(result: Result) -> None:
    (axes,) = cooling(result).axes
    assert axes.get_xscale() == "log"
    assert "°C" in axes.get_ylabel()
    curves = {line.get_label(): line for line in axes.lines}
    for k, p in enumerate(result.positions):
        assert_allclose(curves[p.name].get_ydata(), result.history_temp_degC[:, k], rtol=0, atol=0)
    texts = [text.get_text() for text in axes.texts]
    for name in ("Ae3 762 °C", "Ae1 738 °C", "Ms 331 °C", "quench, mineral oil, agitated"):
        assert name in texts
    assert not any("Acm" in text for text in texts)


def test_the_logarithmic_time_starts_before_anything_is_to_be_seen(result: Result) -> None:
    (axes,) = cooling(result).axes
    start = axes.get_xlim()[0]
    before = result.history_temp_degC[result.history_times_s <= start]
    # nothing has gone 3 % of the way from 860 to 60 degC yet
    assert 0.0 < start <= 45.0
    assert np.all(before > 860.0 - 0.03 * 800.0)


def test_a_short_run_is_drawn_over_linear_seconds(result: Result) -> None:
    short = replace(
        result,
        history_times_s=np.linspace(0.0, 30.0, 11),
        history_temp_degC=np.linspace(860.0, 60.0, 11)[:, None].repeat(4, axis=1),
    )
    (axes,) = cooling(short).axes
    assert axes.get_xscale() == "linear"
    assert axes.get_xlabel() == "time [s]"


def drawn_texts(figure):
    """(text, box in pixels) of all that can be read, as drawn."""
    figure.canvas.draw()
    renderer = figure.canvas.get_renderer()
    beyond = set()
    for axes in figure.axes:
        for axis in (axes.xaxis, axes.yaxis):
            low, high = sorted(axis.get_view_interval())
            for tick in (*axis.get_major_ticks(), *axis.get_minor_ticks()):
                if not low <= tick.get_loc() <= high:  # kept by matplotlib, not drawn
                    beyond |= {tick.label1, tick.label2}
    texts = figure.findobj(matplotlib.text.Text)
    shown = [t for t in texts if t.get_visible() and t.get_text().strip() and t not in beyond]
    # of an annotation without its leader line
    boxes = [(t.get_text(), matplotlib.text.Text.get_window_extent(t, renderer)) for t in shown]
    return [(text, box) for text, box in boxes if box.width > 0]


@pytest.mark.parametrize("draw", [cooling, profile, section])
@pytest.mark.parametrize("which", ["result", "tempered_result"])
def test_no_two_texts_overlap_and_none_leaves_the_sheet(draw, which: str, request) -> None:
    result = request.getfixturevalue(which)
    close = {"Ae3": 745.0, "Ae1": 741.0, "Acm": 743.0, "Ms": 331.0}
    ends = [0.0, 45.0, 47.0, 120.0, 300.0, 2000.0, 9045.0]
    route = tuple(
        replace(result.stages[1], start_s=begin, end_s=end) for begin, end in pairwise(ends)
    )
    figure = draw(replace(result, critical_degC=close, stages=route))
    texts = drawn_texts(figure)
    assert len(texts) > 15
    for text, box in texts:
        assert figure.bbox.x0 <= box.x0 <= box.x1 <= figure.bbox.x1, text
        assert figure.bbox.y0 <= box.y0 <= box.y1 <= figure.bbox.y1, text
    for (one, a), (other, b) in combinations(texts, 2):
        overlap_x = min(a.x1, b.x1) - max(a.x0, b.x0)
        overlap_y = min(a.y1, b.y1) - max(a.y0, b.y0)
        assert overlap_x <= 0 or overlap_y <= 0, (one, other)


def test_profile_has_hardness_above_and_all_phases_below(result: Result) -> None:
    upper, lower = profile(result).axes[:2]
    assert upper.get_ylabel() == "hardness [HV]"
    assert lower.get_xlabel().startswith("depth below the surface [mm]")
    labels = [text.get_text() for text in lower.get_legend().get_texts()]
    # cementite is absent everywhere, so it has no entry
    assert labels == ["martensite", "bainite", "pearlite", "ferrite", "retained austenite"]
    assert_allclose(upper.lines[0].get_ydata(), result.hardness_hv[::-1], rtol=0, atol=0)


def test_profile_of_a_tempered_part_draws_it_bold_over_the_thin_line_as_quenched(
    tempered_result: Result,
) -> None:
    upper = profile(tempered_result).axes[0]
    before, after = upper.lines[:2]
    assert (before.get_label(), after.get_label()) == ("as quenched", "tempered")
    assert before.get_linewidth() < 0.5 * after.get_linewidth()
    hardness = tempered_result.hardness_hv[::-1]
    assert_allclose(after.get_ydata(), hardness, rtol=0, atol=0)
    assert_allclose(before.get_ydata(), hardness / 0.8, rtol=1e-15, atol=0)
    low, high = upper.get_ylim()
    assert low < hardness.min() and (hardness / 0.8).max() < high


def test_profile_marks_only_places_on_its_line_each_at_its_depth_along_it(result: Result) -> None:
    upper = profile(result).axes[0]
    marks = {line.get_label(): line.get_xdata()[0] for line in upper.lines[1:]}
    for p in result.positions:
        assert_allclose(marks.pop(p.name), p.depth_mm, rtol=0, atol=1e-9)
    # a disc: 30 mm from its face but 150 mm from the rim, and a place beside the line
    half = np.column_stack([result.points_mm[:, 0], np.full(result.n_node, 30.0)])
    core = replace(result.positions[3], depth_mm=30.0, coordinates_mm=(0.0, 30.0))
    face = replace(result.positions[0], name="face", coordinates_mm=(0.0, 0.0))
    disc = replace(result, points_mm=half, sense="axisymmetric", positions=(core, face))
    upper = profile(disc).axes[0]
    marks = {line.get_label(): line.get_xdata()[0] for line in upper.lines[1:]}
    assert marks.keys() >= {"core"} and "face" not in marks
    assert_allclose(marks["core"], 150.0, rtol=0, atol=1e-9)


@pytest.mark.parametrize(
    ("sense", "names"),
    [
        ("cylinder", ("x [mm]", "y [mm]")),
        ("plane", ("x [mm]", "y [mm]")),
        ("slab", ("x [mm]", "")),
        ("axisymmetric", ("radius [mm]", "z [mm]")),
    ],
)
def test_section_names_its_axes_as_the_part_has_them(
    result: Result, sense: str, names: tuple[str, str]
) -> None:
    axes = section(replace(result, sense=sense)).axes[0]
    assert (axes.get_xlabel(), axes.get_ylabel()) == names
    (left,) = axes.xaxis.get_major_formatter().format_ticks([-50.0])
    assert left == ("50" if sense == "axisymmetric" else "\N{MINUS SIGN}50")


def test_section_marks_each_position_where_its_depth_says(result: Result) -> None:
    axes = section(result).axes[0]
    marks = {line.get_label().split(":")[0]: line.get_xydata()[0] for line in axes.lines}
    assert marks.keys() == {p.name for p in result.positions}
    for p in result.positions:
        assert_allclose(marks[p.name], [150.0 - p.depth_mm, 0.0], rtol=0, atol=1e-9)


def test_section_marks_two_coordinates_where_they_are(result: Result) -> None:
    moved = replace(result.positions[0], coordinates_mm=(30.0, 40.0))
    axes = section(replace(result, positions=(moved,))).axes[0]
    assert_allclose(axes.lines[0].get_xydata()[0], [30.0, 40.0], rtol=0, atol=0)


def test_text_from_the_case_is_drawn_as_it_stands(tmp_path: Path, result: Result) -> None:
    named = replace(result.positions[0], name=r"_$\frac{1$ \x")
    odd = replace(result, title="100 $ a $ piece\x1b[31m", positions=(named,))
    odd = replace(odd, history_temp_degC=result.history_temp_degC[:, :1])
    assert len(write_pictures(odd, tmp_path)) == 3


def test_colours_are_those_of_the_published_set() -> None:
    sequences = getattr(matplotlib, "color_sequences", {})
    if "okabe_ito" not in sequences:
        pytest.skip("this matplotlib ships no copy of the set")
    published = {matplotlib.colors.to_hex(color).upper() for color in sequences["okabe_ito"]}
    assert set(palette.PHASE.values()) | set(palette.LINES) <= published
    assert palette.PHASE.keys() == palette.PHASE_LABEL.keys() == set(PHASE_NAMES)
    assert len(set(palette.PHASE.values())) == len(PHASE_NAMES)


def test_crowded_labels_are_moved_apart_and_lonely_ones_stay() -> None:
    assert_allclose(spread([10.0, 50.0], 5.0), [10.0, 50.0], rtol=0, atol=0)
    assert_allclose(spread([10.0, 10.0], 4.0), [8.0, 12.0], rtol=0, atol=1e-9)
    placed = spread([1.0, 1.1, 1.2, 1.3, 9.0], 1.0)
    assert np.all(np.diff(placed) >= 1.0 - 1e-6)


def test_importing_loads_no_heavy_library_and_drawing_no_pyplot() -> None:
    code = (
        "import sys\n"
        "import midradius.study.pictures, midradius.study.archive, midradius.study.summary\n"
        "import midradius.study.tables, midradius.study.folder, midradius.study.chart\n"
        "heavy = {'matplotlib', 'meshio', 'h5py', 'rich', 'pyvista', 'vtk'} & set(sys.modules)\n"
        "assert not heavy, heavy\n"
    )
    subprocess.run([sys.executable, "-c", code], check=True)
    source = Path(palette.__file__).parent
    for name in ("chart.py", "pictures.py"):
        assert "import pyplot" not in (source / name).read_text(encoding="utf-8")
