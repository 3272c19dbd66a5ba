"""Three PNG pictures: cooling curves, profile surface to core, hardness over the section.

Drawn on bare `Figure` objects with the Agg canvas: no display, no global state,
no ``pyplot``. 1200 pixels wide. A position has the same colour and dash in
every picture.
"""

import math
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.chart import (
    DPI,
    SIZE,
    SMALL,
    around,
    color_of,
    label,
    line_style,
    margin_labels,
    mark,
    sheet,
    sheets,
)
from midradius.study.palette import (
    BLACK,
    GUIDE,
    MAP,
    PHASE,
    PHASE_LABEL,
)
from midradius.study.result import Result, SectionView
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.conversion import hrc_to_hv
from midradius.thermo.phases import PHASE_NAMES

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

COOLING = "cooling.png"
PROFILE = "profile.png"
SECTION = "section.png"
PACKING = 3  # of zlib's 9: half the time of its default, a tenth more bytes

_BELOW: Any = {
    "loc": "outside lower center",
    "ncols": 2,
    "fontsize": SMALL,
    "frameon": False,
}
_CRITICAL = ("Acm", "Ae3", "Ae1", "Bs", "Ms")
# About evenly apart in the logarithm; those of the second column where there is room.
_ROUND_TIMES = (
    (0.01, "0.01 s", True),
    (0.03, "0.03 s", False),
    (0.1, "0.1 s", True),
    (0.3, "0.3 s", False),
    (1.0, "1 s", True),
    (3.0, "3 s", False),
    (10.0, "10 s", True),
    (30.0, "30 s", False),
    (60.0, "1 min", True),
    (180.0, "3 min", False),
    (600.0, "10 min", True),
    (1800.0, "30 min", False),
    (3600.0, "1 h", True),
    (10_800.0, "3 h", False),
    (36_000.0, "10 h", True),
    (86_400.0, "1 d", False),
    (259_200.0, "3 d", True),
    (864_000.0, "10 d", False),
)
_MOST_TICKS = 10
_LEAST_SHARE = 0.005  # of a constituent: less is thinner than a line


def write_pictures(result: Result, folder: Path) -> tuple[Path, ...]:
    """Draw the pictures into an existing folder and return their paths.

    Temperatures from elsewhere may have no profile and no section to draw; a solid
    has no section.
    """
    drawn = [(COOLING, cooling(result))]
    if len(result.profile.node):
        drawn.append((PROFILE, profile(result)))
    if _flat(result.view):
        drawn.append((SECTION, section(result)))
    for name, figure in drawn:
        _save(figure, folder / name)
    return tuple(folder / name for name, _ in drawn)


def _save(figure: "Figure", path: Path) -> None:
    """Draw once and write; saving a figure lays it out and draws it twice."""
    from matplotlib.image import imsave

    figure.set_dpi(DPI)
    canvas: Any = figure.canvas  # an Agg canvas, of which the library gives no types
    canvas.draw()
    imsave(
        path,
        canvas.buffer_rgba(),
        format="png",
        origin="upper",
        dpi=DPI,
        metadata={"Software": "midradius"},
        pil_kwargs={"compress_level": PACKING},
    )


def cooling(result: Result) -> "Figure":
    """Temperature against time at the named positions."""
    figure, axes = sheet(result, height=5.6)
    times, temps = result.history_times_s, result.history_temp_degC
    start = _first_change(times, temps)
    span = times[-1] / start
    for k, position in enumerate(result.positions):
        axes.plot(times, temps[:, k], label=label(position.name), **line_style(k))
    if span > 50.0:
        axes.set_xscale("log")
        axes.set_xlim(start, times[-1])
        ticks = [tick for tick in _ROUND_TIMES if start <= tick[0] <= times[-1]]
        if len(ticks) > _MOST_TICKS:
            ticks = [tick for tick in ticks if tick[2]]
        axes.set_xticks([t for t, _, _ in ticks], [text for _, text, _ in ticks])
        axes.minorticks_off()
        axes.set_xlabel("time (logarithmic)", fontsize=SIZE)
    else:
        axes.set_xlim(0.0, times[-1])
        axes.set_xlabel("time [s]", fontsize=SIZE)
    top = float(np.max(temps))
    axes.set_ylim(0.0, top * 1.08)
    axes.set_ylabel("temperature [°C]", fontsize=SIZE)
    lines = {n: t for n in _CRITICAL if np.isfinite(t := result.critical_degC.get(n, np.nan))}
    lines = {n: t for n, t in lines.items() if 0.0 < t < top * 1.08}
    for temp in lines.values():
        axes.axhline(temp, color=GUIDE, lw=0.8, ls=(0, (6, 3)), zorder=1)
    margin_labels(axes, [(t, f"{n} {t:.0f} °C") for n, t in lines.items()], gap=0.045 * top)
    _stage_marks(axes, result, top * 1.08)
    figure.legend(**_BELOW)
    return figure


