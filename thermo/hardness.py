"""Vickers hardness as cooled, constituent by constituent.

Model
-----
Mean by fraction. Martensite, bainite and ferrite-pearlite by Maynier from
composition and the logarithm of the cooling rate at 700 degC in degC per hour.
Martensite above 0.45 % C is held under ``150 + 1667 C - 926 C^2`` (C to 0.9),
the bound coming in between 0.45 and 0.50 % so that hardness has no step.
Ferrite-pearlite is the harder of Maynier and the tensile strength of
`thermo.strength` / 3.2, since Maynier alone is too soft for fine pearlite. Bainite
is never softer than Maynier's ferrite-pearlite (closure: its equation turns negative
in plain carbon steel cooled slowly). Retained austenite 250 HV, cementite 850 HV.

A mean by fraction is too hard for martensite with bainite: measured structures of
50, 90 and 99.9 % martensite have the hardness of Hodge & Orehoski, which depends on
carbon alone. From half martensite on that hardness is the upper bound; below, the
bound runs straight from the mean of the other constituents to it (closure: so that
there is no step). The bound fades out between 0.65 and 0.70 % C, where its data end.

Source
------
Maynier, Jungmann & Dollet, in Hardenability Concepts (1978) 518 (remembered;
supported by end-quench bands of four steels). Hodge & Orehoski, Trans. AIME 167
(1946) 627, through `thermo.hardenability` (remembered). Bound of high-carbon martensite,
retained austenite and cementite: remembered. Gladman: `thermo.strength`.

Holds for
---------
0.1 to 0.5 % C, Si < 1, Mn < 2, Ni < 4, Cr < 3, Mo < 1, V < 0.2, Cu < 0.5,
Mn + Ni + Cr + Mo < 5 mass % (remembered). As cooled: no tempering; of
the self-tempering of martensite what the term in the cooling rate holds, the rest is that
of `autotemper`.
"""

import numpy as np

from midradius.thermo import conversion, hardenability, strength
from midradius.thermo.arrays import Array
from midradius.thermo.equilibrium import CEMENTITE_CARBON_PCT
from midradius.thermo.phases import (
    AUSTENITE,
    BAINITE,
    CEMENTITE,
    FERRITE,
    MARTENSITE,
    N_PHASE,
    PEARLITE,
)
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

SOURCES = (
    Source(
        "hardness of martensite, bainite, ferrite-pearlite",
        "Maynier, Jungmann & Dollet 1978",
        "Hardenability Concepts, 518",
        "remembered",
    ),
    Source("hardness of high-carbon martensite", "quadratic bound in carbon", "-", "remembered"),
    Source(
        "hardness of partly martensitic structures",
        "Hodge & Orehoski, Trans. AIME 167 (1946) 627",
        "via ASTM A255",
        "remembered",
    ),
    *strength.SOURCES[:3],
)

RETAINED_AUSTENITE_HV = 250.0
CEMENTITE_HV = 850.0
BOUND_FROM_PCT, BOUND_WHOLE_PCT, BOUND_CARBON_PCT = 0.45, 0.50, 0.9
CARBON_OF_PRODUCTS_PCT = 0.8  # most carbon that bainite and ferrite-pearlite are given
HALF_MARTENSITE = 0.5
FADES_FROM_PCT, FADED_PCT = 0.65, 0.70  # carbon over which the bound of mixtures fades out
PRESENT = 1e-6  # a fraction below this has no formation temperature and no weight
_LIMITS = {
    "C": (0.1, 0.5), "Si": (0.0, 1.0), "Mn": (0.0, 2.0), "Ni": (0.0, 4.0), "Cr": (0.0, 3.0),
    "Mo": (0.0, 1.0), "V": (0.0, 0.2), "Cu": (0.0, 0.5),
}  # fmt: skip


