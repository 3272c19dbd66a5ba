"""Measured isothermal transformation as rates.

Model
-----
At each temperature ``X = 1 - exp(-(t / tau)^n)``: through two points exactly, through
more by least squares of ``ln t`` on ``ln(-ln(1 - X))``. ``X`` is the share of what the
product reaches at that temperature. Between two temperatures ``ln tau`` and ``n`` go
straight; outside those measured the rate is zero. Along a path, growth goes on at each
temperature from the time that this temperature would have needed for what is there.
Martensite: ``X = 1 - exp(-k (Ms - T))`` likewise.

Source
------
Growth: Avrami, J. Chem. Phys. 7 (1939) 1103. Additivity: Scheil, Arch.
Eisenhuettenwes. 12 (1935) 565; Cahn, Acta Metall. 4 (1956) 572 (all remembered). With
one ``n`` for all temperatures it is exact for isokinetic growth; else it is the usual
approximation.

Holds for
---------
The heat, the grain and the austenitising of the measurement, from its lowest to its
highest temperature. Nothing is known between the lowest and the martensite start.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import MeasuredProduct
from midradius.thermo.source import Source

SOURCES = (
    Source(
        "additivity of measured transformation",
        "Avrami, J. Chem. Phys. 7 (1939); Scheil 1935; Cahn 1956",
        "growth at a temperature; fictitious time along a path",
        "remembered",
    ),
)
EXPONENT_RANGE = (0.3, 12.0)


@dataclass(frozen=True)
class Held:
    """Points of one hold at ``temp`` [K]: ``time`` [s] and share ``fraction`` [-], rising."""

    temp: float
    time: tuple[float, ...]
    fraction: tuple[float, ...]


def avrami(held: Held) -> tuple[float, float]:
    """``tau`` [s] and ``n`` of a hold with two points or more.

    Raises
    ------
    InputFault
        Fewer points, not rising together, or an exponent outside 0.3 to 12.
    """
    where = f"at {held.temp - 273.15:.4g} degC"
    if len(held.time) < 2:
        raise InputFault(
            f"points {where}", f"{len(held.time)}", "two or more", "Give begin and end."
        )
    log_time = np.log(np.array(held.time))
    grown = np.log(-np.log1p(-np.array(held.fraction)))
    if not (np.all(np.diff(log_time) > 0.0) and np.all(np.diff(grown) > 0.0)):
        raise InputFault(
            f"points {where}", "not rising together", "a larger fraction after a longer time"
        )
    centred = grown - grown.mean()
    per = float((centred * (log_time - log_time.mean())).sum() / (centred**2).sum())
    exponent = 1.0 / per
    if not EXPONENT_RANGE[0] <= exponent <= EXPONENT_RANGE[1]:
        allowed = "{:g} to {:g}".format(*EXPONENT_RANGE)
        remedy = "The two times are too far apart or too near: check their units."
        raise InputFault(f"Avrami exponent {where}", f"{exponent:.3g}", allowed, remedy)
    return math.exp(float(log_time.mean() - per * grown.mean())), exponent


def product(name: str, holds: Sequence[Held]) -> MeasuredProduct:
    """The curves of one product; at least two temperatures.

    Raises
    ------
    InputFault
        One temperature only, or as `avrami`.
    """
    if len(holds) < 2:
        raise InputFault(
            f"temperatures of {name}",
            f"{len(holds)}",
            "two or more",
            "Nothing forms outside the measured temperatures: one alone has no effect.",
        )
    rising = sorted(holds, key=lambda one: one.temp)
    fitted = [avrami(one) for one in rising]
    return MeasuredProduct(
        name,
        tuple(one.temp for one in rising),
        tuple(time for time, _ in fitted),
        tuple(exponent for _, exponent in fitted),
    )


def clock(one: MeasuredProduct, temp: Array) -> tuple[Array, Array]:
    """``1/tau`` [1/s], zero outside the measurement, and ``n``, shape of ``temp`` each."""
    known = np.array(one.temp)
    log = np.interp(temp, known, np.log(np.array(one.time)))
    inside = (temp >= known[0]) & (temp <= known[-1])
    exponent: Array = np.interp(temp, known, np.array(one.exponent))
    return np.where(inside, np.exp(-log), 0.0), exponent


def martensite(points: Mapping[float, float]) -> tuple[float | None, float | None]:
    """Start [K] and rate [1/K], None where not measured.

    ``points`` are shares of the austenite that has become martensite, by temperature [K];
    a share of 0 marks the start.

    Raises
    ------
    InputFault
        Two starts, a single share without a start, or shares that do not grow on cooling.
    """
    if not points:
        return None, None
    starts = [temp for temp, share in points.items() if share == 0.0]
    grown = {temp: -math.log1p(-share) for temp, share in points.items() if share > 0.0}
    if len(starts) > 1 or (not starts and len(grown) < 2):
        said = f"{len(starts)} starts and {len(grown)} fractions"
        remedy = "The start is the row with the fraction 0."
        raise InputFault("rows of martensite", said, "one start, or two fractions", remedy)
    temps, logs = np.array([*grown]), np.array([*grown.values()])
    if starts:
        start = starts[0]
        if not grown:
            return start, None
        under = start - temps
        rate = float((under * logs).sum() / (under**2).sum())
    else:
        centred = temps - temps.mean()
        rate = -float((centred * logs).sum() / (centred**2).sum())
        start = float(temps.mean() + logs.mean() / rate) if rate > 0.0 else math.nan
    order = np.argsort(-temps)
    if not (rate > 0.0 and np.all(np.diff(logs[order]) > 0.0) and np.all(temps < start)):
        raise InputFault(
            "rows of martensite", "not growing on cooling", "more martensite at lower temperatures"
        )
    return start, rate
