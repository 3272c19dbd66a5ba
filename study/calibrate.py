"""Fit the shifts of a heat to its measured end-quench curve.

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
`thermo.calibration`; the grid is that of `study.endquench`.

Holds for
---------
One heat. Distances 1.5 to 80 mm.
"""

import functools
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
from midradius.thermo.austenitizing import SOAK_TIME, austenitizing
from midradius.thermo.calibration import NAMES, NONE, Calibration, Shifts, calibrate
from midradius.thermo.conversion import hrc_to_hv, hv_to_hrc
from midradius.thermo.errors import InputFault
from midradius.thermo.steel import Steel

LOWEST_HRC, HIGHEST_HRC = 20.0, 68.0
SCATTER_HRC = 1.0
# Local error of one step [K]: sixteen times that of the full test moves the curve by
# 0.08 HRC at most, over nine grades.
STEP_TOLERANCE = 3.2 * ACCURACY
N_CHART = 60  # distances of the drawn curves


@dataclass(frozen=True)
class Fitted:
    """A measured curve, and the shifts that bring the computed one to it.

    ``used`` (n_measured,) marks the points of the fit; ``before_hrc`` and ``after_hrc``
    (n_measured,) are computed at all of them, nan outside 20 to 68 HRC. ``chart_mm``,
    ``chart_before_hrc`` and ``chart_after_hrc`` (n_chart,) are the same curves, drawn.
    """

    steel: Steel
    curve: MeasuredCurve
    austenitize: float
    reason: str
    time: float
    grain_astm: float | None
    used: BoolArray
    fit: Calibration
    before_hrc: Array
    after_hrc: Array
    chart_mm: Array
    chart_before_hrc: Array
    chart_after_hrc: Array
    notes: tuple[str, ...]


def fitted(
    given: SteelInput,
    curve: MeasuredCurve,
    *,
    temp: float | None = None,
    time: float = SOAK_TIME,
    scatter: float = SCATTER_HRC,
) -> Fitted:
    """Fit a heat.

    Parameters
    ----------
    given
        The steel; shifts that it carries already are put aside.
    curve
        The measurement.
    temp, time
        Of the soak [K, s]; by default as in `study.endquench`.
    scatter
        Standard deviation of one measured point [HRC].

    Raises
    ------
    InputFault
        Too few points, or none that tells a shift.
    SolverFault
        The solver gave up.
    """
    rule = austenitizing(given.steel)
    at, reason = (rule.temp, rule.reason) if temp is None else (temp, "as asked")
    plain = replace(given, shifts=NONE, calibration=None)
    used = curve.hardness_hrc >= LOWEST_HRC
    if used.sum() < len(NAMES) + 1:
        raise InputFault(
            "measured curve",
            f"{int(used.sum())} points of {LOWEST_HRC:g} HRC or more",
            f"at least {len(NAMES) + 1} such points for {len(NAMES)} shifts",
            "Measure more points; softer ones cannot be read in Rockwell C.",
        )
    chart = np.geomspace(
        min(1.5, curve.distance_mm.min()), max(50.0, curve.distance_mm.max()), N_CHART
    )
    places = np.concatenate([curve.distance_mm, chart])
    case = replace(
        piece(plain, temp=at, time=time),
        outputs=Outputs(
            tuple(
                PositionInput(f"{k}", "coordinates", coordinates=(DIAMETER / 2 - FLAT, 1e-3 * z))
                for k, z in enumerate(places)
            )
        ),
    )
    n = len(curve.distance_mm)

    @functools.cache
    def hardness_hv(shifts: Shifts) -> Array:
        return _hardness_hv(case, shifts)

    fit = calibrate(
        lambda shifts: _rockwell(hardness_hv(shifts)[:n][used]),
        curve.hardness_hrc[used],
        scatter=scatter,
    )
    before, after = hv_to_hrc(hardness_hv(NONE)), hv_to_hrc(hardness_hv(fit.shifts))
    return Fitted(
        steel=given.steel,
        curve=curve,
        austenitize=at,
        reason=reason,
        time=time,
        grain_astm=given.grain_astm,
        used=used,
        fit=fit,
        before_hrc=before[:n],
        after_hrc=after[:n],
        chart_mm=chart,
        chart_before_hrc=before[n:],
        chart_after_hrc=after[n:],
        notes=_notes(given, used),
    )


def _hardness_hv(case: Case, shifts: Shifts) -> Array:
    """Hardness [HV] at the positions of a test piece, (n_position,), of one march."""
    case = replace(case, steel=replace(case.steel, shifts=shifts))
    setup = prepare(case)
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


def _notes(given: SteelInput, used: BoolArray) -> tuple[str, ...]:
    notes = []
    left_out = int(len(used) - used.sum())
    if left_out:
        points = "1 point" if left_out == 1 else f"{left_out} points"
        notes.append(f"{points} below {LOWEST_HRC:g} HRC left out of the fit")
    if given.shifts != NONE:
        notes.append("the calibration that the steel carries already was put aside")
    notes.append(
        "the shifts belong to this heat, austenitised and cooled as in its measurement; "
        "another heat of the grade needs its own"
    )
    return tuple(notes)
