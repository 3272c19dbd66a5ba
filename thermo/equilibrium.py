"""Critical temperatures and phase boundaries of a low-alloy steel, and the lever rule.

Model
-----
The iron-carbon boundaries of `thermo.boundaries`, shifted in temperature by the
alloying elements. The Acm line moves as a whole by ``shift_acm``; Ae1 moves by
its own coefficients; the eutectoid carbon is where the moved Acm line crosses
Ae1. The A3 line must pass through that point too, so its shift runs linearly in
temperature from there to what was computed for 0.4 % C and on to 0.1 % C.

Fractions that can form on cooling keep to the extrapolated boundaries
(Hultgren): ferrite stops where austenite reaches the Acm line, cementite where
it reaches the A3 line. Above the crossing this is the plain lever rule.

Source
------
Shifts: minimisation of an open assessed database of steel, one element at a
time, +1 mass % (0.5 % Mo, 0.1 % V), ortho-equilibrium (derived). Copper:
estimate. Hultgren extrapolation: textbook (remembered).

Holds for
---------
0.03 to 1.5 % C; shifts taken as linear up to the limits of ``LIMITS``.
Paraequilibrium, which rules fast cooling, lies 4 to 15 K lower and is not used.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.boundaries import boundaries
from midradius.thermo.gibbs import CEMENTITE_CARBON_PCT
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

__all__ = [
    "CEMENTITE_CARBON_PCT",
    "CUSTOMARY",
    "Equilibrium",
    "Invariants",
    "cementite_limit",
    "computed_invariants",
    "equilibrium",
    "ferrite_limit",
    "lever_cementite",
    "lever_ferrite",
    "range_notes",
    "slow_cooling",
]

SOURCES = (
    Source(
        "iron-carbon phase boundaries",
        "Gustafson 1985, Dinsdale 1991, Hallstedt 2010",
        "solved from the Gibbs energies",
        "derived",
    ),
    Source(
        "alloy shifts of Ae1, Ae3, Acm",
        "minimisation of an open assessed steel database",
        "one element at a time",
        "derived",
    ),
)

ZERO_DEGC = 273.15
Values = Array | float

# Kelvin per mass %. Ae3 at 0.1 and 0.4 % C, Ae1 at 0.4 % C, Acm at 1.0 % C.
SHIFT_A3_LOW: Mapping[str, float] = {
    "Mn": -34.0, "Si": 59.0, "Cr": -12.0, "Ni": -29.0, "Mo": 26.0, "V": 60.0, "Cu": -10.0,
}  # fmt: skip
SHIFT_A3: Mapping[str, float] = {
    "Mn": -21.0, "Si": 34.0, "Cr": -5.0, "Ni": -18.0, "Mo": 12.0, "V": 40.0, "Cu": -10.0,
}  # fmt: skip
SHIFT_A1: Mapping[str, float] = {"Mn": -18.0, "Si": 15.0, "Cr": 7.0, "Ni": -15.0, "Mo": 3.0}
SHIFT_ACM: Mapping[str, float] = {"Mn": 2.0, "Si": 24.0, "Cr": 20.0, "Ni": -1.0, "Mo": 8.0}
LOW_CARBON_PCT, MEDIUM_CARBON_PCT = 0.1, 0.4

LIMITS: Mapping[str, tuple[float, float]] = {
    "Mn": (0.0, 2.0), "Si": (0.0, 2.0), "Cr": (0.0, 2.0), "Ni": (0.0, 3.0), "Mo": (0.0, 1.0),
    "V": (0.0, 0.3), "Cu": (0.0, 0.5), "Al": (0.0, 0.1), "W": (0.0, 0.1), "Co": (0.0, 0.1),
}  # fmt: skip

# Two nodes of the A3 line keep at least this part of their distance in iron-carbon, so
# that the line stays monotone for any composition; only steels outside LIMITS get there.
_LEAST_SPACING = 0.2


@dataclass(frozen=True)
class Invariants:
    """The eutectoid of iron-carbon: temperature [K] and carbon of the three phases [mass %]."""

    temp: float
    austenite_pct: float
    ferrite_pct: float
    cementite_pct: float


# As books print them (remembered). The package computes with `computed_invariants`.
CUSTOMARY = Invariants(
    temp=727.0 + ZERO_DEGC, austenite_pct=0.76, ferrite_pct=0.022, cementite_pct=6.70
)


@cache
def computed_invariants() -> Invariants:
    """The eutectoid where the two computed boundaries of austenite cross."""
    lines = boundaries()

    near = (lines.temp >= 900.0) & (lines.temp <= 1100.0)
    gap = lines.austenite_ferrite[near] - lines.austenite_cementite[near]  # falls with temp
    temp = float(np.interp(0.0, gap[::-1], lines.temp[near][::-1]))
    return Invariants(
        temp=temp,
        austenite_pct=float(np.interp(temp, lines.temp, lines.austenite_cementite)),
        ferrite_pct=float(np.interp(temp, lines.temp, lines.ferrite_austenite)),
        cementite_pct=CEMENTITE_CARBON_PCT,
    )


@dataclass(frozen=True)
class Equilibrium:
    """Boundaries of one steel; temperatures in K, carbon in mass percent.

    ``shift_a3`` is the shift of Ae3 at the steel's own carbon. ``ae3`` of a
    hypereutectoid steel is the extrapolated A3 line, below ``ae1``. ``acm`` is
    nan for a hypoeutectoid steel. ``a3_temps`` and ``a3_shifts`` (3,) are the
    nodes of the A3 shift along the steel's own temperature.
    """

    composition: Composition
    shift_a3: float
    shift_acm: float
    ae1: float
    ae3: float
    acm: float
    eutectoid_carbon_pct: float
    a3_temps: tuple[float, ...]
    a3_shifts: tuple[float, ...]

    def austenite_vs_ferrite(self, temp: Values) -> Array:
        """Carbon of austenite beside ferrite [mass %] at ``temp`` [K]; 0 above the A3 line."""
        lines = boundaries()
        return np.asarray(np.interp(self._in_iron(temp), lines.temp, lines.austenite_ferrite))

    def austenite_vs_cementite(self, temp: Values) -> Array:
        """Carbon of austenite beside cementite [mass %] at ``temp`` [K]."""
        lines = boundaries()
        binary = np.asarray(temp) - self.shift_acm
        return np.asarray(np.interp(binary, lines.temp, lines.austenite_cementite))

    def ferrite_solubility(self, temp: Values) -> Array:
        """Carbon of ferrite [mass %] beside austenite above Ae1, beside cementite below."""
        lines = boundaries()
        above = np.interp(self._in_iron(temp), lines.temp, lines.ferrite_austenite)
        binary = np.asarray(temp) - (self.ae1 - computed_invariants().temp)
        below = np.interp(binary, lines.temp, lines.ferrite_cementite)
        return np.where(np.asarray(temp) >= self.ae1, above, below)

    def _in_iron(self, temp: Values) -> Array:
        """The temperature of the iron-carbon A3 line that ``temp`` stands for."""
        return np.asarray(temp) - np.interp(temp, self.a3_temps, self.a3_shifts)


def equilibrium(composition: Composition) -> Equilibrium:
    """Critical temperatures and boundaries of a steel.

    Parameters
    ----------
    composition
        Mass percent; taken to have passed `thermo.steel.check`.
    """
    lines = boundaries()
    shift_acm = _sum(SHIFT_ACM, composition)
    ae1 = computed_invariants().temp + _sum(SHIFT_A1, composition)
    eutectoid = float(np.interp(ae1 - shift_acm, lines.temp, lines.austenite_cementite))
    carbons = np.array([eutectoid, min(MEDIUM_CARBON_PCT, 0.8 * eutectoid), LOW_CARBON_PCT])
    binary = lines.a3(carbons)
    wanted = binary + np.array(
        [ae1 - binary[0], _sum(SHIFT_A3, composition), _sum(SHIFT_A3_LOW, composition)]
    )
    for i in (1, 2):
        least = wanted[i - 1] + _LEAST_SPACING * (binary[i] - binary[i - 1])
        wanted[i] = max(wanted[i], least)
    own = float(lines.a3(composition.C))
    shift_a3 = float(np.interp(own, binary, wanted - binary))
    hyper = eutectoid < composition.C
    return Equilibrium(
        composition=composition,
        shift_a3=shift_a3,
        shift_acm=shift_acm,
        ae1=ae1,
        ae3=own + shift_a3,
        acm=float(lines.acm(composition.C)) + shift_acm if hyper else float("nan"),
        eutectoid_carbon_pct=eutectoid,
        a3_temps=tuple(float(value) for value in wanted),
        a3_shifts=tuple(float(value) for value in wanted - binary),
    )


def _sum(coefficients: Mapping[str, float], composition: Composition) -> float:
    return sum(factor * float(getattr(composition, name)) for name, factor in coefficients.items())


def lever_ferrite(eq: Equilibrium, carbon_pct: Values, temp: Values) -> Array:
    """Mass fraction of ferrite beside austenite at equilibrium, ``temp`` [K] above Ae1."""
    return _ferrite_share(eq.austenite_vs_ferrite(temp), eq.ferrite_solubility(temp), carbon_pct)


def lever_cementite(eq: Equilibrium, carbon_pct: Values, temp: Values) -> Array:
    """Mass fraction of cementite beside austenite at equilibrium, ``temp`` [K] above Ae1."""
    return _cementite_share(eq.austenite_vs_cementite(temp), carbon_pct)


def ferrite_limit(eq: Equilibrium, carbon_pct: Values, temp: Values) -> Array:
    """Largest mass fraction of proeutectoid ferrite at ``temp`` [K], in [0, 1].

    Below the eutectoid austenite may not be enriched beyond the extrapolated Acm.
    """
    richest = np.minimum(eq.austenite_vs_ferrite(temp), eq.austenite_vs_cementite(temp))
    return _ferrite_share(richest, eq.ferrite_solubility(temp), carbon_pct)


def cementite_limit(eq: Equilibrium, carbon_pct: Values, temp: Values) -> Array:
    """Largest mass fraction of proeutectoid cementite at ``temp`` [K], in [0, 1].

    Below the eutectoid austenite may not be drained beyond the extrapolated A3.
    """
    poorest = np.maximum(eq.austenite_vs_ferrite(temp), eq.austenite_vs_cementite(temp))
    return _cementite_share(poorest, carbon_pct)


def slow_cooling(eq: Equilibrium, carbon_pct: float) -> tuple[float, float]:
    """Proeutectoid ferrite and cementite just above Ae1 after infinitely slow cooling."""
    return (
        float(ferrite_limit(eq, carbon_pct, eq.ae1)),
        float(cementite_limit(eq, carbon_pct, eq.ae1)),
    )


def _ferrite_share(austenite: Array, ferrite: Array, carbon_pct: Values) -> Array:
    carbon = np.asarray(carbon_pct, dtype=np.float64)
    forms = (austenite > carbon) & (austenite > ferrite)
    span = np.where(forms, austenite - ferrite, 1.0)
    return np.where(forms, np.clip((austenite - carbon) / span, 0.0, 1.0), 0.0)


def _cementite_share(austenite: Array, carbon_pct: Values) -> Array:
    carbon = np.asarray(carbon_pct, dtype=np.float64)
    forms = carbon > austenite
    span = np.where(forms, CEMENTITE_CARBON_PCT - austenite, 1.0)
    return np.where(forms, (carbon - austenite) / span, 0.0)


def range_notes(composition: Composition) -> tuple[RangeNote, ...]:
    """Notes for elements beyond what the shifts were computed for."""
    return outside(composition, model="alloy shifts of the phase boundaries", limits=LIMITS)
