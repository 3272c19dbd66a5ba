"""Hardenability by ASTM A255: ideal diameter, hardness of martensite, end-quench curve.

Model
-----
Ideal diameter: a product of one factor per element. Its carbon factors are
printed for hundredths of a percent; between the last hundredth of one piece and
the first of the next the factor is straight. Curve: the hardness of martensite,
a polynomial in carbon, divided by a factor that is a polynomial in the ideal
diameter, one for each distance. Between two distances whose row is known the
factor is straight; beyond the last row there is none.

Source
------
ASTM A255 (coefficients remembered, composition range read from its first page):
multiplying factors, initial hardness, hardness of half martensite after Hodge &
Orehoski 1946, dividing factors of steels without boron in
``hardenability.csv``. Grain size: Grossmann (remembered). Boron: Llewellyn &
Cook (remembered) in place of the standard's own table. What 90 % martensite has
of the rise from half to whole: from 51 HRC at 0.40 % C (read).

Holds for
---------
0.10 to 0.70 C, 0.50 to 1.65 Mn, 0.15 to 0.60 Si, to 1.35 Cr, 1.50 Ni, 0.55 Mo,
ideal diameter 1 to 7 in (remembered), 1/16 to 12/16 in from the end (the standard goes on to
32/16; those rows are not known here). Hardness below 20 HRC is nan: there the
scale ends. The standard's pairs of ideal diameter and distance of half
martensite do not follow from conduction and are not used.
"""

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib import resources

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.boron import acts
from midradius.thermo.boron import diameter_factor as boron_factor
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

MODEL = "hardenability by ASTM A255"
SOURCES = (
    Source(MODEL, "ASTM A255", "multiplying and dividing factors", "remembered"),
    Source("grain size in the ideal diameter", "Grossmann", "multiplying factor", "remembered"),
    Source("boron in the ideal diameter", "Llewellyn & Cook", "boron factor", "remembered"),
    Source("hardness of half martensite", "Hodge & Orehoski 1946", "via ASTM A255", "remembered"),
)

INCH = 0.0254
SIXTEENTH = INCH / 16.0
FURTHEST_POSITION = 12.0
SMALLEST_IN, LARGEST_IN = 1.0, 7.0
CONTINUED_TO_IN = 0.5  # smaller, and a farther row comes out harder than a nearer one
SOFTEST_HRC = 20.0
HARDEST_HRC = 68.0  # the scale of ISO 18265 ends here
LEAST_CARBON, MOST_CARBON = 0.10, 0.70  # mass %; beyond, the polynomials of hardness turn over
A255_GRAIN_ASTM = 7.0

_LIMITS = {
    "C": (LEAST_CARBON, MOST_CARBON), "Mn": (0.50, 1.65), "Si": (0.15, 0.60), "Cr": (0.0, 1.35),
    "Ni": (0.0, 1.50), "Mo": (0.0, 0.55),
}  # fmt: skip
# first and last carbon of a piece, then a0, a1, a2 of the factor [in]
_CARBON = (
    (0.00, 0.39, 0.0, 0.54, 0.0),
    (0.40, 0.55, 0.171, 0.001, 0.265),
    (0.56, 0.65, 0.115, 0.268, -0.038),
    (0.66, 0.75, 0.143, 0.2, 0.0),
    (0.76, 0.90, 0.062, 0.409, -0.135),
)
_LINEAR = {"Si": 0.7, "Ni": 0.363, "Cr": 2.16, "Mo": 3.0, "Cu": 0.365, "V": 1.73}
_MANGANESE_BEND, _MOST_MANGANESE = 1.20, 1.95
_WHOLE_HRC = (35.395, 6.990, 312.330, -821.744, 1015.479, -538.346)
_HALF_HRC = (22.974, 6.214, 356.364, -1091.488, 1464.880, -750.441)
# martensite [-], then its share of the rise in hardness from half to whole martensite
_RISE = ((0.5, 0.0), (0.9, 0.63), (0.999, 1.0), (1.0, 1.0))


@dataclass(frozen=True)
class IdealDiameter:
    """Diameter [m] of the round that an ideal quench leaves half martensite at its middle.

    ``factors`` are what was multiplied: carbon in inches, the others pure numbers.
    ``diameter`` is nan where a factor does not exist; ``notes`` name the element.
    """

    diameter: float
    factors: Mapping[str, float]
    notes: tuple[RangeNote, ...]


