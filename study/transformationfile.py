"""Measured isothermal transformation of a heat from a CSV file, every fault with its line.

One point a row: temperature, time, share of what the product reaches there, product. A
row of martensite has no time; its share is of the austenite, 0 at the start.
"""

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from midradius.thermo.errors import InputFault
from midradius.thermo.measuredrates import Held, martensite, product
from midradius.thermo.ratechoice import Measured
from midradius.thermo.units import Kind, parse, show

from .casefaults import CaseFaults, Fault
from .measureddiagram import EIGHT_FIVE, RATE
from .measuredfile import MeasuredFile, one_fault, read_file

MOST_ROWS = 2000
PRODUCTS = ("ferrite", "cementite", "pearlite", "bainite")
MARTENSITE = "martensite"
# Head: (column, unit of its bare numbers; none where each cell carries its own)
HEADS: Mapping[str, tuple[str, str]] = {
    "temperature": ("temperature", ""),
    "temperature_degc": ("temperature", "degC"),
    "temperature_k": ("temperature", "K"),
    "temperature_degf": ("temperature", "degF"),
    "time": ("time", ""),
    "time_s": ("time", "s"),
    "time_min": ("time", "min"),
    "time_h": ("time", "h"),
    "fraction": ("fraction", ""),
    "fraction_pct": ("fraction", ""),
    "product": ("product", ""),
}
COOLING = (*RATE, *EIGHT_FIVE, "rate", "cooling_rate", "time_800_500", "t85", "t8/5")
WORDS = {"start": 1.0, "half": 50.0, "finish": 99.0}  # percent
COLUMNS = ("temperature", "time", "fraction", "product")
TEMP_RANGE = (293.15, 1373.15)
TIME_RANGE = (1e-3, 1e8)
_HEAD = "temperature_degC,time_s,fraction_pct,product"
_REMEDY = f"Begin with {_HEAD}."


@dataclass(frozen=True)
class _Row:
    line: int
    product: str
    temp: float
    time: float
    fraction: float


def read_transformation(path: Path) -> Measured:
    """The curves of a file.

    As `study.measuredfile`; the isothermal rows that `study.measureddiagram` reads are read
    as well, save those of all products together. Units stand in the head
    (``temperature_degC``, ``time_s``) or in the cells (``650 degC``, ``2 min``); a fraction
    is in percent, or start (1 %), half or finish (99 %).

    Raises
    ------
    CaseFaults
        All that is wrong with the file.
    """
    file = read_file(path, remedy=_REMEDY)
    at = _columns(file)
    faults: list[Fault] = []
    rows = [
        row for line, cells in file.rows if (row := _row(line, cells, at, file, faults)) is not None
    ]
    if not rows and not faults:
        faults.append(Fault(None, "", "the file holds no measured point", "", _REMEDY, file.shown))
    if len(file.rows) > MOST_ROWS:
        said = f"{len(file.rows)} rows, but at most {MOST_ROWS} are read"
        faults.append(Fault(None, "", said, "", "Is this the right file?", file.shown))
    if faults:
        raise CaseFaults(tuple(faults))
    return _measured(rows, file.name, file.shown)


def _measured(rows: Sequence[_Row], short: str, name: str) -> Measured:
    faults: list[Fault] = []
    products = []
    for wanted in PRODUCTS:
        own = [row for row in rows if row.product == wanted]
        holds = [held for held in _holds(own)]
        if not holds:
            continue
        try:
            products.append(product(wanted, holds))
        except InputFault as fault:
            faults.append(_of(fault, own[0].line, f"{wanted}: ", name))
    own = [row for row in rows if row.product == MARTENSITE]
    start = rate = None
    try:
        start, rate = martensite({row.temp: row.fraction for row in own})
    except InputFault as fault:
        faults.append(_of(fault, own[0].line, "", name))
    if faults:
        raise CaseFaults(tuple(faults))
    points = tuple(
        (row.product, row.temp, row.time, row.fraction) for row in rows if row.product != MARTENSITE
    )
    return Measured(short, tuple(products), points, start, rate)


