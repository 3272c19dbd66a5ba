"""Grossmann's severity of quench, and the end-quench distance that cools alike.

Model
-----
``H = h / (2 k)``, so that ``Bi = h R / k = H D``. Two rounds harden alike at their
middle when the middle takes equally long to lose half its heat above the bath.
That time is ``Fo R^2 / a`` with Fo from the exact series of a round under a film,
so the ideal diameter DI of a round D follows without the diffusivity:
``DI^2 Fo(infinity) = D^2 Fo(H D)``. A place in a section and a place on the
end-quench piece harden alike when both take equally long from 800 (or 700) to
500 degC; the times on the piece are given by the caller, who has solved it.

Source
------
Definition of H: MacKenzie (read). Half-temperature time: Grossmann, Asimow &
Urban 1939 (remembered). Series: Carslaw & Jaeger 1959, ch. VII (remembered).

Holds for
---------
One constant film coefficient and one conductivity. A real bath boils: thin bars
in water harden far deeper than H says, and the H of books for water and brine
turned into h with the conductivity of hot austenite is half of what is measured.
Use the bath's own film curve for a section; use this inside Grossmann's
arithmetic. "Equally long" ranks one mechanism of transformation, not two.
"""

import math
from dataclasses import dataclass
from functools import cache

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source

EQUIVALENT = "equivalent end-quench distance"
SOURCES = (
    Source("severity of quench", "Grossmann, via MacKenzie", "H = h / 2k", "read"),
    Source("ideal and actual diameter", "Grossmann, Asimow & Urban 1939", "-", "remembered"),
    Source(EQUIVALENT, "equal cooling time", "table of the caller", "derived"),
)

HALF = 0.5
_N_TERM = 6  # at the half-temperature time the seventh is below 1e-38
_LEAST_BIOT = 1e-8  # below this the lumped body is exact to rounding


def severity(htc: float, *, conductivity: float) -> float:
    """Severity H [1/m] of ``htc`` [W/(m2 K)] on a steel of ``conductivity`` [W/(m K)].

    Books print it per inch: multiply by 0.0254.

    Raises
    ------
    InputFault
        Not positive.
    """
    return _positive("film coefficient", htc) / (2.0 * _positive("conductivity", conductivity))


def film(severity: float, *, conductivity: float) -> float:
    """Film coefficient [W/(m2 K)] of ``severity`` [1/m]; see what the module says of water."""
    return 2.0 * _positive("conductivity", conductivity) * _positive("severity", severity)


def half_time_fourier(biot: float) -> float:
    """Fourier number ``a t / R^2`` when the middle of a round has lost half.

    ``biot`` is ``h R / k``, up to infinity.

    Raises
    ------
    InputFault
        Not positive.
    """
    if not biot > 0.0:
        raise InputFault("Biot number", f"{biot:g}", "positive", "Give a film that cools.")
    if biot < _LEAST_BIOT:
        return -math.log(HALF) / (2.0 * biot)
    from scipy.optimize import brentq  # only here: a case file is read without it

    zeta, weight = _series(biot)
    one_term = math.log(weight[0] / HALF) / zeta[0] ** 2  # the second term is negative

    def left(fourier: float) -> float:
        return float(weight @ np.exp(-(zeta**2) * fourier)) - HALF

    return float(brentq(left, 0.5 * one_term, 1.01 * one_term, xtol=1e-300, rtol=1e-14))


def _series(biot: float) -> tuple[Array, Array]:
    """Eigenvalues of the film-cooled round and their weights at its middle, (n_term,) each."""
    from scipy.optimize import brentq
    from scipy.special import j0, j1, jn_zeros

    high = jn_zeros(0, _N_TERM)
    zeta = high
    if math.isfinite(biot):
        low = np.append(0.0, jn_zeros(1, _N_TERM - 1))
        zeta = np.array(
            [
                brentq(lambda z: z * j1(z) - biot * j0(z), a, b, xtol=1e-15, rtol=1e-14)
                for a, b in zip(low, high, strict=True)
            ]
        )
    return zeta, 2.0 * j1(zeta) / (zeta * (j0(zeta) ** 2 + j1(zeta) ** 2))


def ideal_of_actual(diameter: float, *, severity: float) -> float:
    """Ideal diameter [m] of a round of ``diameter`` [m] under ``severity`` [1/m].

    Raises
    ------
    InputFault
        Not positive.
    """
    biot = _positive("diameter", diameter) * _positive("severity", severity)
    return diameter * math.sqrt(half_time_fourier(biot) / _ideal_fourier())


