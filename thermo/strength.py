"""Strength of ferrite with pearlite from its scale, of the rest from its hardness.

Model
-----
Gladman: yield and tensile strength of ferrite-pearlite from the share of
ferrite, its grain ``d`` and the pearlite spacing ``S0`` (mm in the print). Its
pearlite term comes from coarse, normalised pearlite and is 3 to 6 HRC too soft for
the fine one of a quench, so the tensile strength of pearlite is not below that of
eutectoid steel transformed at the same undercooling (``ATLAS_HV``). Pearlite that
formed with less carbon than eutectoid has less cementite and is softer: its hardness
changes by Maynier's carbon term, and where little ferrite formed, so that Gladman's
mixture cannot know of it, the mean by fraction with that pearlite is the upper bound.
Pearlite with more carbon is harder by the same term.
Spacing: ``S0 = 18 um K / (Ae1 - T)``, not below 0.05 um, ``T`` the mean
temperature at which the pearlite formed. Ferrite grain: Hodgson & Gibbs from
carbon equivalent C + Mn/6, cooling rate and austenite grain; the equivalent is
held at 0.40, since beyond its low-carbon steels the regression turns negative
(held there, and not below 1 um: estimate). Martensite and
bainite: yield strength from hardness (Pavlina & Van Tyne). Tensile strength of
everything: `thermo.conversion`.

Source
------
Hardness of isothermal pearlite: 1080 in the I-T diagrams of U.S. Steel, Rockwell
scale at the edge, 11, 32, 38, 40 and 40 HRC at 705, 650, 600, 550 and 500 degC
(remembered), into HV by ASTM E140, 11 HRC by its extension. Carbon term: Maynier et
al. 1978, see `thermo.hardness` (remembered). Gladman, McIvor &
Pickering, J. Iron Steel Inst. 210 (1972) 916; Hodgson & Gibbs, ISIJ Int. 32 (1992)
1329; Pavlina & Van Tyne, J. Mater. Eng. Perform. 17 (2008) 888 (abstract read,
coefficients remembered); all remembered.

Holds for
---------
Carbon-manganese steels, 0.3 to 0.9 % C for Gladman, without precipitates: vanadium and
niobium of microalloyed steels add to its yield strength and are not counted; hypoeutectoid
steels of 450 to 2350 MPa tensile strength (147 to 656 HV) for Pavlina & Van Tyne, outside
of which the yield strength is nan.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.phases import AUSTENITE, BAINITE, CEMENTITE, FERRITE, MARTENSITE, PEARLITE
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

SOURCES = (
    Source(
        "strength of ferrite-pearlite",
        "Gladman, McIvor & Pickering 1972",
        "J. Iron Steel Inst. 210, 916",
        "remembered",
    ),
    Source(
        "hardness of fine pearlite",
        "I-T diagrams, U.S. Steel, 1080",
        "hardness at the edge of the diagram",
        "remembered",
    ),
    Source("ferrite grain", "Hodgson & Gibbs 1992", "ISIJ Int. 32, 1329", "remembered"),
    Source(
        "yield strength from hardness",
        "Pavlina & Van Tyne 2008",
        "J. Mater. Eng. Perform. 17, 888",
        "remembered",
    ),
)

# Eutectoid pearlite by undercooling below Ae1 of 727 degC [K]: hardness [HV].
ATLAS_UNDERCOOLING = (22.0, 77.0, 127.0, 177.0, 227.0)
ATLAS_HV = (197.0, 318.0, 372.0, 392.0, 392.0)
ATLAS_SILICON_PCT, ATLAS_CARBON_PCT = 0.20, 0.79
CARBON_HV = 223.0  # Maynier's hardness of ferrite-pearlite per mass % of carbon
TENSILE_PER_HV = 3.2  # MPa per HV of ferrite-pearlite
SPACING_UNDERCOOLING = 18e-6  # m K
SILICON_MPA = 97.3  # per mass %
NITROGEN_PCT = 0.005  # where the composition gives none
FINEST_SPACING = 0.05e-6  # m
FINEST_FERRITE = 1e-6  # m
EQUIVALENT_CAP_PCT = 0.40
GLADMAN_CARBON_PCT = (0.3, 0.9)
LEAST_PRECIPITATE_PCT = 0.03  # of V + Nb that strengthens ferrite-pearlite: estimate
COUNTED = 0.05  # share of ferrite and pearlite below which their yield strength hardly counts
INTERCEPT_TO_DIAMETER = 1.0 / 0.89  # mean intercept to planimetric diameter, ASTM E112
PAVLINA_HV = (147.2, 656.1)  # 450 and 2350 MPa by its own tensile equation


def interlamellar_spacing(pearlite_temp: Array | float, ae1: float) -> Array:
    """Spacing of pearlite [m] that formed at ``pearlite_temp`` [K]; inf at Ae1 and above."""
    undercooling = np.maximum(ae1 - np.asarray(pearlite_temp, dtype=np.float64), 0.0)
    with np.errstate(divide="ignore"):
        return np.asarray(np.maximum(SPACING_UNDERCOOLING / undercooling, FINEST_SPACING))


def ferrite_grain(
    composition: Composition, rate_700: Array, grain_intercept: Array | float
) -> Array:
    """Ferrite grain diameter [m].

    Parameters
    ----------
    composition
        Mass percent; carbon and manganese count.
    rate_700
        Cooling rate at 700 degC [K/s], positive, any shape.
    grain_intercept
        Mean intercept of the austenite grain [m], one or (n_node,).
    """
    equivalent = min(composition.C + composition.Mn / 6.0, EQUIVALENT_CAP_PCT)
    austenite_um = 1e6 * INTERCEPT_TO_DIAMETER * grain_intercept
    slowness = np.asarray(rate_700, dtype=np.float64) ** -0.5
    if equivalent <= 0.35:
        by_cooling = (-0.4 + 6.37 * equivalent) + (24.2 - 59.0 * equivalent) * slowness
    else:
        by_cooling = (22.6 - 57.0 * equivalent) + 3.0 * slowness
    micrometre = by_cooling + 22.0 * (1.0 - np.exp(-0.015 * austenite_um))
    return np.asarray(np.maximum(1e-6 * micrometre, FINEST_FERRITE))


def gladman_tensile(
    ferrite_share: Array, *, grain: Array, spacing: Array, composition: Composition
) -> Array:
    """Tensile strength of ferrite-pearlite [MPa].

    ``ferrite_share`` of ferrite + pearlite [-], ``grain`` of the ferrite [m] and
    ``spacing`` of the pearlite [m], one shape; the scale of a constituent that is
    absent does not count and may be nan.
    """
    pearlite = 719.0 + 3.54 * (1e3 * spacing) ** -0.5
    ferrite = _ferrite_tensile(grain, composition)
    return np.asarray(_mix(ferrite_share, ferrite, pearlite) + SILICON_MPA * composition.Si)


def ferrite_pearlite_tensile(
    ferrite_share: Array,
    *,
    grain: Array,
    spacing: Array,
    pearlite_carbon_pct: Array,
    composition: Composition,
) -> Array:
    """Tensile strength [MPa] with pearlite at the measured hardness of its undercooling.

    The lower of Gladman's mixture, with the pearlite of eutectoid steel, and the mean by
    fraction, with a pearlite of ``pearlite_carbon_pct`` [mass %], one shape. The other
    arguments are those of `gladman_tensile`, whose pearlite term stays the lower bound.
    """
    undercooling = SPACING_UNDERCOOLING / spacing
    measured = np.interp(undercooling, ATLAS_UNDERCOOLING, ATLAS_HV)
    more = CARBON_HV * (pearlite_carbon_pct - ATLAS_CARBON_PCT)
    coarse = 719.0 + 3.54 * (1e3 * spacing) ** -0.5

    def of(hardness: Array) -> Array:
        return np.maximum(coarse, TENSILE_PER_HV * hardness - SILICON_MPA * ATLAS_SILICON_PCT)

    rich, own = of(measured + np.maximum(more, 0.0)), of(measured + more)
    ferrite = _ferrite_tensile(grain, composition)
    mean = np.where(ferrite_share > 0.0, ferrite_share * ferrite, 0.0)
    mean = mean + np.where(ferrite_share < 1.0, (1.0 - ferrite_share) * own, 0.0)
    return np.asarray(
        np.minimum(_mix(ferrite_share, ferrite, rich), mean) + SILICON_MPA * composition.Si
    )


def _ferrite_tensile(grain: Array, composition: Composition) -> Array:
    nitrogen = composition.N or NITROGEN_PCT
    return np.asarray(246.0 + 1143.0 * np.sqrt(nitrogen) + 18.2 * (1e3 * grain) ** -0.5)


def gladman_yield(
    ferrite_share: Array, *, grain: Array, spacing: Array, composition: Composition
) -> Array:
    """Yield strength of ferrite-pearlite [MPa]; arguments as `gladman_tensile`."""
    nitrogen = composition.N or NITROGEN_PCT
    ferrite = 35.0 + 58.5 * composition.Mn + 17.4 * (1e3 * grain) ** -0.5
    pearlite = 178.0 + 3.85 * (1e3 * spacing) ** -0.5
    everywhere = 63.1 * composition.Si + 426.0 * np.sqrt(nitrogen)
    return np.asarray(_mix(ferrite_share, ferrite, pearlite) + everywhere)


def _mix(ferrite_share: Array, ferrite: Array, pearlite: Array) -> Array:
    weight = np.cbrt(ferrite_share)
    part = np.where(ferrite_share > 0.0, weight * ferrite, 0.0)
    return np.asarray(part + np.where(ferrite_share < 1.0, (1.0 - weight) * pearlite, 0.0))


def yield_of_hardness(hardness_hv: Array | float) -> Array:
    """Yield strength [MPa] of martensite or bainite; nan outside 147 to 656 HV."""
    hv = np.asarray(hardness_hv, dtype=np.float64)
    known = (hv >= PAVLINA_HV[0]) & (hv <= PAVLINA_HV[1])
    return np.where(known, -90.7 + 2.876 * hv, np.nan)


def yield_strength(fractions: Array, hv_by_phase: Array, ferrite_pearlite_mpa: Array) -> Array:
    """Yield strength of the mixture [MPa].

    Parameters
    ----------
    fractions, hv_by_phase
        Mass fractions and hardness of each constituent, shape (n_phase, n_node).
    ferrite_pearlite_mpa
        Yield strength of the ferrite-pearlite part, from `gladman_yield`, (n_node,).

    Returns
    -------
    Array
        Mean by fraction of the ferrite-pearlite part (with proeutectoid cementite)
        and the hardened part (martensite, bainite, retained austenite), (n_node,);
        nan where a part that is present has none.
    """
    soft = fractions[[FERRITE, CEMENTITE, PEARLITE]].sum(axis=0)
    hard_rows = [AUSTENITE, BAINITE, MARTENSITE]
    hard = fractions[hard_rows].sum(axis=0)
    present = fractions[hard_rows] > 0.0
    summed = np.where(present, fractions[hard_rows] * hv_by_phase[hard_rows], 0.0).sum(axis=0)
    hard_mpa = yield_of_hardness(summed / np.where(hard > 0.0, hard, 1.0))
    soft_part = np.where(soft > 0.0, soft * ferrite_pearlite_mpa, 0.0)
    hard_part = np.where(hard > 0.0, hard * hard_mpa, 0.0)
    return np.asarray((soft_part + hard_part) / (soft + hard))


def range_notes(composition: Composition, fractions: Array) -> tuple[RangeNote, ...]:
    """Where the yield strength of ferrite-pearlite leaves its source.

    ``fractions`` of mass, shape (n_phase, n_node): without 5 % of ferrite and pearlite at
    any node there is nothing to note.
    """
    if float((fractions[FERRITE] + fractions[PEARLITE]).max()) < COUNTED:
        return ()
    model, notes = "yield strength of ferrite-pearlite", []
    low, high = GLADMAN_CARBON_PCT
    if not low <= composition.C <= high:
        notes.append(RangeNote(model, "C", f"{composition.C:g} %", f"{low:g} to {high:g} %"))
    precipitates = composition.V + composition.Nb
    if precipitates >= LEAST_PRECIPITATE_PCT:
        allowed = "steels without precipitates, whose share is not counted: stated too low"
        notes.append(RangeNote(model, "V + Nb", f"{precipitates:g} %", allowed))
    return tuple(notes)
