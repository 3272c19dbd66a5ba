"""The amounts of an analysis as written, in mass percent.

A key that ends in ``ppm`` is parts per million by mass (``B_ppm``, ``"N [ppm]"``);
any other amount is mass percent. Element symbols may be in any case. A wrong
unit gives a plausible and wrong steel, so what looks like another unit is refused.
"""

import difflib
import math
import re
from contextlib import suppress

from midradius.thermo.certificatefile import TEXTS, Entry
from midradius.thermo.errors import InputFault
from midradius.thermo.steel import ELEMENTS, HARD_BOUNDS, Composition, check

# Real elements of a certificate that `Composition` cannot hold
_UNHEARD = ("Sn", "As", "Sb", "Pb", "Bi", "Ca", "Mg", "Zr", "Ta", "Se", "Te", "Ce", "La", "Zn",
            "O", "H", "Be")  # fmt: skip
_AMOUNT = re.compile(r"([A-Za-z]{1,2})[ _]*[\[(]?(|%|pct|ppm)[\])]?", re.IGNORECASE)
_PPM_PER_PCT = 1e4
_LOWEST_PPM = 1.0  # no works' analysis resolves less
_PRINTED_IN_PARTS = 5.0  # above this percentage a low-alloy steel is in another unit
_BY_FOLD = {element.casefold(): element for element in ELEMENTS}


def is_element(key: str) -> bool:
    """Whether a key names an element that the models know, with or without unit."""
    return bool(_element(key))


def read_amounts(entry: Entry, faults: list[InputFault]) -> dict[str, float]:
    """Mass percent by element, as far as it can be understood; the rest goes to ``faults``."""
    prefix = "analysis." if entry.prefix else ""
    amounts: dict[str, float] = {}
    bad: set[str] = set()
    for key, value in entry.amounts.items():
        element = _element(key)
        if not element:
            faults.append(_unknown(entry, key))
        elif element in amounts or element in bad:
            faults.append(entry.fault(prefix + key, value, f"given once, as {element}"))
        else:
            try:
                amounts[element] = _amount(value, is_ppm=bool(re.search("ppm", key, re.I)))
            except _Unclear as unclear:
                faults.append(entry.fault(prefix + key, value, *unclear.args))
                bad.add(element)
    low, high = HARD_BOUNDS["C"]
    if "C" not in amounts and "C" not in bad:
        allowed = f"{low:g} to {high:g} % by mass"
        remedy = "Carbon decides everything else."
        faults.append(entry.missing(prefix + "C", allowed, remedy))
    found = check(Composition(**{"C": low, **amounts}))
    of_elements = [item for item in found if item.quantity.startswith("composition.")]
    for item in of_elements or found:  # a sum says nothing new beside an absurd element
        element = item.quantity.removeprefix("composition.")
        remedy = _other_unit(element, amounts.get(element, 0.0)) or item.remedy
        where = prefix + element if of_elements else element
        faults.append(InputFault(entry.place_of(where), item.value, item.allowed, remedy))
    return amounts


class _Unclear(Exception):
    """What was allowed, and the remedy."""


def _element(key: str) -> str:
    matched = _AMOUNT.fullmatch(key)
    return _BY_FOLD.get(matched[1].casefold(), "") if matched else ""


def _amount(value: object, *, is_ppm: bool) -> float:
    amount = math.nan
    if isinstance(value, int | float | str) and not isinstance(value, bool):
        with suppress(ValueError, OverflowError):
            amount = float(value)
    if not math.isfinite(amount):
        remedy = "Write the number alone."
        if isinstance(value, str) and value.startswith("<"):
            remedy = "Below what was detected: write 0 or leave it out."
        raise _Unclear(f"a finite number in {'ppm' if is_ppm else 'mass percent'}", remedy)
    if is_ppm and 0.0 < amount < _LOWEST_PPM:
        remedy = "It looks like mass percent: leave ppm out of the key."
        raise _Unclear(f"0, or at least {_LOWEST_PPM:g} ppm", remedy)
    return amount / _PPM_PER_PCT if is_ppm else amount


def _other_unit(element: str, amount: float) -> str:
    """What a refused amount would be in another unit, where that makes sense."""
    low, high = HARD_BOUNDS.get(element, (0.0, math.inf))
    if element in ("B", "N") and amount >= _LOWEST_PPM and amount / _PPM_PER_PCT <= high:
        percent = f"{amount / _PPM_PER_PCT:g}"
        return f"It looks like ppm: write {percent}, or name it {element}_ppm."
    if element == "C" and 2.0 * high < amount <= 100.0 * high:
        return f"It looks like hundredths of a percent: write {amount / 100.0:g}."
    if element == "C" and low <= 100.0 * amount and amount < 0.5 * low:
        return f"It looks like a mass fraction: write {100.0 * amount:g}, and the others likewise."
    if amount > max(_PRINTED_IN_PARTS, high):
        return "Certificates may print hundredths or thousandths: give mass percent."
    return ""


def _unknown(entry: Entry, key: str) -> InputFault:
    matched = _AMOUNT.fullmatch(key)
    symbol = matched[1].capitalize() if matched else key
    near = difflib.get_close_matches(key, (*TEXTS, *ELEMENTS), n=1)
    if symbol == "Fe":
        remedy = "Iron is the rest: leave it out."
    elif symbol == "Cb":
        remedy = 'Write "Nb".'
    elif symbol in _UNHEARD:
        remedy = "No model here knows this element: leave it out."
    else:
        remedy = f'Nearest: "{near[0]}".' if near else ""
    return entry.fault("element", key, f"one of {', '.join(ELEMENTS)}", remedy)
