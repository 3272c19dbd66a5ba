"""The shipped grades: an aim composition for each, found by name or number.

Source
------
Composition ranges of SAE J403, SAE J404, EN 10250-2 and EN ISO 683, from
memory; each row of ``grades.csv`` carries its own status. Carbon and alloying
elements are the middle of the range, silicon is 0.25 % where the standard
gives only a maximum, phosphorus and sulphur are what a clean electric furnace
heat holds. Residual Cr, Ni, Mo and Cu are left out: 0.02 % Mo alone doubles
the time to pearlite in some rate equations, so a residual belongs to a heat's
certificate, not to a grade.

Holds for
---------
A first look. A heat's own certificate is always better.
"""

import csv
import difflib
from functools import cache
from importlib import resources

from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source
from midradius.thermo.steel import ELEMENTS, Composition, Steel

SOURCE = Source(
    model="grade table",
    work="SAE J403, SAE J404, EN 10250-2, EN ISO 683: middle of the composition range",
    locator="thermo/grades.csv",
    status="remembered",
)

_ISSUERS = ("AISI", "SAE", "ASTM", "DIN", "EN", "UNS", "WNR", "GRADE")


def grade(name: str) -> Steel:
    """The shipped steel of that grade.

    Parameters
    ----------
    name
        Name, material number or UNS number; case, spaces and hyphens do not
        count and a leading ``AISI``, ``SAE``, ``EN`` and the like may stand
        before it: ``"42 crmo4"``, ``"1.7225"``, ``"AISI 4140"``.

    Raises
    ------
    InputFault
        No such grade; the fault names the nearest ones.
    """
    table = _by_key()
    key = _key(name)
    if key in table:
        return table[key]
    names = {_key(steel.name): steel.name for steel in all_grades()}
    near = difflib.get_close_matches(key, list(table), n=3, cutoff=0.6)
    nearest = list(dict.fromkeys(table[item].name for item in near))
    remedy = (
        f"Nearest: {', '.join(nearest)}."
        if nearest
        else f"Known grades: {', '.join(names.values())}."
    )
    raise InputFault(
        "grade",
        f'"{name}"',
        "a grade of the shipped table",
        f"{remedy} Or give a composition in mass percent.",
    )


@cache
def all_grades() -> tuple[Steel, ...]:
    """Every shipped steel, in the order of the table."""
    return tuple(steel for steel, _ in _rows())


@cache
def _rows() -> tuple[tuple[Steel, str], ...]:
    text = resources.files("midradius.thermo").joinpath("grades.csv").read_text(encoding="utf-8")
    rows = []
    for row in csv.DictReader(text.splitlines()):
        amounts = {element: float(row[element]) for element in ELEMENTS if row.get(element)}
        steel = Steel(row["grade"], Composition(**amounts), row["standard"], row["status"])
        rows.append((steel, row["number"]))
    return tuple(rows)


@cache
def _by_key() -> dict[str, Steel]:
    table = {}
    for steel, number in _rows():
        table[_key(steel.name)] = steel
        table[_key(number)] = steel
    return table


def _key(name: str) -> str:
    key = "".join(name.upper().split())
    for issuer in _ISSUERS:
        key = key.removeprefix(issuer)
    return key.replace("-", "").replace("_", "")
