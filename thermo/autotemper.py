"""Martensite that the heat left in its part tempers.

Model
-----
Every second below the start counts for the martensite there is, by the weight that
`thermo.tempering` gives it; per mass of martensite the sum is a time at
``REFERENCE``, and with it the temperature that does the same in 2 h. The kernel
gathers it along the path of each node, so a hold below the start, or the heat of the core
that comes out again in air, counts as what it is, a temper.

Maynier's martensite as quenched already loses 21 HV for every tenfold slower cooling at
700 degC. That term holds what natural cooling does, so only the excess is taken off:
beyond the path that goes on as ``dT/dt = V (T - 20) / 680`` from the rate ``V`` at 700 degC,
with its times taken ``MARGIN`` fold. What comes off is the difference of both on the
straight line of `thermo.tempering` between the hardness as quenched and that after 450 degC.

Source
------
Additivity and weight: Maynier, Jungmann & Dollet 1978 (remembered), as for tempers. The
reference path and its margin are estimates: along it the tempering model alone gives 5 to
10 HV for a tenfold time, so ten times the time lie within Maynier's own term.

Holds for
---------
Martensite as quenched by `thermo.hardness`. Parts that cool through in one bath change
nothing or hardly; a surface that its core heats up again is what it is for. On the straight
line the softening of high-carbon martensite below 450 degC is rather too small.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.martensite import rate as martensite_rate
from midradius.thermo.martensite import start as martensite_start
from midradius.thermo.source import Source
from midradius.thermo.steel import Composition
from midradius.thermo.tempering import (
    MODEL_FROM,
    NOTHING_BELOW,
    R_OVER_H,
    SPIES_HOLD,
    Temper,
    martensite_hv,
)

SOURCES = (
    Source(
        "self-tempering of martensite",
        "additivity of Maynier, Jungmann & Dollet 1978; excess over natural cooling",
        "Hardenability Concepts, 518; reference path chosen here",
        "estimate",
    ),
)
REFERENCE = 573.15  # K
MARGIN = 10.0
ROOM, AT = 293.15, 973.15  # K: where natural cooling ends, where its rate is known
N_PATH = 240
NEVER = 1e-30  # s


def weight(temp: Array) -> Array:
    """How much a second at ``temp`` [K] weighs against one at ``REFERENCE`` [-]."""
    return np.asarray(np.exp((1.0 / REFERENCE - 1.0 / np.asarray(temp)) / R_OVER_H))


def equivalent_temp(time: Array, *, hold: float) -> Array:
    """Temperature [K] that does in ``hold`` [s] what ``time`` [s] at ``REFERENCE`` does."""
    per = np.log(np.maximum(time, NEVER) / hold)
    return np.asarray(1.0 / (1.0 / REFERENCE - R_OVER_H * per))


def natural_time(
    composition: Composition, carbon_pct: Array, rate_700: Array, shift: float = 0.0
) -> Array:
    """Time at ``REFERENCE`` [s] of natural cooling, (n_node,), per mass of martensite.

    ``carbon_pct`` of the martensite, ``rate_700`` [K/s]; ``shift`` [K] is added to the
    start. nan where either is.
    """
    start = martensite_start(composition, carbon_pct) + shift
    speed = martensite_rate(composition, carbon_pct)
    under = np.linspace(0.0, 1.0, N_PATH + 1)[:, None] * (start - ROOM)
    middle = 0.5 * (under[1:] + under[:-1])
    temp = start - middle
    formed = -np.expm1(-speed * middle)
    spent = np.diff(under, axis=0) * (AT - ROOM) / (rate_700 * (temp - ROOM))
    end = -np.expm1(-speed * (start - ROOM))
    return np.asarray((formed * weight(temp) * spent).sum(axis=0) / end)


def softening(
    as_quenched_hv: Array, composition: Composition, *, time: Array, natural: Array
) -> Array:
    """What comes off the martensite [HV], (n_node,), not negative.

    ``time`` at ``REFERENCE`` [s] that each node's martensite has behind it, ``natural`` that
    of its natural cooling. Zero where one of them is not known.
    """
    at, covered = (
        np.clip(equivalent_temp(t, hold=SPIES_HOLD), NOTHING_BELOW, MODEL_FROM)
        for t in (time, MARGIN * natural)
    )
    hard = np.asarray(as_quenched_hv, dtype=np.float64)
    soft = martensite_hv(hard, composition, (Temper(MODEL_FROM, SPIES_HOLD),))
    share = np.maximum(at - covered, 0.0) / (MODEL_FROM - NOTHING_BELOW)
    off = share * np.maximum(hard - soft, 0.0)
    return np.where(np.isfinite(off), off, 0.0)
