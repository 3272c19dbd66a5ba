"""``[[output.paths]]``: straight paths across the section, written as a table.

A path runs between two points of the section, given by their coordinates as
positions are; the table holds the end of the run at even steps along it.
"""

from . import casekeys as keys
from .case import PathInput, PositionInput, SectionInput
from .caseoutput import place_fault
from .casetable import Table, quantity

_EXAMPLE = 'from = ["0 mm", "20 mm"]'


def paths(table: Table | None, section: SectionInput | None) -> tuple[PathInput, ...]:
    """The paths of ``[output]`` in their order; one at fault is left out."""
    if table is None:
        return ()
    items = table.items("paths", "[[output.paths]] before each path")
    if len(items) > keys.PATHS_MOST:
        table.refuse("paths", f"paths has {len(items)} items, at most {keys.PATHS_MOST} are read")
        return ()
    found: list[PathInput] = []
    for key, value in items:
        if not isinstance(value, dict):
            table.notes.add(key, value, "a table, written as [[output.paths]]")
            continue
        path = _path(Table(value, key, table.notes), section)
        if path is not None and path.name in [other.name for other in found]:
            table.notes.add((*key, "name"), path.name, "named once", "Give it another name.")
        elif path is not None:
            found.append(path)
    return tuple(found)


def _path(table: Table, section: SectionInput | None) -> PathInput | None:
    table.only(keys.PATH)
    for key, allowed in (
        ("name", "a text in quotes, of your own"),
        ("from", f"the coordinates of its start, such as {_EXAMPLE}"),
        ("to", "the coordinates of its end"),
    ):
        if not table.has(key):
            table.missing(key, allowed)
    name = table.text("name", keys.LONGEST_NAME)
    ends = [_point(table, end, section) for end in ("from", "to")]
    points = table.integer("points", keys.PATH_POINTS)
    if name is None or ends[0] is None or ends[1] is None:
        return None
    if ends[0] == ends[1]:
        table.fault("to", "another point than from")
        return None
    return PathInput(name, ends[0], ends[1], points or PathInput.n_point)


def _point(table: Table, end: str, section: SectionInput | None) -> tuple[float, ...] | None:
    most = keys.DIMENSION_RANGE[1]
    values = [
        quantity(table.notes, key, value, "length", (-most, most))
        for key, value in table.items(end, _EXAMPLE)
    ]
    known = tuple(value for value in values if value is not None)
    if not values or len(known) < len(values):
        return None
    point = PositionInput(end, "coordinates", coordinates=known)
    if section and (found := place_fault(point, section)):
        table.fault(end, *found)
        return None
    return known
