"""``stage = "heat"`` of a case file: how the part comes to its soak, and what that asks."""

from midradius.fem.furnace import FurnaceMedium, furnace_medium, furnace_names
from midradius.thermo.errors import InputFault
from midradius.thermo.units import parse, show

from . import casekeys as keys
from .case import MediumUse, Outputs, SectionInput, Stage, Until, position
from .caseoutput import place_fault
from .casetable import Table, is_line

ROOM = 20.0 + keys.ZERO_DEGC
EXAMPLE = (
    'stage = "heat", medium = "electric furnace, still air", furnace = "870 degC",'
    ' until = "core above 850 degC"'
)
_UNTIL = 'such as "core above 850 degC"'
_OTHER = {
    "bath": "A furnace is named by furnace, its temperature.",
    "at": 'Write furnace = "870 degC".',
    "film": "Films of your own are for cooling: name a medium that heats.",
    "faces": "All faces see the furnace.",
}


def heat(
    table: Table, section: SectionInput | None, outputs: Outputs, *, again: bool
) -> Stage | None:
    """One stage in the furnace; ``again``: there is a heat stage before it."""
    table.only(keys.HEAT, _OTHER)
    known = _medium(table)
    furnace = _furnace(table, known)
    start = None
    if not again:
        start = ROOM
        if table.has("from"):
            start = table.quantity("from", "temperature", keys.TEMP_RANGE)
    elif table.has("from"):
        table.fault("from", "left out after the first heat stage", "The part is as hot as it is.")
    if furnace is not None and start is not None and start >= furnace:
        remedy = "A furnace no hotter than the part heats nothing."
        table.fault("from", f"below the furnace, {show(furnace, 'temperature')}", remedy)
    ramp = table.quantity("ramp", "heating rate", keys.RAMP_RANGE)
    time = table.quantity("time", "duration", keys.STAGE_TIME_RANGE)
    if not table.has("time") and not table.has("until"):
        remedy = f"Write time, or until, {_UNTIL}."
        table.missing("time", "given, or else until: the stage needs an end", remedy)
    until = _until(table, section, outputs)
    if until and furnace is not None and until.temp >= furnace:
        remedy = "The part never gets as hot as its furnace: the stage would not end."
        table.fault("until", f"below the furnace, {show(furnace, 'temperature')}", remedy)
    elif until and start is not None and until.temp <= start:
        allowed = f"above the start, {show(start, 'temperature')}"
        table.fault("until", allowed, "The stage would end before it begins.")
    if table.notes.has(table.place) or known is None or furnace is None:
        return None
    return Stage(
        "heat",
        at=furnace,
        time=time,
        medium=MediumUse(known.name),
        until=until,
        start=start,
        ramp=ramp,
    )


def soak_fault(soak: Stage, heating: Stage) -> tuple[str, str] | None:
    """What keeps a soak from following its heat stage: what is allowed, and the remedy."""
    assert heating.medium is not None and heating.medium.name is not None
    known = furnace_medium(heating.medium.name)
    if soak.at is not None and not known.coldest <= soak.at <= known.hottest:
        return _span(known), "The soak goes on in the furnace of the heat stage before it."
    return None


def _medium(table: Table) -> FurnaceMedium | None:
    names = "; ".join(furnace_names())
    if not table.has("medium"):
        table.missing("medium", "a medium that heats", f"Choose one of: {names}.")
        return None
    value = table.raw("medium")
    if not isinstance(value, str) or not is_line(value):
        table.fault("medium", "the name of a medium in quotes", f"Choose one of: {names}.")
        return None
    try:
        return furnace_medium(value)
    except InputFault as fault:
        table.fault("medium", fault.allowed, fault.remedy)
        return None


def _furnace(table: Table, known: FurnaceMedium | None) -> float | None:
    low, high = keys.FURNACE_RANGE
    allowed = f"{show(low, 'temperature')} to {show(high, 'temperature')}"
    if known is not None:
        low, high, allowed = known.coldest, known.hottest, _span(known)
    if not table.has("furnace"):
        table.missing("furnace", allowed, 'Write for example furnace = "870 degC".')
        return None
    furnace = table.quantity("furnace", "temperature", (0.0, float("inf")))
    if furnace is None:
        return None
    if not low <= furnace <= high:
        table.fault("furnace", allowed)
        return None
    return furnace


def _span(known: FurnaceMedium) -> str:
    low, high = known.coldest - keys.ZERO_DEGC, known.hottest - keys.ZERO_DEGC
    return f'{low:.4g} to {high:.4g} degC for medium = "{known.name}"'


def _until(table: Table, section: SectionInput | None, outputs: Outputs) -> Until | None:
    text = table.text("until", keys.LONGEST_TITLE)
    if text is None:
        return None
    where, above, temp_text = text.strip().rpartition(" above ")
    if not above:
        table.fault("until", f"a place, above and a temperature, {_UNTIL}")
        return None
    where = where.strip()
    try:
        temp = parse(temp_text, "temperature")
    except InputFault as fault:
        table.fault("until", f"a place, above and {fault.allowed}", fault.remedy)
        return None
    named = [place for place in outputs.positions if place.name == where]
    try:
        place = named[0] if named else position(where)
    except InputFault as fault:
        table.fault("until", f"about an output position, {fault.allowed}", fault.remedy)
        return None
    if section and not named and (found := place_fault(place, section)):
        table.fault("until", *found)
        return None
    return Until(place.name, temp, "above")
