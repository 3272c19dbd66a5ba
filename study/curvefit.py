"""The simulated test piece at the distances of a measured end-quench curve.

Model
-----
The curve is that of the simulated test piece (`study.endquench`) at the measured
distances, marched once on the grid of that test with coarser steps: within 0.1 HRC of the
test itself, which runs three times more to state its own error.

Where a computed curve leaves 20 to 68 HRC the scale goes on along its end slope, so that
the fit can find its way back; such figures are not shown. Points measured below 20 HRC
are left out: Rockwell C is not defined there.

Source
------
`study.endquench`.

Holds for
---------
Distances 1.5 to 80 mm.
"""

import functools
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem import section as forms
from midradius.fem.route import cool
from midradius.study.begin import begin
from midradius.study.case import Case, Outputs, PositionInput, SteelInput
from midradius.study.endquench import ACCURACY, CELLS, DIAMETER, FLAT, piece
from midradius.study.measuredcurve import MeasuredCurve
from midradius.study.setup import coordinates_of, prepare
from midradius.study.worth import worth
from midradius.thermo import properties
from midradius.thermo.arrays import Array, BoolArray
from midradius.thermo.calibration import NONE, Shifts
from midradius.thermo.conversion import hrc_to_hv, hv_to_hrc

LOWEST_HRC, HIGHEST_HRC = 20.0, 68.0
# Local error of one step [K]: sixteen times that of the full test moves the curve by
# 0.08 HRC at most, over nine grades.
STEP_TOLERANCE = 3.2 * ACCURACY
N_CHART = 60  # distances of the drawn curves


@dataclass(frozen=True)
class Part:
    """Points of one measurement on the scales of the fit, (n_point,) each."""

    measured: Array
    scatter: Array
    computed: Callable[[Shifts], Array]


@dataclass(frozen=True)
class CurveFit:
    """A measured end-quench curve beside the computed ones.

    ``used`` (n_measured,) marks the points of the fit; ``before_hrc`` and ``after_hrc``
    (n_measured,) are computed at all of them, nan outside 20 to 68 HRC. ``chart_mm``,
    ``chart_before_hrc`` and ``chart_after_hrc`` (n_chart,) are the same curves, drawn.
    ``root_mean_square`` [HRC] is the deviation before and after, of the points of the fit.
    """

    measured: MeasuredCurve
    scatter: float
    used: BoolArray
    before_hrc: Array
    after_hrc: Array
    chart_mm: Array
    chart_before_hrc: Array
    chart_after_hrc: Array
    root_mean_square: tuple[float, float]


def _case_of(plain: SteelInput, curve: MeasuredCurve, temp: float, time: float) -> Case:
    places = np.concatenate([curve.distance_mm, _chart_mm(curve)])
    return replace(
        piece(plain, temp=temp, time=time),
        outputs=Outputs(
            tuple(
                PositionInput(f"{k}", "coordinates", coordinates=(DIAMETER / 2 - FLAT, 1e-3 * z))
                for k, z in enumerate(places)
            )
        ),
    )


def _chart_mm(curve: MeasuredCurve) -> Array:
    least, most = min(1.5, curve.distance_mm.min()), max(50.0, curve.distance_mm.max())
    return np.geomspace(least, most, N_CHART)


class Piece:
    """The test piece of a measured curve, marched once for every set of shifts."""

    def __init__(
        self, plain: SteelInput, curve: MeasuredCurve, *, temp: float, time: float
    ) -> None:
        case = _case_of(plain, curve, temp, time)
        self.curve = curve
        self.used: BoolArray = curve.hardness_hrc >= LOWEST_HRC
        self.hardness_hv = functools.cache(lambda shifts: hardness_hv_of(case, shifts))

    def part(self, scatter: float) -> Part:
        n, used = len(self.curve.distance_mm), self.used
        return Part(
            self.curve.hardness_hrc[used],
            np.full(int(used.sum()), scatter),
            lambda shifts: _rockwell(self.hardness_hv(shifts)[:n][used]),
        )

    def fit(self, shifts: Shifts, scatter: float) -> CurveFit:
        n = len(self.curve.distance_mm)
        before = hv_to_hrc(self.hardness_hv(NONE))
        after = hv_to_hrc(self.hardness_hv(shifts))
        return CurveFit(
            measured=self.curve,
            scatter=scatter,
            used=self.used,
            before_hrc=before[:n],
            after_hrc=after[:n],
            chart_mm=_chart_mm(self.curve),
            chart_before_hrc=before[n:],
            chart_after_hrc=after[n:],
            root_mean_square=(self._deviation(NONE), self._deviation(shifts)),
        )

    def _deviation(self, shifts: Shifts) -> float:
        computed = _rockwell(self.hardness_hv(shifts)[: len(self.used)][self.used])
        return float(np.sqrt(np.mean((computed - self.curve.hardness_hrc[self.used]) ** 2)))


def hardness_hv_of(case: Case, shifts: Shifts) -> Array:
    """Hardness [HV] at the positions of a test piece, (n_position,), of one march."""
    case = replace(case, steel=replace(case.steel, shifts=shifts))
    setup = prepare(case)
    assert isinstance(setup.section, forms.Section), "a test piece is a round"
    cut = forms.cut(setup.section, CELLS, strongest_film=setup.strongest_film)
    places = [forms.place(cut, coordinates_of(cut.section, p)) for p in case.outputs.positions]
    begun = begin(
        case, setup.furnace, cut, places={"0": places[0]}, watched=("0",), tolerance=STEP_TOLERANCE
    )
    history = cool(
        cut,
        begun.tables,
        setup.stages,
        density=properties.DENSITY,
        start_temp=begun.temp,
        state=begun.state,
        carbon_pct=case.steel.steel.composition.C,
        places={"0": places[0]},
        watched=("0",),
        field_times=np.zeros(1),
        tolerance=STEP_TOLERANCE,
        scale=begun.scale,
    )
    hv = worth(case, begun.soaked, history).hardness_hv
    return np.array([float((hv[place.node] * place.share).sum()) for place in places])


def _rockwell(hardness_hv: Array) -> Array:
    """HRC, beyond the ends of the scale along its slope there, any shape."""
    low, high = (float(hrc_to_hv(hrc)) for hrc in (LOWEST_HRC, HIGHEST_HRC))
    inside = hv_to_hrc(np.clip(hardness_hv, low, high))
    at_low = 1.0 / (float(hrc_to_hv(LOWEST_HRC + 1.0)) - low)
    at_high = 1.0 / (high - float(hrc_to_hv(HIGHEST_HRC - 1.0)))
    below, above = np.minimum(hardness_hv - low, 0.0), np.maximum(hardness_hv - high, 0.0)
    return np.asarray(inside + at_low * below + at_high * above)
