"""Thermocouple records: a CSV of times and temperatures, one column for each place.

The heading is the first line that holds every wanted column; what a logger writes above
it is skipped. Cells are parted by semicolon, tab or comma, whichever shows the heading.
A decimal comma is read only where the case says so: ``1,234`` has two meanings.
"""

import csv
from collections.abc import Iterator, Mapping
from pathlib import Path

import numpy as np

from midradius.fem.histories import Histories
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

LARGEST = 200_000_000  # bytes
_PARTED = (";", "\t", ",")
_HEADING_WITHIN = 200  # lines


def read_thermocouples(
    path: Path,
    *,
    time: str,
    places: Mapping[str, str],
    time_factor: float,
    to_kelvin: tuple[float, float],
    decimal_comma: bool,
) -> Histories:
    """Read a record.

    Parameters
    ----------
    path
        The CSV, UTF-8 or Latin-1.
    time
        Heading of the times.
    places
        Heading by name of the place; empty: every other column under its own heading.
    time_factor
        Seconds in one unit of time.
    to_kelvin
        ``(factor, offset)``: kelvin are ``factor (value + offset)``.
    decimal_comma
        Whether numbers are written ``12,5``.

    Raises
    ------
    InputFault
        No such column, a cell that is no number, times that do not rise.
    """
    lines = _lines(path)
    heading, mark = _heading(lines, (time, *places.values()))
    head = _cells(lines[heading], mark)
    wanted = dict(places) or {name: name for name in head if name not in ("", time)}
    for name in wanted.values():
        if head.count(name) > 1:
            raise InputFault(
                "temperatures.columns", f'"{name}"', "the heading of one column", "It has several."
            )
    if not wanted:
        raise InputFault("temperatures.file", "no column but the times", "at least one place")
    columns = [head.index(name) for name in (time, *wanted.values())]
    values = _numbers(lines, heading, mark, columns, head, decimal_comma)
    times = values[:, 0] * time_factor
    _refuse_falling(values[:, 0])
    factor, offset = to_kelvin
    temps = np.ascontiguousarray(factor * (values[:, 1:] + offset))

    def samples() -> Iterator[Array]:
        return iter(temps)

    return Histories(
        times=times,
        n_node=len(wanted),
        samples=samples,
        text=f"{len(wanted)} thermocouple{'s' * (len(wanted) != 1)} of {path.name},"
        f" {len(times)} samples",
        names=tuple(wanted),
    )


def _lines(path: Path) -> list[str]:
    try:
        if path.stat().st_size > LARGEST:
            raise InputFault("temperatures.file", path.name, "a CSV of at most 200 MB")
        data = path.read_bytes()
    except OSError as fault:
        raise InputFault(
            "temperatures.file", f'"{path.name}"', "a file that can be read", f"{fault.strerror}."
        ) from fault
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    return text.splitlines()


def _cells(line: str, mark: str) -> list[str]:
    try:
        return [cell.strip() for cell in next(csv.reader([line], delimiter=mark), [])]
    except csv.Error:  # no text at all: then no heading is found
        return []


def _heading(lines: list[str], wanted: tuple[str, ...]) -> tuple[int, str]:
    """Line and mark of the heading."""
    best: tuple[int, list[str]] = (0, [])
    for number, line in enumerate(lines[:_HEADING_WITHIN]):
        for mark in _PARTED:
            cells = _cells(line, mark)
            if all(name in cells for name in wanted):
                return number, mark
            found = sum(name in cells for name in wanted)
            if found > best[0] or (not best[1] and len(cells) > 1):
                best = (found, cells)
    missing = [name for name in wanted if name not in best[1]]
    seen = ", ".join(f'"{cell}"' for cell in best[1][:12] if cell)
    raise InputFault(
        "temperatures.columns",
        ", ".join(f'"{name}"' for name in missing),
        "headings of the file" + (f": {seen}" if seen else ""),
        "The map reads columns = { time = HEADING, places = { NAME = HEADING } }.",
    )


def _numbers(
    lines: list[str], heading: int, mark: str, columns: list[int], head: list[str], comma: bool
) -> Array:
    rows = []
    for number, line in enumerate(lines[heading + 1 :], start=heading + 2):
        if not line.strip():
            continue
        cells = _cells(line, mark)
        row = []
        for column in columns:
            text = cells[column] if column < len(cells) else ""
            row.append(_number(text, f'line {number}, column "{head[column]}"', comma))
        rows.append(row)
    if not rows:
        raise InputFault("temperatures.file", "no samples below the heading", "one on each line")
    return np.array(rows)


def _number(text: str, place: str, comma: bool) -> float:
    plain = text.replace(",", ".") if comma and "." not in text else text
    try:
        value = float(plain)
    except ValueError:
        value = float("nan")
    if np.isfinite(value) and "_" not in plain:
        return value
    shown = text if len(text) <= 40 else text[:36] + " ..."
    remedy = "Take the line out, or give the number; nothing is filled in."
    if not comma and "," in text:
        remedy = 'If the comma is a decimal sign, write decimal = "comma" in [temperatures].'
    raise InputFault("temperatures.file", f'"{shown}" in {place}', "a number", remedy)


def _refuse_falling(written: Array) -> None:
    falls = np.flatnonzero(np.diff(written) <= 0.0)
    if not falls.size:
        return
    k = int(falls[0])
    raise InputFault(
        "temperatures.file",
        f"time {written[k + 1]:.9g} after {written[k]:.9g} (sample {k + 2})",
        "times that rise from line to line",
        "Sort the samples and take doubles out.",
    )
