"""Fit the shifts of a heat to its measured end-quench curve and transformation diagrams.

Model
-----
Points of the curve come from `study.curvefit`, points of diagrams from `study.diagramfit`; all
are weighed by their scatter and fitted together.

Source
------
`thermo.calibration`.

Holds for
---------
One heat, austenitised in one way.
"""

import functools
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.study.case import SteelInput
from midradius.study.curvefit import LOWEST_HRC, CurveFit, Part, Piece
from midradius.study.diagramfit import (
    DiagramFit,
    Heat,
    compared,
    computed,
    deviations,
    shown,
    usable,
)
from midradius.study.diagramfit import free as free_of
from midradius.study.diagramfit import scatter as scatter_of
from midradius.study.measuredcurve import MeasuredCurve
from midradius.study.measureddiagram import MeasuredDiagram
from midradius.thermo import austenite as soaking
from midradius.thermo.arrays import BoolArray
from midradius.thermo.austenitizing import SOAK_TIME, austenitizing
from midradius.thermo.calibration import NAMES, NONE, Calibration, calibrate
from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import EXTENDED
from midradius.thermo.steel import Steel

SCATTER_HRC = 1.0


@dataclass(frozen=True)
class Fitted:
    """The shifts that bring a computed heat to what was measured on it.

    ``carbon_pct`` and ``grain_left_astm`` are what the soak of the fit left; at least one of
    ``curve`` and ``diagrams`` is there. ``files`` are name and sha256 of each measurement.
    """

    steel: Steel
    austenitize: float
    reason: str
    time: float
    grain_astm: float | None
    carbon_pct: float
    grain_left_astm: float
    fit: Calibration
    curve: CurveFit | None
    diagrams: tuple[DiagramFit, ...]
    files: tuple[tuple[str, str], ...]
    notes: tuple[str, ...]
    kinetics: str = EXTENDED


def fitted(
    given: SteelInput,
    measured: Sequence[MeasuredCurve | MeasuredDiagram],
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
    measured
        One end-quench curve at most, and diagrams; all of one heat and one soak.
    temp, time
        Of the soak [K, s]; by default as in `study.endquench`.
    scatter
        Standard deviation of one point of the curve [HRC].

    Raises
    ------
    InputFault
        Too few points, two curves, or nothing that tells a shift.
    SolverFault
        The solver gave up.
    """
    if given.kinetics.measured is not None:
        raise InputFault(
            "steel",
            f"one with transformation = {given.kinetics.measured.name}",
            "one without measured transformation curves",
            "Shifts move the formulas; measured curves need none. Leave that key out.",
        )
    rule = austenitizing(given.steel)
    at, reason = (rule.temp, rule.reason) if temp is None else (temp, "as asked")
    plain = replace(given, shifts=NONE, calibration=None)
    heat = Heat(given.steel, at, time, given.grain_astm, given.kinetics)
    curves = [item for item in measured if isinstance(item, MeasuredCurve)]
    drawn = [item for item in measured if isinstance(item, MeasuredDiagram)]
    if len(curves) > 1:
        names = " and ".join(curve.name for curve in curves[:2])
        raise InputFault("measured curve", names, "one end-quench curve", "Join them in one file.")
    test = Piece(plain, curves[0], temp=at, time=time) if curves else None
    taken = [usable(diagram.points, heat) for diagram in drawn]
    parts = [] if test is None else [test.part(scatter)]
    parts += [_points(diagram, used, heat) for diagram, used in zip(drawn, taken, strict=True)]
    free = (
        set(NAMES)
        if test
        else {
            name
            for diagram, used in zip(drawn, taken, strict=True)
            for name in free_of([p for p, u in zip(diagram.points, used, strict=True) if u])
        }
    )
    whole = np.concatenate([part.measured for part in parts])
    if len(whole) < len(free) + 1 or not free:
        raise _too_few(test, len(whole), len(free))
    fit = calibrate(
        lambda shifts: np.concatenate([part.computed(shifts) for part in parts]),
        whole,
        scatter=np.concatenate([part.scatter for part in parts]),
        free=tuple(name for name in NAMES if name in free),
    )
    held = tuple(
        line.replace(": not asked for", ": nothing measured tells it") for line in fit.held
    )
    left = soaking.soak(given.steel, at, time, grain_astm=given.grain_astm)
    return Fitted(
        steel=given.steel,
        austenitize=at,
        reason=reason,
        time=time,
        grain_astm=given.grain_astm,
        carbon_pct=left.carbon_pct,
        grain_left_astm=left.grain_astm,
        fit=replace(fit, held=held),
        curve=None if test is None else test.fit(fit.shifts, scatter),
        diagrams=tuple(
            DiagramFit(
                d,
                u,
                shown(d, heat, NONE),
                shown(d, heat, fit.shifts),
                deviations(d, u, heat, fit.shifts),
            )
            for d, u in zip(drawn, taken, strict=True)
        ),
        files=tuple((item.name, item.sha256) for item in measured),
        notes=_notes(given, test, drawn, taken, fit),
        kinetics=given.kinetics.name,
    )


def _too_few(test: "Piece | None", points: int, shifts: int) -> InputFault:
    if test is not None:
        return InputFault(
            "measured curve",
            f"{points} points of {LOWEST_HRC:g} HRC or more",
            f"at least {shifts + 1} such points for {shifts} shifts",
            "Measure more points; softer ones cannot be read in Rockwell C.",
        )
    return InputFault(
        "measured diagram",
        f"{points} points that the computed heat can meet",
        f"at least {max(shifts, 1) + 1} for {max(shifts, 1)} shift{'s' * (shifts > 1)}",
        "Measure more points between Ms and Ae3; check steel and austenitising.",
    )


def _points(diagram: MeasuredDiagram, used: BoolArray, heat: Heat) -> Part:
    points = [p for p, u in zip(diagram.points, used, strict=True) if u]
    return Part(
        compared(points),
        scatter_of(points),
        functools.cache(lambda shifts: computed(points, heat, shifts, past=True)),
    )


def _notes(
    given: SteelInput,
    test: Piece | None,
    drawn: Sequence[MeasuredDiagram],
    taken: Sequence[BoolArray],
    fit: Calibration,
) -> tuple[str, ...]:
    notes = []
    left_out = 0 if test is None else int(len(test.used) - test.used.sum())
    if left_out:
        points = "1 point" if left_out == 1 else f"{left_out} points"
        notes.append(f"{points} below {LOWEST_HRC:g} HRC left out of the fit")
    for diagram, used in zip(drawn, taken, strict=True):
        lines = [str(p.line) for p, u in zip(diagram.points, used, strict=True) if not u]
        if lines:
            notes.append(
                f"{diagram.name}: line{'s' * (len(lines) > 1)} {', '.join(lines[:8])} left out of "
                "the fit: the computed heat never forms that much there"
            )
    for other in fit.rivals:
        notes.append(
            "another set fits nearly as well: ferrite and pearlite time x "
            f"{other.diffusional_time:.2f}, bainite time x {other.bainite_time:.2f}, martensite "
            f"start {other.martensite_start:+.0f} K, hardness {other.hardness:+.0f} HV"
        )
    if given.shifts != NONE:
        notes.append("the calibration that the steel carries already was put aside")
    notes.append(
        "the shifts belong to this heat, austenitised and cooled as in its measurement; "
        "another heat of the grade needs its own"
    )
    return tuple(notes)
