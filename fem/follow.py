"""Carry nodes along temperatures that are given, from one sample to the next.

Model
-----
Between two samples the temperature is a straight line, or a cubic with given slopes at
its ends. The way is cut into parts of at most :data:`STRIDE` kelvin and at most
:data:`TICKS` of the quickest clock, and each is handed to the one place where products
compete, `kinetics.advance`. Slopes for the cubic keep it free of overshoot: no node
gets hotter or colder than its samples.

Source
------
Slopes: Fritsch & Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300 (remembered), ends by
the three-point rule; the tests hold them to another implementation.

Holds for
---------
Samples near enough to each other that the way between them does not matter: what that
costs is measured by :mod:`midradius.fem.given`.
"""

import numpy as np

from midradius.fem.march import MARKS_K
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel
from midradius.thermo.kinetics import (
    KIND,
    RATE_CEMENTITE,
    RATE_FERRITE,
    Tables,
    advance,
)

# Against a tenth of both no fraction of the shipped steels moves by more than 1e-3.
STRIDE = 2.0  # K
TICKS = 0.05  # of the clocks, which run from 0 to about 3
MOST_PARTS = 2000  # between two samples: a hold of hours at the nose


@kernel
def _parts(temp0: float, temp1: float, span: float, tables: Tables, kind: int, scale: Array) -> int:
    """Into how many parts the way between two samples is cut."""
    n = 1.0 + abs(temp1 - temp0) / STRIDE
    value = tables.value[kind]
    quickest = 0.0
    for k in range(5):
        temp = temp0 + 0.25 * k * (temp1 - temp0)
        row = min(max(int((temp - tables.first) / tables.step), 0), value.shape[0] - 1)
        for which in range(3):
            quickest = max(quickest, value[row, RATE_FERRITE + which] * scale[which])
        quickest = max(quickest, value[row, RATE_CEMENTITE] * scale[3])
    return int(min(max(n, 1.0 + quickest * span / TICKS), float(MOST_PARTS)))


@kernel
def carry(
    states: Array,
    marks: Array,
    scales: Array,
    tables: Tables,
    start: float,
    span: float,
    temp0: Array,
    temp1: Array,
    slope0: Array,
    slope1: Array,
    cubic: bool,
) -> None:
    """Take every node from one sample to the next; states and marks change in place.

    Parameters
    ----------
    states, marks, scales
        (n_node, N_STATE), (n_node, 4), (n_node, N_SCALE), as in :mod:`midradius.fem.remains`.
    tables
        The steel.
    start, span
        Time of the first sample and from there to the second [s].
    temp0, temp1, slope0, slope1
        Temperatures [K] and, for the cubic, slopes [K/s], (n_node,) each.
    """
    for i in range(len(temp0)):
        first, last = temp0[i], temp1[i]
        n = _parts(first, last, span, tables, int(states[i, KIND]), scales[i])
        austenite = 1.0
        for k in range(5):
            austenite -= states[i, k]
        if austenite <= 0.0:
            n = 1 + int(abs(last - first) / STRIDE)  # for the marks
        before = first
        for part in range(n):
            s = (part + 1.0) / n
            here = first + s * (last - first)
            if cubic:
                back = 1.0 - s
                bend = back * slope0[i] * span - s * slope1[i] * span
                here += s * back * (bend + (s - back) * (last - first))
            if part == n - 1:
                here = last
            advance(states, i, before, here, span / n, scales, tables, part % 2 == 1)
            for k in range(3):
                level = MARKS_K[k]
                if marks[i, k] < 0.0 and here <= level <= before and here < before:
                    share = (level - before) / (here - before)
                    marks[i, k] = start + (part + share) * span / n
                    if k == 1:
                        marks[i, 3] = (before - here) * n / span
            before = here


def slopes(spans: tuple[float, float], rises: tuple[Array, Array]) -> Array:
    """Slopes [K/s] at the middle of three samples, (n_node,).

    ``spans`` [s] and ``rises`` [K] are those of the two gaps around it.
    """
    rate0, rate1 = rises[0] / spans[0], rises[1] / spans[1]
    same = rate0 * rate1 > 0.0
    w0, w1 = 2.0 * spans[1] + spans[0], spans[1] + 2.0 * spans[0]
    safe0, safe1 = np.where(same, rate0, 1.0), np.where(same, rate1, 1.0)
    return np.where(same, (w0 + w1) / (w0 / safe0 + w1 / safe1), 0.0)


def end_slopes(spans: tuple[float, float], rises: tuple[Array, Array]) -> Array:
    """Slopes [K/s] at an end, (n_node,); the first gap is the one that touches it."""
    rate0, rate1 = rises[0] / spans[0], rises[1] / spans[1]
    found = ((2.0 * spans[0] + spans[1]) * rate0 - spans[0] * rate1) / (spans[0] + spans[1])
    found = np.where(found * rate0 <= 0.0, 0.0, found)
    over = (rate0 * rate1 < 0.0) & (np.abs(found) > 3.0 * np.abs(rate0))
    return np.asarray(np.where(over, 3.0 * rate0, found))
