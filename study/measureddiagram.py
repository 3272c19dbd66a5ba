"""Measured points of a heat's transformation diagram from a CSV file, each fault with its line.

Format
------
One point a line below a head. Held: ``temperature_degC, time_s, product, fraction``. Cooled at a
constant rate: ``rate_K_per_s`` (or ``time_800_500_s``, taken as 300 K over it) with
``temperature_degC, product, fraction``, or with the final ``hardness_HV`` (or ``hardness_HRC``),
or with both. ``product`` is ferrite, pearlite, bainite, martensite or all; ``fraction`` is
start, half, finish or a number of percent, understood as `study.diagram` draws them: the
start is 1 % of the steel, half and finish are parts of what the product reaches, of ``all`` parts
of the austenite there was.
"""

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from midradius.study.casefaults import CaseFaults, Fault
from midradius.study.measuredcurve import MILLIMETRES, SIXTEENTHS
from midradius.study.measuredfile import MeasuredFile, one_fault, read_file
from midradius.thermo.conversion import hrc_to_hv

ZERO_DEGC = 273.15
ALL = "all"
PRODUCTS = ("ferrite", "pearlite", "bainite", "martensite", ALL)
HELD_PRODUCTS = ("ferrite", "pearlite", "bainite", ALL)  # martensite asks for no time
WORDS = ("start", "half", "finish")
MOST_POINTS = 400
TEMPERATURE = ("temperature_degc", "hold_degc", "temp_degc")
TIME = ("time_s",)
RATE = ("rate_k_per_s", "cooling_rate_k_per_s")
EIGHT_FIVE = ("time_800_500_s", "t85_s")
VICKERS, ROCKWELL = ("hardness_hv", "hv"), ("hardness_hrc", "hrc")
KELVIN_800_500 = 300.0
REMEDY = (
    "Begin with temperature_degC,time_s,product,fraction for holds, or with"
    " rate_K_per_s,temperature_degC,product,fraction,hardness_HV for cooling."
)
_LIMITS = {
    "temperature_degC": (20.0, 1200.0),
    "time_s": (0.01, 1e7),
    "rate_K_per_s": (1e-3, 1e3),
    "time_800_500_s": (0.3, 3e5),
    "hardness_HV": (80.0, 1000.0),
    "hardness_HRC": (20.0, 68.0),
}

Kind = Literal["held", "cooled", "hardness"]


@dataclass(frozen=True)
class Point:
    """One measured point.

    Held: ``at`` is the temperature [K], ``value`` the time [s]. Cooled: ``at`` the rate [K/s],
    ``value`` the temperature [K]. Hardness: ``at`` the rate [K/s], ``value`` in HV; no product.
    ``fraction`` is a word of :data:`WORDS` or a part of one.
    """

    line: int
    kind: Kind
    at: float
    value: float
    product: str = ""
    fraction: str | float = ""


@dataclass(frozen=True)
class MeasuredDiagram:
    """The points of a file; ``name`` and ``sha256`` are its own."""

    points: tuple[Point, ...]
    name: str
    sha256: str


def is_diagram(file: MeasuredFile) -> bool:
    """Whether a file is such a diagram and no end-quench curve, which may give times beside."""
    if file.column(MILLIMETRES) is not None or file.column(SIXTEENTHS) is not None:
        return False
    return any(file.column(names) is not None for names in (TIME, RATE, EIGHT_FIVE))


def read_diagram(path: Path) -> MeasuredDiagram:
    """The points of a CSV file.

    Raises
    ------
    CaseFaults
        All that is wrong with the file.
    """
    return diagram_of(read_file(path, remedy=REMEDY))


def diagram_of(file: MeasuredFile) -> MeasuredDiagram:
    """As `read_diagram`, of a file that is read."""
    reader = _Reader(file)
    points = [point for line, row in file.rows for point in reader.points(line, row)]
    if len(file.rows) > MOST_POINTS:
        value = f"{len(file.rows)} rows, but at most {MOST_POINTS} are read"
        reader.faults.append(Fault(None, "", value, "", "Is this the right file?", file.shown))
    if reader.faults:
        raise CaseFaults(tuple(reader.faults))
    if not points:
        raise one_fault(file.shown, "the file holds no measured point", REMEDY)
    return MeasuredDiagram(tuple(points), file.name, file.sha256)


