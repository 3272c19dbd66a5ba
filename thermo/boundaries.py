"""Phase boundaries of iron-carbon, solved from the Gibbs energies of the phases.

Model
-----
Two phases share a tangent: equal potentials of iron and of carbon in austenite
and ferrite; ``3 mu(Fe) + mu(C) = G(Fe3C)`` against cementite. Solved at every
kelvin once in a process, linear between. Solving the thermodynamics rather than
using a fitted polynomial gives the metastable continuation that the kinetics
ask for, far below A1, monotone by nature instead of by a clamp.

Source
------
`thermo.gibbs`: Dinsdale 1991, Gustafson 1985, cementite of Hallstedt 2010.

Holds for
---------
200 to 1650 K. Above A3 of iron (911.7 degC) austenite needs no carbon to be
stable: both boundaries with ferrite are 0 there. Outside the temperatures of
the table the end value holds; alloy shifts reach that only for steels at the
edge of what `thermo.steel` admits, below 20 degC, where every limit is 0.
"""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.gibbs import (
    AUSTENITE,
    CEMENTITE_HALLSTEDT,
    FERRITE,
    GAS_CONSTANT,
    Interstitial,
)

FIRST_TEMP = 200.0
LAST_TEMP = 1650.0
_NEWTON_STEPS = 60
_HALVINGS = 80


@dataclass(frozen=True)
class Boundaries:
    """Carbon [mass %] along ``temp`` [K], shape (n_temp,) each.

    ``austenite_ferrite`` is austenite in equilibrium with ferrite (A3 line) and
    so on; the first word is the phase whose carbon it is. ``a3_iron`` [K] is A3
    of iron without carbon.
    """

    temp: Array
    austenite_ferrite: Array
    austenite_cementite: Array
    ferrite_austenite: Array
    ferrite_cementite: Array
    a3_iron: float

    def a3(self, carbon_pct: Array | float) -> Array:
        """Temperature [K] where austenite of that carbon meets ferrite."""
        below = self.austenite_ferrite > 0.0
        line = np.append(self.austenite_ferrite[below], 0.0)[::-1]
        temp = np.append(self.temp[below], self.a3_iron)[::-1]
        return np.asarray(np.interp(carbon_pct, line, temp))

    def acm(self, carbon_pct: Array | float) -> Array:
        """Temperature [K] where austenite of that carbon meets cementite."""
        return np.asarray(np.interp(carbon_pct, self.austenite_cementite, self.temp))


@cache
def boundaries() -> Boundaries:
    """The boundaries of iron-carbon at every kelvin."""
    temp = np.arange(FIRST_TEMP, LAST_TEMP + 0.5)
    austenite, ferrite = _against_ferrite(temp)
    return Boundaries(
        temp=temp,
        austenite_ferrite=austenite,
        austenite_cementite=_against_cementite(AUSTENITE, temp),
        ferrite_austenite=ferrite,
        ferrite_cementite=_against_cementite(FERRITE, temp),
        a3_iron=_crossing(np.linspace(1100.0, 1250.0, 15001), _iron_gap),
    )


def _crossing(temp: Array, gap: Callable[[Array], Array]) -> float:
    """Where a monotone gap is zero, straight between temperatures [K] (n_temp,).

    Without a root finder: reading a case file needs A1 and should not wait for one.
    """
    values = gap(temp)
    order = np.argsort(values)
    return float(np.interp(0.0, values[order], temp[order]))


def _iron_gap(temp: Array | float) -> Array:
    """Gibbs energy of ferrite less that of austenite, pure iron [J/mol]."""
    return FERRITE.iron_potential(temp, 0.0) - AUSTENITE.iron_potential(temp, 0.0)


def _against_cementite(phase: Interstitial, temp: Array) -> Array:
    """Carbon [mass %] of ``phase`` beside cementite; the potential grows with carbon."""
    low = np.full(temp.shape, np.log(1e-40))
    high = np.full(temp.shape, np.log(0.5))
    target = CEMENTITE_HALLSTEDT.gibbs(temp)
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        y = np.exp(middle)
        potential = 3.0 * phase.iron_potential(temp, y) + phase.carbon_potential(temp, y)
        above = potential > target
        high = np.where(above, middle, high)
        low = np.where(above, low, middle)
    return phase.carbon_pct(np.exp(0.5 * (low + high)))


def _against_ferrite(temp: Array) -> tuple[Array, Array]:
    """Carbon [mass %] of austenite and of ferrite beside each other; 0 above A3 of iron."""
    y = np.full(temp.shape, 0.9)
    for _ in range(_NEWTON_STEPS):
        # The gap of the iron potentials is concave in y: Newton from the right never
        # crosses the root. Its slope follows from the Gibbs-Duhem relation.
        in_ferrite = _ferrite_at(AUSTENITE.carbon_potential(temp, y), temp)
        gap = AUSTENITE.iron_potential(temp, y) - FERRITE.iron_potential(temp, in_ferrite)
        stiffness = GAS_CONSTANT * temp / (y * (1.0 - y)) - 2.0 * AUSTENITE.attraction.gibbs(temp)
        slope = (FERRITE.sites * in_ferrite - AUSTENITE.sites * y) * stiffness
        y = np.clip(y - gap / slope, 1e-9, 0.9)
    stable = _iron_gap(temp) < 0.0
    in_ferrite = _ferrite_at(AUSTENITE.carbon_potential(temp, y), temp)
    return (
        np.where(stable, AUSTENITE.carbon_pct(y), 0.0),
        np.where(stable, FERRITE.carbon_pct(in_ferrite), 0.0),
    )


def _ferrite_at(carbon_potential: Array, temp: Array) -> Array:
    """Site fraction of dilute ferrite at a carbon potential, by fixed point."""
    attraction = FERRITE.attraction.gibbs(temp)
    ends = FERRITE.filled.gibbs(temp) - FERRITE.empty.gibbs(temp)
    scale = FERRITE.sites * GAS_CONSTANT * temp
    y = np.zeros(temp.shape)
    for _ in range(8):
        drive = FERRITE.sites * carbon_potential - ends - (1.0 - 2.0 * y) * attraction
        # Ferrite holds below 0.1 % of its sites at the root; the cap serves the first guesses.
        y = np.minimum(np.exp(np.minimum(drive / scale, 0.0)), 0.01)
        y = y / (1.0 + y)
    return y
