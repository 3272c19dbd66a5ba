"""Files of the commands that leave a table, a picture and a document in a folder."""

import contextlib
import csv
import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from midradius.study.chart import DPI
from midradius.study.folder import ResultFolder, shown
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from matplotlib.figure import Figure

RECORD = "record.h5"


@contextlib.contextmanager
def written(target: Path) -> Iterator[Path]:
    """A folder to fill that appears whole or not at all.

    Raises
    ------
    InputFault
        The place cannot be written, or holds something else than an earlier result.
    """
    try:
        with ResultFolder(target) as work:
            yield work
    except OSError as fault:
        reason = fault.strerror or str(fault)
        raise InputFault(
            "output folder", shown(target), "a place that takes all files", f"{reason}."
        ) from fault


def write_table(path: Path, rows: Iterable[Sequence[object]]) -> None:
    """RFC 4180 in UTF-8, nine digits; what is not available is an empty cell."""
    with path.open("w", encoding="utf-8", newline="") as file:
        csv.writer(file).writerows([_cell(value) for value in row] for row in rows)


def write_document(path: Path, document: Mapping[str, object]) -> None:
    """A JSON document without nan."""
    path.write_text(json.dumps(document, indent=1, allow_nan=False) + "\n", encoding="utf-8")


def write_picture(path: Path, figure: "Figure") -> None:
    """A PNG, 1200 pixels wide."""
    figure.savefig(path, dpi=DPI, metadata={"Software": "midradius"})


def record_path(given: Path) -> Path:
    """The record of a result: the file itself, or that of a result folder."""
    return given / RECORD if given.is_dir() else given


def _cell(value: object) -> str:
    if isinstance(value, float):  # np.float64 is one
        return f"{value:.9g}" if np.isfinite(value) else ""
    return "" if value is None else str(value)