class _Reader:
    """Reads rows and collects what is wrong with them."""

    def __init__(self, file: MeasuredFile) -> None:
        self.file = file
        self.faults: list[Fault] = []
        self.columns = {
            "temperature_degC": file.column(TEMPERATURE),
            "time_s": file.column(TIME),
            "rate_K_per_s": file.column(RATE),
            "time_800_500_s": file.column(EIGHT_FIVE),
            "hardness_HV": file.column(VICKERS),
            "hardness_HRC": file.column(ROCKWELL),
            "product": file.column(("product", "phase")),
            "fraction": file.column(("fraction", "event")),
        }

    def cell(self, row: tuple[str, ...], name: str) -> str:
        k = self.columns[name]
        return row[k] if k is not None and k < len(row) else ""

    def number(self, line: int, row: tuple[str, ...], name: str) -> float | None:
        """A number within its limits; None where the cell is empty or was faulty."""
        text = self.cell(row, name)
        if not text:
            return None
        value, (low, high) = self.file.number(text), _LIMITS[name]
        if value is None or not low <= value <= high:
            self.faults.append(self.file.fault(line, name, text, f"{low:g} to {high:g}", ""))
            return math.nan
        return value

    def points(self, line: int, row: tuple[str, ...]) -> list[Point]:
        before = len(self.faults)
        value = {name: self.number(line, row, name) for name in _LIMITS}
        clock = [n for n in ("time_s", "rate_K_per_s", "time_800_500_s") if value[n] is not None]
        hard = [n for n in ("hardness_HV", "hardness_HRC") if value[n] is not None]
        if len(clock) != 1 or len(hard) > 1:
            allowed = "one of time_s, rate_K_per_s, time_800_500_s, and one hardness at most"
            self.faults.append(self.file.fault(line, "row", ",".join(row), allowed, REMEDY))
            return []
        held = clock[0] == "time_s"
        temp = value["temperature_degC"]
        if (held and (temp is None or hard)) or (not held and temp is None and not hard):
            allowed = "a hold with its temperature, or a rate with temperature or hardness"
            self.faults.append(self.file.fault(line, "row", ",".join(row), allowed, REMEDY))
            return []
        product, fraction = "", ""
        if temp is not None:
            product, fraction = self.product(line, row, held), self.fraction(line, row)
        if len(self.faults) > before:
            return []
        time = value[clock[0]] or math.nan
        if held:
            at = (temp or 0.0) + ZERO_DEGC
            return [Point(line, "held", at, time, product, _part(fraction))]
        rate = KELVIN_800_500 / time if clock[0] == "time_800_500_s" else time
        found = []
        if temp is not None:
            found.append(Point(line, "cooled", rate, temp + ZERO_DEGC, product, _part(fraction)))
        if hard:
            amount = value[hard[0]] or math.nan
            hv = amount if hard[0] == "hardness_HV" else float(hrc_to_hv(amount))
            found.append(Point(line, "hardness", rate, hv))
        return found

    def product(self, line: int, row: tuple[str, ...], held: bool) -> str:
        text, known = self.cell(row, "product").casefold(), HELD_PRODUCTS if held else PRODUCTS
        if text not in known:
            remedy = "No shift of a heat moves cementite." if text == "cementite" else ""
            allowed = "one of " + ", ".join(known)
            self.faults.append(self.file.fault(line, "product", text, allowed, remedy))
        return text

    def fraction(self, line: int, row: tuple[str, ...]) -> str:
        text = self.cell(row, "fraction").casefold().removesuffix("%").strip()
        value = self.file.number(text)
        if text not in WORDS and (value is None or not 0.1 <= value <= 99.9):
            allowed = f"{', '.join(WORDS)}, or 0.1 to 99.9 percent"
            self.faults.append(self.file.fault(line, "fraction", text, allowed, ""))
        return text if text in WORDS else f"{value}"


def _part(fraction: str) -> str | float:
    return fraction if fraction in WORDS else 0.01 * float(fraction)