@dataclass(frozen=True)
class Curve:
    """Hardness along the end-quench test piece: ``distance`` [m] and HRC, (n_distance,) each."""

    distance: Array
    hardness_hrc: Array
    notes: tuple[RangeNote, ...]


def ideal_diameter(composition: Composition, *, grain_astm: float) -> IdealDiameter:
    """Ideal diameter by the factors of ASTM A255.

    Parameters
    ----------
    composition
        Mass percent. Boron counts from 0.0005 % on, all of it as if protected
        from nitrogen.
    grain_astm
        Prior austenite grain number; the standard itself computes with ASTM 7.

    Returns
    -------
    IdealDiameter
        nan above 0.90 % C or 1.95 % Mn, where the factors end.
    """
    c = composition
    boron = acts(c)
    factors = {"C": carbon_factor(c.C), "Mn": manganese_factor(c.Mn)}
    factors |= {name: 1.0 + slope * getattr(c, name) for name, slope in _LINEAR.items()}
    factors["B"] = boron_factor(c)
    factors["grain"] = 1.083 ** (A255_GRAIN_ASTM - grain_astm)
    notes = list(outside(c, model=MODEL, limits=_LIMITS))
    if boron:
        notes.append(RangeNote(MODEL, "B", f"{c.B:g} %", "boron that titanium protects"))
    elif c.B > 0.0:
        notes.append(RangeNote(MODEL, "B", f"{c.B:g} %, counted as none", "0.0005 % and more"))
    return IdealDiameter(INCH * float(np.prod(list(factors.values()))), factors, tuple(notes))


def carbon_factor(carbon_pct: float) -> float:
    """Ideal diameter of a steel without alloy at ASTM 7 [in]; nan above 0.90 % C."""
    before = _CARBON[0]
    for piece in _CARBON:
        first, last, *_ = piece
        if carbon_pct <= last:
            if carbon_pct >= first:
                return _on(piece, carbon_pct)
            ends = (_on(before, before[1]), _on(piece, first))
            return float(np.interp(carbon_pct, (before[1], first), ends))
        before = piece
    return float("nan")


def _on(piece: tuple[float, ...], carbon_pct: float) -> float:
    _, _, a0, a1, a2 = piece
    return a0 + a1 * carbon_pct + a2 * carbon_pct**2


def manganese_factor(manganese_pct: float) -> float:
    """Factor of manganese in the ideal diameter [-]; nan above 1.95 % Mn."""
    if manganese_pct <= _MANGANESE_BEND:
        return 1.0 + 3.3333 * manganese_pct
    return 5.10 * manganese_pct - 1.12 if manganese_pct <= _MOST_MANGANESE else float("nan")


def initial_hardness(carbon_pct: Array | float) -> Array:
    """Hardness of 99.9 % martensite [HRC], any shape; nan outside 0.10 to 0.70 % C."""
    return _of_carbon(carbon_pct, _WHOLE_HRC)


def half_martensite_hardness(carbon_pct: Array | float) -> Array:
    """Hardness of 50 % martensite [HRC], any shape; nan outside 0.10 to 0.70 % C."""
    return _of_carbon(carbon_pct, _HALF_HRC)


def martensite_hardness(carbon_pct: Array | float, *, martensite: Array | float) -> Array:
    """Hardness [HRC] of a hardened structure that holds ``martensite`` [-].

    Straight between 50, 90 and 99.9 % martensite, broadcast with ``carbon_pct``;
    nan below 50 % and outside 0.10 to 0.70 % C.
    """
    shares, rise = np.array(_RISE).T
    risen = np.interp(martensite, shares, rise, left=np.nan, right=np.nan)
    half = half_martensite_hardness(carbon_pct)
    return np.asarray(half + (initial_hardness(carbon_pct) - half) * risen)


def _of_carbon(carbon_pct: Array | float, coefficients: tuple[float, ...]) -> Array:
    carbon = np.asarray(carbon_pct, dtype=np.float64)
    inside = (carbon >= LEAST_CARBON) & (carbon <= MOST_CARBON)
    return np.where(inside, np.polynomial.polynomial.polyval(carbon, coefficients), np.nan)


