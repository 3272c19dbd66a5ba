"""One steel of a works' own file: the certificate that a case or a command means by name."""

import difflib
from dataclasses import dataclass
from pathlib import Path

from midradius.thermo.certificate import Certificate, deviations, read_certificates
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source, Status
from midradius.thermo.steel import Steel

_MOST_NAMED = 8  # steels of a file that a message lists


@dataclass(frozen=True)
class FileSteel:
    """Which steel of which file: ``name`` is the certificate's own, unique in the file."""

    path: Path
    name: str


def pick(certificates: tuple[Certificate, ...], *, key: str, wanted: str) -> Certificate:
    """The one certificate whose ``key`` ("heat" or "name") is ``wanted``.

    Case and blanks do not count. With an empty ``wanted`` the file must hold one
    steel only.

    Raises
    ------
    InputFault
        None is meant, or more than one; the remedy lists what the file holds.
    """
    if not wanted and len(certificates) == 1:
        return certificates[0]
    found = [item for item in certificates if wanted and _fold(getattr(item, key)) == _fold(wanted)]
    if len(found) == 1:
        return found[0]
    if found:
        names = _listed([item.name for item in found])
        value = f'"{wanted}", which {len(found)} steels have'
        raise InputFault(key, value, f"that of one steel of the file, or name = {names}")
    known = [text for item in certificates if (text := getattr(item, key))]
    near = difflib.get_close_matches(wanted, known, n=1) if wanted else []
    remedy = f'Nearest: "{near[0]}".' if near else f"It holds {_listed(known)}."
    value = f'"{wanted}"' if wanted else "missing"
    raise InputFault(key, value, f"a {key} of the file", remedy if known else "")


def read_one(path: Path, *, key: str = "name", wanted: str = "") -> Certificate:
    """The certificate that is meant, read from its file; faults of both kinds."""
    return pick(read_certificates(path), key=key, wanted=wanted)


def notes_of(certificate: Certificate) -> tuple[RangeNote, ...]:
    """Where the analysis leaves the limits of the grade that was ordered, if one was."""
    return deviations(certificate) if certificate.grade else ()


def source_of(steel: Steel) -> Source:
    """Where a composition comes from: a row of the grade table, a certificate, the case."""
    status: Status = "remembered" if steel.status == "remembered" else "read"
    return Source("composition of the steel", steel.standard, steel.name, status)


def _fold(text: str) -> str:
    return "".join(text.casefold().split())


def _listed(names: list[str]) -> str:
    shown = ", ".join(f'"{name}"' for name in names[:_MOST_NAMED])
    return shown + (", ..." if len(names) > _MOST_NAMED else "")