def profile(result: Result) -> "Figure":
    """Hardness and microstructure from the surface to the core."""
    figure, (upper, lower) = sheets(result, height=7.2, rows=2)
    depth, on = result.profile.depth_mm, result.profile.of
    hardness = on(result.hardness_hv)
    before = on(result.hardness_as_quenched_hv)
    if result.tempers:
        upper.plot(depth, before, color=BLACK, lw=0.8, label="as quenched")
        upper.plot(depth, hardness, color=BLACK, lw=2.4, label="tempered")
    else:
        upper.plot(depth, hardness, color=BLACK, lw=1.8)
    on_line = [(k, p, _along(result, p.coordinates_mm)) for k, p in enumerate(result.positions)]
    for k, p, place in on_line:
        if place is None:
            continue
        error = abs(p.hardness_time_error_hv) + abs(p.hardness_grid_error_hv)
        if np.isfinite(error):
            upper.errorbar(
                place, p.hardness_hv, yerr=error, fmt="none", capsize=4, ecolor=color_of(k)
            )
        mark(upper, k, place, p.hardness_hv, label(p.name))
    low, high = around(
        [*hardness, *before, *(p.hardness_hv for _, p, place in on_line if place is not None)],
        least=40.0,
    )
    upper.set_ylim(low, high)
    upper.set_ylabel("hardness [HV]", fontsize=SIZE)
    _rockwell_axis(upper, low, high)
    phases = on(result.phases)
    present = [k for k in range(len(PHASE_NAMES)) if phases[k].max() > _LEAST_SHARE]
    lower.stackplot(
        depth,
        100.0 * phases[present],
        labels=[PHASE_LABEL[PHASE_NAMES[k]] for k in present],
        colors=[PHASE[PHASE_NAMES[k]] for k in present],
        edgecolor="white",
        lw=0.6,
    )
    lower.set_ylim(0.0, 100.0)
    lower.set_ylabel("mass fraction [%]", fontsize=SIZE)
    lower.set_xlabel(f"depth below the surface [mm], {result.profile.label}", fontsize=SIZE)
    for axes in (upper, lower):
        axes.set_xlim(float(depth.min()), float(depth.max()))
    lower.legend(
        loc="upper left", bbox_to_anchor=(1.01, 1.02), reverse=True, fontsize=SMALL, frameon=False
    )
    figure.legend(*upper.get_legend_handles_labels(), **_BELOW)
    return figure


def section(result: Result) -> "Figure":
    """Hardness over the drawing of the part."""
    from matplotlib.tri import Triangulation

    view = result.view
    first, second = _plane(view.points_mm)
    x, y = view.points_mm[:, first], view.points_mm[:, second]
    slender = float(np.ptp(y) / np.ptp(x))  # height over width of the drawing
    flat = slender < 0.6
    figure, axes = sheet(result, height=2.6 + 5.6 * slender if flat else 6.4, drawing=True)
    hardness = result.hardness_hv[view.node]
    low, high = around(hardness, least=10.0, margin=0.0)
    drawn = axes.tripcolor(
        Triangulation(x, y, _triangles(view)),
        hardness,
        shading="gouraud",
        cmap=MAP,
        vmin=low,
        vmax=high,
        rasterized=True,
    )
    for k, p in enumerate(result.positions):
        mark(
            axes,
            k,
            *_place_of(result, p.coordinates_mm),
            f"{label(p.name)}: {p.hardness_hv:.0f} HV",
        )
    axes.set_aspect("equal")
    axes.grid(visible=False)
    _name_axes(axes, result.sense)
    bar = figure.colorbar(
        drawn,
        ax=axes,
        location="bottom" if flat else "right",
        shrink=0.6 if flat else 0.9,
        aspect=30 if flat else 20,
        pad=0.03,
    )
    bar.set_label("hardness [HV]", fontsize=SIZE)
    bar.ax.tick_params(labelsize=SMALL)
    figure.legend(**_BELOW)
    return figure


def _name_axes(axes: "Axes", sense: str) -> None:
    """Axis names of the drawing; a slab has no end, so only its thickness has a scale."""
    axes.set_xlabel("radius [mm]" if sense == "axisymmetric" else "x [mm]", fontsize=SIZE)
    if sense == "axisymmetric":
        axes.xaxis.set_major_formatter(lambda value, _: f"{abs(value):g}")
    if sense == "slab":
        axes.set_yticks([])
    else:
        axes.set_ylabel("z [mm]" if sense == "axisymmetric" else "y [mm]", fontsize=SIZE)


