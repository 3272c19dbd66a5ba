"""The route of a case file: its stages one by one, and what they ask of each other."""

import math
from collections.abc import Mapping
from typing import cast

from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.tempering import refuse_secondary_hardening
from midradius.thermo.units import parse, show

from . import caseheat
from . import casekeys as keys
from .case import MediumUse, Outputs, SectionInput, Stage, StageKind, SteelInput, Until, position
from .caselines import KeyPath
from .casemedium import effective_bath, medium_in, medium_use
from .caseoutput import place_fault
from .casetable import Table, nearest, one_of

_SOAK = 'stage = "soak", at = "860 degC", time = "2 h"'
_UNTIL = 'such as "core below 150 degC"'
_COOL = "Heat flows to what the stage names: medium, or film with bath."


def route(
    top: Table, steel: SteelInput | None, section: SectionInput | None, outputs: Outputs
) -> tuple[Stage, ...]:
    """``[[route]]``: the stages in their order.

    Faults are noted; a stage at fault is left out of what comes back.
    """
    if not top.has("route") or top.raw("route") == []:
        top.missing("route", "a soak and at least one stage that cools", _SOAK_HINT)
        return ()
    stages: list[Stage] = []
    soak: float | None = None
    heated: Stage | None = None
    seen: set[StageKind] = set()
    items = top.items("route", "[[route]] before each stage")
    if len(items) > keys.STAGES_MOST:
        top.refuse("route", f"route has {len(items)} stages, at most {keys.STAGES_MOST} are read")
        return ()
    for place, (key, value) in enumerate(items):
        if not isinstance(value, dict):
            top.notes.add(key, value, "a table, written as [[route]]")
            continue
        table = Table(value, key, top.notes)
        kind = _kind(table, place, seen)
        again = kind in seen
        if kind:
            seen.add(kind)
        if kind == "temper":
            stage = _temper(table, steel)
        elif kind == "heat":
            stage = caseheat.heat(table, section, outputs, again=again)
            heated = stage or heated
        elif kind == "soak":
            stage = _soak(table, steel)
            soak = stage.at if stage else None
            if stage and heated and (found := caseheat.soak_fault(stage, heated)):
                table.fault("at", *found)
        elif kind:
            stage = _cooling(table, kind, section, outputs, soak)
        else:
            stage = None
        if stage:
            stages.append(stage)
    key, value = items[-1]
    if seen <= {"heat", "soak"} and not top.notes.has(key):
        remedy = 'Add a [[route]] with stage = "quench".'
        if "soak" not in seen:
            remedy = f"A soak, and then a stage that cools: {_SOAK}."
        top.notes.add(key, value, "followed by a stage that cools", remedy)
    return tuple(stages)


_SOAK_HINT = f"Write [[route]] and below it {_SOAK.replace(', ', '; ')}."


def _kind(table: Table, place: int, seen: set[StageKind]) -> StageKind | None:
    if not table.has("stage"):
        table.missing("stage", one_of(keys.STAGES))
        table.only(tuple(dict.fromkeys(keys.HEAT + keys.SOAK + keys.COOLING)))
        return None
    kind = cast(StageKind | None, table.choice("stage", keys.STAGES))
    if kind and place == 0 and kind not in ("heat", "soak"):
        remedy = f"The soak says what austenite there is: {_SOAK}."
        table.fault("stage", 'a "soak" first, or a "heat" before it', remedy)
    late = seen - {"heat"} if kind == "soak" else seen & {"soak", *keys.COOLS, "temper"}
    if kind in ("heat", "soak") and late:
        remedy = "Heating up again between stages is not computed; describe the last soak only."
        table.fault("stage", '"transfer", "quench" or "hold" after the first stage', remedy)
    if kind in keys.COOLS and seen == {"heat"}:
        table.fault("stage", 'a "soak" after the last "heat"', f"Write {_SOAK}.")
    if kind == "temper" and place > 0 and seen.isdisjoint(keys.COOLS):
        remedy = "A temper softens what a quench has hardened: put it last."
        table.fault("stage", f"{one_of(keys.COOLS)} before the first temper", remedy)
    if kind in keys.COOLS and "temper" in seen:
        remedy = "Tempers come last: what cools the part after them changes nothing here."
        table.fault("stage", 'only "temper" after a temper', remedy)
    return kind


