"""The reader of a film curve that a user brings: two columns in a CSV file.

Format
------
``surface_degC, htc_W_per_m2K``, one knot a line, surface temperature rising or
falling. The column heads may be left out. Columns are split by comma,
semicolon or tab; with semicolons or tabs a decimal comma is understood. Text
after ``#`` and empty lines are skipped.

A wrong unit gives a plausible and wrong answer, so what looks like kelvin,
degrees Fahrenheit or kW/(m2 K) is refused unless the heads name the units.
"""

import re
from collections.abc import Iterator
from pathlib import Path
from typing import NoReturn

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

MAX_ROWS = 10_000
COLDEST_DEGC, HOTTEST_DEGC = -50.0, 1500.0
HIGHEST_HTC = 1.0e5
# Without heads: a curve for steel starts near the bath, and its coefficient in
# W/(m2 K) passes this value even in still air once radiation counts.
_KELVIN_SUSPECT_DEGC = 250.0
_KILOWATT_SUSPECT_HTC = 20.0
_RADIATION_COUNTS_DEGC = 400.0
_HEADS = "surface_degC, htc_W_per_m2K"
MEASURED = "# Measured film: "  # how the first line of a film from a probe begins


def read_curve(path: Path) -> tuple[Array, Array]:
    """Surface temperature [degC] and film coefficient [W/(m2 K)], shape (n,) each.

    Temperatures come back rising.

    Raises
    ------
    InputFault
        Not a file of text, fewer than 2 knots, a value that is no number or
        absurd, temperatures that turn back, or a unit that looks wrong.
    """
    text = _text(path)
    heads, lines = "", list[int]()
    knots: list[tuple[float, float]] = []
    for number, fields in _fields(text):
        if not knots and not heads and not _is_number(fields[0]):
            heads = " ".join(fields)
            _check_heads(path, number, fields)
            continue
        knots.append(_knot(path, number, fields))
        lines.append(number)
        if len(knots) > MAX_ROWS:
            _refuse(path, "", f"more than {MAX_ROWS} rows", f"2 to {MAX_ROWS} rows", "Thin it out.")
    if len(knots) < 2:
        _refuse(
            path,
            "",
            f"{len(knots)} row{'' if len(knots) == 1 else 's'}",
            "at least 2 rows",
            f"Write one knot a line: {_HEADS}. A constant needs the same value twice.",
        )
    surface, htc = np.array(knots, dtype=np.float64).T
    if surface[0] > surface[-1]:
        surface, htc, lines = surface[::-1].copy(), htc[::-1].copy(), lines[::-1]
    _check_order(path, lines, surface)
    _check_units(path, heads.lower(), surface, htc)
    return surface, htc


def provenance(path: Path) -> str:
    """What the first line says of where a film was measured; empty without such a line.

    Raises
    ------
    InputFault
        Not a file of text.
    """
    first = _text(path).partition("\n")[0].strip()
    return first.removeprefix(MEASURED) if first.startswith(MEASURED) else ""


def _text(path: Path) -> str:
    try:
        data = path.read_bytes()
    except OSError as error:
        reason = error.strerror or "not readable"
        raise InputFault(
            "film", f'"{path}"', "a CSV file that can be read", f"{reason}. Check the path."
        ) from error
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")  # older spreadsheet exports; only comments can differ
    if "\0" in text:
        _refuse(path, "", "binary data", "a text file", "Export the curve as CSV.")
    return text


def _fields(text: str) -> Iterator[tuple[int, list[str]]]:
    for number, line in enumerate(text.splitlines(), start=1):
        line = line.split("#", 1)[0].strip()
        if not line:
            continue
        for separator in (";", "\t", ","):
            if separator in line:
                fields = [_clean(field) for field in line.split(separator)]
                break
        else:
            fields = line.split()
        while len(fields) > 1 and not fields[-1]:
            fields.pop()
        yield number, fields


