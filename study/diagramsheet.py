"""Transformation diagrams as pictures: lines as a map draws roads, coloured with a dark edge.

A product has the colour it has in every picture; full is its start (1 % of the steel),
dashed its middle, dotted its end. A section's own curves are black.
"""

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label, margin_labels
from midradius.study.diagram import DIFFUSIONAL, PRODUCTS, ZERO_DEGC, Cooling, Isothermal, Soaked
from midradius.study.palette import BLACK, GRID, GUIDE, MARKS, PHASE, PHASE_LABEL
from midradius.study.sectioncurves import SectionCurves, since
from midradius.thermo.arrays import Array
from midradius.thermo.conversion import hv_to_hrc

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_DASHES = ("solid", (0, (4, 1.6)), (0, (1, 1.2)))  # start, middle, end
_WIDTHS = (2.4, 1.5, 1.9)
_PARTS = ("start: 1 % of the steel", "half of the product", "99 % of the product")
_OWN_DASHES = ("solid", (0, (7, 2)), (0, (2, 1.5)), (0, (7, 2, 1.5, 2)))
_NAMED_TIMES = ((60.0, "1 min"), (3600.0, "1 h"), (86_400.0, "1 d"))
_ROOM_DEGC = 20.0
_SHOWN_RATES = tuple(r * 10.0**d for d in (2, 1, 0, -1, -2, -3) for r in (3.0, 1.0))
_FEWEST_SHOWN = 6
_MOST_SHOWN = 9


def isothermal_picture(
    metal: Soaked, diagram: Isothermal, curves: SectionCurves | None
) -> "Figure":
    """Temperature of the hold against the logarithm of time."""
    ends = [t for name in DIFFUSIONAL for t in (_known(diagram.times[name]),) if t.size]
    first = min((float(t.min()) for t in ends), default=1.0)
    last = max((float(t.max()) for t in ends), default=1e4)
    figure, axes = _sheet(metal, "isothermal transformation", height=7.0)
    axes.set_xlim(10.0 ** np.floor(np.log10(0.2 * first)), 10.0 ** np.ceil(np.log10(last)))
    degc = diagram.temp - ZERO_DEGC
    for name in DIFFUSIONAL:
        for k in (2, 1, 0):
            _road(axes, diagram.times[name][k], degc, name, k)
        _name_start(axes, diagram.times[name][0], degc, name)
    _measured_points(axes, metal)
    low = metal.critical["Ms"] - ZERO_DEGC
    rate = _martensite_rate(metal)
    for share in (0.5, 0.9):
        temp = low + np.log(1.0 - share) / rate
        if temp > 0.0:
            axes.axhline(temp, color=PHASE["martensite"], lw=1.2, ls=(0, (4, 1.6)), zorder=1)
            axes.text(
                0.985,
                temp + 4.0,
                f"{100 * share:.0f} % martensite, cooled to here",
                transform=axes.get_yaxis_transform(),
                fontsize=SMALL,
                color=PHASE["martensite"],
                ha="right",
            )
    axes.set_ylim(0.0, metal.top - ZERO_DEGC + 45.0)
    own = f"; section: time below {metal.top - ZERO_DEGC:.0f} °C" if curves else ""
    axes.set_xlabel(f"time at temperature [s]{own}", fontsize=SIZE)
    _finish(figure, axes, metal, curves)
    return figure


def _measured_points(axes: "Axes", metal: Soaked) -> None:
    """The points that measured curves were drawn through, in the colour of their product."""
    measured = metal.kinetics.measured
    every = measured.points if measured else ()
    for name in DIFFUSIONAL:
        points = [(time, temp) for own, temp, time, _ in every if own == name]
        if points:
            time, temp = np.array(points).T
            axes.plot(
                *(time, temp - ZERO_DEGC),
                ls="none",
                marker="o",
                ms=4.5,
                mfc=PHASE[name],
                mec=BLACK,
                mew=0.7,
                zorder=5,
            )


