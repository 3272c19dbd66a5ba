"""What every chart shares: the sheet, its heading, line styles, labels that keep apart.

Sheets are `Figure` objects on the Agg canvas, 1200 pixels wide at ``DPI``.
"""

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from midradius.study.palette import DASHES, GRID, GUIDE, LINES, MARKS
from midradius.study.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

DPI = 150
WIDTH_INCH = 8.0
SIZE = 9.5
SMALL = 8.5


def sheet(result: Result, *, height: float, drawing: bool = False) -> "tuple[Figure, Axes]":
    """A sheet with one pair of axes; those of a ``drawing`` have equal scales."""
    figure, (axes,) = sheets(result, height=height, rows=1, drawing=drawing)
    return figure, axes


def sheets(
    result: Result, *, height: float, rows: int, drawing: bool = False
) -> "tuple[Figure, Sequence[Axes]]":
    """A sheet with ``rows`` pairs of axes that share their abscissa."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    layout: Literal["constrained", "compressed"] = "compressed" if drawing else "constrained"
    figure = Figure(figsize=(WIDTH_INCH, height), layout=layout, facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots(rows, 1, sharex=True, squeeze=False)[:, 0]
    figure.suptitle(heading(result), fontsize=SIZE + 1.5)
    for one in axes:
        one.grid(color=GRID, lw=0.6)
        one.set_axisbelow(True)
        one.tick_params(labelsize=SMALL)
    return figure, tuple(axes)


def heading(result: Result) -> str:
    """Title, steel and section, on two lines of at most 90 letters."""
    parts = [label(result.title), f"{label(result.steel)}, {label(result.section)}"]
    return "\n".join(part if len(part) <= 90 else part[:88] + " …" for part in parts if part)


def label(text: str) -> str:
    """Text from a case file, safe to draw."""
    # "$" starts a formula in matplotlib, and a leading "_" hides a legend entry.
    printable = "".join(c if c.isprintable() else "?" for c in text)
    return printable.replace("$", r"\$").lstrip("_")


def color_of(k: int) -> str:
    """The colour of position ``k``, the same in every picture."""
    return LINES[k % len(LINES)]


def line_style(k: int) -> dict[str, Any]:
    """How the line of position ``k`` is drawn."""
    dash = DASHES[(k // len(LINES)) % len(DASHES)]
    return {"color": color_of(k), "ls": dash, "lw": 1.8, "zorder": 2}


def mark(axes: "Axes", k: int, x: float, y: float, label: str) -> None:
    """A marker for position ``k``."""
    shape = MARKS[(k // len(LINES)) % len(MARKS)]
    axes.plot(
        [x],
        [y],
        shape,
        ms=7,
        color=color_of(k),
        mec="white",
        mew=1.0,
        label=label,
        clip_on=False,
        zorder=3,
    )


def around(values: Iterable[float], *, least: float, margin: float = 0.08) -> tuple[float, float]:
    """Limits around the values, at least ``least`` apart, widened by ``margin`` on each side."""
    array = np.asarray(list(values))
    low, high = float(np.nanmin(array)), float(np.nanmax(array))
    wide = max(high - low, least)
    middle = 0.5 * (high + low)
    return middle - wide * (0.5 + margin), middle + wide * (0.5 + margin)


def spread(wanted: Sequence[float], gap: float) -> list[float]:
    """Places at least ``gap`` apart, near the wanted ones (rising order)."""
    placed = list(wanted)
    for _ in range(100):
        for k in range(len(placed) - 1):
            lack = gap - (placed[k + 1] - placed[k])
            if lack > 1e-9:
                placed[k] -= lack / 2.0
                placed[k + 1] += lack / 2.0
    return placed


def margin_labels(axes: "Axes", labels: Sequence[tuple[float, str]], *, gap: float) -> None:
    """Labels right of the axes at heights on the ordinate, at least ``gap`` apart."""
    labels = sorted(labels)
    for (value, text), place in zip(labels, spread([v for v, _ in labels], gap), strict=True):
        axes.annotate(
            text,
            xy=(1.0, value),
            xytext=(1.02, place),
            xycoords=("axes fraction", "data"),
            textcoords=("axes fraction", "data"),
            va="center",
            fontsize=SMALL,
            color=GUIDE,
            arrowprops={"arrowstyle": "-", "color": GUIDE, "lw": 0.6, "shrinkA": 0, "shrinkB": 0},
            annotation_clip=False,
        )