def _soak(table: Table, steel: SteelInput | None) -> Stage | None:
    other = dict.fromkeys(keys.COOLING, "A soak has no medium: the part is at one temperature.")
    table.only(keys.SOAK, other)
    at = table.quantity("at", "temperature", (0.0, float("inf")))
    time = table.quantity("time", "duration", keys.STAGE_TIME_RANGE)
    low, high = keys.SOAK_RANGE
    why, remedy = "", ""
    if steel:
        low = equilibrium(steel.steel.composition).ae1
        why = f", above the Ae1 of {steel.steel.name}"
        remedy = "At or below Ae1 no austenite forms and nothing can transform: raise the soak."
    allowed = f"{math.ceil(low - keys.ZERO_DEGC)} to {high - keys.ZERO_DEGC:.0f} degC{why}"
    if not table.has("at"):
        table.missing("at", allowed)
    if not table.has("time"):
        table.missing("time", "a duration", 'Write for example time = "2 h".')
    too_cold = at is not None and (at <= low if steel else at < low)
    if at is not None and (too_cold or at > high):
        table.fault("at", allowed, remedy if at <= low else "")
        return None
    if at is None or time is None:
        return None
    return Stage(kind="soak", at=at, time=time)


def _temper(table: Table, steel: SteelInput | None) -> Stage | None:
    other = dict.fromkeys(keys.COOLING, "A temper has no medium: the part is hot throughout.")
    table.only(keys.TEMPER, other)
    at = table.quantity("at", "temperature", (0.0, float("inf")))
    time = table.quantity("time", "duration", keys.STAGE_TIME_RANGE)
    low, high, of_steel = keys.TEMPER_COLDEST, keys.TEMPER_HOTTEST, ""
    if steel:
        high = equilibrium(steel.steel.composition).ae1
        of_steel = f", below the Ae1 of {steel.steel.name}"
        try:
            refuse_secondary_hardening(steel.steel.composition)
        except InputFault as fault:
            sentence = f"{fault.quantity} = {fault.value}, but must be {fault.allowed}"
            table.refuse("stage", sentence, fault.remedy)
    celsius = (math.ceil(low - keys.ZERO_DEGC), math.floor(high - keys.ZERO_DEGC))
    allowed = f"{celsius[0]} to {celsius[1]} degC{of_steel}"
    if not table.has("at"):
        table.missing("at", allowed)
    if not table.has("time"):
        table.missing("time", "a duration", 'Write for example time = "4 h".')
    if at is not None and not low <= at < high:
        remedy = "From Ae1 on austenite forms again: that is a soak, not a temper."
        table.fault("at", allowed, remedy if at >= high else "")
        return None
    if at is None or time is None:
        return None
    return Stage(kind="temper", at=at, time=time)


def _cooling(
    table: Table,
    kind: StageKind,
    section: SectionInput | None,
    outputs: Outputs,
    soak: float | None,
) -> Stage | None:
    bath_says = f'A {kind} has a medium: give its temperature as bath = "60 degC".'
    table.only(keys.COOLING, {"at": bath_says})
    use = medium_in(table)
    faces = _faces(table, section)
    everywhere = section is not None and set(section.zones) <= set(faces)
    needs = not any(table.has(name) for name in ("medium", "film", "bath")) and not everywhere
    if needs and not table.notes.has(table.key("faces")):
        table.missing("medium", f"given for a {kind}", _COOL)
    time = table.quantity("time", "duration", keys.STAGE_TIME_RANGE)
    if not table.has("time") and not (table.has("until") and kind != "transfer"):
        if kind == "transfer":
            table.missing("time", "a duration", 'Write for example time = "45 s".')
        else:
            remedy = f"Write time, or until, {_UNTIL}."
            table.missing("time", "given, or else until: the stage needs an end", remedy)
    until = _until(table, section, outputs)
    _not_hotter(table, use, faces, soak)
    if until and use and not faces:
        _reachable(table, until, use, soak)
    if table.notes.has(table.place):
        return None
    return Stage(kind=kind, time=time, medium=use, until=until, faces=faces)


