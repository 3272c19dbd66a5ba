"""Volume fraction from a systematic point count, and how far it can be trusted.

Model
-----
The share of grid points that fall on a constituent is an unbiased estimate of
its volume fraction; a point on a boundary counts one half. With the share of
every field, the mean of n fields lies within ``t s / sqrt(n)``: s their standard
deviation, t Student's for n - 1. With the totals alone the points are taken as
independent (Wilson's interval of a binomial share). Neighbouring points often hit
one grain and fields differ, which that interval cannot see: it is the least.

Source
------
ASTM E562, ISO 9042: mean, standard deviation, interval and relative accuracy of
the field shares (remembered). Wilson 1927, score interval (remembered).

Holds for
---------
A grid laid without regard to the structure, on a section without texture, two
fields or more. Says nothing of etching or of the eye that counts.
"""

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source

MODEL = "point count"
SOURCES = (
    Source("interval of a point count", "ASTM E562, ISO 9042", "field shares", "remembered"),
    Source("interval of a total", "Wilson 1927", "score interval", "remembered"),
)

USUAL_LEVEL = 0.95  # both standards state the 95 % interval
Method = Literal["fields", "totals"]


@dataclass(frozen=True)
class CountedFraction:
    """A counted share with its two-sided interval at ``level``.

    ``relative_accuracy`` is half the interval over the share [-], as the standards
    state it in percent, before the interval is kept inside 0 to 1.
    """

    fraction: float
    low: float
    high: float
    level: float
    relative_accuracy: float
    n_field: int | None
    n_point: float
    method: Method
    notes: tuple[RangeNote, ...]


def from_fields(
    shares: Array, *, points_per_field: float, level: float = USUAL_LEVEL
) -> CountedFraction:
    """Fraction from the share of points hit in each field.

    Parameters
    ----------
    shares
        Points hit over points laid [-], (n_field,).
    points_per_field
        Points of the grid.
    level
        Confidence of the interval, between 0 and 1.

    Returns
    -------
    CountedFraction
        Where no two fields differ there is no scatter to judge by: Wilson's
        interval of all points stands in, with a note.

    Raises
    ------
    InputFault
        Fewer than two fields, a share outside 0 to 1, no points, level not
        between 0 and 1.
    """
    field = np.asarray(shares, dtype=np.float64)
    _check_level(level)
    _check_points("points per field", points_per_field)
    if field.ndim != 1 or field.size < 2:
        raise InputFault(
            "fields", f"{field.size}", "two or more", "Without a second field give the totals."
        )
    if not np.all((field >= 0.0) & (field <= 1.0)):  # true for nan as well
        worst = field[~((field >= 0.0) & (field <= 1.0))][0]
        raise InputFault("share of a field", f"{worst:g}", "0 to 1", "Divide hits by points.")
    n_point = field.size * float(points_per_field)
    mean, deviation = float(field.mean()), float(field.std(ddof=1))
    if np.all(field == field[0]):
        mean = float(field[0])
        low, high = wilson(mean, n_point, level)
        half = 0.5 * (high - low)
        scatter = "none between fields, interval as if points were independent"
        notes = [RangeNote(MODEL, "scatter", scatter, "fields that differ")]
    else:
        half = student(field.size - 1, level) * deviation / math.sqrt(field.size)
        low, high, notes = _inside(mean, half)
    return CountedFraction(
        mean, low, high, level, _relative(half, mean), field.size, n_point, "fields", tuple(notes)
    )


def from_totals(hits: float, *, points: float, level: float = USUAL_LEVEL) -> CountedFraction:
    """Fraction from all points hit, a point on a boundary as one half, of all ``points`` laid.

    The interval is the least there can be; a note says so.

    Raises
    ------
    InputFault
        More hits than points, none laid, level not between 0 and 1.
    """
    _check_level(level)
    _check_points("points", points)
    if not 0.0 <= hits <= points:
        raise InputFault("points hit", f"{hits:g}", f"0 to {points:g}", "Count all points laid.")
    share = float(hits / points)
    low, high = wilson(share, points, level)
    scatter = "not given per field, so the interval is the least there can be"
    note = RangeNote(MODEL, "scatter", scatter, "a share for every field")
    relative = _relative(0.5 * (high - low), share)
    return CountedFraction(
        share, low, high, level, relative, None, float(points), "totals", (note,)
    )


def student(freedom: int, level: float) -> float:
    """Two-sided multiplier of Student's t for ``freedom`` degrees of freedom."""
    from scipy.special import stdtrit  # only here: a case file is read without it

    return float(stdtrit(freedom, 0.5 * (1.0 + level)))


def wilson(share: float, points: float, level: float) -> tuple[float, float]:
    """Score interval of a binomial ``share`` of ``points``."""
    from scipy.special import ndtri

    z = float(ndtri(0.5 * (1.0 + level)))
    wide = 1.0 + z**2 / points
    middle = (share + z**2 / (2.0 * points)) / wide
    half = z / wide * math.sqrt(share * (1.0 - share) / points + (z / (2.0 * points)) ** 2)
    # exactly, 0 <= low <= share <= high <= 1; near the ends rounding leaves a speck outside
    low, high = max(middle - half, 0.0), min(middle + half, 1.0)
    return min(low, share), max(high, share)


def _inside(mean: float, half: float) -> tuple[float, float, list[RangeNote]]:
    """The interval cut where no fraction exists, with a note that it was."""
    low, high = mean - half, mean + half
    if low >= 0.0 and high <= 1.0:
        return low, high, []
    note = RangeNote(MODEL, "interval", f"{low:.3f} to {high:.3f}, cut", "fractions of 0 to 1")
    return max(low, 0.0), min(high, 1.0), [note]


def _relative(half: float, share: float) -> float:
    return half / share if share > 0.0 else math.inf


def _check_level(level: float) -> None:
    if not 0.0 < level < 1.0:
        raise InputFault("level", f"{level:g}", "between 0 and 1", "0.95 is usual.")


def _check_points(quantity: str, points: float) -> None:
    if not (points >= 1.0 and math.isfinite(points)):
        raise InputFault(quantity, f"{points:g}", "1 or more", "Give the points of the grid.")