def _clean(field: str) -> str:
    field = field.strip().strip('"').strip()
    return field.replace(",", ".") if re.fullmatch(r"[-+]?\d+,\d+", field) else field


def _is_number(field: str) -> bool:
    try:
        float(field)
    except ValueError:
        return False
    return True


def _knot(path: Path, line: int, fields: list[str]) -> tuple[float, float]:
    if len(fields) != 2:
        _refuse(
            path,
            f", line {line}",
            f"{len(fields)} column{'' if len(fields) == 1 else 's'}",
            "2 columns",
            f"Write {_HEADS}; with a decimal comma separate the columns by semicolons.",
        )
    for field in fields:
        if not _is_number(field):
            _refuse(path, f", line {line}", f'"{field}"', "a number", f"Write {_HEADS}.")
    surface, htc = float(fields[0]), float(fields[1])
    if not COLDEST_DEGC <= surface <= HOTTEST_DEGC:
        _refuse(
            path,
            f", line {line}: surface temperature",
            f"{surface:g}",
            f"{COLDEST_DEGC:g} to {HOTTEST_DEGC:g} degC",
            "Give degrees Celsius.",
        )
    if not 0.0 <= htc <= HIGHEST_HTC:
        _refuse(
            path,
            f", line {line}: film coefficient",
            f"{htc:g}",
            f"0 to {HIGHEST_HTC:g} W/(m2 K)",
            "Give W/(m2 K).",
        )
    return surface, htc


def _check_heads(path: Path, line: int, fields: list[str]) -> None:
    heads = [field.lower() for field in fields]
    wrong_temp = re.search(r"kelvin|_k\b|\[k\]|\(k\)|fahrenheit|deg_?f\b|°f", heads[0])
    swapped = re.search(r"htc|w[_ /]", heads[0])
    wrong_htc = len(heads) > 1 and re.search(r"kw|mw|btu|kcal|cal", heads[1])
    if wrong_temp or swapped or wrong_htc:
        _refuse(
            path,
            f", line {line}",
            f'"{", ".join(fields)}"',
            f'columns in the order and units of "{_HEADS}"',
            "Convert or reorder the columns.",
        )


def _check_order(path: Path, lines: list[int], surface: Array) -> None:
    turned = np.flatnonzero(np.diff(surface) <= 0.0)
    if turned.size:
        at = int(turned[0])
        _refuse(
            path,
            f", line {lines[at + 1]}: surface temperature",
            f"{surface[at + 1]:g} beside {surface[at]:g} degC of line {lines[at]}",
            "different from line to line and in one direction",
            "Sort the rows and keep one value for each temperature.",
        )


def _check_units(path: Path, heads: str, surface: Array, htc: Array) -> None:
    named_degC = re.search(r"deg_?c|°c|celsius|[\[(]c[\])]|_c\b", heads)
    if surface[0] >= _KELVIN_SUSPECT_DEGC and not named_degC:
        _refuse(
            path,
            ": lowest surface temperature",
            f"{surface[0]:g}",
            f"below {_KELVIN_SUSPECT_DEGC:g} degC in a file without the head surface_degC",
            f'It looks like kelvin. If it is degC, put "{_HEADS}" on the first line.',
        )
    named_watt = re.search(r"(?<![km])w[_ /]", heads)
    hot = surface[-1] >= _RADIATION_COUNTS_DEGC
    if hot and 0.0 < htc.max() < _KILOWATT_SUSPECT_HTC and not named_watt:
        _refuse(
            path,
            ": highest film coefficient",
            f"{htc.max():g}",
            f"at least {_KILOWATT_SUSPECT_HTC:g} W/(m2 K) in a file without the head htc_W_per_m2K",
            f'It looks like kW/(m2 K). If it is W/(m2 K), put "{_HEADS}" on the first line.',
        )


def _refuse(path: Path, where: str, value: str, allowed: str, remedy: str) -> NoReturn:
    raise InputFault(f"film {path.name}{where}", value, allowed, remedy)