@cache
def _ideal_fourier() -> float:
    return half_time_fourier(math.inf)


def actual_of_ideal(ideal: float, *, severity: float) -> float:
    """Round [m] that under ``severity`` [1/m] hardens like ``ideal`` [m] in an ideal quench.

    With the ideal diameter of a steel, its critical diameter: half martensite at
    the middle.

    Raises
    ------
    InputFault
        Not positive.
    """
    from scipy.optimize import brentq

    _positive("severity", severity)
    low = high = _positive("ideal diameter", ideal)
    while ideal_of_actual(low, severity=severity) > ideal:
        low *= 0.1
        if low == 0.0:
            return 0.0

    def gap(diameter: float) -> float:
        return ideal_of_actual(diameter, severity=severity) - ideal

    return float(brentq(gap, low, high, xtol=1e-300, rtol=1e-13))


def cooling_time(time: Array, temp: Array, *, upper: float, lower: float) -> Array:
    """Time [s] from the first fall below ``upper`` to the first fall below ``lower`` [K].

    Parameters
    ----------
    time, temp
        Histories [s] (n_time,) and [K] (n_time, n_node), straight between times.

    Returns
    -------
    Array
        (n_node,); nan where a node starts below ``upper`` or never reaches ``lower``.
    """
    starts, ends = (_first_below(time, temp, level) for level in (upper, lower))
    return np.asarray(ends - starts)


def _first_below(time: Array, temp: Array, level: float) -> Array:
    below = temp <= level
    after = np.argmax(below, axis=0)
    found = below.any(axis=0) & (after > 0)
    after = np.maximum(after, 1)
    node = np.arange(temp.shape[1])
    hot, cold = temp[after - 1, node], temp[after, node]
    share = np.where(found, hot - level, np.nan) / np.where(found, hot - cold, 1.0)
    return np.asarray(time[after - 1] + share * (time[after] - time[after - 1]))


@dataclass(frozen=True)
class EndQuenchTimes:
    """The caller's table of the test piece: distance [m] and cooling time [s], (n,) each.

    Both must rise and be positive; the time is between the same two temperatures
    as the times that will be looked up.
    """

    distance: Array
    cooling_time: Array

    def __post_init__(self) -> None:
        for name, values in (("distance", self.distance), ("cooling time", self.cooling_time)):
            if values.shape != self.distance.shape or values.size < 2:
                raise InputFault(name, f"{values.size} values", "two or more, as many as the other")
            if not (values[0] > 0.0 and np.all(np.diff(values) > 0.0)):
                raise InputFault(f"{name} of the test piece", "not rising", "positive and rising")


def equivalent_distance(cooling_time: Array | float, table: EndQuenchTimes) -> Array:
    """End-quench distance [m] that cools in ``cooling_time`` [s], any shape.

    A monotone curve (Fritsch & Carlson) through the table in logarithms of both;
    nan outside the table.
    """
    from scipy.interpolate import PchipInterpolator

    rise = PchipInterpolator(np.log(table.cooling_time), np.log(table.distance), extrapolate=False)
    asked = np.asarray(cooling_time, dtype=np.float64)
    # on the last row rounding must not fall outside
    ends = table.cooling_time[[0, -1]]
    inside = (asked >= ends[0]) & (asked <= ends[1])
    distance = np.exp(rise(np.clip(np.log(np.where(inside, asked, ends[0])), *np.log(ends))))
    return np.where(inside, distance, np.nan)


def range_notes(cooling_time: Array | float, table: EndQuenchTimes) -> tuple[RangeNote, ...]:
    """A note when a time [s] lies outside the table, or is not known."""
    asked = np.atleast_1d(np.asarray(cooling_time, dtype=np.float64))
    first, last = table.cooling_time[0], table.cooling_time[-1]
    inside = (asked >= first) & (asked <= last)
    if inside.all():
        return ()
    known = asked[~np.isnan(asked)]
    value = f"{known.min():.3g} to {known.max():.3g} s" if known.size else "unknown"
    return (RangeNote(EQUIVALENT, "cooling time", value, f"{first:.3g} to {last:.3g} s"),)


def _positive(quantity: str, value: float) -> float:
    if not value > 0.0:
        raise InputFault(quantity, f"{value:g}", "positive", "Give a number above zero.")
    return value
