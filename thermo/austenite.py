"""What the soak leaves: carbon in solution, what stayed undissolved, grain size.

Model
-----
Above Ae3 and Acm everything dissolves. Between Ae1 and Ae3 the lever rule leaves
ferrite, between Ae1 and Acm cementite. A hypereutectoid steel with 0.5 % Cr or
more never gets that far in a works soak, chromium being slow: its carbon in
solution after about half an hour is read from ``DISSOLVED``, never above
equilibrium. Cementite left over holds ``CHROMIUM_RATIO`` times the chromium of
the austenite, sulphides hold manganese (`thermo.extension`). The grain grows as
``A exp(-Q / RT) time^0.211``.

Source
------
Grain growth: Lee & Lee, Mater. Des. 29 (2008) 1840 (remembered; within one ASTM
number of a maker's card for 100Cr6). Dissolved carbon: works practice
(estimate, low confidence; measure it or give it where it matters). Chromium in
cementite, 8.1 % beside 1.45 %: computed at 845 degC (derived). Grain number:
ASTM E112 (remembered).

Holds for
---------
Grain growth 850 to 1200 degC, no particles that pin it: an upper size for
fine-grain steel below about 950 degC. Dissolved carbon 800 to 950 degC, 20 to
60 min, about 1 % C; continued on straight lines outside, with a note.
"""

import math
from dataclasses import dataclass, replace
from typing import Literal, NamedTuple

import numpy as np

from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.equilibrium import (
    CEMENTITE_CARBON_PCT,
    Equilibrium,
    equilibrium,
    lever_cementite,
    lever_ferrite,
)
from midradius.thermo.errors import InputFault
from midradius.thermo.extension import soluble_manganese
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, Steel

SOURCES = (
    Source("austenite grain growth", "Lee & Lee 2008", "Mater. Des. 29, 1840", "remembered"),
    Source("grain number", "ASTM E112", "intercept relation", "remembered"),
    Source("dissolved carbon of chromium steel", "works practice", "thermo.austenite", "estimate"),
)

ZERO_DEGC = 273.15
GAS_CONSTANT = 8.314
HOTTEST_DEGC = 1300.0
GROWTH_POWER = 0.211  # of the time at temperature
Regime = Literal["full", "intercritical", "below Acm", "undissolved carbide"]
REGIMES: tuple[Regime, ...] = ("full", "intercritical", "below Acm", "undissolved carbide")

# (soak [degC], carbon in solution [mass %]) after 20 to 60 min
DISSOLVED = ((800.0, 0.50), (845.0, 0.62), (880.0, 0.75), (950.0, 0.95))
SLOW_CHROMIUM_PCT = 0.5
CHROMIUM_RATIO = 8.1 / 1.45


class Dissolution(NamedTuple):
    """Soaks at several temperatures, (n,) each: carbon in solution [mass %], ferrite and
    cementite left [mass fraction], place of the regime in `REGIMES`."""

    carbon_pct: Array
    ferrite: Array
    cementite: Array
    regime: IntArray


@dataclass(frozen=True)
class Austenite:
    """The state of a steel at the end of its soak.

    ``carbon_pct`` is the carbon of the austenite, ``composition`` the austenite
    as a whole; ``ferrite`` and ``cementite`` [mass fraction] stay through the
    quench; ``grain_mean_intercept`` [m].
    """

    carbon_pct: float
    ferrite: float
    cementite: float
    grain_astm: float
    grain_mean_intercept: float
    notes: tuple[RangeNote, ...]
    regime: Regime
    composition: Composition


def soak(steel: Steel, temp: float, time: float, grain_astm: float | None = None) -> Austenite:
    """Austenite after a soak at ``temp`` [K] for ``time`` [s].

    Parameters
    ----------
    steel
        The steel; its composition has passed `thermo.steel.check`.
    temp, time
        Soak temperature [K] and time at temperature [s].
    grain_astm
        Measured grain number, -3 to 14; left out, the grain grows by time and
        temperature.

    Raises
    ------
    InputFault
        Soak at or below Ae1 or above 1300 degC, no time, grain out of range.
    """
    eq = equilibrium(steel.composition)
    _check(steel, temp, time, grain_astm, eq.ae1)
    left = dissolution(eq, np.array([temp]))
    carbon, ferrite, cementite = (float(part[0]) for part in left[:3])
    regime = REGIMES[int(left.regime[0])]
    notes = dissolution_notes(eq, temp, time)
    if grain_astm is None:
        intercept = grown_intercept(steel.composition, temp, time)
        notes += growth_notes(temp)
    else:
        intercept = intercept_of(grain_astm)
    return Austenite(
        carbon_pct=carbon,
        ferrite=ferrite,
        cementite=cementite,
        grain_astm=astm_of(intercept) if grain_astm is None else grain_astm,
        grain_mean_intercept=intercept,
        notes=tuple(notes),
        regime=regime,
        composition=_left_in_austenite(steel.composition, carbon, cementite),
    )


