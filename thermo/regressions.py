"""Hardenability by regression on composition, independent of the rates and of ASTM A255.

Model
-----
Just: the whole end-quench curve in one equation, under the most that martensite
of that carbon reaches. Maynier: cooling rates at 700 degC above which all, or
half, of the austenite becomes martensite.

Source
------
Just 1969 (remembered). A second recollection has 12.28, 0.898, 0.00276 and 0.81
where 12, 0.9, 0.0028 and 0.8 stand here, and a term 96 P: within 1 HRC of this
one for 0.015 % P (not settled). Maynier, Jungmann & Dollet 1978 (remembered).

Holds for
---------
Just: 5 to 80 mm, ASTM grain 1.5 to 11, 0.08 to 0.56 C, 0.2 to 1.88 Mn, to 1.97
Cr, 8.94 Ni, 0.53 Mo (limits remembered); below 20 HRC nan. Maynier: 0.1 to 0.5 C,
Si < 1, Mn < 2, Ni < 4, Cr < 3, Mo < 1, V < 0.2, Cu < 0.5, about half an hour at
heat; above 0.5 % C it is wrong by a factor of a hundred and gives nan. Neither has
a term for boron.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo import boron
from midradius.thermo.arrays import Array
from midradius.thermo.hardenability import Curve, curve, distance_notes
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

JUST, MAYNIER = "end-quench regression", "critical cooling rates"
SOURCES = (
    Source(JUST, "Just 1969", "distances in mm", "remembered"),
    Source(MAYNIER, "Maynier, Jungmann & Dollet 1978", "Hardenability Concepts, 518", "remembered"),
)

ZERO_DEGC = 273.15
NEAREST, FURTHEST = 5e-3, 80e-3
FINEST_ASTM, COARSEST_ASTM = 11.0, 1.5
MOST_CARBON_OF_RATES = 0.5
_JUST_LIMITS = {
    "C": (0.08, 0.56), "Mn": (0.2, 1.88), "Cr": (0.0, 1.97), "Ni": (0.0, 8.94), "Mo": (0.0, 0.53),
    "B": (0.0, boron.EFFECTIVE_PCT),
}  # fmt: skip
_MAYNIER_LIMITS = {
    "C": (0.1, MOST_CARBON_OF_RATES), "Si": (0.0, 1.0), "Mn": (0.0, 2.0), "Ni": (0.0, 4.0),
    "Cr": (0.0, 3.0), "Mo": (0.0, 1.0), "V": (0.0, 0.2), "Cu": (0.0, 0.5),
    "B": (0.0, boron.EFFECTIVE_PCT),
}  # fmt: skip


@dataclass(frozen=True)
class CriticalRates:
    """Cooling rates at 700 degC [K/s] above which all, or half, becomes martensite."""

    full: float
    half: float
    notes: tuple[RangeNote, ...]


def just_curve(composition: Composition, distance: Array, *, grain_astm: float) -> Curve:
    """End-quench curve by Just.

    Parameters
    ----------
    composition
        Mass percent.
    distance
        From the quenched end [m], (n_distance,).
    grain_astm
        Prior austenite grain number.

    Returns
    -------
    Curve
        nan outside 5 to 80 mm and below 20 HRC: ``notes``.
    """
    c = composition
    at = np.asarray(distance, dtype=np.float64)
    inside = (at >= NEAREST * (1.0 - 1e-9)) & (at <= FURTHEST * (1.0 + 1e-9))
    s = np.where(inside, 1e3 * at, np.nan)
    root = np.sqrt(c.C)
    hrc = (
        95.0 * root - 0.0028 * s**2 * root + 20.0 * c.Cr + 38.0 * c.Mo + 14.0 * c.Mn + 5.5 * c.Ni
        + 6.1 * c.Si + 39.0 * c.V - 0.8 * grain_astm - 12.0 * np.sqrt(s) + 0.9 * s - 13.0
    )  # fmt: skip
    notes = list(outside(c, model=JUST, limits=_JUST_LIMITS))
    if not COARSEST_ASTM <= grain_astm <= FINEST_ASTM:
        allowed = f"ASTM {COARSEST_ASTM:g} to {FINEST_ASTM:g}"
        notes.append(RangeNote(JUST, "austenite grain", f"ASTM {grain_astm:g}", allowed))
    notes += distance_notes(JUST, at, NEAREST, FURTHEST)
    return curve(JUST, at, np.minimum(hrc, just_hardest(c.C)), notes)


def just_hardest(carbon_pct: Array | float) -> Array:
    """Most that martensite reaches by Just [HRC], any shape."""
    return np.asarray(20.0 + 60.0 * np.sqrt(carbon_pct))


def critical_rates(composition: Composition, *, austenitising_temp: float) -> CriticalRates:
    """Critical cooling rates by Maynier; ``austenitising_temp`` [K] for about half an hour.

    nan above 0.5 % C.
    """
    c = composition
    degc = austenitising_temp - ZERO_DEGC
    full = 9.81 - (
        4.62 * c.C + 1.05 * c.Mn + 0.54 * c.Ni + 0.50 * c.Cr + 0.66 * c.Mo + 0.00183 * degc
    )
    half = 8.50 - (
        4.13 * c.C + 0.86 * c.Mn + 0.57 * c.Ni + 0.41 * c.Cr + 0.94 * c.Mo + 0.0012 * degc
    )
    notes = list(outside(c, model=MAYNIER, limits=_MAYNIER_LIMITS))
    alloy = c.Mn + c.Ni + c.Cr + c.Mo
    if alloy > 5.0:
        notes.append(RangeNote(MAYNIER, "Mn + Ni + Cr + Mo", f"{alloy:g} %", "0 to 5 %"))
    if c.C > MOST_CARBON_OF_RATES:
        return CriticalRates(float("nan"), float("nan"), tuple(notes))
    return CriticalRates(10.0**full / 3600.0, 10.0**half / 3600.0, tuple(notes))
