"""Shift a steel's kinetics to what was measured on its own heat.

Model
-----
Four shifts with a physical name: a factor on the times of ferrite and pearlite,
one on the times of bainite, an offset of the martensite start, an offset of
hardness. A measured curve is fitted by bounded least squares; the standard errors
follow from the Jacobian and the scatter that is left (or from the scatter of the
measurement where that is larger). Every fit starts anew from several places, so that no
local minimum decides which shift is held; other minima that fit nearly as well are
named. A shift that the data cannot tell is not fitted:
its error would exceed half its bounds, or two shifts are correlated beyond 0.98.

Source
------
Nonlinear least squares: scipy's trust region reflective method. The choice of
shifts and the two limits of refusal are estimates.

Holds for
---------
The composition, austenitising and cooling range of the measurement. A calibrated
heat says nothing about another heat of the same grade.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np

from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

SOURCE = Source(
    "calibration to a heat", "bounded least squares (scipy)", "four named shifts", "estimate"
)

NAMES = ("ferrite and pearlite time", "bainite time", "martensite start", "hardness")
# Bounds: factors 1/6 to 6 as logarithms, offsets in K and HV; and a step that counts.
_LOWER = np.array([-np.log(6.0), -np.log(6.0), -50.0, -60.0])
_UPPER = -_LOWER
_SCALE = np.array([0.5, 0.5, 15.0, 15.0])
WORST_ERROR = 0.5  # of the half width of the bounds
WORST_CORRELATION = 0.98
START = 0.6  # of its bound, where a restart begins
SAME = 0.5  # counting steps within which two minima are one
RIVAL = 4.0  # chi squared by which a minimum may be worse and still count [two sigma]
LOST = "lost in the misfit"
MOST_ALIKE = 1e8  # condition number beyond which shifts act as one


@dataclass(frozen=True)
class Shifts:
    """What distinguishes one heat from its grade.

    ``diffusional_time`` and ``bainite_time`` multiply the times of ferrite with
    pearlite and of bainite; ``martensite_start`` [K] and ``hardness`` [HV] add.
    """

    diffusional_time: float = 1.0
    bainite_time: float = 1.0
    martensite_start: float = 0.0
    hardness: float = 0.0


NONE = Shifts()


@dataclass(frozen=True)
class Calibration:
    """A fit: the shifts, their standard errors, and the curves before and after.

    ``error`` has the order of :data:`NAMES` (factors: relative error), nan for a
    shift that was held; ``before``, ``after`` and ``measured`` (n_point,) in the
    unit of the measurement; ``held`` names the shifts the data could not tell,
    with the reason. ``scatter`` (n_point,) is that of one measured point. ``rivals`` are
    other minima that fit nearly as well (two standard deviations): the data do not choose.
    """

    shifts: Shifts
    error: Array
    held: tuple[str, ...]
    measured: Array
    before: Array
    after: Array
    scatter: Array
    rivals: tuple[Shifts, ...] = ()

    @property
    def root_mean_square(self) -> tuple[float, float]:
        """Root mean square deviation before and after, of points in one unit."""
        return (
            float(np.sqrt(np.mean((self.before - self.measured) ** 2))),
            float(np.sqrt(np.mean((self.after - self.measured) ** 2))),
        )


def calibrate(
    curve: Callable[[Shifts], Array],
    measured: Array,
    *,
    scatter: float | Array,
    free: Sequence[str] = NAMES,
) -> Calibration:
    """Fit shifts so that a computed curve meets a measured one.

    Parameters
    ----------
    curve
        Computes the curve for given shifts, shape (n_point,).
    measured
        The measurement, shape (n_point,).
    scatter
        Standard deviation of one measured point, in its unit; one, or (n_point,).
    free
        Which shifts may move, of :data:`NAMES`.

    Raises
    ------
    InputFault
        Fewer points than shifts plus one, a point that is not a number, or no
        shift that the data can tell.
    """
    measured = np.asarray(measured, dtype=np.float64)
    _check(measured, scatter, free)
    moving = [name in free for name in NAMES]
    held = [f"{name}: not asked for" for name in NAMES if name not in free]
    before = np.asarray(curve(NONE), dtype=np.float64)
    last = np.zeros(len(NAMES))
    while True:
        which: IntArray = np.flatnonzero(moving).astype(np.int64)
        if len(which) == 0:
            remedy = "Measure where the curve is steep"
            if any(LOST in reason for reason in held):
                remedy = "No shifts meet these points: check points, steel and austenitising"
            raise InputFault(
                "measured curve",
                f"{len(measured)} points",
                "able to tell at least one shift",
                f"{remedy} ({'; '.join(held)}).",
            )

        def residual(x: Array, which: IntArray = which) -> Array:
            return np.asarray((curve(_shifts(x, which)) - measured) / scatter)

        found = _minima(residual, which, last)
        fit, last = found[0], _spread(found[0].x, which)
        jacobian = _jacobian(residual, fit.x, _SCALE[which])
        left = max(1.0, float(np.sum(fit.fun**2)) / max(len(measured) - len(which), 1))
        error, worst, why = _errors(jacobian, left, which)
        if worst is None:
            break
        moving[worst] = False
        held.append(f"{NAMES[worst]}: {why}")
    shifts = _shifts(fit.x, which)
    errors = np.full(len(NAMES), np.nan)
    errors[which] = error
    return Calibration(
        shifts=shifts,
        error=errors,
        held=tuple(held),
        measured=measured,
        before=before,
        after=np.asarray(curve(shifts), dtype=np.float64),
        scatter=np.broadcast_to(scatter, measured.shape),
        rivals=tuple(
            _shifts(other.x, which)
            for other in found[1:]
            if 2.0 * (other.cost - fit.cost) < RIVAL * left
        ),
    )


class _Minimum(Protocol):
    """What of a fit of scipy is used."""

    x: Array
    fun: Array
    cost: float


def _minima(residual: Callable[[Array], Array], which: IntArray, last: Array) -> list[_Minimum]:
    """The minima that several starts lead to, the deepest first.

    Starts: where the fit before a shift was held ended, at first no shifts; and the best of
    every shift alone at six tenths of its range to either side.
    """
    from scipy.optimize import least_squares

    alone = [sign * START * _UPPER[k] * np.eye(len(NAMES))[k] for k in which for sign in (-1, 1)]
    best = min(alone, key=lambda x: float(np.sum(residual(x[which]) ** 2)))
    found: list[_Minimum] = []
    for start in (last, best):
        found.append(
            least_squares(
                residual,
                start[which],
                # Curves come out of a time stepper: differences over a counting step, not
                # over the square root of rounding.
                jac=lambda x: _slopes(residual, x, which),
                bounds=(_LOWER[which], _UPPER[which]),
                x_scale=_SCALE[which],
                xtol=1e-4,
                ftol=1e-6,
                max_nfev=40,
            )
        )
    found.sort(key=lambda one: one.cost)
    apart: list[_Minimum] = []
    for one in found:
        if all(np.abs((one.x - other.x) / _SCALE[which]).max() > SAME for other in apart):
            apart.append(one)
    return apart


def _spread(x: Array, which: IntArray) -> Array:
    """Shifts by :data:`NAMES`, zero for those held."""
    full = np.zeros(len(NAMES))
    full[which] = x
    return full


def _shifts(x: Array, which: IntArray) -> Shifts:
    full = _spread(x, which)
    return replace(
        NONE,
        diffusional_time=float(np.exp(full[0])),
        bainite_time=float(np.exp(full[1])),
        martensite_start=float(full[2]),
        hardness=float(full[3]),
    )


def _slopes(residual: Callable[[Array], Array], x: Array, which: IntArray) -> Array:
    """Differences over a tenth of a counting step away from the nearer bound."""
    here, columns = residual(x), []
    for k in range(len(x)):
        step = np.zeros(len(x))
        step[k] = np.copysign(0.1 * _SCALE[which[k]], -x[k])
        columns.append((residual(x + step) - here) / step[k])
    return np.stack(columns, axis=1)


def _jacobian(residual: Callable[[Array], Array], x: Array, scale: Array) -> Array:
    """Central differences over a tenth of a counting step, (n_point, n_shift)."""
    columns = []
    for k in range(len(x)):
        step = np.zeros(len(x))
        step[k] = 0.1 * scale[k]
        columns.append((residual(x + step) - residual(x - step)) / (2.0 * step[k]))
    return np.stack(columns, axis=1)


def _errors(jacobian: Array, left: float, which: IntArray) -> tuple[Array, int | None, str]:
    """Standard errors; and the shift to hold with the reason, if there is one."""
    normal = jacobian.T @ jacobian
    strength = np.sqrt(np.diag(normal))
    for k in np.argsort(strength):
        # Alone, with all others known, it would still be lost in the scatter.
        told = strength[k] * WORST_ERROR * _UPPER[which[k]]
        if told < 1.0:
            return np.empty(0), int(which[k]), "the data do not depend on it"
        if told < np.sqrt(left):
            why = f"{LOST}, {np.sqrt(left):.1f} times the scatter of a point"
            return np.empty(0), int(which[k]), why
    alike = normal / np.outer(strength, strength) - np.eye(len(which))
    if np.linalg.cond(alike + np.eye(len(which))) > MOST_ALIKE:
        pair = np.unravel_index(int(np.abs(alike).argmax()), alike.shape)
        weaker = min(pair, key=lambda k: strength[k] * _UPPER[which[k]])
        other = pair[0] if weaker == pair[1] else pair[1]
        return np.empty(0), int(which[weaker]), f"cannot be told from {NAMES[which[other]]}"
    covariance = left * np.linalg.inv(normal)
    error = np.sqrt(np.diag(covariance))
    correlation = covariance / np.outer(error, error) - np.eye(len(which))
    if len(which) > 1 and np.abs(correlation).max() > WORST_CORRELATION:
        pair = np.unravel_index(int(np.abs(correlation).argmax()), correlation.shape)
        later = max(pair, key=lambda k: error[k] / _UPPER[which[k]])
        other = pair[0] if later == pair[1] else pair[1]
        return error, int(which[later]), f"cannot be told from {NAMES[which[other]]}"
    worst = int(np.argmax(error / _UPPER[which]))
    if error[worst] > WORST_ERROR * _UPPER[which[worst]]:
        return error, int(which[worst]), "its error would exceed half of its range"
    return error, None, ""


def _check(measured: Array, scatter: float | Array, free: Sequence[str]) -> None:
    unknown = [name for name in free if name not in NAMES]
    if unknown:
        raise InputFault("shift", unknown[0], "one of " + ", ".join(NAMES), "")
    if not np.isfinite(measured).all():
        raise InputFault("measured curve", "nan", "numbers only", "Leave unmeasured points out.")
    if len(measured) < len(free) + 1:
        raise InputFault(
            "measured curve",
            f"{len(measured)} points",
            f"at least {len(free) + 1} points for {len(free)} shifts",
            "Measure more points or free fewer shifts.",
        )
    if not (np.isfinite(scatter) & (np.asarray(scatter) > 0.0)).all():
        least = float(np.min(scatter))
        raise InputFault("scatter", f"{least:g}", "more than 0", "Rockwell C repeats to 1 HRC.")