def _of(fault: InputFault, line: int, before: str, name: str) -> Fault:
    return Fault(line, before + fault.quantity, fault.value, fault.allowed, fault.remedy, name)


def _holds(rows: Sequence[_Row]) -> Iterator[Held]:
    """The points of one product by temperature, each in the order of its times."""
    for temp in dict.fromkeys(row.temp for row in rows):
        points = sorted((row.time, row.fraction) for row in rows if row.temp == temp)
        yield Held(temp, tuple(time for time, _ in points), tuple(part for _, part in points))


def _row(
    line: int,
    cells: Sequence[str],
    at: Mapping[str, tuple[int, str]],
    file: MeasuredFile,
    faults: list[Fault],
) -> _Row | None:
    before = len(faults)

    def raw(column: str) -> str:
        place = at[column][0]
        return cells[place] if place < len(cells) else ""

    def note(column: str, allowed: str, remedy: str = "") -> None:
        if raw(column):
            faults.append(file.fault(line, column, raw(column), allowed, remedy))
        else:
            faults.append(Fault(line, column, "", allowed, remedy, file.shown))

    def quantity(column: str, kind: Kind, within: tuple[float, float]) -> float:
        low, high = (show(end, kind) for end in within)
        number = file.number(raw(column))
        unit = at[column][1]
        text = raw(column).replace(",", ".") if file.has_comma else raw(column)
        try:
            value = parse(text if number is None or not unit else f"{number!r} {unit}", kind)
        except InputFault as fault:
            note(column, f"{low} to {high}", fault.remedy)
            return math.nan
        if not within[0] <= value <= within[1]:
            note(column, f"{low} to {high}")
        return value

    which = raw("product").casefold()
    if which not in (*PRODUCTS, MARTENSITE):
        note("product", ", ".join((*PRODUCTS, MARTENSITE)))
    is_martensite = which == MARTENSITE
    temp = quantity("temperature", "temperature", TEMP_RANGE)
    percent = _percent(raw("fraction"), file, is_martensite)
    if percent is None or not (0.0 if is_martensite else 0.01) <= percent <= 99.99:
        least = "0" if is_martensite else "0.01"
        note("fraction", f"{least} to 99.99 %, start, half or finish")
    time = 0.0
    if not is_martensite:
        time = quantity("time", "duration", TIME_RANGE)
    elif raw("time"):
        note("time", "empty for martensite", "Its share follows temperature, not time.")
    if len(faults) > before or percent is None:
        return None
    return _Row(line, which, temp, time, percent / 100.0)


def _percent(text: str, file: MeasuredFile, is_martensite: bool) -> float | None:
    word = text.casefold()
    if word in WORDS:
        return 0.0 if is_martensite and word == "start" else WORDS[word]
    return file.number(text.removesuffix("%").strip())


def _columns(file: MeasuredFile) -> dict[str, tuple[int, str]]:
    """Where each column stands and the unit of its bare numbers."""
    cooling = [head for head in file.head if head in COOLING]
    if cooling:
        said = f"column {cooling[0]}: continuous cooling is not read here"
        remedy = "Give isothermal rows; cooling rows of a heat serve midradius calibrate."
        raise one_fault(file.shown, said, remedy, file.head_line)
    found: dict[str, tuple[int, str]] = {}
    faults = []
    for place, known in enumerate(file.head):
        if known in HEADS:
            column, unit = HEADS[known]
            if column in found:
                faults.append(
                    file.fault(file.head_line, f"{column} column", known, "given once", "")
                )
            found[column] = (place, unit)
    for column in COLUMNS:
        if column not in found:
            allowed = " or ".join(head for head, (own, _) in HEADS.items() if own == column)
            what = f"{column} column"
            faults.append(Fault(file.head_line, what, "", allowed, _REMEDY, file.shown))
    if faults:
        raise CaseFaults(tuple(faults))
    return found