def vickers(
    fractions: Array,
    composition: Composition,
    *,
    carbon_austenite_pct: Array,
    carbon_initial_pct: float,
    rate_700: Array,
    pearlite_temp: Array,
    ae1: float,
    grain_intercept: Array | float,
) -> tuple[Array, Array]:
    """Hardness of the mixture and of each constituent.

    Parameters
    ----------
    fractions
        Mass fractions in phase order, shape (n_phase, n_node).
    composition
        The steel [mass %].
    carbon_austenite_pct
        Carbon of the austenite that became martensite [mass %], (n_node,).
    carbon_initial_pct
        Carbon that went into bainite and ferrite-pearlite [mass %].
    rate_700
        Cooling rate at 700 degC [K/s], (n_node,). Not known (nan) or not positive:
        the node's hardness is nan, unless austenite and cementite are all it holds;
        `range_notes` reports it.
    pearlite_temp
        Mean temperature at which pearlite formed [K], (n_node,); nan where there
        is none.
    ae1
        Equilibrium Ae1 [K].
    grain_intercept
        Mean intercept of the austenite grain [m], one or (n_node,).

    Returns
    -------
    tuple[Array, Array]
        Hardness [HV], (n_node,), and by constituent, (n_phase, n_node). Ferrite
        and pearlite carry one value, that of their mixture.
    """
    rate = _known_rate(rate_700)
    log_rate = np.log10(3600.0 * rate)
    product_carbon = min(carbon_initial_pct, CARBON_OF_PRODUCTS_PCT)
    by_phase = np.empty((N_PHASE, rate.size))
    by_phase[AUSTENITE] = RETAINED_AUSTENITE_HV
    by_phase[CEMENTITE] = CEMENTITE_HV
    whole, none = np.ones(rate.size), np.zeros(rate.size)
    hard = martensite_hv(composition, carbon_austenite_pct, log_rate)
    by_phase[MARTENSITE] = mixture_bound(hard, none, whole, carbon_initial_pct)
    slow = ferrite_pearlite_hv(composition, product_carbon, log_rate)
    by_phase[BAINITE] = np.maximum(bainite_hv(composition, product_carbon, log_rate), slow)
    ferrite_share, scales = _ferrite_pearlite(
        fractions, composition, rate, pearlite_temp, ae1, grain_intercept
    )
    tensile = strength.ferrite_pearlite_tensile(
        ferrite_share,
        grain=scales[0],
        spacing=scales[1],
        pearlite_carbon_pct=_pearlite_carbon(fractions, carbon_initial_pct),
        composition=composition,
    )
    mixture = np.maximum(slow, tensile / strength.TENSILE_PER_HV)
    by_phase[FERRITE] = by_phase[PEARLITE] = mixture
    weighted = np.where(fractions > PRESENT, fractions * by_phase, 0.0)
    held = np.where(fractions > PRESENT, fractions, 0.0)
    total = held.sum(axis=0)
    mean = np.asarray(weighted.sum(axis=0) / total)
    martensite = held[MARTENSITE] / total
    rest = total - held[MARTENSITE]
    others = np.where(
        rest > PRESENT,
        (weighted.sum(axis=0) - weighted[MARTENSITE]) / np.where(rest > PRESENT, rest, 1.0),
        0.0,  # none there: nothing for the bound to respect
    )
    return mixture_bound(mean, others, martensite, carbon_initial_pct), by_phase


def mixture_bound(mean: Array, others: Array, martensite: Array, carbon_pct: float) -> Array:
    """Hardness [HV] of mixtures under the bound of Hodge & Orehoski.

    Parameters
    ----------
    mean, others
        Mean hardness of all constituents, and of those other than martensite
        [HV], (n_node,).
    martensite
        Fraction of martensite [-], (n_node,).
    carbon_pct
        Carbon of the steel [mass %].
    """
    carbon = max(carbon_pct, hardenability.LEAST_CARBON)
    if carbon >= FADED_PCT:
        return mean
    hardened = conversion.hrc_to_hv(
        hardenability.martensite_hardness(
            carbon, martensite=np.maximum(martensite, HALF_MARTENSITE)
        )
    )
    share = np.minimum(martensite / HALF_MARTENSITE, 1.0)
    bound = np.maximum(others + share * (hardened - others), others)
    bound = np.where(martensite >= HALF_MARTENSITE, np.maximum(hardened, others), bound)
    excess = np.maximum(mean - bound, 0.0)
    fade = min(1.0, (FADED_PCT - carbon) / (FADED_PCT - FADES_FROM_PCT))
    return np.asarray(mean - fade * excess)


def martensite_hv(composition: Composition, carbon_pct: Array, log_rate: Array) -> Array:
    """Martensite of ``carbon_pct`` [HV]; ``log_rate`` is log10 of degC/h at 700 degC."""
    c = composition
    carbon = np.asarray(carbon_pct, dtype=np.float64)
    alloy = 27.0 * c.Si + 11.0 * c.Mn + 8.0 * c.Ni + 16.0 * c.Cr
    maynier = 127.0 + 949.0 * carbon + alloy + 21.0 * log_rate
    rich = np.minimum(carbon, BOUND_CARBON_PCT)
    bound = 150.0 + 1667.0 * rich - 926.0 * rich**2
    span = BOUND_WHOLE_PCT - BOUND_FROM_PCT
    weight = np.clip((carbon - BOUND_FROM_PCT) / span, 0.0, 1.0)
    return np.asarray(maynier - weight * np.maximum(maynier - bound, 0.0))


