"""What a result rests on: models left, works used, inputs as understood."""

from dataclasses import asdict

from midradius.fem.media import ZERO_DEGC
from midradius.fem.route import History
from midradius.study import uncertainty
from midradius.study.case import Case
from midradius.study.setup import Setup
from midradius.study.steelfile import source_of
from midradius.study.worth import Worth
from midradius.thermo import austenite as soaking
from midradius.thermo import (
    calibration,
    conversion,
    diffusional,
    embrittlement,
    equilibrium,
    hardness,
    martensite,
    network,
    properties,
    steel,
    strength,
    tempering,
    toughness,
)
from midradius.thermo.austenite import Austenite
from midradius.thermo.source import RangeNote, Source

# Above it bainite could still form on the way to room temperature [estimate].
ENDS_HOT = 200.0 + ZERO_DEGC


def notes_of(
    case: Case, setup: Setup, left: Austenite, history: History, value: Worth
) -> tuple[RangeNote, ...]:
    """Every model that the run used outside the range of its source."""
    composition = case.steel.steel.composition
    found = [
        *case.steel.notes,
        *steel.range_notes(composition),
        *equilibrium.range_notes(composition),
        *left.notes,
        *diffusional.range_notes(composition, left.carbon_pct, left.grain_astm),
        *martensite.range_notes(left.composition),
        *hardness.range_notes(composition, history.phases, history.rate_700),
        *value.notes,
        *properties.range_notes(history.field, composition.C),
        *setup.notes,
    ]
    hottest = float(history.temp.max())
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


def sources_of(case: Case, setup: Setup) -> tuple[Source, ...]:
    """The works that a run of the case rests on."""
    found: list[Source] = [source_of(case.steel.steel)]
    used = [equilibrium, soaking, diffusional, martensite, properties, hardness, conversion]
    used += [strength, tempering, embrittlement] if case.tempers else [strength]
    composition = case.steel.steel.composition
    rich = equilibrium.equilibrium(composition).eutectoid_carbon_pct < composition.C
    used += [network] if rich else []
    used += [toughness] if toughness.applies(composition) else []
    used += [calibration] if case.steel.calibration else []
    used += [uncertainty] if case.needs else []
    for module in used:
        found += getattr(module, "SOURCES", ()) or [module.SOURCE]
    return tuple(dict.fromkeys([*found, *setup.sources]))


def inputs_of(case: Case) -> dict[str, object]:
    """The case as it was understood, for the record."""
    resolved = asdict(case)
    resolved.pop("text")
    resolved["path"] = case.path.name if case.path else None
    return resolved
