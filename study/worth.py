"""What the structure at the end of a route is worth: hardness, temper, strength."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem.remains import Remains
from midradius.study.case import Asked
from midradius.study.scale import Scales, scales
from midradius.thermo import (
    autotemper,
    embrittlement,
    equilibrium,
    hardness,
    martensite,
    strength,
    tempering,
)
from midradius.thermo.arrays import Array
from midradius.thermo.phases import (
    AUSTENITE,
    BAINITE,
    CEMENTITE,
    FERRITE,
    MARTENSITE,
    PEARLITE,
)
from midradius.thermo.soaked import OLD_RATE, Soaked
from midradius.thermo.source import RangeNote
from midradius.thermo.tempering import Temper, Tempered

LEAST_OFF_HV = 5.0  # of self-tempering that is worth a note, half of a Rockwell unit


@dataclass(frozen=True)
class Worth:
    """Of every node: fractions (n_phase, n_node), hardness before and after the tempers
    [HV] and yield strength [MPa], (n_node,) each; its lengths as cooled; what the soak
    left; what the models say beside it."""

    phases: Array
    as_quenched_hv: Array
    hardness_hv: Array
    yield_mpa: Array
    scales: Scales
    soaked: Soaked
    notes: tuple[RangeNote, ...]
    cautions: tuple[str, ...]


def tempers_of(case: Asked) -> tuple[Temper, ...]:
    """The tempers of a case, in its order."""
    return tuple(Temper(stage.at or 0.0, stage.time or 0.0) for stage in case.tempers)


def worth(case: Asked, soaked: Soaked, history: Remains) -> Worth:
    """Hardness as quenched, then through the tempers, then the strength of what is left.

    Raises
    ------
    InputFault
        A temper of a steel that hardens a second time.
    """
    composition = case.steel.steel.composition
    ae1 = equilibrium.equilibrium(composition).ae1
    # What was never austenite keeps the structure of an earlier cooling.
    rate_700 = np.where(soaked.austenitised, history.rate_700, OLD_RATE)
    history = replace(history, rate_700=rate_700)
    as_quenched, by_phase = hardness.vickers(
        history.phases,
        composition,
        carbon_austenite_pct=np.where(
            np.isnan(history.carbon_martensite_pct),
            soaked.carbon_pct,
            history.carbon_martensite_pct,
        ),
        carbon_initial_pct=composition.C,
        rate_700=history.rate_700,
        pearlite_temp=history.pearlite_temp,
        ae1=ae1,
        grain_intercept=soaked.old_intercept,
    )
    as_quenched = as_quenched + case.steel.shifts.hardness
    by_phase = by_phase + case.steel.shifts.hardness
    fresh = by_phase
    by_phase, as_quenched, told = _self_tempered(case, soaked, history, by_phase, as_quenched)
    tempers = tempers_of(case)
    left = _tempered(history.phases, fresh, as_quenched, case, tempers)
    if not tempers:
        left = Tempered(history.phases, by_phase, as_quenched)
    sizes = scales(
        composition,
        history.phases,
        rate_700=history.rate_700,
        pearlite_temp=history.pearlite_temp,
        grain_intercept=soaked.old_intercept,
        carbide_left=soaked.cementite,
    )
    return Worth(
        phases=left.fractions,
        as_quenched_hv=as_quenched,
        hardness_hv=left.hardness_hv,
        yield_mpa=_yield_mpa(case, soaked, history, left, ae1),
        scales=sizes,
        soaked=soaked,
        notes=(
            *told,
            *tempering.range_notes(composition, history.phases, fresh, tempers),
            *strength.range_notes(composition, left.fractions),
            *sizes.notes,
        ),
        cautions=embrittlement.cautions(composition, tempers, ae1=ae1) if tempers else (),
    )


def _self_tempered(
    case: Asked, soaked: Soaked, history: Remains, by_phase: Array, as_quenched: Array
) -> tuple[Array, Array, tuple[RangeNote, ...]]:
    """Hardness by phase and of the mixture, less what martensite has tempered itself."""
    composition = case.steel.steel.composition
    own, shift = case.steel.kinetics.measured, case.steel.shifts.martensite_start
    carbon = np.where(
        np.isnan(history.carbon_martensite_pct), soaked.carbon_pct, history.carbon_martensite_pct
    )
    if own is not None and own.martensite_start is not None:
        shift += own.martensite_start - float(martensite.start(composition, carbon).max())
    natural = autotemper.natural_time(composition, carbon, history.rate_700, shift)
    off = autotemper.softening(
        by_phase[MARTENSITE], composition, time=history.self_temper, natural=natural
    )
    most = int(np.argmax(off))
    softer = by_phase.copy()
    softer[MARTENSITE] -= off
    mixed = as_quenched - np.where(off > 0.0, history.phases[MARTENSITE] * off, 0.0)
    if off[most] < LEAST_OFF_HV:
        return softer, mixed, ()
    at, covered = (
        float(autotemper.equivalent_temp(time[most : most + 1], hold=3600.0)[0]) - 273.15
        for time in (history.self_temper, autotemper.MARGIN * natural)
    )
    note = RangeNote(
        autotemper.SOURCES[0].model,
        "heat left in the part, as a temper of 1 h",
        f"{at:.0f} degC",
        f"up to {covered:.0f} degC, which hardness as quenched holds already; beyond it "
        f"up to {off[most]:.0f} HV is taken off",
    )
    return softer, mixed, (note,)


def _tempered(
    phases: Array, by_phase: Array, as_quenched: Array, case: Asked, tempers: Sequence[Temper]
) -> Tempered:
    if not tempers:
        return Tempered(phases, by_phase, as_quenched)
    composition = case.steel.steel.composition
    return tempering.temper(phases, by_phase, as_quenched, composition=composition, tempers=tempers)


def _yield_mpa(case: Asked, soaked: Soaked, history: Remains, left: Tempered, ae1: float) -> Array:
    composition = case.steel.steel.composition
    some = np.where(left.fractions > hardness.PRESENT, left.fractions, 0.0)
    soft = some[FERRITE] + some[PEARLITE]
    rate = np.where(history.rate_700 > 0.0, history.rate_700, np.nan)
    ferrite_pearlite = strength.gladman_yield(
        np.where(soft > 0.0, some[FERRITE] / np.where(soft > 0.0, soft, 1.0), 1.0),
        grain=strength.ferrite_grain(composition, rate, soaked.old_intercept),
        spacing=strength.interlamellar_spacing(history.pearlite_temp, ae1),
        composition=composition,
    )
    # Yield follows the hardness that is stated: where the mixture is held below the mean
    # of its constituents, those that take their yield from hardness share the loss.
    weighted = np.where(some > 0.0, some * left.hv_by_phase, 0.0)
    steady = weighted[[FERRITE, CEMENTITE, PEARLITE]].sum(axis=0)
    hard = weighted[[AUSTENITE, BAINITE, MARTENSITE]].sum(axis=0)
    wanted = left.hardness_hv * some.sum(axis=0) - steady
    share = np.clip(wanted / np.where(hard > 0.0, hard, 1.0), 0.0, 1.0)
    return strength.yield_strength(some, left.hv_by_phase * share, ferrite_pearlite)
