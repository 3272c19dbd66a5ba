"""What a heat with given shifts would show at the measured points of its diagram.

Model
-----
One node of `study.diagram` held or cooled as each point was. A hold compares the logarithm
of times, a cooling the temperature, a final hardness Vickers. Where a computed product
stays below the level that was measured, the figure goes on past the end of the scale in
proportion to what is missing, so that a fit can find its way back; it is not shown.

Source
------
`study.diagram`. Scatter of one point: a time to 30 %, a temperature to 10 K, a hardness to
10 HV (estimates: what two laboratories make of one heat).

Holds for
---------
Holds between Ms and the highest temperature at which anything forms, where the computed
heat forms the measured amount at all; cooling at a constant rate. Other points are left out
of a fit, with a note.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from midradius.study import diagram
from midradius.study.diagram import ROOM, Soaked
from midradius.study.measureddiagram import ALL, MeasuredDiagram, Point
from midradius.thermo.arrays import Array, BoolArray
from midradius.thermo.assemble import fractions
from midradius.thermo.calibration import NAMES, NONE, Shifts
from midradius.thermo.ratechoice import DEFAULT, Kinetics
from midradius.thermo.steel import Steel

SCATTER = {"held": 0.3, "cooled": 10.0, "hardness": 10.0}  # relative, K, HV
UNITS = {"held": "s", "cooled": "degC", "hardness": "HV"}
ZERO_DEGC = 273.15
PAST_TIME, PAST_TEMP = 3.0, 100.0  # how far past the end nothing at all counts
_LEVELS = {"start": diagram.START, "half": diagram.MIDDLE, "finish": diagram.END}
_FITS = {"ferrite": (0,), "pearlite": (0,), "bainite": (1,), ALL: (0, 1), "martensite": (2,)}


@dataclass(frozen=True)
class Heat:
    """A steel and its soak [K, s]."""

    steel: Steel
    temp: float
    time: float
    grain_astm: float | None
    kinetics: Kinetics = DEFAULT

    def soaked(self, shifts: Shifts) -> Soaked:
        """The heat ready for its diagram."""
        return diagram.soaked(
            self.steel,
            temp=self.temp,
            time=self.time,
            grain_astm=self.grain_astm,
            shifts=shifts,
            kinetics=self.kinetics,
        )


@dataclass(frozen=True)
class DiagramFit:
    """A measured diagram beside the computed one, (n_point,) each.

    ``before`` and ``after`` are times [s], temperatures [K] or hardness [HV] as the points are;
    nan where the computed heat never gets there. ``used`` marks the points of the fit.
    ``deviation`` is the root mean square before and after by kind, on the scales of the fit.
    """

    measured: MeasuredDiagram
    used: BoolArray
    before: Array
    after: Array
    deviation: Mapping[str, tuple[float, float]]


def compared(points: Sequence[Point]) -> Array:
    """The measured values on the scales of the fit: ln s, K, HV."""
    return np.array([np.log(p.value) if p.kind == "held" else p.value for p in points])


def scatter(points: Sequence[Point]) -> Array:
    """Standard deviation of every point on those scales."""
    return np.array([SCATTER[p.kind] for p in points])


def free(points: Sequence[Point]) -> tuple[str, ...]:
    """The shifts that such points can tell of, in the order of `thermo.calibration.NAMES`."""
    if any(p.kind == "hardness" for p in points):
        return NAMES
    found = {k for p in points for k in _FITS[p.product]}
    return tuple(NAMES[k] for k in sorted(found))


def usable(points: Sequence[Point], heat: Heat) -> BoolArray:
    """Which points the computed heat can meet, (n_point,)."""
    metal = heat.soaked(NONE)
    there = np.isfinite(computed(points, heat, NONE, past=False))
    low, high = metal.critical["Ms"], metal.top
    inside = [
        low < p.at < high if p.kind == "held" else p.kind == "hardness" or p.value < high
        for p in points
    ]
    is_held = np.array([p.kind == "held" for p in points])
    return np.asarray(np.array(inside) & (there | ~is_held))


def computed(points: Sequence[Point], heat: Heat, shifts: Shifts, *, past: bool) -> Array:
    """What the heat shows at each point on the scales of the fit, (n_point,).

    ``past``: with figures past the end of a scale; else nan there.
    """
    metal = heat.soaked(shifts)
    decades = np.log10(diagram.LONGEST / diagram.SHORTEST)
    time = np.geomspace(diagram.SHORTEST, diagram.LONGEST, int(diagram.PER_DECADE * decades) + 1)
    holds: dict[float, Array] = {}
    coolings: dict[float, tuple[Array, Array, Array]] = {}
    values = []
    for p in points:
        if p.kind == "held":
            if p.at not in holds:
                low, high = metal.critical["Ms"], metal.top
                hold = min(max(p.at, low), high - 1.0)
                holds[p.at] = diagram.held(metal, hold, time)[0]
            values.append(_time(p, metal, holds[p.at], time, past=past))
            continue
        if p.at not in coolings:
            coolings[p.at] = diagram.cooled(metal, p.at)
        temp, grown, state = coolings[p.at]
        if p.kind == "cooled":
            values.append(_temperature(p, metal, temp, grown, past=past))
        else:
            hv = diagram.hardness_of(metal, np.array([p.at]), state, fractions(state))
            values.append(float(hv[0]) + shifts.hardness)
    return np.array(values)


def shown(found: MeasuredDiagram, heat: Heat, shifts: Shifts) -> Array:
    """As `computed`, as a person reads it: times in s; nan past the end of a scale."""
    values = computed(found.points, heat, shifts, past=False)
    is_held = np.array([p.kind == "held" for p in found.points])
    return np.where(is_held, np.exp(np.where(is_held, values, 0.0)), values)


def deviations(
    found: MeasuredDiagram, used: BoolArray, heat: Heat, shifts: Shifts
) -> dict[str, tuple[float, float]]:
    """Root mean square deviation without and with shifts by kind, of the points used."""
    wanted = compared(found.points)
    both = [computed(found.points, heat, each, past=True) - wanted for each in (NONE, shifts)]
    kinds = np.array([p.kind for p in found.points])
    return {
        kind: (
            float(np.sqrt(np.mean(both[0][used & (kinds == kind)] ** 2))),
            float(np.sqrt(np.mean(both[1][used & (kinds == kind)] ** 2))),
        )
        for kind in SCATTER
        if (used & (kinds == kind)).any()
    }


def _level(point: Point, metal: Soaked, grown: Array, names: Sequence[str]) -> tuple[Array, float]:
    """How much there is (n,), and the amount that the point asks for."""
    if point.product == ALL:
        amount = grown.sum(axis=1) / diagram.austenite_before(metal)
        return amount, _LEVELS.get(str(point.fraction)) or float(point.fraction)
    amount = grown[:, names.index(point.product)]
    if isinstance(point.fraction, float):
        return amount, point.fraction
    level = _LEVELS[point.fraction]
    if point.fraction == "start":
        return amount, level
    # of what it reaches; a trace has no end
    return amount, max(level * float(amount[-1]), level * diagram.LEAST)


def _time(point: Point, metal: Soaked, grown: Array, time: Array, *, past: bool) -> float:
    amount, level = _level(point, metal, grown, diagram.DIFFUSIONAL)
    found = diagram.crossing(np.log(time), amount, level)
    if past and not np.isfinite(found):
        return float(np.log(diagram.LONGEST) + PAST_TIME * (1.0 - amount[-1] / level))
    return found


def _temperature(point: Point, metal: Soaked, temp: Array, grown: Array, *, past: bool) -> float:
    amount, level = _level(point, metal, grown, diagram.PRODUCTS)
    found = -diagram.crossing(-temp, amount, level)
    if past and not np.isfinite(found):
        last = float(amount[-1])
        ended = -diagram.crossing(-temp, amount, diagram.END * last) if last > 0.0 else ROOM
        return float(ended - PAST_TEMP * (1.0 - last / level))
    return found
