"""Hardness after one or several tempers, constituent by constituent.

Model
-----
All stages together weigh as much as ``t`` at the hottest of them, each second counted
by ``exp(-H / R T)`` (H = 100 kcal/mol), which for one stage is Maynier's parameter; so
the order of stages does not matter. The *equivalent temperature* does in 2 h (or 1 h)
what the whole treatment does.

Martensite: from 450 degC of the 2 h equivalent the mean of Spies and Maynier, above 680
degC Spies going on along Maynier's slope; below, a straight line from the hardness as
quenched at 150 degC to the model at 450 degC (closure: Maynier's equation exceeds the
hardness as quenched there). The mean, since the published tables lie between the two:
Spies alone is 5 HRC too hard on the mean, Maynier too soft in manganese steels.
Maynier's half fades out between 0.50 % C, where its range ends, and 0.60 %.
Bainite: Maynier from 450 degC of the 1 h equivalent, below it the same straight line.
Ferrite, pearlite and proeutectoid cementite do not change. Retained austenite: goes
between 200 and 300 degC of the 1 h equivalent, straight between (closure), to what is
counted as bainite and given the hardness of the austenite or, if less, of the tempered
bainite, since a temper must not harden here. The mixture is the mean by fraction, and
nothing is ever harder than as quenched: hotter or longer is never harder.

Source
------
Spies, Neue Huette (1992; a paper of Spies, Muench & Prewitz, 1977, is quoted for it too);
Maynier, Jungmann & Dollet, in Hardenability Concepts (1978) 518, signs of the tempered
bainite settled by their own sense; second stage of tempering: Speich & Leslie, Metall.
Trans. 3 (1972) 1043. All remembered.

Holds for
---------
Spies: 500 to 650 degC, 2 h; C 0.20 to 0.54, Si 0.17 to 1.4, Mn 0.5 to 1.9, Cr 0.03 to
1.2 mass %, no term for nickel. Maynier: below about 400 degC without meaning. Secondary
hardening is not in it: steels with more than 3.5 % Cr, 1.2 % Mo (W by half) or 0.3 % V
are refused, a little beyond Maynier's 3, 1 and 0.2 %, where carbides of these elements
begin to rule the curve. Austenite with more than 1 % Si decomposes later than given here.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.conversion import BRINELL_RATIO, hv_to_hrc
from midradius.thermo.errors import InputFault
from midradius.thermo.hardness import PRESENT
from midradius.thermo.phases import AUSTENITE, BAINITE, FERRITE, MARTENSITE, PEARLITE
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

SOURCES = (
    Source("hardness of tempered martensite", "Spies 1992", "Neue Huette", "remembered"),
    Source(
        "tempering parameter, tempered martensite and bainite",
        "Maynier, Jungmann & Dollet 1978",
        "Hardenability Concepts, 518",
        "remembered",
    ),
    Source(
        "retained austenite on tempering",
        "Speich & Leslie 1972; straight between the ends of the second stage",
        "Metall. Trans. 3, 1043",
        "estimate",
    ),
    Source(
        "tempers below 450 and above 680 degC",
        "straight to the hardness as quenched, along Maynier's slope",
        "-",
        "estimate",
    ),
)

ZERO_DEGC = 273.15
HOUR = 3600.0
R_OVER_H = 1.987 / 100e3  # 1/K, Maynier: cal/(mol K) over cal/mol
SPIES_HOLD, MAYNIER_HOLD = 2.0 * HOUR, HOUR
NOTHING_BELOW = 150.0 + ZERO_DEGC
MODEL_FROM, MODEL_TO = 450.0 + ZERO_DEGC, 680.0 + ZERO_DEGC
AUSTENITE_GOES = (200.0 + ZERO_DEGC, 300.0 + ZERO_DEGC)
SPHEROIDISES_ABOVE = 650.0 + ZERO_DEGC
SECONDARY = (("Cr", 3.5), ("Mo", 1.2), ("V", 0.3))  # mass %, refused above
LEAST_SHARE = 0.01  # of a constituent that is worth a note
MAYNIER_WEIGHT = 0.5  # the plain mean; 0 leaves Spies alone
MAYNIER_FADES_PCT = (0.50, 0.60)  # carbon, mass %
ROCKWELL = (20.0, 68.0)  # scale of the hardness as quenched in Spies' equation
_SPIES_LIMITS = {
    "C": (0.20, 0.54), "Si": (0.17, 1.4), "Mn": (0.5, 1.9), "Cr": (0.03, 1.2), "Ni": (0.0, 1.0),
}  # fmt: skip


@dataclass(frozen=True)
class Temper:
    """One stage: temperature [K] and the time [s] that the part is at it."""

    temp: float
    time: float


@dataclass(frozen=True)
class Tempered:
    """What tempers leave: mass fractions and hardness by constituent, (n_phase, n_node),
    and the hardness of the mixture [HV], (n_node,)."""

    fractions: Array
    hv_by_phase: Array
    hardness_hv: Array


def equivalent_temp(tempers: Sequence[Temper], *, hold: float) -> float:
    """Temperature [K] that does in ``hold`` [s] what all ``tempers`` (one at least) do.

    With one hour it is Maynier's parameter Pc.
    """
    hottest = max(stage.temp for stage in tempers)
    time = sum(
        stage.time * np.exp((1.0 / hottest - 1.0 / stage.temp) / R_OVER_H) for stage in tempers
    )
    return float(1.0 / (1.0 / hottest - R_OVER_H * np.log(time / hold)))


def temper(
    fractions: Array,
    hv_by_phase: Array,
    hardness_hv: Array,
    *,
    composition: Composition,
    tempers: Sequence[Temper],
) -> Tempered:
    """Take a quenched structure through its tempers.

    Parameters
    ----------
    fractions, hv_by_phase
        As quenched: mass fractions and hardness [HV], (n_phase, n_node).
    hardness_hv
        Of the mixture as quenched [HV], (n_node,); the bound of the answer.
    composition
        The steel [mass %].
    tempers
        In any order; none leaves everything as it is.

    Raises
    ------
    InputFault
        The steel hardens a second time on tempering.
    """
    refuse_secondary_hardening(composition)
    if not tempers:
        return Tempered(fractions, hv_by_phase, hardness_hv)
    by_phase = hv_by_phase.copy()
    by_phase[MARTENSITE] = martensite_hv(hv_by_phase[MARTENSITE], composition, tempers)
    by_phase[BAINITE] = bainite_hv(hv_by_phase[BAINITE], composition, tempers)
    by_phase[AUSTENITE] = np.fmin(hv_by_phase[AUSTENITE], by_phase[BAINITE])
    # the mean still counts the old fractions: austenite and its product have one hardness
    held = np.where(fractions > PRESENT, fractions, 0.0)
    weighted = np.where(fractions > PRESENT, held * by_phase, 0.0).sum(axis=0)
    mean = weighted / held.sum(axis=0)
    gone = fractions[AUSTENITE] * austenite_decomposed(tempers)
    after = fractions.copy()
    after[AUSTENITE] -= gone
    after[BAINITE] += gone
    return Tempered(after, by_phase, np.minimum(mean, hardness_hv))


def martensite_hv(
    as_quenched_hv: Array, composition: Composition, tempers: Sequence[Temper]
) -> Array:
    """Tempered martensite [HV] from its hardness as quenched [HV], any shape."""
    hard = np.asarray(as_quenched_hv, dtype=np.float64)
    at = equivalent_temp(tempers, hold=SPIES_HOLD)
    inside = max(at, MODEL_FROM)
    held = min(inside, MODEL_TO)
    fixed, slope = _maynier_martensite(composition)
    beyond = max(slope, 0.0) * (1.0 / inside - 1.0 / held)
    model = spies_hb(hard, composition, held) / BRINELL_RATIO + beyond
    if slope > 0.0:
        after_1h = 1.0 / inside - R_OVER_H * np.log(SPIES_HOLD / MAYNIER_HOLD)
        weight = maynier_weight(composition.C)
        model = (1.0 - weight) * model + weight * (fixed + slope * after_1h)
    return _up_to_the_model(hard, np.minimum(model, hard), at)


def bainite_hv(as_cooled_hv: Array, composition: Composition, tempers: Sequence[Temper]) -> Array:
    """Tempered bainite [HV] from its hardness as cooled [HV], any shape."""
    hard = np.asarray(as_cooled_hv, dtype=np.float64)
    at = equivalent_temp(tempers, hold=MAYNIER_HOLD)
    fixed, slope = _maynier_bainite(composition)
    if slope <= 0.0:  # plain carbon steel: the equation would harden on tempering
        return hard
    within = np.minimum(hard, fixed + slope / max(at, MODEL_FROM))
    return _up_to_the_model(hard, within, at)


def maynier_weight(carbon_pct: float) -> float:
    """Weight of Maynier beside Spies in tempered martensite [-]."""
    return float(np.interp(carbon_pct, MAYNIER_FADES_PCT, (MAYNIER_WEIGHT, 0.0)))


def austenite_decomposed(tempers: Sequence[Temper]) -> float:
    """Share of the retained austenite that the tempers decompose [-]."""
    at = equivalent_temp(tempers, hold=MAYNIER_HOLD)
    return float(np.interp(at, AUSTENITE_GOES, (0.0, 1.0)))


def spies_hb(as_quenched_hv: Array, composition: Composition, temp: float) -> Array:
    """Brinell hardness by Spies after 2 h at ``temp`` [K]; hardness as quenched in HV.

    Hardness as quenched outside 238 to 940 HV counts as the nearer end; `range_notes`
    reports it.
    """
    c = composition
    hard = np.asarray(as_quenched_hv, dtype=np.float64)
    hrc = np.asarray(hv_to_hrc(hard))
    # nan of the conversion: beyond the end of the scale that the hardness is nearer to
    beyond = np.where(hard > 500.0, ROCKWELL[1], ROCKWELL[0])
    hrc = np.where(np.isnan(hrc) & ~np.isnan(hard), beyond, hrc)
    alloy = 75.0 * c.C - 0.78 * c.Si + 14.24 * c.Mn + 14.77 * c.Cr + 128.22 * c.Mo - 54.0 * c.V
    return np.asarray(2.84 * hrc + alloy - 0.55 * (temp - ZERO_DEGC) + 435.66)


def maynier_martensite_hv(composition: Composition, tempers: Sequence[Temper]) -> float:
    """Tempered martensite by Maynier alone [HV], for comparison."""
    fixed, slope = _maynier_martensite(composition)
    return fixed + slope / equivalent_temp(tempers, hold=MAYNIER_HOLD)


def refuse_secondary_hardening(composition: Composition) -> None:
    """Raise `InputFault` for steels whose carbides harden them on tempering."""
    for element, most in SECONDARY:
        amount = getattr(composition, element)
        if element == "Mo":
            amount += 0.5 * composition.W
        if amount > most:
            name = "Mo + W/2" if element == "Mo" and composition.W else element
            raise InputFault(
                f"{name} of a steel to be tempered",
                f"{amount:g} %",
                f"at most {most:g} %",
                "Above it the steel hardens a second time on tempering, which no model here"
                " represents: take the temper out; the result is as quenched.",
            )


def range_notes(
    composition: Composition, fractions: Array, hv_by_phase: Array, tempers: Sequence[Temper]
) -> tuple[RangeNote, ...]:
    """Notes on tempers and steels outside of what the sources hold for.

    ``fractions`` and ``hv_by_phase`` as quenched, (n_phase, n_node).
    """
    if not tempers:
        return ()
    notes: list[RangeNote] = []
    most = fractions.max(axis=1)
    in_1h = equivalent_temp(tempers, hold=MAYNIER_HOLD)
    in_2h = equivalent_temp(tempers, hold=SPIES_HOLD)
    if most[MARTENSITE] > LEAST_SHARE:
        model = SOURCES[0].model
        notes += outside(composition, model=model, limits=_SPIES_LIMITS)
        if not 500.0 <= in_2h - ZERO_DEGC <= 650.0:
            what = "temper (as 2 h)"
            notes.append(RangeNote(model, what, _degc(in_2h), f"500 to 650 degC{_instead(in_2h)}"))
        hard = hv_by_phase[MARTENSITE][fractions[MARTENSITE] > LEAST_SHARE]
        if not np.all(np.isfinite(hv_to_hrc(hard[np.isfinite(hard)]))):
            ends = f"{np.nanmin(hard):.0f} to {np.nanmax(hard):.0f} HV"
            notes.append(RangeNote(model, "hardness as quenched", ends, "238 to 940 HV"))
    if most[BAINITE] > LEAST_SHARE and in_1h < 400.0 + ZERO_DEGC:
        notes.append(RangeNote(SOURCES[1].model, "temper (as 1 h)", _degc(in_1h), "above 400 degC"))
    if most[[FERRITE, PEARLITE]].max() > LEAST_SHARE and in_1h > SPHEROIDISES_ABOVE:
        allowed = "below 650 degC, where pearlite does not turn to spheroids and soften"
        notes.append(
            RangeNote("ferrite-pearlite unchanged", "temper (as 1 h)", _degc(in_1h), allowed)
        )
    if most[AUSTENITE] > LEAST_SHARE:
        notes += outside(composition, model=SOURCES[2].model, limits={"Si": (0.0, 1.0)})
    return tuple(notes)


def _up_to_the_model(hard: Array, within: Array, at: float) -> Array:
    """Straight from the hardness as quenched to that of the model at its lowest temperature."""
    share = np.clip((at - NOTHING_BELOW) / (MODEL_FROM - NOTHING_BELOW), 0.0, 1.0)
    return np.asarray(hard + share * (within - hard))


def _maynier_martensite(composition: Composition) -> tuple[float, float]:
    """Constant [HV] and slope [HV K] on 1 / Pc."""
    c = composition
    fixed = (
        -74.0 - 434.0 * c.C - 368.0 * c.Si - 25.0 * c.Mn + 37.0 * c.Ni - 335.0 * c.Mo
        - 2235.0 * c.V
    )  # fmt: skip
    slope = (
        260.0 + 616.0 * c.C + 321.0 * c.Si - 21.0 * c.Mn - 35.0 * c.Ni - 11.0 * c.Cr
        + 352.0 * c.Mo + 2345.0 * c.V
    )  # fmt: skip
    return fixed, 1e3 * slope


def _maynier_bainite(composition: Composition) -> tuple[float, float]:
    """Constant [HV] and slope [HV K] on 1 / Pc."""
    c = composition
    fixed = (
        262.0 + 162.0 * c.C - 349.0 * c.Si - 64.0 * c.Mn - 6.0 * c.Ni - 186.0 * c.Cr
        - 485.0 * c.Mo - 857.0 * c.V
    )  # fmt: skip
    slope = (
        -149.0 + 43.0 * c.C + 336.0 * c.Si + 79.0 * c.Mn + 16.0 * c.Ni + 196.0 * c.Cr
        + 498.0 * c.Mo + 1094.0 * c.V
    )  # fmt: skip
    return fixed, 1e3 * slope


def _degc(temp: float) -> str:
    return f"{temp - ZERO_DEGC:.0f} degC"


def _instead(temp: float) -> str:
    if temp < NOTHING_BELOW:
        return " (below 150 degC nothing is changed)"
    if temp < MODEL_FROM:
        return " (below 450 degC straight to the hardness as quenched)"
    return " (above 680 degC along Maynier's slope)" if temp > MODEL_TO else ""
