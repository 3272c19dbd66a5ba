"""What the lever command is told in words: an analysis, and a measured fraction."""

import math
import re

from midradius.thermo.analysis import read_amounts
from midradius.thermo.certificatefile import Entry
from midradius.thermo.errors import InputFault
from midradius.thermo.pointcount import (
    CountedFraction,
    from_fields,
    from_totals,
)
from midradius.thermo.steel import Composition, Steel

OWN = "own composition"
# Stands in where the carbon is what is asked for; the boundaries do not read it.
_ANY_CARBON_PCT = 0.4
_NUMBER = r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?"
_ITEM = re.compile(rf"([A-Za-z]{{1,2}})\s*[=:]?\s*({_NUMBER})\s*(%|ppm)?")
_DECIMAL_COMMA = re.compile(r"(\d),(\d)")
_PERCENT = re.compile(rf"({_NUMBER})\s*%(?:\s*(?:\+-|\+/-|±)\s*({_NUMBER})\s*%)?")
_HITS = re.compile(rf"((?:{_NUMBER}[\s,]+)+)of\s+(\d+)")
_FIELDS = re.compile(r"(\d+)\s+fields?\s+of\s+(\d+)\s+points?")
_POINTS = re.compile(r"(\d+)\s+points?")
_FRACTION_EXAMPLE = '"42 %" with --counted, "41 38.5 45 of 100" or "42 % +- 3 %"'
_COUNTED_EXAMPLE = '"25 fields of 100 points" or "2500 points"'


def composition(text: str, *, needs_carbon: bool = True) -> Steel:
    """The steel of ``"C 0.45, Mn 0.7"``: mass percent, or ppm where that is written.

    With semicolons between the elements a decimal comma is understood. Without
    ``needs_carbon`` carbon may be left out.

    Raises
    ------
    InputFault
        What cannot be read or computed; the first of it.
    """
    parts = re.split(r"[;,]", text)
    if ";" in text:
        parts = [_DECIMAL_COMMA.sub(r"\1.\2", part) for part in text.split(";")]
    amounts: dict[str, object] = {}
    for part in filter(None, (part.strip() for part in parts)):
        found = _ITEM.fullmatch(part)
        if found is None:
            remedy = "With a decimal comma separate the elements by semicolons."
            allowed = 'elements and mass percent, as "C 0.45, Mn 0.7, B 30 ppm"'
            raise InputFault("composition", f'"{part}"', allowed, remedy)
        key = found[1] + ("_ppm" if found[3] == "ppm" else "")
        if key.casefold() in {known.casefold() for known in amounts}:
            raise InputFault("composition", f'"{part}"', f"given once for {found[1]}")
        amounts[key] = float(found[2])
    names = {key.partition("_")[0].casefold() for key in amounts}
    if not needs_carbon and "c" not in names:
        amounts["C"] = _ANY_CARBON_PCT
    faults: list[InputFault] = []
    read = read_amounts(Entry("", "", {}, amounts), faults)
    for fault in faults:
        where = fault.quantity.rpartition(": ")[2]
        quantity = f"composition, {where}" if where else "composition"
        raise InputFault(quantity, fault.value, fault.allowed, fault.remedy)
    return Steel(OWN, Composition(**{"C": _ANY_CARBON_PCT, **read}), "the command line", "given")


def plain() -> Steel:
    """Iron and carbon alone, for a measurement on a steel of which nothing else is known."""
    carbon = Composition(C=_ANY_CARBON_PCT)
    return Steel("plain iron-carbon", carbon, "no alloying elements", "given")


def fraction(option: str, text: str, counted: str | None, *, level: float) -> CountedFraction:
    """A measured share with its interval, as a person would write it.

    Parameters
    ----------
    option
        Name of the option, for messages.
    text
        ``"42 %"`` with ``counted`` = ``"25 fields of 100 points"``; hits of every field,
        ``"41 38.5 45 of 100"``; hits of all points, ``"1052 of 2500"``; or a share whose
        interval is known otherwise, ``"42 % +- 3 %"``.
    level
        Confidence of the interval, between 0 and 1.

    Raises
    ------
    InputFault
        What cannot be read, or is no share.
    """
    text = text.strip()
    percent, hits = _PERCENT.fullmatch(text), _HITS.fullmatch(text)
    if percent is None and hits is None:
        raise InputFault(option, f'"{text}"', f"a share, as {_FRACTION_EXAMPLE}")
    if counted is not None and (percent is None or percent[2]):
        allowed = f'left out with {option} "{text}"'
        raise InputFault("--counted", f'"{counted}"', allowed, "That text says it all.")
    if hits:
        numbers = [float(number) for number in re.split(r"[\s,]+", hits[1].strip(" ,"))]
        points = float(hits[2])
        if len(numbers) == 1:
            return from_totals(numbers[0], points=points, level=level)
        over = [number for number in numbers if not 0.0 <= number <= points]
        if over:
            allowed = f"0 to {points:g}, the points of a field"
            raise InputFault(f"{option}, points hit", f"{over[0]:g}", allowed)
        shares = [number / max(points, 1.0) for number in numbers]
        return _by_field(shares, points, level)
    assert percent is not None, "one of the two was found"
    share = float(percent[1]) / 100.0
    if not 0.0 <= share <= 1.0:
        raise InputFault(option, f'"{text}"', "0 to 100 %")
    if percent[2]:
        return _stated(share, abs(float(percent[2])) / 100.0, level)
    points = _points(counted)
    return from_totals(share * points, points=points, level=level)


def _by_field(shares: list[float], points: float, level: float) -> CountedFraction:
    import numpy as np

    return from_fields(np.array(shares), points_per_field=points, level=level)


def _stated(share: float, half: float, level: float) -> CountedFraction:
    """A share whose half-width was found elsewhere, by an image analyser perhaps."""
    low, high = max(share - half, 0.0), min(share + half, 1.0)
    relative = half / share if share > 0.0 else math.inf
    return CountedFraction(share, low, high, level, relative, None, math.nan, "totals", ())


def _points(counted: str | None) -> float:
    if counted is None:
        remedy = f"Write for example {_COUNTED_EXAMPLE}: the interval follows from it."
        raise InputFault("--counted", "not given", "given beside a share", remedy)
    fields, total = _FIELDS.fullmatch(counted.strip()), _POINTS.fullmatch(counted.strip())
    points = float(fields[1]) * float(fields[2]) if fields else float(total[1]) if total else 0.0
    if points < 1.0:
        raise InputFault("--counted", f'"{counted}"', f"written as {_COUNTED_EXAMPLE}")
    return points


def level_of(text: str) -> float:
    """Confidence of ``"95 %"`` as 0.95.

    Raises
    ------
    InputFault
        Not a percentage between 50 and 99.9.
    """
    found = re.fullmatch(rf"({_NUMBER})\s*%?", text.strip())
    percent = float(found[1]) if found else math.nan
    if not 50.0 <= percent <= 99.9:
        raise InputFault("--level", f'"{text}"', "50 % to 99.9 %", "95 % is usual.")
    return percent / 100.0
