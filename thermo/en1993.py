"""Carbon steel by EN 1993-1-2: conductivity, heat capacity, enthalpy, elongation.

A heating curve: the peak of the heat capacity near 735 degC already holds the
heat of transformation, so it must never be combined with a latent heat. The
package uses only the conductivity; the rest serves comparison.

Source
------
EN 1993-1-2:2005, clauses 3.4.1.1 to 3.4.1.3, formulas read in public copies.

Holds for
---------
20 to 1200 degC. Below and above, conductivity continues its line and its
constant; heat capacity keeps its end value. `thermo.properties` notes that use.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

SOURCE = Source(
    model="thermal properties of carbon steel",
    work="EN 1993-1-2:2005",
    locator="cl. 3.4.1.1 to 3.4.1.3",
    status="read",
)

DENSITY = 7850.0  # kg/m3, cl. 3.2.2
ZERO_DEGC = 273.15


def conductivity(temp: Array | float) -> Array:
    """Conductivity [W/(m K)] at ``temp`` [K], any shape; it steps by 0.06 at 800 degC."""
    t = np.asarray(temp, dtype=np.float64) - ZERO_DEGC
    return np.where(t < 800.0, 54.0 - 3.33e-2 * t, 27.3)


def heat_capacity(temp: Array | float) -> Array:
    """Apparent heat capacity on heating [J/(kg K)] at ``temp`` [K], any shape."""
    t = np.clip(np.asarray(temp, dtype=np.float64) - ZERO_DEGC, 20.0, 1200.0)
    return np.select(
        [t < 600.0, t < 735.0, t < 900.0],
        [
            425.0 + 7.73e-1 * t - 1.69e-3 * t**2 + 2.22e-6 * t**3,
            666.0 + 13002.0 / (738.0 - np.minimum(t, 735.0)),
            545.0 + 17820.0 / (np.maximum(t, 735.0) - 731.0),
        ],
        650.0,
    )


def enthalpy(temp: Array | float) -> Array:
    """Exact integral of `heat_capacity` from 20 degC [J/kg] at ``temp`` [K], 20..1200 degC."""
    t = np.asarray(temp, dtype=np.float64) - ZERO_DEGC
    cold = np.minimum(t, 600.0)
    warm = np.clip(t, 600.0, 735.0)
    hot = np.clip(t, 735.0, 900.0)
    return np.asarray(
        _cubic(cold)
        - _cubic(np.float64(20.0))
        + 666.0 * (warm - 600.0)
        + 13002.0 * np.log(138.0 / (738.0 - warm))
        + 545.0 * (hot - 735.0)
        + 17820.0 * np.log((hot - 731.0) / 4.0)
        + 650.0 * np.maximum(t - 900.0, 0.0)
    )


def _cubic(t: Array | np.float64) -> Array:
    return np.asarray(425.0 * t + 7.73e-1 / 2 * t**2 - 1.69e-3 / 3 * t**3 + 2.22e-6 / 4 * t**4)


def elongation(temp: Array | float) -> Array:
    """Elongation from 20 degC [-] at ``temp`` [K], any shape."""
    t = np.asarray(temp, dtype=np.float64) - ZERO_DEGC
    return np.select(
        [t < 750.0, t <= 860.0],
        [1.2e-5 * t + 0.4e-8 * t**2 - 2.416e-4, np.full(t.shape, 1.1e-2)],
        2e-5 * t - 6.2e-3,
    )