def cooling_picture(metal: Soaked, diagram: Cooling, curves: SectionCurves | None) -> "Figure":
    """Constant cooling rates, what forms along them, and the hardness they leave."""
    figure, axes = _sheet(metal, "transformation on continuous cooling", height=8.0)
    fall = metal.top - ZERO_DEGC - _ROOM_DEGC
    shown = shown_rates(diagram)
    span = np.geomspace(1.0, fall, 200)
    axes.set_xlim(
        10.0 ** np.floor(np.log10(20.0 / shown[0])),
        10.0 ** np.ceil(np.log10(1.4 * fall / shown[-1])),
    )
    for rate in shown:
        axes.plot(span / rate, metal.top - ZERO_DEGC - span, color=GUIDE, lw=0.7, zorder=1.5)
    for name in PRODUCTS:
        for k in (2, 1, 0):
            temp = diagram.temps[name][k]
            if name == "martensite" and k > 0:
                continue
            with np.errstate(invalid="ignore", divide="ignore"):
                _road(axes, (metal.top - temp) / diagram.rate, temp - ZERO_DEGC, name, k)
        temp = diagram.temps[name][0]
        _name_start(axes, (metal.top - temp) / diagram.rate, temp - ZERO_DEGC, name)
    _foot(axes, diagram, shown, fall)
    axes.set_ylim(-175.0, metal.top - ZERO_DEGC + 45.0)
    axes.set_yticks([t for t in range(0, 1200, 100) if t < metal.top - ZERO_DEGC + 45.0])
    top = metal.top - ZERO_DEGC
    axes.set_xlabel(
        f"time below {top:.0f} °C [s]; thin lines: constant cooling rate", fontsize=SIZE
    )
    _finish(figure, axes, metal, curves)
    return figure


def shown_rates(diagram: Cooling) -> list[float]:
    """Round rates [K/s], falling, around those at which something changes."""
    known = [rate for rate in diagram.critical.values() if np.isfinite(rate)]
    if not known:
        return list(_SHOWN_RATES[:_MOST_SHOWN])
    fast, slow = 3.5 * max(known), min(known) / 3.5
    first = next((k for k, rate in enumerate(_SHOWN_RATES) if rate <= fast), 0)
    count = sum(slow <= rate <= fast for rate in _SHOWN_RATES)
    return list(_SHOWN_RATES[first : first + min(max(count, _FEWEST_SHOWN), _MOST_SHOWN)])


def at_rates(diagram: Cooling, values: Array, rates: Sequence[float]) -> Array:
    """Values along the drawn rates at others, straight in the logarithm, (n_rate,)."""
    asked, given = -np.log(np.asarray(rates)), -np.log(diagram.rate)
    return np.asarray(np.interp(asked, given, values))


def _sheet(metal: Soaked, kind: str, *, height: float) -> "tuple[Figure, Axes]":
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH_INCH, height), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots()
    left = metal.austenite
    figure.suptitle(
        f"{label(metal.steel.name)}, {kind}\n{metal.soak_temp - ZERO_DEGC:.0f} °C, "
        f"{metal.soak_time / 60.0:.3g} min; {left.carbon_pct:.2f} % C in solution, "
        f"grain ASTM {left.grain_astm:.1f}",
        fontsize=SIZE + 1.5,
    )
    axes.set_xscale("log")
    axes.grid(color=GRID, lw=0.6)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=SMALL)
    axes.set_ylabel("temperature [°C]", fontsize=SIZE)
    return figure, axes


def _road(axes: "Axes", x: Array, y: Array, product: str, part: int) -> None:
    """A coloured line with a dark edge where it is full: yellow reads on white, too."""
    from matplotlib.patheffects import Normal, Stroke

    width = _WIDTHS[part]
    edge: list[Any] = [Stroke(linewidth=width + 1.3, foreground=GUIDE), Normal()]
    color = PHASE[product] if part == 0 else _darker(PHASE[product])
    (line,) = axes.plot(x, y, color=color, ls=_DASHES[part], lw=width, zorder=3 - 0.2 * part)
    if part == 0:
        line.set_path_effects(edge)


def _darker(color: str) -> tuple[float, ...]:
    """A dashed line has no edge, so it is darkened to stand on white."""
    from matplotlib.colors import to_rgb

    return tuple(0.78 * channel for channel in to_rgb(color))


