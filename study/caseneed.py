"""``[[need]]`` of a case file: what the drawing asks for, with its limits.

A limit keeps the unit that it was written in; nothing is converted here.
"""

import math
import re
import unicodedata
from collections.abc import Mapping
from typing import cast

from midradius.thermo.errors import InputFault

from . import casekeys as keys
from .case import EVERYWHERE, TRADE_TERMS, Need, Outputs, SectionInput, position, with_unit
from .caseoutput import deepest, place_fault
from .casetable import Table, nearest, one_of

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_AMOUNT = re.compile(rf"({_NUMBER})\s*([^\s0-9.,+-][^\s]*)")
_GRAIN = re.compile(rf"ASTM\s*({_NUMBER})", re.IGNORECASE)
_SHARE = re.compile(rf"({_NUMBER})\s*%\s*martensite")
_COMMA = re.compile(r"([+-]?[0-9]+),([0-9]+)(.*)", re.DOTALL)
_LONGEST = 60
# Other spellings of the same unit, after NFKC.
_SAME: Mapping[str, str] = {"HBW": "HB", "N/mm2": "MPa", "μm": "um"}
_EXAMPLES: Mapping[str, str] = {
    "HRC": "28 HRC",
    "MPa": "900 MPa",
    "%": "5 %",
    "mm": "8 mm",
    "um": "0.3 um",
    "ASTM": "ASTM 5",
}
_LIMITS = ("at_least", "at_most", "between")
_OTHER_WORDS = {
    **dict.fromkeys(("min", "minimum", "least"), "Write at_least."),
    **dict.fromkeys(("max", "maximum", "most"), "Write at_most."),
    **dict.fromkeys(("value", "limit"), "Write at_least, at_most or between."),
    **dict.fromkeys(("place", "where", "depth", "at"), 'Write position = "12 mm below surface".'),
}
_TERMS = ", ".join(f'"{term}"' for term in (EVERYWHERE, *TRADE_TERMS))
_PLACE = f'{_TERMS}, an output position or a depth such as "12 mm below surface"'
_WHERE = "Say where the drawing asks for it."


def needs(top: Table, section: SectionInput | None, outputs: Outputs) -> tuple[Need, ...]:
    """``[[need]]``: the requirements in their order; one at fault is left out."""
    if isinstance(top.raw("need"), dict):
        top.fault("need", "written as [[need]]", "Two brackets: there may be several.")
        return ()
    items = top.items("need", "[[need]] before each requirement")
    if len(items) > keys.NEEDS_MOST:
        top.refuse("need", f"need has {len(items)} items, at most {keys.NEEDS_MOST} are read")
        return ()
    found: list[Need] = []
    for key, value in items:
        if not isinstance(value, dict):
            top.notes.add(key, value, "a table, written as [[need]]")
            continue
        need = _need(Table(value, key, top.notes), section, outputs)
        if need is not None and need in found:
            top.notes.add(key, value, "asked once", "Take the second one out.")
        elif need is not None:
            found.append(need)
    return tuple(found)


def _need(table: Table, section: SectionInput | None, outputs: Outputs) -> Need | None:
    table.only(keys.NEED, _OTHER_WORDS)
    quantity = table.choice("quantity", keys.QUANTITIES)
    if not table.has("quantity"):
        table.missing("quantity", one_of(keys.QUANTITIES))
    place = _place(table, quantity, section, outputs)
    to = _to(table, quantity)
    limits = _limits(table, quantity)
    if quantity == keys.DEPTH and limits and section:
        _reachable(table, limits, section)
    if table.notes.has(table.place) or quantity is None or place is None or limits is None:
        return None
    low, high, unit = limits
    return Need(
        position=place,
        quantity=quantity,
        unit=unit,
        at_least=low,
        at_most=high,
        to=to[0] if to else None,
        to_unit=to[1] if to else "",
    )


def _place(
    table: Table, quantity: str | None, section: SectionInput | None, outputs: Outputs
) -> str | None:
    if quantity == keys.DEPTH:
        if table.has("position"):
            remedy = "A hardened depth is counted from the surface, along the profile."
            table.fault("position", f'left out where quantity = "{keys.DEPTH}"', remedy)
        return EVERYWHERE
    if not table.has("position"):
        if quantity != keys.GRAIN:
            table.missing("position", _PLACE, _WHERE)
        return EVERYWHERE
    name = table.text("position", keys.LONGEST_TITLE)
    if name is None or name == EVERYWHERE:
        return name
    named = [place.name for place in outputs.positions]
    if name in named:
        return name
    try:
        place = position(name)
    except InputFault as fault:
        near = nearest(name, (EVERYWHERE, *named, *TRADE_TERMS))
        unreadable = name.endswith("below surface") and not near
        table.fault("position", _PLACE, fault.remedy if unreadable else near)
        return None
    if section and (found := place_fault(place, section)):
        table.fault("position", *found)
        return None
    return name


def _limits(table: Table, quantity: str | None) -> tuple[float | None, float | None, str] | None:
    """At least, at most, unit."""
    given = [name for name in _LIMITS if table.has(name)]
    if not given:
        table.missing("at_least", "given, or else at_most or between", _example(quantity))
        return None
    if len(given) > 1:
        remedy = "For two limits write between."
        table.fault(given[1], f"left out where {given[0]} is given", remedy)
        return None
    if quantity is None:
        return None
    if given[0] != "between":
        found = _amount_of(table, given[0], quantity)
        if found is None:
            return None
        value, unit = found
        return (value, None, unit) if given[0] == "at_least" else (None, value, unit)
    return _between(table, quantity)


