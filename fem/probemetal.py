"""Metals of cooling probes that do not transform.

Model
-----
Conductivity and heat capacity linear between tabulated temperatures; density that of the
cold metal.

Source
------
Alloy 600: Special Metals bulletin values as tabulated in public material data (read); the
step of its heat capacity between 500 and 600 degC is an order-disorder change. Austenitic
stainless steel: EN 1993-1-2 annex C (remembered).

Holds for
---------
Alloy 600 to 800 degC (conductivity) and 900 degC (heat capacity), continued on the last
slope above; stainless steel to 1200 degC. A steel that transforms is no such metal: its
latent heat would be read as a weaker film.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

ZERO_DEGC = 273.15
FIRST_K, LAST_K, STEP_K = 223.15, 1623.15, 1.0
SOURCES = (
    Source("alloy 600 of the probe", "Special Metals bulletin", "tabulated values", "read"),
    Source("stainless steel of a probe", "EN 1993-1-2", "annex C", "remembered"),
)


@dataclass(frozen=True)
class ProbeMetal:
    """Tables at even steps from ``FIRST_K``, (n,) each: ``conductivity`` [W/(m K)] and
    ``enthalpy`` [J/m3]."""

    name: str
    conductivity: Array
    enthalpy: Array
    source: Source

    def diffusivity(self, temp: float) -> float:
        """At one temperature [K], m2/s."""
        k = int(round((temp - FIRST_K) / STEP_K))
        slope = (self.enthalpy[k + 1] - self.enthalpy[k - 1]) / (2.0 * STEP_K)
        return float(self.conductivity[k] / slope)


_ALLOY_K = (
    (20.0, 14.9), (100.0, 15.9), (200.0, 17.3), (300.0, 19.0), (400.0, 20.5), (500.0, 22.1),
    (600.0, 23.9), (700.0, 25.7), (800.0, 27.5), (900.0, 29.3),
)  # fmt: skip
_ALLOY_CP = (
    (20.0, 444.0), (100.0, 465.0), (200.0, 486.0), (300.0, 502.0), (400.0, 519.0), (500.0, 536.0),
    (600.0, 578.0), (700.0, 595.0), (800.0, 611.0), (900.0, 628.0),
)  # fmt: skip
_ALLOY_DENSITY, _STAINLESS_DENSITY = 8470.0, 7900.0
ALLOY_600, STAINLESS = "alloy 600", "stainless 1.4301"
NAMES = (ALLOY_600, STAINLESS)


def probe_metal(name: str) -> ProbeMetal:
    """The metal of that name.

    Raises
    ------
    InputFault
        Another name: a steel that transforms is refused, its latent heat is not handled.
    """
    temp = np.arange(FIRST_K, LAST_K + 0.5 * STEP_K, STEP_K)
    degc = temp - ZERO_DEGC
    if name == ALLOY_600:
        conductivity = np.interp(degc, *np.array(_ALLOY_K).T)
        capacity = _ALLOY_DENSITY * np.interp(degc, *np.array(_ALLOY_CP).T)
        return ProbeMetal(name, conductivity, _enthalpy(capacity), SOURCES[0])
    if name == STAINLESS:
        conductivity = 14.6 + 1.27e-2 * degc
        capacity = _STAINLESS_DENSITY * (
            450.0 + 0.280 * degc - 2.91e-4 * degc**2 + 1.34e-7 * degc**3
        )
        return ProbeMetal(name, conductivity, _enthalpy(capacity), SOURCES[1])
    raise InputFault(
        "material",
        f'"{name}"',
        "one of: " + "; ".join(NAMES),
        "A steel that transforms is refused: its latent heat would be read as a weaker film. "
        "Use a dummy of nickel alloy or of austenitic stainless steel.",
    )


def _enthalpy(capacity: Array) -> Array:
    """Sum of a capacity [J/(m3 K)] over the even steps."""
    return np.concatenate([[0.0], np.cumsum(0.5 * (capacity[1:] + capacity[:-1]) * STEP_K)])
