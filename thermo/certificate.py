"""Steels of the user's own: works' certificates and grades that the table does not hold.

A certificate carries the heat, the works, the grade that was ordered and the
analysis. It becomes a `Steel` like any shipped one, and `deviations` holds it
against the limits of a grade.

The format is that of `thermo.certificatefile`, the units those of
`thermo.analysis`. An element that the file does not give counts as zero in the
models, and as not given where a grade asks for it. Limits are those of the cast
analysis; what standards allow a product analysis beyond them is not applied,
nor are sums of residuals.
"""

import difflib
import math
from dataclasses import dataclass
from pathlib import Path

from midradius.thermo.analysis import is_element, read_amounts
from midradius.thermo.certificatefile import TEXTS, Entry, entries
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import row
from midradius.thermo.source import RangeNote
from midradius.thermo.steel import ELEMENTS, Composition, Steel

LONGEST_TEXT = 60
_MOST_FAULTS = 40  # shown at once


class CertificateFaults(InputFault):
    """All that is wrong with a file of steels; the first fault lends its fields."""

    def __init__(self, faults: tuple[InputFault, ...]) -> None:
        first = faults[0]
        super().__init__(first.quantity, first.value, first.allowed, first.remedy)
        self.faults = faults
        shown = [str(fault) for fault in faults[:_MOST_FAULTS]]
        if len(faults) > _MOST_FAULTS:
            shown.append(f"... and {len(faults) - _MOST_FAULTS} more.")
        self.args = ("\n".join(shown),)


@dataclass(frozen=True)
class Certificate:
    """One analysed heat, or a grade of the user's own.

    ``grade`` is what was ordered, empty where nothing was said; ``given`` are the
    elements that were analysed.
    """

    name: str
    heat: str
    works: str
    grade: str
    standard: str
    composition: Composition
    given: tuple[str, ...]

    @property
    def steel(self) -> Steel:
        """The steel that the models compute with."""
        parts = (self.standard or "certificate", self.works, self.heat and f"heat {self.heat}")
        return Steel(self.name, self.composition, ", ".join(filter(None, parts)), "given")


def read_steels(path: Path) -> tuple[Steel, ...]:
    """The steels of a CSV or TOML file; faults as :func:`read_certificates`."""
    return tuple(item.steel for item in read_certificates(path))


def read_certificates(path: Path) -> tuple[Certificate, ...]:
    """The certificates of a CSV or TOML file, in its order.

    Raises
    ------
    CertificateFaults
        Unknown elements or keys, no carbon, amounts that are no mass percent or
        beyond what the models are asked about, a name that occurs twice or is
        that of a shipped grade, an ordered grade that the table does not hold.
    InputFault
        The file cannot be read as such.
    """
    faults: list[InputFault] = []
    found: list[Certificate] = []
    places: dict[str, str] = {}
    for entry in entries(path):
        n_fault = len(faults)
        item = _certificate(entry, faults)
        key = "".join(item.name.casefold().split())
        if key and key in places:
            allowed = f"a name that {places[key]} does not have"
            remedy = "Two analyses of one heat need two names."
            faults.append(entry.fault("name", item.name, allowed, remedy))
        places.setdefault(key, entry.place.rpartition(", ")[2])
        if len(faults) == n_fault:
            found.append(item)
    if faults:
        raise CertificateFaults(tuple(_once(faults)))
    return tuple(found)


def deviations(certificate: Certificate, grade: str = "") -> tuple[RangeNote, ...]:
    """A note for each element that lies outside the limits of a grade.

    Parameters
    ----------
    certificate
        The analysis; elements that it does not give deviate only where the
        grade has a lower limit.
    grade
        As for `grades.row`, so ``"4140H"`` holds against the H limits; left out,
        the grade that the certificate names.

    Raises
    ------
    InputFault
        No such grade, or none named.
    """
    if not (grade or certificate.grade):
        raise InputFault("grade", "not given", "the grade to hold the analysis against")
    wanted = row(grade or certificate.grade)
    notes = []
    for limit in wanted.limits:
        amount = getattr(certificate.composition, limit.element)
        is_given = limit.element in certificate.given
        if limit.low <= amount <= limit.high or not (is_given or limit.low > 0.0):
            continue
        if math.isinf(limit.high):
            allowed = f"at least {limit.low:g} %"
        elif limit.low > 0.0:
            allowed = f"{limit.low:g} to {limit.high:g} %"
        else:
            allowed = f"at most {limit.high:g} %"
        value = f"{amount:g} %" if is_given else "not given"
        model = f"limits of {wanted.name}, {wanted.standard}"
        notes.append(RangeNote(model, limit.element, value, allowed))
    return tuple(notes)


def _certificate(entry: Entry, faults: list[InputFault]) -> Certificate:
    """What an entry says, as far as it can be understood; the rest goes to ``faults``."""
    texts = _texts(entry, faults)
    name = texts["name"] or texts["heat"]
    if not name and not {"name", "heat"} & set(entry.texts):
        faults.append(entry.missing("name", "given, or else the heat"))
    _check_name(entry, name, faults)
    if texts["grade"]:
        try:
            row(texts["grade"])
        except InputFault as unknown:
            remedy = unknown.remedy.partition(" Or give")[0] + " Or leave it out."
            faults.append(entry.fault("grade", texts["grade"], unknown.allowed, remedy))
    amounts = read_amounts(entry, faults)
    return Certificate(
        name=name,
        heat=texts["heat"],
        works=texts["works"],
        grade=texts["grade"],
        standard=texts["standard"],
        composition=Composition(**{"C": 0.0, **amounts}),
        given=tuple(element for element in ELEMENTS if element in amounts),
    )


def _texts(entry: Entry, faults: list[InputFault]) -> dict[str, str]:
    texts = dict.fromkeys(TEXTS, "")
    for key, value in entry.texts.items():
        if key not in TEXTS:
            near = difflib.get_close_matches(key, (*TEXTS, "analysis"), n=1)
            remedy = "Elements stand in its analysis." if is_element(key) else ""
            remedy = f'Nearest: "{near[0]}".' if near else remedy
            allowed = f"one of {', '.join(TEXTS)}, analysis"
            faults.append(entry.fault("key", key, allowed, remedy))
            continue
        text = str(value).strip() if isinstance(value, str | int) else ""
        if isinstance(value, bool) or not (text.isprintable() and 1 <= len(text) <= LONGEST_TEXT):
            allowed = f"a text of 1 to {LONGEST_TEXT} characters on one line"
            faults.append(entry.fault(key, value, allowed))
            continue
        texts[key] = text
    return texts


def _check_name(entry: Entry, name: str, faults: list[InputFault]) -> None:
    try:
        shipped = row(name) if name else None
    except InputFault:
        return
    if shipped:
        allowed = "a name of its own, not that of a shipped grade"
        remedy = f"If {shipped.name} was ordered, write that as grade and name the heat otherwise."
        faults.append(entry.fault("name", name, allowed, remedy))


def _once(faults: list[InputFault]) -> list[InputFault]:
    """Drops repeats: a head that no model knows is said once, not on every row of a CSV file."""
    said = set()
    kept = []
    for item in faults:
        what = item.quantity.rpartition(": ")[2], item.value
        if what[0] == "element" and what in said:
            continue
        said.add(what)
        kept.append(item)
    return kept