def _between(table: Table, quantity: str) -> tuple[float | None, float | None, str] | None:
    pair = table.raw("between")
    if not isinstance(pair, list) or len(pair) != 2:
        table.fault("between", f'two limits, such as ["{_first(quantity)}", ...]')
        return None
    ends = []
    for place, item in enumerate(pair):
        try:
            ends.append(amount(item, quantity))
        except InputFault as fault:
            table.notes.add((*table.key("between"), place), item, fault.allowed, fault.remedy)
    if len(ends) < 2:
        return None
    (low, unit), (high, other) = ends
    if unit != other:
        table.fault("between", "two limits in one unit", f"Write both in {unit}.")
    elif not low < high:
        table.fault("between", "the lower limit and then the higher one")
    else:
        return low, high, unit
    return None


def _to(table: Table, quantity: str | None) -> tuple[float, str] | None:
    """To what a hardened depth counts: a hardness, or a share of martensite [%]."""
    allowed = 'a hardness or a share of martensite, such as "50 HRC" or "50 % martensite"'
    if quantity != keys.DEPTH:
        if table.has("to") and quantity is not None:
            table.fault("to", f'left out unless quantity = "{keys.DEPTH}"')
        return None
    value = table.raw("to")
    if value is None:
        table.missing("to", allowed)
        return None
    share = _SHARE.fullmatch(value.strip()) if isinstance(value, str) else None
    if share:
        low, high = keys.MARTENSITE_RANGE
        if low <= float(share[1]) <= high:
            return float(share[1]), keys.OF_MARTENSITE
        table.fault("to", f"{low:g} to {high:g} % martensite")
        return None
    try:
        return amount(value, "hardness")
    except InputFault as fault:
        known = isinstance(value, str) and _AMOUNT.fullmatch(value.strip())
        unit = _unit(known[2]) if known else ""
        ranged = unit in keys.NEED_UNITS["hardness"]
        table.fault("to", fault.allowed if ranged else allowed, fault.remedy)
        return None


def _reachable(
    table: Table, limits: tuple[float | None, float | None, str], section: SectionInput
) -> None:
    low, high, unit = limits
    most = deepest(section) / keys.LENGTHS[unit]
    if not math.isfinite(most) or most <= 0.0:
        return
    for name, limit in (("at_least", low), ("at_most", high)):
        if limit is not None and limit > most * (1.0 + 1e-9):
            key = name if table.has(name) else "between"
            allowed = f"at most {most:.6g} {unit}, the core of this section"
            table.fault(key, allowed, "No depth is larger.")
            return


def _amount_of(table: Table, name: str, quantity: str) -> tuple[float, str] | None:
    try:
        return amount(table.raw(name), quantity)
    except InputFault as fault:
        table.fault(name, fault.allowed, fault.remedy)
        return None


def amount(text: object, quantity: str) -> tuple[float, str]:
    """Number and unit of a limit, such as ``("28 HRC", "hardness")``.

    Raises
    ------
    InputFault
        Not a text, no such unit for this quantity, or outside its range.
    """
    units = keys.NEED_UNITS[quantity]
    names = list(units)
    listed = ", ".join(names[:-1]) + f" or {names[-1]}" if len(names) > 1 else names[0]
    allowed = f'a number in {listed}, such as "{_first(quantity)}"'
    if names == ["ASTM"]:
        allowed = f'a grain number, such as "{_first(quantity)}"'
    if not isinstance(text, str):
        raise InputFault(quantity, str(text)[:_LONGEST], allowed, "Write it in quotes with unit.")
    body = text.strip()[:_LONGEST]
    if comma := _COMMA.fullmatch(body):
        remedy = f'Write "{comma[1]}.{comma[2]}{comma[3]}": the decimal sign is a point.'
        raise InputFault(quantity, body, allowed, remedy)
    if names == ["ASTM"]:
        grain = _GRAIN.fullmatch(body)
        found = (grain[1], "ASTM") if grain else None
    else:
        known = _AMOUNT.fullmatch(body)
        found = (known[1], _unit(known[2])) if known else None
    if found is None or found[1] not in units:
        near = nearest(found[1], names) if found else ""
        if re.fullmatch(_NUMBER, body):
            near = f'Add the unit, for example "{with_unit(float(body), names[0])}".'
        raise InputFault(quantity, body, allowed, near)
    value, unit = float(found[0]), found[1]
    low, high = units[unit]
    if not low <= value <= high:
        span = f"ASTM {low:g} to {high:g}" if unit == "ASTM" else f"{low:g} to {high:g} {unit}"
        why = keys.NEED_WHY.get(unit, "")
        raise InputFault(quantity, body, span, why)
    return value, unit


def _unit(text: str) -> str:
    plain = unicodedata.normalize("NFKC", text)
    return _SAME.get(plain, plain)


def _first(quantity: str) -> str:
    return _EXAMPLES[next(iter(keys.NEED_UNITS[quantity]))]


def _example(quantity: str | None) -> str:
    known = quantity if quantity in keys.NEED_UNITS else "hardness"
    return f'Write for example at_least = "{_first(cast(str, known))}".'
