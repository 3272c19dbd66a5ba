"""From a form with dimensions to a grid, its places and a drawing of the part.

Coordinates are the part's own: x from the near face of a slab, r from the axis,
(x, y) from the left bottom corner of a bar, (r, z) from the near end or bottom.
Where both ends of an axis see the same medium only the lower half is solved.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

import numpy as np

from midradius.fem.grids import Axis, axis, halved, line, rectangle
from midradius.fem.place import Line
from midradius.fem.place import Place as Place  # for those who read sections only
from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from midradius.fem.drawing import Drawing

FormName = Literal["slab", "round", "tube", "ball", "bar", "ring"]
FIRST_OVER_FILM = 0.04  # first of 64 cells as a share of k/h, the depth a film acts over
HOT_STEEL_K = 27.0  # W/(m K), any steel near 700 degC, for choosing cells only
SMALLEST_FIRST = 1.0 / 4000.0  # first cell not below this share of the side


@dataclass(frozen=True)
class Span:
    """One direction of the section, from ``low`` to ``high`` [m].

    The zones are None where no surface is (an axis of rotation). ``folded``: both
    ends see the same, so the lower half stands for both.
    """

    name: str
    low: float
    high: float
    low_zone: str | None
    high_zone: str | None
    folded: bool = False

    @property
    def length(self) -> float:
        """Whole length [m]."""
        return self.high - self.low

    @property
    def middle(self) -> float:
        """Half way [m]."""
        return 0.5 * (self.low + self.high)

    @property
    def cooled_low(self) -> bool:
        """Whether the low end is a surface."""
        return self.low_zone is not None


@dataclass(frozen=True)
class Section:
    """A form: its directions and what a unit of it extends over."""

    form: FormName
    spans: tuple[Span, ...]
    sense: Sense
    text: str

    @property
    def zones(self) -> tuple[str, ...]:
        """Names of all surfaces."""
        names = [z for span in self.spans for z in (span.low_zone, span.high_zone)]
        return tuple(name for name in names if name is not None)

    @property
    def whole(self) -> tuple[float, str]:
        """Factor from the solved extent to a whole that a person would name, and its name."""
        folds = 2.0 ** sum(span.folded for span in self.spans)
        factor, name = _WHOLE[self.sense]
        return factor * folds, name

    @property
    def n_dim(self) -> int:
        """How many coordinates a point has."""
        return len(self.spans)

    def trade_place(self, term: str, depth: float | None = None) -> tuple[float, ...]:
        """Coordinates [m] of a trade term; see :func:`trade_place`."""
        return trade_place(self, term, depth)

    def depth_of(self, coordinates: tuple[float, ...]) -> float:
        """Distance [m] to the nearest surface; see :func:`depth_of`."""
        return depth_of(self, coordinates)

    def cooled_by(self, strongest_film: Mapping[str, float]) -> "Section":
        """Depths of a form count from all its surfaces, cooled or not."""
        del strongest_film
        return self

    def folded(self, same: Mapping[tuple[str, str], bool]) -> "Section":
        """The section with each axis folded whose two zones always see the same."""
        spans = tuple(
            replace(
                span,
                folded=bool(
                    span.low_zone and span.high_zone and same.get((span.low_zone, span.high_zone))
                )
                and self.sense in ("slab", "plane", "axisymmetric")
                and span.name != "r",
            )
            for span in self.spans
        )
        return replace(self, spans=spans)


@dataclass(frozen=True)
class Cut:
    """A section cut into cells: the axes and the control volumes made of them."""

    section: Section
    axes: tuple[Axis, ...]
    body: ControlVolumes

    def coarser(self) -> "Cut":
        """The same section with every second node."""
        return _assemble(self.section, tuple(halved(a) for a in self.axes))

    def finer(self, strongest_film: Mapping[str, float], most: int) -> "Cut | None":
        """The same section on twice the cells a side; None beyond ``most`` nodes."""
        cells = tuple(2 * (len(a.nodes) - 1) for a in self.axes)
        if np.prod([count + 1 for count in cells]) > most:
            return None
        return cut(self.section, cells, strongest_film=strongest_film)

    def shared(self, field: Array) -> Array:
        """A field (n_time, n_node) on the nodes that the coarser grid keeps."""
        shape = [len(a.nodes) for a in self.axes]
        every = [slice(None, None, 2)] * len(shape)
        kept = field.reshape(len(field), *shape)[(slice(None), *every)]
        return kept.reshape(len(field), -1)

    def place(self, coordinates: tuple[float, ...]) -> Place:
        """A point [m] of the part; see :func:`place`."""
        return place(self, coordinates)

    def profile(self) -> Line:
        """The line from surface to core; see :func:`profile`."""
        return profile(self)

    def drawing(self) -> "Drawing":
        """The whole part as a mesh to look at."""
        from midradius.fem.drawing import draw  # which knows cuts

        return draw(self)


def slab(thickness: float) -> Section:
    """A plate cooled on two faces; dimensions in m here and below."""
    span = Span("x", 0.0, thickness, "near face", "far face")
    return Section("slab", (span,), "slab", f"slab, {_mm(thickness)} mm thick")


def round_bar(diameter: float, length: float | None = None) -> Section:
    """A round; with a length its ends cool too."""
    radial = Span("r", 0.0, diameter / 2.0, None, "side")
    if length is None:
        return Section("round", (radial,), "cylinder", f"round, diameter {_mm(diameter)} mm")
    axial = Span("z", 0.0, length, "near end", "far end")
    text = f"round, diameter {_mm(diameter)} mm, {_mm(length)} mm long"
    return Section("round", (radial, axial), "axisymmetric", text)


def tube(outside: float, bore: float) -> Section:
    """A long tube by its diameters."""
    span = Span("r", bore / 2.0, outside / 2.0, "bore", "outside")
    return Section(
        "tube", (span,), "cylinder", f"tube, outside {_mm(outside)} mm, bore {_mm(bore)} mm"
    )


def ball(diameter: float) -> Section:
    """A ball."""
    span = Span("r", 0.0, diameter / 2.0, None, "surface")
    return Section("ball", (span,), "ball", f"ball, diameter {_mm(diameter)} mm")


def bar(width: float, height: float) -> Section:
    """A long rectangular bar."""
    spans = (
        Span("x", 0.0, width, "left", "right"),
        Span("y", 0.0, height, "bottom", "top"),
    )
    return Section("bar", spans, "plane", f"bar, {_mm(width)} x {_mm(height)} mm")


def ring(outside: float, bore: float, height: float) -> Section:
    """A ring by its diameters and height."""
    spans = (
        Span("r", bore / 2.0, outside / 2.0, "bore", "outside"),
        Span("z", 0.0, height, "bottom", "top"),
    )
    text = f"ring, outside {_mm(outside)} mm, bore {_mm(bore)} mm, {_mm(height)} mm high"
    return Section("ring", spans, "axisymmetric", text)


_WHOLE: Mapping[str, tuple[float, str]] = {
    "slab": (1.0, "per square metre of plate"),
    "cylinder": (2.0 * np.pi, "per metre of length"),
    "ball": (4.0 * np.pi, "of the whole ball"),
    "plane": (1.0, "per metre of length"),
    "axisymmetric": (2.0 * np.pi, "of the whole part"),
}


def _mm(length: float) -> str:
    return f"{length * 1e3:.6g}"


def cells_for(section: Section, accuracy: float) -> tuple[int, ...]:
    """Cells along each axis for an accuracy [K], before the error is known.

    The error falls with the square of the cells. 96 per cooled side in one
    dimension meet about half a kelvin everywhere, 64 in two about a kelvin at the
    surface and far less inside; the run measures it.
    """
    base = 96 if len(section.spans) == 1 else 64
    wanted = base * np.sqrt(0.5 / accuracy)
    counts = []
    for span in section.spans:
        sides = 2 if span.low_zone and span.high_zone and not span.folded else 1
        counts.append(int(sides * 4 * np.ceil(wanted / 4)))
    return tuple(counts)


def cut(section: Section, cells: tuple[int, ...], *, strongest_film: Mapping[str, float]) -> Cut:
    """Cut a section into cells, fine where its films are strong.

    Parameters
    ----------
    section
        The form, folded where symmetric.
    cells
        Cells along each solved axis; odd counts are raised by one.
    strongest_film
        Largest film coefficient of each zone over the route [W/(m2 K)].

    Raises
    ------
    InputFault
        If the number of counts does not fit the section, or one is below 4.
    """
    if len(cells) != len(section.spans) or min(cells) < 4:
        raise InputFault(
            "cells",
            str(list(cells)),
            f"{len(section.spans)} number{'s' * (len(section.spans) > 1)} of 4 or more",
            "Leave cells out and the tool chooses.",
        )
    axes = []
    for span, count in zip(section.spans, cells, strict=True):
        end = span.middle if span.folded else span.high
        high_zone = None if span.folded else span.high_zone
        low_film = strongest_film.get(span.low_zone or "", 0.0)
        high_film = strongest_film.get(high_zone or "", 0.0)
        fine: Literal["low", "high", "both", "even"] = "even"
        if low_film > 0.0 and high_film > 0.0:
            fine = "both"
        elif low_film > 0.0 or high_film > 0.0:
            fine = "low" if low_film > 0.0 else "high"
        side = (end - span.low) / (2.0 if fine == "both" else 1.0)
        film = max(low_film, high_film, 1e-9)
        first = max(FIRST_OVER_FILM * HOT_STEEL_K / film * 64.0 / count, SMALLEST_FIRST * side)
        axes.append(
            axis(
                span.low,
                end,
                count + count % 2,
                fine=fine,
                first=first,
                low=span.low_zone,
                high=high_zone,
            )
        )
    return _assemble(section, tuple(axes))


def _assemble(section: Section, axes: tuple[Axis, ...]) -> Cut:
    if len(axes) == 1:
        return Cut(section, axes, line(axes[0], section.sense))
    return Cut(section, axes, rectangle(axes[0], axes[1], section.sense))


def place(cut: Cut, coordinates: tuple[float, ...]) -> Place:
    """The weights on nodes that read a field at a point [m] of the part."""
    nodes, shares = np.array([0]), np.array([1.0])
    for span, along, value in zip(cut.section.spans, cut.axes, coordinates, strict=True):
        inside = min(max(value, span.low), span.high)
        if span.folded and inside > span.middle:
            inside = span.low + span.high - inside
        k = int(np.clip(np.searchsorted(along.nodes, inside) - 1, 0, len(along.nodes) - 2))
        part = (inside - along.nodes[k]) / (along.nodes[k + 1] - along.nodes[k])
        count = len(along.nodes)
        nodes = (nodes[:, None] * count + np.array([k, k + 1])).ravel()
        shares = (shares[:, None] * np.array([1.0 - part, part])).ravel()
    return Place(
        nodes.astype(np.int64), shares, tuple(coordinates), depth_of(cut.section, coordinates)
    )


def depth_of(section: Section, coordinates: tuple[float, ...]) -> float:
    """Distance [m] from a point to the nearest surface."""
    gaps = [
        gap
        for span, value in zip(section.spans, coordinates, strict=True)
        for zone, gap in ((span.low_zone, value - span.low), (span.high_zone, span.high - value))
        if zone is not None
    ]
    return float(max(min(gaps), 0.0))


def _line_of(section: Section) -> tuple[int, bool, float]:
    """The axis the drawing measures depth along, whether from its low end, and how far."""
    spans = section.spans
    if section.form in ("round", "ball"):
        return 0, False, spans[0].length
    if section.form == "slab":
        return 0, True, spans[0].length / 2.0
    if section.form == "tube":
        return 0, False, spans[0].length / 2.0
    thin = int(np.argmin([span.length for span in spans]))
    return thin, section.form == "bar" or thin == 1, spans[thin].length / 2.0


def trade_place(section: Section, term: str, depth: float | None = None) -> tuple[float, ...]:
    """Coordinates [m] of surface, core, mid-radius, quarter thickness or a depth.

    Depth runs from the surface to the core along the thinnest direction, half
    way along the others: a bar from the middle of its broad face, a round with
    ends from the side at half length, a ring from its outside or its face.

    Raises
    ------
    InputFault
        If the section has no such place.
    """
    which, from_low, core = _line_of(section)
    whole = 2.0 * core
    depths = {"surface": 0.0, "core": core, "quarter thickness": whole / 4.0, "depth": depth}
    if section.form in ("round", "ball"):
        depths["mid-radius"] = core / 2.0
    far = depths.get(term)
    if far is None:
        raise InputFault("position", f'"{term}"', f"one of {', '.join(depths)}", "")
    span = section.spans[which]
    value = span.low + far if from_low else span.high - far
    # In a round with ends the core is half way along, like in a bar.
    return tuple(value if i == which else s.middle for i, s in enumerate(section.spans))


def profile(cut: Cut) -> Line:
    """Depth [m] and nodes from surface to core along the drawing's line."""
    section = cut.section
    which, from_low, core = _line_of(section)
    nodes = cut.axes[which].nodes
    span = section.spans[which]
    through = section.form == "tube" or (section.form == "slab" and not span.folded)
    depth = nodes - span.low if from_low else span.high - nodes
    order = np.argsort(depth)
    order = order if through else order[depth[order] <= core * (1.0 + 1e-9)]
    labels = {True: "through the wall", False: "surface to core"}
    if section.form == "slab" and through:
        labels[True] = "near face to far face"
    chosen = order
    if len(cut.axes) == 2:
        other = 1 - which
        across = section.spans[other]
        at = int(np.argmin(np.abs(cut.axes[other].nodes - across.middle)))
        n_along = len(cut.axes[1].nodes)
        chosen = order * n_along + at if which == 0 else at * n_along + order
    return Line(depth[order], chosen.astype(np.int64), labels[through])