def a255_curve(composition: Composition, distance: Array, *, grain_astm: float) -> Curve:
    """End-quench curve by ASTM A255.

    Parameters
    ----------
    composition
        Mass percent.
    distance
        From the quenched end [m], (n_distance,).
    grain_astm
        Prior austenite grain number; the standard itself computes with ASTM 7.

    Returns
    -------
    Curve
        nan where the standard, as far as known here, says nothing: ``notes``.
    """
    ideal = ideal_diameter(composition, grain_astm=grain_astm)
    at = np.asarray(distance, dtype=np.float64)
    notes = list(ideal.notes)
    inches = ideal.diameter / INCH
    if inches < SMALLEST_IN or inches > LARGEST_IN:
        notes.append(RangeNote(MODEL, "ideal diameter", f"{inches:.2f} in", "1 to 7 in"))
    if acts(composition):
        rows = "dividing factors of steels without boron"
        notes.append(RangeNote(MODEL, "end-quench curve", rows, "steels without boron"))
    notes += distance_notes(MODEL, at, SIXTEENTH, FURTHEST_POSITION * SIXTEENTH)
    hardness = initial_hardness(composition.C) / dividing_factor(ideal.diameter, at)
    return curve(MODEL, at, hardness, notes)


def dividing_factor(diameter: float, distance: Array) -> Array:
    """What divides the hardness of martensite at ``distance`` [m], (n_distance,).

    ``diameter`` is the ideal one [m]. 1 at 1/16 in, and above the largest diameter of
    a row; nan below an ideal diameter of 0.5 in and outside 1/16 to 12/16 in.
    """
    # rounded, so that a distance computed from sixteenths falls on its row
    position = np.round(np.asarray(distance, dtype=np.float64) / SIXTEENTH, 9)
    inches = diameter / INCH
    positions, coefficients, largest = _rows()
    factors: Array = np.asarray(np.polynomial.polynomial.polyval(inches, coefficients.T))
    factors = np.where(inches > largest, 1.0, factors)
    if inches < CONTINUED_TO_IN:
        factors = np.full(factors.shape, np.nan)
    known, values = np.append(1.0, positions), np.append(1.0, factors)
    return np.asarray(np.interp(position, known, values, left=np.nan, right=np.nan))


@cache
def _rows() -> tuple[Array, Array, Array]:
    """Positions [1/16 in] (n_row,), coefficients (n_row, 6), largest diameters [in] (n_row,)."""
    path = resources.files("midradius.thermo").joinpath("hardenability.csv")
    rows = list(csv.DictReader(path.read_text(encoding="utf-8").splitlines()))
    positions = np.array([float(row["position"]) for row in rows])
    coefficients = np.array([[float(row[f"a{k}"]) for k in range(6)] for row in rows])
    return positions, coefficients, np.array([float(row["largest_in"]) for row in rows])


def distance_notes(model: str, distance: Array, near: float, far: float) -> list[RangeNote]:
    """A note when a distance [m] lies outside ``near`` to ``far``."""
    least, most = float(np.min(distance)), float(np.max(distance))
    if near * (1.0 - 1e-9) <= least and most <= far * (1.0 + 1e-9):
        return []
    value, allowed = (f"{1e3 * a:.2f} to {1e3 * b:.2f} mm" for a, b in ((least, most), (near, far)))
    return [RangeNote(model, "distance from the quenched end", value, allowed)]


def curve(model: str, distance: Array, hardness_hrc: Array, notes: list[RangeNote]) -> Curve:
    """The curve with nan, and a note, in place of what lies off the scale."""
    soft = hardness_hrc < SOFTEST_HRC
    if np.any(soft):
        value = f"below 20 HRC from {1e3 * float(distance[soft].min()):.2f} mm on"
        notes = [*notes, RangeNote(model, "hardness", value, "20 HRC and more")]
    hard = hardness_hrc > HARDEST_HRC
    if np.any(hard):
        value = f"above {HARDEST_HRC:g} HRC to {1e3 * float(distance[hard].max()):.2f} mm"
        notes = [*notes, RangeNote(model, "hardness", value, f"{HARDEST_HRC:g} HRC and less")]
    return Curve(distance, np.where(soft | hard, np.nan, hardness_hrc), tuple(notes))
