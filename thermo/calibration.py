"""Shift a steel's kinetics to what was measured on its own heat.

Model
-----
Four shifts with a physical name: a factor on the times of ferrite and pearlite,
one on the times of bainite, an offset of the martensite start, an offset of
hardness. A measured curve is fitted by bounded least squares; the standard errors
follow from the Jacobian and the scatter that is left (or from the scatter of the
measurement where that is larger). A shift that the data cannot tell is not fitted:
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
    with the reason.
    """

    shifts: Shifts
    error: Array
    held: tuple[str, ...]
    measured: Array
    before: Array
    after: Array
    scatter: float

    @property
    def root_mean_square(self) -> tuple[float, float]:
        """Root mean square deviation before and after."""
        return (
            float(np.sqrt(np.mean((self.before - self.measured) ** 2))),
            float(np.sqrt(np.mean((self.after - self.measured) ** 2))),
        )


def calibrate(
    curve: Callable[[Shifts], Array],
    measured: Array,
    *,
    scatter: float,
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
        Standard deviation of one measured point, in its unit.
    free
        Which shifts may move, of :data:`NAMES`.

    Raises
    ------
    InputFault
        Fewer points than shifts plus one, a point that is not a number, or no
        shift that the data can tell.
    """
    from scipy.optimize import least_squares

    measured = np.asarray(measured, dtype=np.float64)
    _check(measured, scatter, free)
    moving = [name in free for name in NAMES]
    held = [f"{name}: not asked for" for name in NAMES if name not in free]
    before = np.asarray(curve(NONE), dtype=np.float64)
    while True:
        which: IntArray = np.flatnonzero(moving).astype(np.int64)
        if len(which) == 0:
            raise InputFault(
                "measured curve",
                f"{len(measured)} points",
                "able to tell at least one shift",
                "Measure where the curve is steep: " + "; ".join(held) + ".",
            )

        def residual(x: Array, which: IntArray = which) -> Array:
            return np.asarray((curve(_shifts(x, which)) - measured) / scatter)

        fit = least_squares(
            residual,
            np.zeros(len(which)),
            bounds=(_LOWER[which], _UPPER[which]),
            x_scale=_SCALE[which],
            # Curves come out of a time stepper: differences over a counting step, not over
            # the square root of rounding.
            diff_step=1e-2 * np.ones(len(which)),
            xtol=1e-4,
            ftol=1e-6,
            max_nfev=40,
        )
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
        scatter=scatter,
    )


def _shifts(x: Array, which: IntArray) -> Shifts:
    full = np.zeros(len(NAMES))
    full[which] = x
    return replace(
        NONE,
        diffusional_time=float(np.exp(full[0])),
        bainite_time=float(np.exp(full[1])),
        martensite_start=float(full[2]),
        hardness=float(full[3]),
    )


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
        if strength[k] * WORST_ERROR * _UPPER[which[k]] < np.sqrt(left):
            return np.empty(0), int(which[k]), "the data do not depend on it"
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


def _check(measured: Array, scatter: float, free: Sequence[str]) -> None:
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
    if not (np.isfinite(scatter) and scatter > 0.0):
        raise InputFault("scatter", f"{scatter:g}", "more than 0", "Rockwell C repeats to 1 HRC.")