def bainite_hv(composition: Composition, carbon_pct: float, log_rate: Array) -> Array:
    """Bainite [HV]; ``log_rate`` is log10 of degC/h at 700 degC."""
    c = composition
    fixed = (
        -323.0 + 185.0 * carbon_pct + 330.0 * c.Si + 153.0 * c.Mn + 65.0 * c.Ni
        + 144.0 * c.Cr + 191.0 * c.Mo
    )  # fmt: skip
    slope = (
        89.0 + 53.0 * carbon_pct - 55.0 * c.Si - 22.0 * c.Mn - 10.0 * c.Ni
        - 20.0 * c.Cr - 33.0 * c.Mo
    )  # fmt: skip
    return np.asarray(fixed + slope * log_rate)


def ferrite_pearlite_hv(composition: Composition, carbon_pct: float, log_rate: Array) -> Array:
    """Ferrite-pearlite by Maynier [HV]; ``log_rate`` is log10 of degC/h at 700 degC."""
    c = composition
    fixed = (
        42.0 + 223.0 * carbon_pct + 53.0 * c.Si + 30.0 * c.Mn + 12.6 * c.Ni + 7.0 * c.Cr
        + 19.0 * c.Mo
    )  # fmt: skip
    slope = 10.0 - 19.0 * c.Si + 4.0 * c.Ni + 8.0 * c.Cr + 130.0 * c.V
    return np.asarray(fixed + slope * log_rate)


def _known_rate(rate_700: Array) -> Array:
    """The rate where it is positive, else nan."""
    rate = np.asarray(rate_700, dtype=np.float64)
    return np.where(rate > 0.0, rate, np.nan)


def _ferrite_pearlite(
    fractions: Array,
    composition: Composition,
    rate: Array,
    pearlite_temp: Array,
    ae1: float,
    grain_intercept: Array | float,
) -> tuple[Array, tuple[Array, Array]]:
    """Share of ferrite in ferrite + pearlite, and the two lengths that scale them [m]."""
    ferrite = np.where(fractions[FERRITE] > PRESENT, fractions[FERRITE], 0.0)
    pearlite = np.where(fractions[PEARLITE] > PRESENT, fractions[PEARLITE], 0.0)
    both = ferrite + pearlite
    # where neither is present the value carries no weight: state it as for ferrite alone
    share = np.where(both > 0.0, ferrite / np.where(both > 0.0, both, 1.0), 1.0)
    grain = strength.ferrite_grain(composition, rate, grain_intercept)
    return share, (grain, strength.interlamellar_spacing(pearlite_temp, ae1))


def _pearlite_carbon(fractions: Array, carbon_pct: float) -> Array:
    """Carbon [mass %] that ferrite and cementite on the grain faces left for pearlite."""
    before = np.where(fractions[FERRITE] > PRESENT, fractions[FERRITE], 0.0)
    cementite = fractions[CEMENTITE]
    left = np.maximum(1.0 - before - cementite, PRESENT)
    return np.asarray((carbon_pct - CEMENTITE_CARBON_PCT * cementite) / left)


def range_notes(
    composition: Composition, fractions: Array, rate_700: Array
) -> tuple[RangeNote, ...]:
    """Notes for composition outside Maynier's range and for nodes without a rate.

    ``fractions`` (n_phase, n_node), ``rate_700`` [K/s] (n_node,).
    """
    model = SOURCES[0].model
    notes = list(outside(composition, model=model, limits=_LIMITS))
    alloy = composition.Mn + composition.Ni + composition.Cr + composition.Mo
    if alloy > 5.0:
        notes.append(RangeNote(model, "Mn + Ni + Cr + Mo", f"{alloy:g} %", "0 to 5 %"))
    needed = fractions[[FERRITE, PEARLITE, BAINITE, MARTENSITE]].max(axis=0) > PRESENT
    unknown = int(np.count_nonzero(np.isnan(_known_rate(rate_700)) & needed))
    if unknown:
        value = f"unknown at {unknown} of {needed.size} points: no hardness there"
        notes.append(RangeNote(model, "cooling rate at 700 degC", value, "parts cooled through it"))
    return tuple(notes)
