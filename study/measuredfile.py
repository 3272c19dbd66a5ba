"""A CSV file of measurements, read row by row; every fault carries its line."""

import csv
import hashlib
import io
import math
from dataclasses import dataclass
from pathlib import Path

from midradius.study.casefaults import CaseFaults, Fault

LARGEST = 1_000_000  # bytes


@dataclass(frozen=True)
class MeasuredFile:
    """The rows of a file, with their lines; ``head`` are its first row's names, made plain.

    ``shown`` is the path as a message shows it.
    """

    shown: str
    name: str
    sha256: str
    head_line: int
    head: tuple[str, ...]
    rows: tuple[tuple[int, tuple[str, ...]], ...]
    has_comma: bool

    def column(self, known: tuple[str, ...]) -> int | None:
        """The first column that has one of these names."""
        return next((k for k, cell in enumerate(self.head) if cell in known), None)

    def number(self, text: str) -> float | None:
        """A finite number, with a decimal comma where semicolons divide the columns."""
        try:
            value = float(text.replace(",", ".") if self.has_comma else text)
        except ValueError:
            return None
        return value if math.isfinite(value) else None

    def fault(self, line: int | None, what: str, cell: str, allowed: str, remedy: str) -> Fault:
        """One fault of this file; ``cell`` is what stands there."""
        plain = "".join(c if c.isprintable() else "?" for c in cell[:60])
        return Fault(line, what, f'"{plain}"', allowed, remedy, self.shown)


def read_file(path: Path, *, remedy: str) -> MeasuredFile:
    """The rows of a CSV file.

    A head, then one point a line; comma or semicolon between the columns, a decimal comma
    with semicolons only. Empty rows and those that begin with # are skipped.

    Raises
    ------
    CaseFaults
        No such file, no text, no CSV, no rows; ``remedy`` says how it should begin.
    """
    shown = str(path).encode(errors="replace").decode()
    data = _bytes(path, shown)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        value = f"byte {data[error.start]:#04x} is not UTF-8"
        raise one_fault(shown, value, "Save the file as UTF-8 text.", line) from None
    # a remark may hold semicolons
    said = (line for line in text.splitlines() if not line.lstrip().startswith("#"))
    divided = any(";" in line for line in said)
    rows = _rows(text, shown, remedy, ";" if divided else ",")
    if not rows:
        raise one_fault(shown, "the file holds no rows", remedy)
    line, head = rows[0]
    plain = ["_".join(cell.casefold().replace("[", "").replace("]", "").split()) for cell in head]
    digest = hashlib.sha256(data).hexdigest()
    return MeasuredFile(shown, path.name, digest, line, tuple(plain), tuple(rows[1:]), divided)


def one_fault(shown: str, value: str, remedy: str, line: int | None = None) -> CaseFaults:
    """A fault of the file as a whole."""
    return CaseFaults((Fault(line, "", value, "", remedy, shown),))


def _bytes(path: Path, name: str) -> bytes:
    if path.exists() and not path.is_file():
        raise one_fault(name, "this is no ordinary file", "Name a CSV file.")
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST + 1)
    except FileNotFoundError:
        raise one_fault(name, "there is no such file", "Check the path.") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise one_fault(name, f"cannot be read: {reason}", "Check its rights.") from None
    if len(data) > LARGEST:
        raise one_fault(
            name, "larger than 1 MB", "A curve is some hundred bytes: is this the file?"
        )
    return data


def _rows(text: str, name: str, remedy: str, delimiter: str) -> list[tuple[int, tuple[str, ...]]]:
    """Every row that says something, with its line."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    try:
        found = [(reader.line_num, tuple(cell.strip() for cell in row)) for row in reader]
    except csv.Error as error:
        raise one_fault(name, f"not CSV: {error}", remedy, reader.line_num) from None
    return [(line, row) for line, row in found if any(row) and not row[0].startswith("#")]
