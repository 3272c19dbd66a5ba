"""A measured diagram beside the computed heat: in words, as table, document and picture."""

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label
from midradius.study.diagramfit import SCATTER, ZERO_DEGC, DiagramFit
from midradius.study.measureddiagram import Point
from midradius.study.palette import BLACK, GRID, GUIDE, PURPLE

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

POINTS_TABLE, POINTS_PICTURE = "calibration-points.csv", "calibration-points.png"
_HEADS = (
    *("file", "line", "kind", "hold_degC", "rate_K_per_s", "product", "fraction", "unit"),
    *("measured", "used_in_fit", "before", "after"),
)
_KINDS = {
    "held": ("times of holds", "s"),
    "cooled": ("temperatures in cooling", "degC"),
    "hardness": ("final hardness", "HV"),
}


def points_text(drawn: DiagramFit) -> str:
    """How many points of which kinds are in the fit."""
    kinds = [p.kind for p, used in zip(drawn.measured.points, drawn.used, strict=True) if used]
    counts = [f"{kinds.count(kind)} {said}" for kind, (said, _) in _KINDS.items() if kind in kinds]
    return f"{drawn.measured.name}: {', '.join(counts) if counts else 'no point of use'}"


def deviation_texts(drawn: DiagramFit) -> list[str]:
    """Root mean square deviations before and after; of times as a factor."""
    lines = []
    for kind, (before, after) in drawn.deviation.items():
        said = _KINDS[kind][0]
        if kind == "held":
            lines.append(
                f"{said} by a factor {math.exp(before):.2f} before, {math.exp(after):.2f} after"
            )
        else:
            unit = "K" if kind == "cooled" else "HV"
            lines.append(f"{said} {before:.1f} {unit} before, {after:.1f} after")
    return lines


def table_lines(diagrams: Sequence[DiagramFit]) -> list[str]:
    """A table for the terminal."""
    lines = [f"{'at':>14} {'what':>18}   measured     before      after"]
    for drawn in diagrams:
        for k, p in enumerate(drawn.measured.points):
            at = f"{p.at - ZERO_DEGC:.0f} degC" if p.kind == "held" else f"{p.at:.3g} K/s"
            what = "hardness" if p.kind == "hardness" else f"{p.product} {_fraction(p)}"
            unit = _KINDS[p.kind][1]
            values = [_shown(p, value) for value in (p.value, drawn.before[k], drawn.after[k])]
            cells = " ".join(f"{v:>10}" for v in values)
            said = "" if drawn.used[k] else "   left out"
            lines.append(f"{at:>14} {what:>18} {cells} {unit}{said}")
    return lines


def point_rows(diagrams: Sequence[DiagramFit]) -> Iterable[Sequence[object]]:
    """Rows of the CSV file, heads first; the unit of a row stands in its own column."""
    yield list(_HEADS)
    for drawn in diagrams:
        for record in diagram_document(drawn)["points"]:
            yield ["" if record[head] is None else record[head] for head in _HEADS]


def diagram_document(drawn: DiagramFit) -> dict[str, Any]:
    """One diagram for JSON; None where the computed heat never gets there."""
    points = []
    for k, p in enumerate(drawn.measured.points):
        before, after = (_plain(p, float(v)) for v in (drawn.before[k], drawn.after[k]))
        points.append(
            {
                "file": drawn.measured.name,
                "line": p.line,
                "kind": p.kind,
                "hold_degC": round(p.at - ZERO_DEGC, 6) if p.kind == "held" else None,
                "rate_K_per_s": None if p.kind == "held" else p.at,
                "product": p.product,
                "fraction": _fraction(p),
                "unit": _KINDS[p.kind][1],
                "measured": _plain(p, p.value),
                "used_in_fit": bool(drawn.used[k]),
                "before": before,
                "after": after,
            }
        )
    return {
        "file": drawn.measured.name,
        "deviation": {
            kind: {"before": before, "after": after, "scatter": SCATTER[kind]}
            for kind, (before, after) in drawn.deviation.items()
        },
        "points": points,
    }


def points_picture(steel: str, diagrams: Sequence[DiagramFit]) -> "Figure":
    """Measured points, and where the computed heat has them before and after."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    kinds = [kind for kind in _KINDS if any(kind in drawn.deviation for drawn in diagrams)]
    height = 1.2 + 3.0 * max(len(kinds), 1)
    figure = Figure(figsize=(WIDTH_INCH, height), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    names = " and ".join(drawn.measured.name for drawn in diagrams)
    title = f"{steel}, calibrated to {names}"
    figure.suptitle(label(title if len(title) <= 90 else title[:88] + " …"), fontsize=SIZE + 1.5)
    panels = figure.subplots(max(len(kinds), 1), 1, squeeze=False)[:, 0]
    for axes, kind in zip(panels, kinds, strict=False):
        _panel(axes, kind, diagrams)
    panels[0].legend(fontsize=SMALL, frameon=True, edgecolor="white", framealpha=0.9)
    return figure


def _panel(axes: "Axes", kind: str, diagrams: Sequence[DiagramFit]) -> None:
    axes.grid(color=GRID, lw=0.6)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=SMALL)
    axes.set_xscale("log")
    rows = [
        (p.at, p.value, drawn.before[k], drawn.after[k], drawn.used[k])
        for drawn in diagrams
        for k, p in enumerate(drawn.measured.points)
        if p.kind == kind
    ]
    at, *values, used = (np.array(column, dtype=np.float64) for column in zip(*rows, strict=True))
    is_used = used > 0.0
    drawn_at = at - ZERO_DEGC if kind == "held" else at
    looks = (
        ("measured", "o", BLACK, "white"),
        ("computed before", "x", PURPLE, PURPLE),
        ("computed after", "+", BLACK, BLACK),
    )
    for value, (said, mark, color, fill) in zip(values, looks, strict=True):
        shown = value - ZERO_DEGC if kind == "cooled" else value
        where = (shown, drawn_at) if kind == "held" else (drawn_at, shown)
        axes.plot(*where, mark, color=color, mfc=fill, ms=6, label=said)
        if said == "measured" and not is_used.all():
            left_out = [column[~is_used] for column in where]
            axes.plot(*left_out, "s", color=GUIDE, ms=8, mfc="none", label="left out")
    if kind == "held":
        axes.set_xlabel("time [s]", fontsize=SIZE)
        axes.set_ylabel("hold [degC]", fontsize=SIZE)
        return
    axes.set_xlabel("cooling rate [K/s]", fontsize=SIZE)
    said = "temperature [degC]" if kind == "cooled" else "hardness [HV]"
    axes.set_ylabel(said, fontsize=SIZE)


def _plain(point: Point, value: float) -> float | None:
    if not math.isfinite(value):
        return None
    return value - ZERO_DEGC if point.kind == "cooled" else value


def _shown(point: Point, value: float) -> str:
    plain = _plain(point, float(value))
    if plain is None:
        return "-"
    return f"{plain:.3g}" if point.kind == "held" else f"{plain:.0f}"


def _fraction(point: Point) -> str:
    return f"{100.0 * point.fraction:g}" if isinstance(point.fraction, float) else point.fraction