def _name_start(axes: "Axes", x: Array, y: Array, product: str) -> None:
    """The product's name at the nose of its start line."""
    from matplotlib.patheffects import withStroke

    inside = np.isfinite(x)
    if not inside.any():
        return
    at = int(np.nanargmin(np.where(inside, x, np.inf)))
    where, shift, side = (float(x[at]), float(y[at])), (-6, 0), "right"
    if where[0] <= axes.get_xlim()[0]:  # a line that comes in from the left, like martensite
        where, shift, side = (axes.get_xlim()[0], where[1]), (6, -10), "left"
    axes.annotate(
        PHASE_LABEL[product],
        where,
        xytext=shift,
        textcoords="offset points",
        ha=side,
        va="center",
        fontsize=SIZE,
        color=BLACK,
        path_effects=[withStroke(linewidth=3.0, foreground="white")],
        zorder=3.6,
    )


def _foot(axes: "Axes", diagram: Cooling, shown: Sequence[float], fall: float) -> None:
    """Rate and final hardness under the end of each thin line."""
    hv = at_rates(diagram, diagram.hardness_hv, shown)
    hrc = hv_to_hrc(hv)
    axes.axhline(0.0, color=BLACK, lw=0.8)
    rows = (
        ("K/s", [f"{rate:g}" for rate in shown]),
        ("HV", [f"{one:.0f}" for one in hv]),
        ("HRC", [f"{one:.0f}" if np.isfinite(one) else "–" for one in hrc]),
    )
    for k, (name, texts) in enumerate(rows):
        y = -30.0 - 50.0 * k
        axes.text(0.012, y, name, transform=axes.get_yaxis_transform(), fontsize=SMALL, va="center")
        for rate, text in zip(shown, texts, strict=True):
            weight = "bold" if name == "HV" else "normal"
            axes.text(
                fall / rate, y, text, fontsize=SMALL, ha="center", va="center", fontweight=weight
            )


def _finish(figure: "Figure", axes: "Axes", metal: Soaked, curves: SectionCurves | None) -> None:
    from matplotlib.lines import Line2D

    top = axes.get_ylim()[1]
    lines = [(t - ZERO_DEGC, f"{n} {t - ZERO_DEGC:.0f} °C") for n, t in metal.critical.items()]
    for temp, _ in lines:
        axes.axhline(temp, color=GUIDE, lw=0.8, ls=(0, (6, 3)), zorder=1)
    margin_labels(axes, lines, gap=0.035 * top)
    handles = [
        Line2D([], [], color=GUIDE, ls=dash, lw=width, label=text)
        for dash, width, text in zip(_DASHES, _WIDTHS, _PARTS, strict=True)
    ]
    handles += _own_curves(axes, metal, curves) if curves else []
    left, right = axes.get_xlim()
    twin = axes.secondary_xaxis("top")
    named = [(t, text) for t, text in _NAMED_TIMES if left < t < right]
    twin.set_xticks([t for t, _ in named], [text for _, text in named], minor=False)
    twin.tick_params(labelsize=SMALL, which="major")
    twin.xaxis.set_minor_locator(_no_ticks())
    figure.legend(
        handles=handles, loc="outside lower center", ncols=3, fontsize=SMALL, frameon=False
    )


def _own_curves(axes: "Axes", metal: Soaked, curves: SectionCurves) -> list[Any]:
    handles = []
    for k, (name, time, temp) in enumerate(since(curves, metal.top)):
        mark = MARKS[k % len(MARKS)]
        inside = (time > axes.get_xlim()[0]) & (temp > ZERO_DEGC)
        every = max(1, int(inside.sum() / 6))
        handles += axes.plot(
            time[inside],
            temp[inside] - ZERO_DEGC,
            color=BLACK,
            ls=_OWN_DASHES[k % len(_OWN_DASHES)],
            lw=1.4,
            marker=mark,
            markevery=(min(3 * k, every), every),
            ms=5,
            mec="white",
            mew=0.6,
            label=f"{label(name)} of the section",
            zorder=3.5,
        )
    return handles


def _no_ticks() -> Any:
    from matplotlib.ticker import NullLocator

    return NullLocator()


def _known(times: Array) -> Array:
    return times[np.isfinite(times)]


def _martensite_rate(metal: Soaked) -> float:
    from midradius.thermo.martensite import rate
    from midradius.thermo.ratesets import martensite_shift

    formula = float(rate(metal.austenite.composition, metal.austenite.carbon_pct))
    return formula + martensite_shift(metal.kinetics, metal.austenite)[1]
