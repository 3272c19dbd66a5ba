"""Phases of a steel at equilibrium: how much of each at a temperature, and their carbon.

Model
-----
The lever rule on the boundaries of `thermo.equilibrium`: above Ae1 austenite
beside ferrite (below Ae3) or cementite (below Acm) or alone, below Ae1 ferrite
beside cementite. Mass fractions.

Source
------
`thermo.equilibrium` (derived).

Holds for
---------
0.03 to 1.5 % C, 0 to 1147 degC; above that liquid may form, and it is refused.
Alloying elements move the boundaries and are not shared out between the phases:
Ae1, a range of some kelvin in an alloyed steel, is one temperature here.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.equilibrium import (
    CEMENTITE_CARBON_PCT,
    SOURCES,
    ZERO_DEGC,
    Equilibrium,
    lever_cementite,
    lever_ferrite,
    slow_cooling,
)
from midradius.thermo.errors import InputFault

__all__ = ["SOURCES", "Amount", "at", "structure"]

COLDEST, HOTTEST = ZERO_DEGC, 1147.0 + ZERO_DEGC


@dataclass(frozen=True)
class Amount:
    """One phase or constituent: its mass fraction [-] and its carbon [mass %]."""

    name: str
    mass_fraction: float
    carbon_pct: float


def at(eq: Equilibrium, temp: float) -> tuple[Amount, ...]:
    """The phases of a steel at ``temp`` [K], the scarcer one first; only those there are.

    Raises
    ------
    InputFault
        ``temp`` outside 0 to 1147 degC.
    """
    if not COLDEST <= temp <= HOTTEST:
        low, high = COLDEST - ZERO_DEGC, HOTTEST - ZERO_DEGC
        allowed = f"{low:g} to {high:g} degC"
        raise InputFault("temperature", f"{temp - ZERO_DEGC:g} degC", allowed, "Above, iron melts.")
    carbon = eq.composition.C
    solved = float(eq.ferrite_solubility(temp))
    if temp < eq.ae1:
        share = max(carbon - solved, 0.0) / (CEMENTITE_CARBON_PCT - solved)
        both = (
            Amount("cementite", share, CEMENTITE_CARBON_PCT),
            Amount("ferrite", 1.0 - share, min(solved, carbon)),
        )
        return tuple(item for item in both if item.mass_fraction > 0.0)
    ferrite, cementite = float(lever_ferrite(eq, carbon, temp)), 0.0
    if np.isfinite(eq.acm):
        cementite = float(lever_cementite(eq, carbon, temp))
    beside = Amount("ferrite", ferrite, min(solved, carbon))
    if cementite > 0.0:
        beside = Amount("cementite", cementite, CEMENTITE_CARBON_PCT)
    rest = 1.0 - beside.mass_fraction
    left = carbon - beside.mass_fraction * beside.carbon_pct
    found = [beside] if beside.mass_fraction > 0.0 else []
    if rest > 0.0:
        found.append(Amount("austenite", rest, left / rest))
    return tuple(found)


def structure(eq: Equilibrium) -> tuple[Amount, ...]:
    """Constituents after infinitely slow cooling: the proeutectoid one first, then pearlite."""
    ferrite, cementite = slow_cooling(eq, eq.composition.C)
    found = [Amount("ferrite", ferrite, float(eq.ferrite_solubility(eq.ae1)))]
    found.append(Amount("cementite", cementite, CEMENTITE_CARBON_PCT))
    found.append(Amount("pearlite", 1.0 - ferrite - cementite, eq.eutectoid_carbon_pct))
    return tuple(item for item in found if item.mass_fraction > 0.0)