def _along(result: Result, coordinates_mm: tuple[float, ...]) -> float | None:
    """Depth of a place along the line of the profile [mm]; None if it lies elsewhere."""
    line = result.profile.of(result.points_mm.T).T
    depth = result.profile.depth_mm
    length = float(np.linalg.norm(line[-1] - line[0]))
    ahead = (line[-1] - line[0]) / length
    away = np.asarray(coordinates_mm) - line[0]
    far = float(away @ ahead)
    if len(coordinates_mm) == 1 and far > length:  # the other half of a slab
        far = 2.0 * length - far
    beside = float(np.linalg.norm(away - (away @ ahead) * ahead))
    if beside > 0.01 * length or not -1e-6 <= far / length <= 1.0 + 1e-6:
        return None
    return float(depth[0]) + far


def _first_change(times: Array, temps: Array) -> float:
    """Left end of a logarithmic time axis: just before any place has gone 3 % of its way."""
    cooled = np.max(np.abs(temps - temps[0]), axis=1) > 0.03 * np.ptp(temps)
    candidates = times[cooled & (times > 0.0)] if cooled.any() else times[times > 0.0]
    time = float(candidates[0])
    decade = 10.0 ** math.floor(math.log10(time))
    return max(s * decade for s in (1.0, 2.0, 5.0) if s * decade <= time * (1.0 + 1e-9))


def _stage_marks(axes: "Axes", result: Result, top: float) -> None:
    """A line where a stage begins; its name above, where there is room for it."""
    from matplotlib.transforms import blended_transform_factory

    left, right = axes.get_xlim()
    logarithmic = axes.get_xscale() == "log"

    def place(time: float) -> float:
        time = min(max(time, left), right)
        if logarithmic:
            return float(np.log(time / left) / np.log(right / left))
        return (time - left) / (right - left)

    for stage in result.stages:
        begin, end = place(stage.start_s), place(stage.end_s)
        if 0.0 < begin < 1.0:
            axes.axvline(stage.start_s, color=GUIDE, lw=0.8, zorder=1)
        medium = stage.medium.replace("degC", "°C")
        full = label(f"{stage.kind}, {medium}" if medium else stage.kind)
        for text in (full, label(stage.kind)):
            if len(text) * 0.0115 < end - begin:
                axes.text(
                    begin + 0.006,
                    top * 0.985,
                    text,
                    transform=blended_transform_factory(axes.transAxes, axes.transData),
                    fontsize=SMALL,
                    va="top",
                    color=GUIDE,
                )
                break


def _rockwell_axis(axes: "Axes", low: float, high: float) -> None:
    marks = np.arange(20.0, 69.0)
    places = np.asarray(hrc_to_hv(marks))
    shown = np.isfinite(places) & (places >= low) & (places <= high)
    marks, places = marks[shown], places[shown]
    if not shown.any():
        return
    step = next(s for s in (1, 2, 5, 10) if len(marks) / s <= 8)
    round_ones = marks % step == 0
    twin = axes.twinx()
    twin.set_ylim(low, high)
    twin.set_yticks(places[round_ones], [f"{m:.0f}" for m in marks[round_ones]])
    twin.tick_params(labelsize=SMALL)
    twin.set_ylabel("hardness [HRC], by conversion", fontsize=SIZE)


def _plane(points_mm: Array) -> tuple[int, int]:
    """The two axes of the drawing: all but the one with the smallest extent."""
    flat = int(np.argmin(np.ptp(points_mm, axis=0)))
    first, second = (k for k in range(3) if k != flat)
    return first, second


def _flat(view: SectionView) -> bool:
    """Whether the view is a sheet of cells that a plane picture can show."""
    if not len(view.quads) + len(view.triangles):
        return False
    extent = np.ptp(view.points_mm, axis=0)
    return bool(extent.min() <= 1e-9 * extent.max())


def _triangles(view: SectionView) -> IntArray:
    halves = np.concatenate([view.quads[:, [0, 1, 2]], view.quads[:, [0, 2, 3]]])
    return np.concatenate([halves, view.triangles.reshape(-1, 3)])


def _place_of(result: Result, coordinates_mm: tuple[float, ...]) -> tuple[float, float]:
    """Where the drawing shows a position: along a radius of a disc, at mid-height of a slab."""
    if len(coordinates_mm) == 3:  # of a mesh that may lie in any plane
        first, second = _plane(result.view.points_mm)
        return coordinates_mm[first], coordinates_mm[second]
    if len(coordinates_mm) > 1:
        return coordinates_mm[0], coordinates_mm[1]
    heights = result.view.points_mm[:, _plane(result.view.points_mm)[1]]
    return coordinates_mm[0], 0.5 * float(heights.min() + heights.max())
