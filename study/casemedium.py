"""A medium in a case file: a name of the catalogue, or a film curve of the user's own."""

from pathlib import Path

from midradius.fem.filmfile import read_curve
from midradius.fem.media import medium, names
from midradius.thermo.errors import InputFault
from midradius.thermo.units import show

from . import casekeys as keys
from .case import MediumUse
from .casetable import Table, is_line

_FILM_MOST = 1_000_000  # bytes; a film curve has a few lines
_EXAMPLE = '"still air" or { medium = "mineral oil, agitated", bath = "60 degC" }'


def medium_use(table: Table, name: str) -> MediumUse | None:
    """The value of a key that is a medium: its name, or an inline table."""
    value = table.raw(name)
    if isinstance(value, str):
        return medium_in(Table({"medium": value}, table.place, table.notes), shown=name)
    if not isinstance(value, dict):
        table.fault(name, f"a medium, written as {_EXAMPLE}")
        return None
    inner = Table(value, table.key(name), table.notes)
    inner.only(keys.MEDIUM)
    use = medium_in(inner)
    if use is None and not table.notes.has(inner.place):
        table.fault(name, f"a medium, written as {_EXAMPLE}")
    return use


def medium_in(table: Table, shown: str = "medium") -> MediumUse | None:
    """The medium that the keys ``medium``, ``film`` and ``bath`` of a table make.

    ``shown`` is the key that faults name where the medium stands alone.
    None where there is neither medium nor film, or where they are at fault.
    """
    if table.has("medium") and table.has("film"):
        table.fault("film", "left out where a medium is named", "Keep one of the two.")
        return None
    if table.has("film"):
        return _film(table)
    if table.has("medium"):
        return _named(table, shown)
    if table.has("bath"):
        table.fault("bath", "left out where neither medium nor film is given", "Name the medium.")
    return None


def effective_bath(use: MediumUse) -> float | None:
    """The bath [K] that a use means, with the catalogue's usual one; None where no heat flows."""
    if use.name is None:
        return use.bath
    known = medium(use.name)
    if known.kind == "ideal" and use.bath is None:
        return None
    return use.bath if use.bath is not None else known.bath_default


def _named(table: Table, shown: str) -> MediumUse | None:
    value = table.raw("medium")
    key = table.key(shown)
    if not isinstance(value, str) or not is_line(value):
        table.notes.add(key, value, "the name of a medium in quotes", 'Such as "still air".')
        return None
    try:
        known = medium(value)
    except InputFault as fault:
        table.notes.add(key, value, "a medium of the catalogue", _remedy(fault))
        return None
    low, high = (f"{end - keys.ZERO_DEGC:.4g}" for end in (known.bath_min, known.bath_max))
    allowed = f'{low} to {high} degC for medium = "{known.name}"'
    if not table.has("bath"):
        if known.bath_default is None:
            middle = (known.holds_min + known.holds_max) / 2.0 - keys.ZERO_DEGC
            example = f'bath = "{round(middle, -1):.0f} degC"'
            if shown == "medium":
                table.missing("bath", allowed, f"Write for example {example}.")
            else:
                written = f'{{ medium = "{known.name}", {example} }}'
                table.notes.add(key, value, "given with its bath", f"Write {shown} = {written}.")
            return None
        return MediumUse(known.name)
    bath = table.quantity("bath", "temperature", (0.0, float("inf")))
    if bath is None:
        return None
    if not known.bath_min <= bath <= known.bath_max:
        table.fault("bath", allowed, _bath_remedy(bath))
        return None
    return MediumUse(known.name, bath=bath)


def _film(table: Table) -> MediumUse | None:
    bath = table.quantity("bath", "temperature", keys.TEMP_RANGE)
    if not table.has("bath"):
        low, high = (show(end, "temperature") for end in keys.TEMP_RANGE)
        table.missing("bath", f"{low} to {high}", "A film curve needs the bath it was measured at.")
    text = table.text("film", 1000)
    if text is None:
        return None
    path = table.notes.folder / text
    if fault := film_fault(path):
        table.fault("film", fault.allowed, fault.remedy)
        return None
    return MediumUse(film_file=path, bath=bath) if bath is not None else None


def film_fault(path: Path) -> InputFault | None:
    """What is wrong with a film curve, if anything."""
    try:
        if path.is_dir():
            return _refused(path, "a file", "This is a folder.")
        if not path.exists():
            remedy = "There is no such file; the path counts from the case file."
            return _refused(path, "a CSV file", remedy)
        if not path.is_file():
            return _refused(path, "an ordinary file", "This is a device or a pipe.")
        if path.stat().st_size > _FILM_MOST:
            return _refused(path, "at most 1 MB", "A film curve has a few lines.")
        read_curve(path)
    except InputFault as fault:
        where = fault.quantity.partition(path.name)[2].lstrip(",: ")
        found = f"{where}: {fault.value}".removeprefix(": ")
        return InputFault(
            "film", str(path), fault.allowed, f"Found {found}. {fault.remedy}".strip()
        )
    except (OSError, ValueError) as error:
        return _refused(path, "a CSV file that can be read", f"{error}.")
    return None


def _refused(path: Path, allowed: str, remedy: str) -> InputFault:
    return InputFault("film", str(path), allowed, remedy)


def _remedy(fault: InputFault) -> str:
    if fault.remedy.startswith("Did you mean"):
        return fault.remedy
    return "Choose one of: " + "; ".join(names()) + "; or give film = a curve of your own."


def _bath_remedy(bath: float) -> str:
    fit = [
        known
        for known in map(medium, names())
        if known.kind == "liquid" and known.bath_min <= bath <= known.bath_max
    ]
    if not fit:
        return "Change the bath temperature, or choose another medium."
    return f'Change the bath temperature, or choose medium = "{fit[0].name}".'
