"""``[temperatures]`` of a case file: histories from elsewhere instead of section and cooling.

Units have no default: a file that says nothing of its own must be told.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from . import casekeys as keys
from .case import EVERYWHERE, Asked, PositionInput
from .casetable import Table, one_of, quantity

TABLE, RECORD, MESH = "table", "record", "mesh"
# What a file is, by its ending.
KINDS: Mapping[str, str] = {
    ".csv": TABLE,
    ".txt": TABLE,
    ".h5": RECORD,
    ".pvd": MESH,
    ".xdmf": MESH,
    ".xmf": MESH,
    ".e": MESH,
    ".ex2": MESH,
    ".exo": MESH,
    ".vtkhdf": MESH,
}
TIME_UNITS: Mapping[str, float] = {"ms": 1e-3, "s": 1.0, "min": 60.0, "h": 3600.0}
# Kelvin are factor (value + offset).
TEMPERATURE_UNITS: Mapping[str, tuple[float, float]] = {
    "degC": (1.0, 273.15),
    "K": (1.0, 0.0),
    "degF": (5.0 / 9.0, 459.67),
}
LENGTH_UNITS: Mapping[str, float] = {"mm": 1e-3, "m": 1.0, "in": 0.0254}
DECIMALS = ("point", "comma")

_KEYS: Mapping[str, tuple[str, ...]] = {
    TABLE: ("file", "time_unit", "temperature_unit", "columns", "decimal", "starts_at"),
    RECORD: ("file", "starts_at"),
    MESH: ("file", "time_unit", "temperature_unit", "array", "length_unit", "starts_at"),
}
ALL_KEYS = tuple(dict.fromkeys(key for known in _KEYS.values() for key in known))
_WHY_NOT: Mapping[str, str] = {
    TABLE: "A CSV has columns: it takes columns and decimal, no array and no lengths.",
    RECORD: "A record of a run states its own units and arrays.",
    MESH: "A mesh has arrays: it takes array and length_unit, no columns.",
}
_COLUMNS = '{ time = "t", places = { core = "TC3", surface = "TC1" } }'


@dataclass(frozen=True)
class GivenInput:
    """Where temperatures come from.

    ``kind`` is TABLE, RECORD or MESH; units are names of the tables above, None where the
    file states its own. ``columns`` are headings by place, empty for all. ``starts_at``
    [s] is the time in the file at which the soak ends; None: its first.
    """

    file: Path
    kind: str
    time_unit: str | None = None
    temperature_unit: str | None = None
    length_unit: str | None = None
    array: str | None = None
    time_column: str | None = None
    columns: Mapping[str, str] = field(default_factory=dict)
    decimal: str = "point"
    starts_at: float | None = None


@dataclass(frozen=True, kw_only=True)
class SeriesCase(Asked):
    """A case whose temperatures come from a file."""

    temperatures: GivenInput

    def position(self, name: str) -> PositionInput:
        """The place that ``name`` means: an output position, else a place of the file."""
        for place in self.outputs.positions:
            if place.name == name:
                return place
        return PositionInput(name, "place of the file")


def temperatures(table: Table) -> GivenInput | None:
    """``[temperatures]``; None and notes where it is at fault."""
    file = table.text("file", 1000)
    if not table.has("file"):
        table.missing("file", "the file with the temperatures")
    if file is None:
        table.only(ALL_KEYS)
        return None
    path = table.notes.folder / file
    kind = KINDS.get(path.suffix.lower())
    if kind is None:
        table.fault("file", f"a file ending with {', '.join(KINDS)}", "The ending says what it is.")
        table.only(ALL_KEYS)
        return None
    if not path.is_file():
        remedy = "This is a folder." if path.is_dir() else "The path counts from the case file."
        table.fault("file", "a file that exists", remedy)
    table.only(_KEYS[kind], dict.fromkeys(ALL_KEYS, _WHY_NOT[kind]))
    units = {
        name: _unit(table, name, known)
        for name, known in (
            ("time_unit", TIME_UNITS),
            ("temperature_unit", TEMPERATURE_UNITS),
            ("length_unit", LENGTH_UNITS),
        )
        if name in _KEYS[kind]
    }
    array = table.text("array", keys.LONGEST_TITLE) if kind == MESH else None
    if kind == MESH and not table.has("array"):
        table.missing("array", "the name of the temperature in the file")
    time_column, columns = _columns(table) if kind == TABLE else (None, {})
    decimal = table.choice("decimal", DECIMALS) if kind == TABLE else None
    starts_at = None
    if table.has("starts_at"):
        key = table.key("starts_at")
        starts_at = quantity(
            table.notes, key, table.raw("starts_at"), "duration", keys.FIELD_TIME_RANGE
        )
    if table.notes.has(table.place):
        return None
    return GivenInput(
        file=path,
        kind=kind,
        array=array,
        time_column=time_column,
        columns=columns,
        decimal=decimal or "point",
        starts_at=starts_at,
        **units,
    )


def _unit(table: Table, name: str, known: Mapping[str, object]) -> str | None:
    if not table.has(name):
        table.missing(name, one_of(tuple(known)), "The file does not say it, and no unit is usual.")
    return table.choice(name, tuple(known))


def _columns(table: Table) -> tuple[str | None, dict[str, str]]:
    inner = table.table("columns", _COLUMNS)
    if inner is None:
        if not table.has("columns"):
            table.missing("columns", f"written as {_COLUMNS}", "Left out, places are all columns.")
        return None, {}
    inner.only(("time", "places"))
    time = inner.text("time", keys.LONGEST_TITLE)
    if not inner.has("time"):
        inner.missing("time", "the heading of the times")
    named = inner.table("places", '{ core = "TC3", surface = "TC1" }')
    found = {}
    if named is None:
        return time, {}
    for name in named.names():
        heading = named.text(name, keys.LONGEST_TITLE)
        if name == EVERYWHERE or len(name) > keys.LONGEST_NAME or name != name.strip():
            inner.fault("places", "names of your own, without blanks at their ends")
        elif heading is not None:
            found[name] = heading
    if not named.names():
        inner.fault("places", "at least one place", "Left out, places are all columns.")
    return time, found
