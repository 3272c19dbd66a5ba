"""The shipped grades: limits and an aim composition for each, found by name or number.

Source
------
Composition ranges of SAE J403, J404 and J1268, EN ISO 683, EN 10089, EN 10132,
EN 10250, EN 10267 and EN 10293, from memory; each row of ``grades.csv`` carries
its own status, and a note where a number is less sure than the rest. Limits are
those of the cast analysis, as the standard states them; an element without a
limit there has none here. Silicon of SAE J403 is by agreement and not limited.

Aims of carbon and alloying elements are the middle of the range. Silicon is
0.25 % where the standard gives only a maximum, 0.40 % in cast steel; phosphorus
and sulphur are what a clean electric furnace heat holds. Residual Cr, Ni, Mo
and Cu have their limit in the row and an aim of zero: 0.02 % Mo alone doubles
the time to pearlite in some rate equations, so a residual belongs to a heat's
certificate, not to a grade.

An SAE H steel (``4140H``) has limits of its own and the aim of its plain grade.
Grades of different standards are never the same row, however alike: 4140 is not
42CrMo4. Former names are known only where the material number stayed the same.

Holds for
---------
A first look. A heat's own certificate is always better.
"""

import csv
import difflib
import math
from dataclasses import dataclass
from functools import cache
from importlib import resources

from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source
from midradius.thermo.steel import ELEMENTS, Composition, Steel

SOURCE = Source(
    model="grade table",
    work="SAE J403, J404, J1268, EN ISO 683, EN 10089, EN 10132, EN 10250, EN 10267, EN 10293: "
    "limits, and their middle as aim",
    locator="thermo/grades.csv",
    status="remembered",
)

_ISSUERS = ("AISI", "SAE", "ASTM", "DIN", "EN", "UNS", "W.NR.", "WNR", "GRADE")
_N_NEAREST = 3


@dataclass(frozen=True)
class Limit:
    """What a standard allows of one element [mass %]; ``high`` is inf where it sets none."""

    element: str
    low: float
    high: float


@dataclass(frozen=True)
class GradeRow:
    """One row of the table.

    ``steel`` holds the aim composition, for an H steel that of the plain grade.
    ``families`` starts with the alloy family; what the grade is for may follow.
    ``also`` are former names under the same number.
    """

    name: str
    number: str
    standard: str
    families: tuple[str, ...]
    also: tuple[str, ...]
    limits: tuple[Limit, ...]
    steel: Steel
    note: str

    @property
    def family(self) -> str:
        """The first of the families."""
        return self.families[0]

    @property
    def own_aim(self) -> bool:
        """False for an H steel, which takes the aim of its plain grade."""
        return self.name == self.steel.name


def grade(name: str) -> Steel:
    """The shipped steel of that grade; arguments and faults as :func:`row`."""
    return row(name).steel


def row(name: str) -> GradeRow:
    """The row of a grade.

    Parameters
    ----------
    name
        Name, material number or UNS number; case, spaces and hyphens do not
        count, a leading ``AISI``, ``SAE``, ``EN`` and the like may stand before
        it and a delivery condition behind it: ``"42 crmo4"``, ``"1.7225"``,
        ``"AISI 4140"``, ``"42CrMo4+QT"``.

    Raises
    ------
    InputFault
        No such grade; the fault names the nearest ones.
    """
    table = _by_key()
    key = _key(name)
    if key in table:
        return table[key]
    near = difflib.get_close_matches(key, list(table), n=4 * _N_NEAREST, cutoff=0.6)
    nearest = list(dict.fromkeys(table[item].steel.name for item in near))[:_N_NEAREST]
    if nearest:
        remedy = f"Nearest: {', '.join(nearest)}."
    else:
        remedy = f"None of its {len(rows())} grades is near. Families: {', '.join(families())}."
    raise InputFault(
        "grade",
        f'"{name}"',
        "a grade of the shipped table",
        f"{remedy} Or give a composition in mass percent.",
    )


def limits(name: str) -> dict[str, tuple[float, float]]:
    """Lowest and highest mass percent by element of a grade, where its standard limits it.

    ``limits("4140H")`` are those of the H steel. A missing upper limit is inf.
    Arguments and faults as :func:`row`.
    """
    return {limit.element: (limit.low, limit.high) for limit in row(name).limits}


def find(
    *, family: str | None = None, carbon: tuple[float, float] | None = None, text: str = ""
) -> tuple[GradeRow, ...]:
    """The rows that pass every filter given, in the order of the table.

    Parameters
    ----------
    family
        One of :func:`families`, in any case.
    carbon
        Lowest and highest aim of carbon [mass %].
    text
        Part of a name, number, former name or standard; compared as in :func:`row`.

    Raises
    ------
    InputFault
        An unknown family, or carbon bounds in the wrong order.
    """
    found = rows()
    if family is not None:
        wanted = {name.casefold(): name for name in families()}.get(family.strip().casefold())
        if wanted is None:
            raise InputFault("family", f'"{family}"', f"one of {', '.join(families())}")
        found = tuple(item for item in found if wanted in item.families)
    if carbon is not None:
        low, high = carbon
        if not low <= high:
            raise InputFault("carbon", f"{low:g} to {high:g} %", "from the lower to the higher")
        found = tuple(item for item in found if low <= item.steel.composition.C <= high)
    return tuple(item for item in found if _mentions(item, text))


@cache
def families() -> tuple[str, ...]:
    """Every family of the table, in order of appearance."""
    return tuple(dict.fromkeys(name for item in rows() for name in item.families))


@cache
def all_grades() -> tuple[Steel, ...]:
    """Every shipped steel once, in the order of the table; H steels are their plain grade."""
    return tuple(item.steel for item in rows() if item.own_aim)


@cache
def rows() -> tuple[GradeRow, ...]:
    """Every row of the table, H steels after all others."""
    text = resources.files("midradius.thermo").joinpath("grades.csv").read_text(encoding="utf-8")
    steels: dict[str, Steel] = {}
    found = []
    for line in csv.DictReader(text.splitlines()):
        if line["plain"]:
            steel = steels[line["plain"]]
        else:
            aims = {element: float(line[element]) for element in ELEMENTS if line.get(element)}
            steel = Steel(line["grade"], Composition(**aims), line["standard"], line["status"])
            steels[steel.name] = steel
        found.append(
            GradeRow(
                name=line["grade"],
                number=line["number"],
                standard=line["standard"],
                families=tuple(line["family"].split()),
                also=tuple(line["also"].split()),
                limits=_limits(line),
                steel=steel,
                note=line["note"],
            )
        )
    return tuple(found)


def _limits(line: dict[str, str]) -> tuple[Limit, ...]:
    return tuple(
        Limit(element, float(line[f"{element}_low"]), float(line[f"{element}_high"] or math.inf))
        for element in ELEMENTS
        if line.get(f"{element}_low")
    )


@cache
def _by_key() -> dict[str, GradeRow]:
    return {_key(name): item for item in rows() for name in (*item.also, item.name, item.number)}


def _mentions(item: GradeRow, text: str) -> bool:
    names = (item.name, item.number, *item.also)
    key = _key(text)
    within_name = bool(key) and any(key in _key(name) for name in names)
    return within_name or text.strip().casefold() in f"{item.standard} {item.name}".casefold()


def _key(name: str) -> str:
    key = "".join(name.upper().split()).partition("+")[0].replace("-", "").replace("_", "")
    before = ""
    while key != before:
        before = key
        for issuer in _ISSUERS:
            key = key.removeprefix(issuer)
    return key
