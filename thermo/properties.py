"""Heat content and conductivity of each constituent.

Model
-----
Every constituent has its own enthalpy; a mixture is their mass mean, and the
latent heat is simply the difference between two of them at the temperature of
transformation. There is no separate latent heat and none may be added.
Martensite is body-centred iron with the carbon left in solution, without the
energy of ordering or of defects (physical error about 15 kJ/kg); pearlite and
bainite are ferrite with cementite; ferrite is carbon-free.

All functions share one zero: ferrite with cementite of the same carbon at
20 degC, that is ``(1-w) ferrite + w cementite``, ``w = C / 6.69``. The zero is
linear in carbon, so a sum over constituents that conserves carbon is an energy.

Source
------
Enthalpy: `thermo.gibbs`, cementite of Gustafson 1985. Conductivity of ferrite,
pearlite and bainite: EN 1993-1-2; austenite: 20.14 + 0.009313 T, read in a
public listing, attributed from memory to Harste 1989; martensite: 0.86 of the
ferrite value, from the tables common in quench literature (remembered). The
effect of alloying on conductivity is not represented: at 20 degC a low-alloy
steel may conduct 10 to 20 % less, above 800 degC the difference vanishes.

Holds for
---------
250 to 1500 K and up to 1.5 % C without loss of sense; alloying elements are
counted as iron. Against calorimetry of eutectoid steel (Hagel, Pound & Mehl,
82.0 kJ/kg +- 5 %) the pearlite heat comes out at 79.6 kJ/kg.
"""

import numpy as np

from midradius.thermo import en1993, gibbs
from midradius.thermo.arrays import Array
from midradius.thermo.gibbs import AUSTENITE, CEMENTITE_CARBON_PCT, FERRITE, Values
from midradius.thermo.source import RangeNote, Source

SOURCES = (
    *gibbs.SOURCES,
    Source("conductivity of ferrite, pearlite, bainite", "EN 1993-1-2:2005", "3.4.1.3", "read"),
    Source("conductivity of austenite", "Harste 1989", "regression in T", "remembered"),
    Source("conductivity of martensite", "Sjostrom 1982", "ratio to ferrite", "remembered"),
)

DENSITY = en1993.DENSITY  # kg/m3, fixed: on a fixed mesh mass and energy stay conserved
LOWEST_TEMP = 250.0
HIGHEST_TEMP = 1500.0
REFERENCE_TEMP = 293.15
ZERO_DEGC = 273.15
_CEMENTITE = gibbs.CEMENTITE_GUSTAFSON


def enthalpy_austenite(temp: Values, carbon_pct: Values) -> Array:
    """Enthalpy of austenite [J/kg] at ``temp`` [K] and ``carbon_pct``, broadcast together."""
    return AUSTENITE.enthalpy(temp, carbon_pct) - _zero(carbon_pct)


def enthalpy_ferrite(temp: Values) -> Array:
    """Enthalpy of carbon-free ferrite [J/kg] at ``temp`` [K], any shape."""
    return np.asarray(FERRITE.enthalpy(temp, 0.0) - FERRITE.enthalpy(REFERENCE_TEMP, 0.0))


def enthalpy_cementite(temp: Values) -> Array:
    """Enthalpy of cementite [J/kg] at ``temp`` [K], any shape."""
    return np.asarray(_CEMENTITE.enthalpy(temp) - _CEMENTITE.enthalpy(REFERENCE_TEMP))


def enthalpy_ferrite_cementite(temp: Values, carbon_pct: Values) -> Array:
    """Enthalpy of pearlite or bainite [J/kg]: the mass mix that holds ``carbon_pct``."""
    share = carbon_pct / CEMENTITE_CARBON_PCT
    return np.asarray((1.0 - share) * enthalpy_ferrite(temp) + share * enthalpy_cementite(temp))


def enthalpy_martensite(temp: Values, carbon_pct: Values) -> Array:
    """Enthalpy of martensite [J/kg] at ``temp`` [K] and ``carbon_pct``, broadcast together."""
    return FERRITE.enthalpy(temp, carbon_pct) - _zero(carbon_pct)


def heat_capacity_austenite(temp: Values, carbon_pct: Values) -> Array:
    """Exact temperature derivative of `enthalpy_austenite` [J/(kg K)]."""
    return AUSTENITE.heat_capacity(temp, carbon_pct)


def heat_capacity_ferrite(temp: Values) -> Array:
    """Exact temperature derivative of `enthalpy_ferrite` [J/(kg K)], Curie peak included."""
    return FERRITE.heat_capacity(temp, 0.0)


def heat_capacity_cementite(temp: Values) -> Array:
    """Exact temperature derivative of `enthalpy_cementite` [J/(kg K)]."""
    return _CEMENTITE.heat_capacity(temp)


def heat_capacity_ferrite_cementite(temp: Values, carbon_pct: Values) -> Array:
    """Exact temperature derivative of `enthalpy_ferrite_cementite` [J/(kg K)]."""
    share = carbon_pct / CEMENTITE_CARBON_PCT
    return np.asarray(
        (1.0 - share) * heat_capacity_ferrite(temp) + share * heat_capacity_cementite(temp)
    )


def heat_capacity_martensite(temp: Values, carbon_pct: Values) -> Array:
    """Exact temperature derivative of `enthalpy_martensite` [J/(kg K)]."""
    return FERRITE.heat_capacity(temp, carbon_pct)


def conductivity_austenite(temp: Values) -> Array:
    """Conductivity of austenite [W/(m K)] at ``temp`` [K], any shape."""
    return np.asarray(20.14 + 9.313e-3 * (np.asarray(temp, dtype=np.float64) - ZERO_DEGC))


def conductivity_ferrite(temp: Values) -> Array:
    """Conductivity of ferrite, pearlite and bainite [W/(m K)] at ``temp`` [K], any shape."""
    return en1993.conductivity(temp)


def conductivity_martensite(temp: Values) -> Array:
    """Conductivity of martensite [W/(m K)] at ``temp`` [K], any shape."""
    return 0.86 * en1993.conductivity(temp)


def range_notes(temp: Values, carbon_pct: Values) -> tuple[RangeNote, ...]:
    """Notes when ``temp`` [K] or ``carbon_pct`` leave the range of this module."""
    notes = []
    for name, values, low, high, unit in (
        ("temperature", temp, LOWEST_TEMP, HIGHEST_TEMP, "K"),
        ("carbon", carbon_pct, 0.0, 1.5, "%"),
    ):
        least, most = float(np.min(values)), float(np.max(values))
        if not (low <= least and most <= high):
            value = f"{least:g} to {most:g} {unit}"
            notes.append(RangeNote("phase enthalpies", name, value, f"{low:g} to {high:g} {unit}"))
    return tuple(notes)


def _zero(carbon_pct: Values) -> Array:
    """Enthalpy of ferrite with cementite at the reference temperature on the absolute scale."""
    share = carbon_pct / CEMENTITE_CARBON_PCT
    ferrite = FERRITE.enthalpy(REFERENCE_TEMP, 0.0)
    return np.asarray((1.0 - share) * ferrite + share * _CEMENTITE.enthalpy(REFERENCE_TEMP))
