"""The lengths of a structure: ferrite grain, pearlite spacing, cementite film; what they tell."""

from dataclasses import dataclass

import numpy as np

from midradius.thermo import network, strength, toughness
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.phases import CEMENTITE, FERRITE, PEARLITE
from midradius.thermo.source import RangeNote
from midradius.thermo.steel import Composition

GRAIN_MODEL = strength.SOURCES[2].model
COUNTED = 0.01  # a constituent below it has no grain or spacing that one could measure


@dataclass(frozen=True)
class Scales:
    """Of every node, (n_node,) each: ``ferrite_grain`` [m] and ``pearlite_spacing`` [m], nan
    with less than 1 % of it; ``cementite_film`` [m] on the austenite's grain faces and its
    ``network`` code; ``impact_transition`` [K], nan where no relation holds.

    ``hypereutectoid``: whether the steel can form such a film at all.
    """

    ferrite_grain: Array
    pearlite_spacing: Array
    cementite_film: Array
    network: IntArray
    impact_transition: Array
    hypereutectoid: bool
    notes: tuple[RangeNote, ...]


def scales(
    composition: Composition,
    phases: Array,
    *,
    rate_700: Array,
    pearlite_temp: Array,
    grain_intercept: Array | float,
    carbide_left: Array | float,
) -> Scales:
    """The lengths of a structure.

    Parameters
    ----------
    composition
        The steel [mass %].
    phases
        Mass fractions as cooled, (n_phase, n_node).
    rate_700, pearlite_temp
        Cooling rate at 700 degC [K/s] and where pearlite formed [K], (n_node,); nan
        where there is none.
    grain_intercept, carbide_left
        Of the austenite after the soak [m, -]; one, or (n_node,).
    """
    eq = equilibrium(composition)
    rate = np.where(rate_700 > 0.0, rate_700, np.nan)
    grain = strength.ferrite_grain(composition, rate, grain_intercept)
    grain = np.where(phases[FERRITE] >= COUNTED, grain, np.nan)
    spacing = strength.interlamellar_spacing(pearlite_temp, eq.ae1)
    film = network.film_thickness(phases[CEMENTITE] - carbide_left, grain_intercept)
    return Scales(
        ferrite_grain=grain,
        pearlite_spacing=np.where(
            (phases[PEARLITE] >= COUNTED) & np.isfinite(spacing), spacing, np.nan
        ),
        cementite_film=film,
        network=network.network(film),
        impact_transition=toughness.impact_transition(phases, composition, grain=grain),
        hypereutectoid=bool(eq.eutectoid_carbon_pct < composition.C),
        notes=(
            *_grain_notes(composition, grain),
            *network.range_notes(composition, film, carbide_left=float(np.max(carbide_left))),
        ),
    )


def _grain_notes(composition: Composition, grain: Array) -> tuple[RangeNote, ...]:
    equivalent = composition.C + composition.Mn / 6.0
    if equivalent <= strength.EQUIVALENT_CAP_PCT or not np.isfinite(grain).any():
        return ()
    allowed = f"to {strength.EQUIVALENT_CAP_PCT:g} % (held there)"
    return (RangeNote(GRAIN_MODEL, "C + Mn/6", f"{equivalent:.2f} %", allowed),)