def dissolution(eq: Equilibrium, temp: Array) -> Dissolution:
    """What soaks at ``temp`` (n,) [K], above Ae1 each, leave of a steel; see `Dissolution`."""
    total = eq.composition.C
    carbon, none = np.full(temp.shape, total), np.zeros(temp.shape)
    regime = np.zeros(temp.shape, dtype=np.int64)
    if total <= eq.eutectoid_carbon_pct:
        below = temp < eq.ae3
        ferrite = np.where(below, lever_ferrite(eq, total, temp), 0.0)
        carbon = np.where(below, eq.austenite_vs_ferrite(temp), total)
        return Dissolution(carbon, ferrite, none, np.where(below, 1, regime))
    below = temp < eq.acm
    cementite = np.where(below, lever_cementite(eq, total, temp), 0.0)
    carbon = np.where(below, eq.austenite_vs_cementite(temp), total)
    regime = np.where(below, 2, regime)
    if eq.composition.Cr >= SLOW_CHROMIUM_PCT:
        practical = _dissolved(temp)
        less = practical < carbon
        carbon = np.where(less, practical, carbon)
        held = (total - carbon) / (CEMENTITE_CARBON_PCT - carbon)
        cementite = np.where(less, held, cementite)
        regime = np.where(less & ~below, 3, regime)
    return Dissolution(carbon, none, cementite, regime)


def intercept_of(grain_astm: float) -> float:
    """Mean lineal intercept [m] of an ASTM grain number."""
    return float(1e-3 * 10.0 ** (-(grain_astm + 3.2877) / 6.6439))


def astm_of(intercept: float) -> float:
    """ASTM grain number of a mean lineal intercept [m]."""
    return -3.2877 - 6.6439 * math.log10(1e3 * intercept)


def grown_intercept(composition: Composition, temp: float, time: float) -> float:
    """Mean intercept [m] of austenite grown at ``temp`` [K] for ``time`` [s]."""
    activation = growth_activation(composition)
    micrometre = 76671.0 * math.exp(-activation / (GAS_CONSTANT * temp)) * time**GROWTH_POWER
    return float(1e-6 * micrometre)


def growth_activation(composition: Composition) -> float:
    """Activation energy of grain growth [J/mol]."""
    c = composition
    return 89098.0 + 3581.0 * c.C + 1211.0 * c.Ni + 1443.0 * c.Cr + 4031.0 * c.Mo


def _dissolved(temp: Array) -> Array:
    """Carbon in solution [mass %] of chromium steel, straight lines through ``DISSOLVED``."""
    degc = temp - ZERO_DEGC
    points, carbons = np.array(DISSOLVED).T
    i = np.clip(np.searchsorted(points, degc) - 1, 0, len(points) - 2)
    slope = (carbons[i + 1] - carbons[i]) / (points[i + 1] - points[i])
    return np.asarray(carbons[i] + slope * (degc - points[i]))


def _left_in_austenite(composition: Composition, carbon: float, cementite: float) -> Composition:
    chromium = composition.Cr / (1.0 + (CHROMIUM_RATIO - 1.0) * cementite)
    return replace(composition, C=carbon, Cr=chromium, Mn=soluble_manganese(composition))


def _check(steel: Steel, temp: float, time: float, grain_astm: float | None, ae1: float) -> None:
    degc = f"{temp - ZERO_DEGC:.0f} degC"
    lowest = ae1 - ZERO_DEGC
    if not temp > ae1:
        raise InputFault(
            "soak temperature",
            degc,
            f"above Ae1 of {steel.name}, {lowest:.0f} degC",
            "At or below Ae1 there is no austenite and nothing to transform: raise the soak.",
        )
    if not temp <= HOTTEST_DEGC + ZERO_DEGC:
        raise InputFault(
            "soak temperature",
            degc,
            f"{lowest:.0f} to {HOTTEST_DEGC:.0f} degC",
            "The models know no steel that hot.",
        )
    if not (time > 0.0 and math.isfinite(time)):
        raise InputFault("soak time", f"{time:g} s", "longer than 0 s", "Give the time at heat.")
    if grain_astm is not None and not -3.0 <= grain_astm <= 14.0:
        raise InputFault(
            "austenite grain", f"ASTM {grain_astm:g}", "ASTM -3 to 14", "Give an E112 number."
        )


def growth_notes(temp: float) -> list[RangeNote]:
    """Where a soak leaves the range of the growth law."""
    degc = temp - ZERO_DEGC
    if 850.0 <= degc <= 1200.0:
        return []
    return [RangeNote("austenite grain growth", "soak", f"{degc:.0f} degC", "850 to 1200 degC")]


def dissolution_notes(eq: Equilibrium, temp: float, time: float) -> list[RangeNote]:
    """Where a soak leaves the range of the carbon in solution of chromium steel."""
    hypo = eq.eutectoid_carbon_pct >= eq.composition.C
    if hypo or eq.composition.Cr < SLOW_CHROMIUM_PCT:
        return []
    model = "dissolved carbon of chromium steel (estimate)"
    degc, minutes = temp - ZERO_DEGC, time / 60.0
    notes = []
    if not DISSOLVED[0][0] <= degc <= DISSOLVED[-1][0]:
        notes.append(RangeNote(model, "soak", f"{degc:.0f} degC", "800 to 950 degC"))
    if not 20.0 <= minutes <= 60.0:
        notes.append(RangeNote(model, "soak time", f"{minutes:.0f} min", "20 to 60 min"))
    return notes
