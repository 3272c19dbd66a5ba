"""What a result rests on: models left, works used, inputs as understood."""

from dataclasses import asdict

import numpy as np

from midradius.fem.media import ZERO_DEGC
from midradius.fem.remains import Remains
from midradius.study import uncertainty
from midradius.study.calibrationfile import CalibratedSoak, soak_differences
from midradius.study.case import Asked, SteelInput
from midradius.study.steelfile import source_of
from midradius.study.worth import Worth
from midradius.thermo import austenite as soaking
from midradius.thermo import (
    autotemper,
    calibration,
    conversion,
    embrittlement,
    equilibrium,
    hardness,
    heatup,
    martensite,
    network,
    properties,
    ratesets,
    soaked,
    steel,
    strength,
    tempering,
    toughness,
)
from midradius.thermo.arrays import Array
from midradius.thermo.soaked import OLD_RATE, Soaked
from midradius.thermo.source import RangeNote, Source

# Above it bainite could still form on the way to room temperature [estimate].
ENDS_HOT = 200.0 + ZERO_DEGC


def notes_of(
    case: Asked,
    more: tuple[RangeNote, ...],
    history: Remains,
    value: Worth,
    *,
    seen: Array,
    last: Array,
) -> tuple[RangeNote, ...]:
    """Every model that the run used outside the range of its source.

    ``seen`` are temperatures [K] of any shape that include the extremes, ``last`` those
    of every node at the end; ``more`` are notes of the setup.
    """
    composition = case.steel.steel.composition
    left = value.soaked
    # what was never austenite keeps a hardness of its own, whatever it cools through
    rate_700 = np.where(left.austenitised, history.rate_700, OLD_RATE)
    # the poorest and the richest austenite stand for all between
    ends = (int(np.argmin(left.carbon_pct)), int(np.argmax(left.carbon_pct)))
    found = [
        *case.steel.notes,
        *steel.range_notes(composition),
        *equilibrium.range_notes(composition),
        *left.notes,
        *(note for each in ends for note in _of_austenite(case.steel, left, each)),
        *hardness.range_notes(composition, history.phases, rate_700),
        *value.notes,
        *properties.range_notes(seen, composition.C),
        *more,
        *_of_calibration(case.steel, left),
    ]
    hottest = float(last.max())
    if hottest > ENDS_HOT:
        found.append(
            RangeNote(
                "phases at room temperature",
                "hottest node at the end of the route",
                f"{hottest - ZERO_DEGC:.0f} degC",
                f"below {ENDS_HOT - ZERO_DEGC:.0f} degC (add a stage that cools further)",
            )
        )
    return tuple(dict.fromkeys(found))


def _of_austenite(given: SteelInput, left: Soaked, node: int) -> list[RangeNote]:
    if not left.austenitised[node]:
        return []
    carbon, grain = float(left.carbon_pct[node]), float(left.grain_astm[node])
    return [
        *ratesets.range_notes(given.kinetics, given.steel.composition, carbon, grain),
        *martensite.range_notes(left.kinds[int(left.kind[node])].composition),
    ]


def _of_calibration(given: SteelInput, left: Soaked) -> tuple[RangeNote, ...]:
    """Notes for the mean of all that was austenitised."""
    if given.calibration is None or not left.austenitised.any():
        return ()
    hottest, time, grain, carbon = (
        float(np.mean(each[left.austenitised]))
        for each in (left.hottest, left.time, left.grain_astm, left.carbon_pct)
    )
    return calibration_notes(given, CalibratedSoak(hottest - ZERO_DEGC, time, grain, carbon))


def calibration_notes(given: SteelInput, soak: CalibratedSoak) -> tuple[RangeNote, ...]:
    """A note for each way in which a calibrated steel is soaked otherwise than it was measured."""
    if given.calibration is None:
        return ()
    return tuple(
        RangeNote(calibration.SOURCE.model, "austenitising", found, "as in its measurement")
        for found in soak_differences(given.calibration, soak)
    )


def sources_of(case: Asked, more: tuple[Source, ...]) -> tuple[Source, ...]:
    """The works that a run of the case rests on."""
    found: list[Source] = [source_of(case.steel.steel)]
    used = [equilibrium, soaking, martensite, properties, hardness, autotemper, conversion]
    used += [strength, tempering, embrittlement] if case.tempers else [strength]
    composition = case.steel.steel.composition
    rich = equilibrium.equilibrium(composition).eutectoid_carbon_pct < composition.C
    used += [network] if rich else []
    used += [toughness] if toughness.applies(composition) else []
    used += [soaked, heatup] if case.heating else []
    used += [calibration] if case.steel.calibration else []
    used += [uncertainty] if case.needs else []
    found += ratesets.sources(case.steel.kinetics, composition)
    for module in used:
        found += getattr(module, "SOURCES", ()) or [module.SOURCE]
    return tuple(dict.fromkeys([*found, *more]))


def inputs_of(case: Asked) -> dict[str, object]:
    """The case as it was understood, for the record."""
    resolved = asdict(case)
    resolved.pop("text")
    resolved["path"] = case.path.name if case.path else None
    return resolved
