"""Martensite: the temperature where it starts and how fast it takes the austenite.

Model
-----
``f = 1 - exp(-rate (start - T))`` of the austenite present at the start,
following the lowest temperature reached; time does not enter. Start and rate
both fall with carbon as ``base - amplitude (1 - exp(-exponent C))``.

Source
------
van Bohemen, Mater. Sci. Technol. 28 (2012) 487 (remembered; agrees with measured
starts of eight steels within 25 K). For comparison only: Andrews 1965, linear;
Steven & Haynes 1956; Capdevila, Caballero & Garcia de Andres 2002 (all
remembered); rate of Koistinen & Marburger 1959, 0.011 per K.

Holds for
---------
Carbon to about 1.9 %. The linear start formulas fail above 0.6 % C. Nothing
here knows stabilisation of austenite by a hold below the start.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

SOURCE = Source(
    model="martensite start and fraction",
    work="van Bohemen 2012",
    locator="Mater. Sci. Technol. 28, 487",
    status="remembered",
)
ZERO_DEGC = 273.15
KOISTINEN_MARBURGER_RATE = 0.011  # 1/K
_LIMITS = {
    "C": (0.1, 1.9), "Mn": (0.0, 2.0), "Si": (0.0, 2.0), "Cr": (0.0, 2.0), "Ni": (0.0, 4.0),
    "Mo": (0.0, 1.0),
}  # fmt: skip


def start_coefficients(composition: Composition) -> tuple[float, float, float]:
    """``(base [K], amplitude [K], exponent [1/mass %])`` of the start of one steel."""
    c = composition
    base = 565.0 - 31.0 * c.Mn - 13.0 * c.Si - 10.0 * c.Cr - 18.0 * c.Ni - 12.0 * c.Mo
    return base + ZERO_DEGC, 600.0, 0.96


def rate_coefficients(composition: Composition) -> tuple[float, float, float]:
    """``(base [1/K], amplitude [1/K], exponent [1/mass %])`` of the rate of one steel."""
    c = composition
    base = 27.2 - 0.14 * c.Mn - 0.21 * c.Si - 0.11 * c.Cr - 0.08 * c.Ni - 0.05 * c.Mo
    return 1e-3 * base, 1e-3 * 19.8, 1.56


def start(composition: Composition, carbon_pct: Array | float) -> Array:
    """Martensite start [K] of austenite with ``carbon_pct``, any shape."""
    return _falling(start_coefficients(composition), carbon_pct)


def rate(composition: Composition, carbon_pct: Array | float) -> Array:
    """Rate [1/K] of austenite with ``carbon_pct``, any shape."""
    return _falling(rate_coefficients(composition), carbon_pct)


def _falling(coefficients: tuple[float, float, float], carbon_pct: Array | float) -> Array:
    base, amplitude, exponent = coefficients
    return np.asarray(base + amplitude * np.expm1(-exponent * np.asarray(carbon_pct)))


def fraction(coldest: Array | float, *, start: Array | float, rate: Array | float) -> Array:
    """Share of the austenite that has become martensite, in [0, 1].

    Parameters
    ----------
    coldest
        Lowest temperature reached so far [K].
    start
        Martensite start [K].
    rate
        Rate [1/K].
    """
    undercooling = np.maximum(np.asarray(start) - np.asarray(coldest), 0.0)
    return np.asarray(-np.expm1(-np.asarray(rate) * undercooling))


def start_andrews(composition: Composition, carbon_pct: Array | float) -> Array:
    """Start [K] by Andrews 1965, linear equation; below 0.6 % C."""
    c = composition
    alloy = 30.4 * c.Mn + 17.7 * c.Ni + 12.1 * c.Cr + 7.5 * c.Mo
    return np.asarray(539.0 - 423.0 * np.asarray(carbon_pct) - alloy + ZERO_DEGC)


def start_steven_haynes(composition: Composition, carbon_pct: Array | float) -> Array:
    """Start [K] by Steven & Haynes 1956; below 0.6 % C."""
    c = composition
    alloy = 33.0 * c.Mn + 17.0 * c.Ni + 17.0 * c.Cr + 21.0 * c.Mo
    return np.asarray(561.0 - 474.0 * np.asarray(carbon_pct) - alloy + ZERO_DEGC)


def start_capdevila(composition: Composition, carbon_pct: Array | float) -> Array:
    """Start [K] by Capdevila et al. 2002."""
    c = composition
    alloy = (
        30.6 * c.Mn + 16.6 * c.Ni + 8.9 * c.Cr - 2.4 * c.Mo + 11.3 * c.Cu
        - 8.58 * c.Co - 7.4 * c.W + 14.5 * c.Si
    )  # fmt: skip
    return np.asarray(764.2 - 302.6 * np.asarray(carbon_pct) - alloy)


def range_notes(composition: Composition) -> tuple[RangeNote, ...]:
    """Notes for elements beyond the range of the start formula (range: estimate)."""
    return outside(composition, model=SOURCE.model, limits=_LIMITS)
