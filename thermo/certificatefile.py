"""The reader of a file of steels, CSV or TOML: what is written, not whether it is right.

Format
------
CSV: a line of heads, then a steel a line. Columns are split by semicolon, tab or
comma; with semicolons or tabs a decimal comma is understood. Lines that start
with ``#`` and empty lines are skipped, an empty cell is not given. Heads are
``name``, ``heat``, ``works``, ``grade``, ``standard`` and elements.

TOML: a ``[[steel]]`` table for each, with the same keys as text and the elements
in its ``[steel.analysis]`` table.
"""

import csv
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import NoReturn

from midradius.thermo.errors import InputFault

MAX_STEELS = 1000
_LONGEST_VALUE = 70  # characters of a value in a message
TEXTS = ("name", "heat", "works", "grade", "standard")
_EXAMPLE = "name; heat; works; grade; C; Mn; Si; Cr"
_HEADER = re.compile(r"^[ \t]*\[\[[ \t]*steel[ \t]*\]\]", re.MULTILINE)
_DECIMAL_COMMA = re.compile(r"[-+]?\d+,\d+")
_SEPARATORS = (";", "\t", ",")


@dataclass(frozen=True)
class Entry:
    """One steel as written.

    ``place`` and ``prefix`` lead to a key in a message: ``"x.toml, line 3"`` and
    ``"steel[0].analysis."``. Amounts of a CSV file are texts with a decimal point.
    """

    place: str
    prefix: str
    texts: Mapping[str, object]
    amounts: Mapping[str, object]

    def place_of(self, key: str) -> str:
        """File, line and key, as a fault names them."""
        return f"steels {self.place}: {self.prefix}{key}"

    def fault(self, key: str, value: object, allowed: str, remedy: str = "") -> InputFault:
        """A fault that shows ``value`` much as it was written."""
        return InputFault(self.place_of(key), _shown(value), allowed, remedy)

    def missing(self, key: str, allowed: str, remedy: str = "") -> InputFault:
        """A fault of a key that must be given."""
        return InputFault(self.place_of(key), "missing", allowed, remedy)


def entries(path: Path) -> list[Entry]:
    """The steels written in a file, in its order.

    Raises
    ------
    InputFault
        Not a file of text that can be read as CSV or TOML, no steel in it, or
        more than ``MAX_STEELS``.
    """
    kind = path.suffix.lower()
    if kind not in (".toml", ".csv"):
        raise InputFault("steels", f'"{path}"', "a file that ends in .toml or .csv")
    text = _text(path)
    found = _from_toml(path, text) if kind == ".toml" else _from_csv(path, text)
    if not 1 <= len(found) <= MAX_STEELS:
        example = "[[steel]]" if kind == ".toml" else f"a line of heads ({_EXAMPLE}) and rows"
        allowed = f"1 to {MAX_STEELS} steels"
        _refuse(path.name, f"{len(found)} steels", allowed, f"Write {example}.")
    return found


def _text(path: Path) -> str:
    try:
        data = path.read_bytes()
    except OSError as error:
        reason = error.strerror or "not readable"
        remedy = f"{reason}. Check the path."
        raise InputFault("steels", f'"{path}"', "a file that can be read", remedy) from error
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")  # older spreadsheet exports; only names can differ
    if "\0" in text:
        _refuse(path.name, "binary data", "a text file", "Export the table as CSV in UTF-8.")
    return text


def _from_toml(path: Path, text: str) -> list[Entry]:
    try:
        data = tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        remedy = f"{error}." if str(error) else "It is nested too deeply."
        raise InputFault(f"steels {path.name}", "this text", "TOML", remedy) from error
    strange = sorted(set(data) - {"steel"})
    if strange:
        _refuse(path.name, f'key "{strange[0]}"', "[[steel]] tables only")
    tables = data.get("steel", [])
    if not isinstance(tables, list) or not all(isinstance(item, dict) for item in tables):
        _refuse(path.name, "steel", "[[steel]] tables", "Write [[steel]] in double brackets.")
    lines = [text.count("\n", 0, match.start()) + 1 for match in _HEADER.finditer(text)]
    known = len(lines) == len(tables)  # not so where the tables are written inline
    found = []
    for i, table in enumerate(tables):
        place = f"{path.name}, line {lines[i]}" if known else path.name
        amounts = table.pop("analysis", {})
        if not isinstance(amounts, dict):
            allowed = "a table, as { C = 0.42, Mn = 0.75 }"
            raise Entry(place, f"steel[{i}].", {}, {}).fault("analysis", amounts, allowed)
        found.append(Entry(place, f"steel[{i}].", table, amounts))
    return found


def _from_csv(path: Path, text: str) -> list[Entry]:
    heads: list[str] = []
    separator = ","
    found = []
    for number, line in enumerate(text.splitlines(), start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        if not heads:
            separator = next((mark for mark in _SEPARATORS if mark in line), ",")
            heads = _cells(line, separator)
            _check_heads(path, number, heads)
            continue
        cells = _cells(line, separator)
        if not any(cells):
            continue
        if len(cells) > len(heads):
            _refuse(
                f"{path.name}, line {number}",
                f"{len(cells)} cells",
                f"at most {len(heads)}, one under each head",
                "With a decimal comma separate the columns by semicolons.",
            )
        written = {head: cell for head, cell in zip(heads, cells, strict=False) if cell}
        texts = {head: cell for head, cell in written.items() if head in TEXTS}
        amounts = {head: cell for head, cell in written.items() if head not in TEXTS}
        if separator != ",":
            amounts = {head: _with_point(cell) for head, cell in amounts.items()}
        found.append(Entry(f"{path.name}, line {number}", "", texts, amounts))
    return found


def _cells(line: str, separator: str) -> list[str]:
    cells = [cell.strip() for cell in next(csv.reader([line], delimiter=separator))]
    while cells and not cells[-1]:
        cells.pop()
    return cells


def _check_heads(path: Path, line: int, heads: list[str]) -> None:
    place = f"{path.name}, line {line}"
    for i, head in enumerate(heads):
        if head.lower() in TEXTS:
            heads[i] = head.lower()
    twice = [head for i, head in enumerate(heads) if head in heads[:i]]
    if twice:
        _refuse(place, f'head "{twice[0]}" twice', "a head of its own for each column")
    if "" in heads:
        _refuse(place, "an empty head", "a head over each column")


def _shown(value: object) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int) and value.bit_length() > 200:
        return "a number of many digits"
    safe = "".join(letter if letter.isprintable() else "?" for letter in str(value))
    text = f'"{safe}"' if isinstance(value, str) else safe
    return text if len(text) <= _LONGEST_VALUE else text[: _LONGEST_VALUE - 4] + " ..."


def _with_point(cell: str) -> str:
    return cell.replace(",", ".") if _DECIMAL_COMMA.fullmatch(cell.lstrip("< ")) else cell


def _refuse(place: str, value: str, allowed: str, remedy: str = "") -> NoReturn:
    raise InputFault(f"steels {place}", value, allowed, remedy)