def _faces(table: Table, section: SectionInput | None) -> dict[str, MediumUse]:
    inner = table.table("faces", '{ "far face" = "still air" }')
    if inner is None:
        return {}
    faces: dict[str, MediumUse] = {}
    raw = cast(Mapping[str, object], table.raw("faces"))
    for zone in raw:
        if section and zone not in section.zones:
            remedy = nearest(zone, section.zones)
            inner.fault(zone, f"one of the zones {', '.join(section.zones)}", remedy)
        elif use := medium_use(inner, zone):
            faces[zone] = use
    return faces


def _until(table: Table, section: SectionInput | None, outputs: Outputs) -> Until | None:
    if not table.has("until"):
        return None
    text = table.text("until", keys.LONGEST_TITLE)
    if text is None:
        return None
    where, below, temp_text = text.strip().rpartition(" below ")
    if not below:
        table.fault("until", f"a place, below and a temperature, {_UNTIL}")
        return None
    where = where.strip()
    key = table.key("until")
    try:
        temp = parse(temp_text, "temperature")
    except InputFault as fault:
        table.fault("until", f"a place, below and {fault.allowed}", fault.remedy)
        return None
    named = [place for place in outputs.positions if place.name == where]
    try:
        place = named[0] if named else position(where)
    except InputFault as fault:
        allowed = f"about an output position, {fault.allowed}"
        table.notes.add(key, text, allowed, fault.remedy)
        return None
    if section and not named and (found := place_fault(place, section)):
        table.notes.add(key, text, *found)
        return None
    return Until(place.name, temp)


def _not_hotter(
    table: Table, use: MediumUse | None, faces: Mapping[str, MediumUse], soak: float | None
) -> None:
    if soak is None:
        return
    uses: list[tuple[KeyPath, MediumUse]] = [
        ((*table.key("faces"), zone), face) for zone, face in faces.items()
    ]
    if use:
        uses.insert(0, (table.key("bath"), use))
    for key, given in uses:
        bath = effective_bath(given)
        if bath is not None and bath >= soak:
            remedy = "A bath as hot as the part cools nothing."
            allowed = f"colder than the soak, {show(soak, 'temperature')}"
            table.notes.add(key, show(bath, "temperature"), allowed, remedy)


def _reachable(table: Table, until: Until, use: MediumUse, soak: float | None) -> None:
    bath = effective_bath(use)
    if bath is not None and until.temp <= bath:
        remedy = "The part never gets colder than its bath: the stage would not end."
        table.fault("until", f"above the bath, {show(bath, 'temperature')}", remedy)
    elif soak is not None and until.temp >= soak:
        remedy = "The stage would end before it begins."
        table.fault("until", f"below the soak, {show(soak, 'temperature')}", remedy)


def soak_and_tempers(top: Table, steel: SteelInput | None) -> tuple[Stage, ...]:
    """``[[route]]`` where the temperatures of the cooling are given: a soak, then tempers."""
    if not top.has("route") or top.raw("route") == []:
        top.missing("route", "a soak: it says what austenite there is", _SOAK_HINT)
        return ()
    stages: list[Stage] = []
    items = top.items("route", "[[route]] before each stage")
    if len(items) > keys.STAGES_MOST:
        top.refuse("route", f"route has {len(items)} stages, at most {keys.STAGES_MOST} are read")
        return ()
    for place, (key, value) in enumerate(items):
        if not isinstance(value, dict):
            top.notes.add(key, value, "a table, written as [[route]]")
            continue
        table = Table(value, key, top.notes)
        kind = cast(StageKind | None, table.choice("stage", keys.STAGES))
        if not table.has("stage"):
            table.missing("stage", '"soak" first, then "temper"')
        if kind is not None and kind not in ("soak", "temper"):
            remedy = "Take the stage out, or describe the part by [section] instead."
            allowed = '"soak" or "temper": [temperatures] says how the part cools'
            table.fault("stage", allowed, remedy)
        elif kind == "soak" and place > 0:
            table.fault("stage", '"temper" after the soak', "One soak leaves the austenite.")
        elif kind == "temper" and place == 0:
            table.fault("stage", 'a "soak" first', f"It says what austenite there is: {_SOAK}.")
        elif kind:
            stage = _soak(table, steel) if kind == "soak" else _temper(table, steel)
            stages += [stage] if stage else []
    return tuple(stages)
