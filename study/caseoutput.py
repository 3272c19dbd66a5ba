"""``[output]`` of a case file: the places and times where the answer is wanted.

A place must lie in the section.
"""

import math
from collections.abc import Mapping

from midradius.thermo.errors import InputFault
from midradius.thermo.units import show

from . import casekeys as keys
from .case import TRADE_TERMS, Outputs, PositionInput, SectionInput, position
from .caselines import KeyPath
from .casetable import Table, quantity

_AXES: Mapping[str, tuple[str, ...]] = {
    "plane": ("x", "y"),
    "axisymmetric": ("r", "z"),
    "solid": ("x", "y", "z"),
}
_PLACES = '["surface", "mid-radius", "12 mm below surface", "core"]'


def outputs(table: Table | None, section: SectionInput | None) -> Outputs:
    """``[output]``: positions and times of the fields; usual ones where left out."""
    usual = _usual_positions(section)
    if table is None:
        return Outputs(usual)
    table.only(keys.OUTPUT)
    places: list[PositionInput] = []
    for name, most in (("positions", keys.PLACES_MOST), ("times", keys.TIMES_MOST)):
        given = table.raw(name)
        if isinstance(given, list) and len(given) > most:
            table.refuse(name, f"{name} has {len(given)} items, at most {most} are read")
            return Outputs(usual)
    # a mesh has its origin where it likes
    mesh = section is not None and section.mesh is not None
    lowest = -keys.DIMENSION_RANGE[1] if mesh else 0.0
    for key, value in table.items("positions", _PLACES):
        place = _place(table, key, value, lowest)
        if place is None:
            continue
        if section and (found := place_fault(place, section)):
            table.notes.add(key, value, *found)
        elif place.name in [other.name for other in places]:
            table.notes.add(key, value, "named once", "Take the second one out.")
        else:
            places.append(place)
    if table.raw("positions") == []:
        table.fault("positions", f"at least one place, such as {_PLACES}", "Or leave it out.")
    if table.has("fields") and table.has("times"):
        table.fault("times", "left out where fields is given", "Keep one of the two.")
    n_field = table.integer("fields", keys.FIELDS_RANGE)
    return Outputs(
        tuple(places) or usual,
        _field_times(table),
        n_field or Outputs(()).n_field,
        field_format=table.choice("format", keys.FORMATS) or Outputs(()).field_format,
        pictures=table.choice("pictures", keys.PICTURES) or Outputs(()).pictures,
    )


def _field_times(table: Table) -> tuple[float, ...]:
    times: list[float] = []
    for key, value in table.items("times", '["10 s", "5 min", "1 h"]'):
        time = quantity(table.notes, key, value, "duration", keys.FIELD_TIME_RANGE)
        if time is not None and times and time <= times[-1]:
            table.notes.add(key, value, f"later than {show(times[-1], 'duration')}")
        elif time is not None:
            times.append(time)
    if table.raw("times") == []:
        table.fault("times", 'at least one time, such as ["10 s", "5 min", "1 h"]')
    return tuple(times)


def _usual_positions(section: SectionInput | None) -> tuple[PositionInput, ...]:
    radius = section is not None and section.form in ("round", "ball")
    between = "mid-radius" if radius else "quarter thickness"
    return tuple(position(name) for name in ("surface", between, "core"))


def _place(table: Table, key: KeyPath, value: object, lowest: float) -> PositionInput | None:
    if isinstance(value, dict):
        return _named_place(Table(value, key, table.notes), lowest)
    if not isinstance(value, str):
        table.notes.add(key, value, f"a place, as in {_PLACES}")
        return None
    try:
        return position(value)
    except InputFault as fault:
        table.notes.pass_on(key, value, fault)
        return None


def _named_place(table: Table, lowest: float) -> PositionInput | None:
    table.only(keys.POSITION)
    name = table.text("name", keys.LONGEST_NAME)
    if not table.has("name"):
        table.missing("name", "a text in quotes, of your own")
    elif name and name != name.strip():
        table.fault("name", "a name without blanks at its ends")
        return None
    elif name in TRADE_TERMS:
        table.fault("name", "a name of your own", "The trade terms name their own places.")
        return None
    if table.has("depth") == table.has("at"):
        example = 'depth = "12 mm" or at = ["10 mm", "20 mm"]'
        table.missing("at", "given, or else a depth", f"Write one of {example}.")
        return None
    if table.has("depth"):
        depth = table.quantity("depth", "length", (0.0, keys.DIMENSION_RANGE[1]))
        if name is None or depth is None:
            return None
        return PositionInput(name, "depth", depth=depth)
    at = [
        quantity(table.notes, key, value, "length", (lowest, keys.DIMENSION_RANGE[1]))
        for key, value in table.items("at", '["10 mm", "20 mm"]')
    ]
    known = tuple(value for value in at if value is not None)
    if name is None or len(known) < max(len(at), 1):
        return None
    return PositionInput(name, "coordinates", coordinates=known)


def place_fault(place: PositionInput, section: SectionInput) -> tuple[str, str] | None:
    """What is allowed, and the remedy, where a position does not fit the section."""
    if place.kind == "mid-radius" and section.form not in ("round", "ball", "mesh", "outline"):
        return (
            f'a place that form = "{section.form}" has',
            'Only a round and a ball have a mid-radius: write "quarter thickness" or "core".',
        )
    if any(getattr(section, name) is None for name in keys.DIMENSIONS.get(section.form, ())):
        return None
    spans = spans_of(section)
    if place.kind == "depth" and place.depth is not None:
        most = deepest(section)
        if 0.0 < most * (1.0 + 1e-9) < place.depth:
            return (
                f"at most {most * 1e3:.6g} mm below the surface of this section",
                'Write a smaller depth; the middle of the section is "core".',
            )
    if place.coordinates is not None:
        if len(place.coordinates) != len(spans):
            return f"{len(spans)} coordinates for this section", f"Write {spans_text(section)}."
        for value, (_, low, high) in zip(place.coordinates, spans, strict=True):
            if not low - 1e-12 <= value <= high * (1.0 + 1e-9):
                return f"inside the section: {spans_text(section)}", ""
    return None


def spans_of(section: SectionInput) -> list[tuple[str, float, float]]:
    """Name, lowest and highest [m] of each coordinate of the section."""
    if section.mesh is not None:
        names = _AXES[section.mesh.sense]
        return list(zip(names, section.mesh.low, section.mesh.high, strict=True))
    size = {name: getattr(section, name) or 0.0 for name in keys.ALL_DIMENSIONS}
    if section.form == "slab":
        return [("x", 0.0, size["thickness"])]
    if section.form == "bar":
        return [("x", 0.0, size["width"]), ("y", 0.0, size["height"])]
    if section.form in ("tube", "ring"):
        radial = ("r", size["bore"] / 2.0, size["outside"] / 2.0)
        return [radial] if section.form == "tube" else [radial, ("z", 0.0, size["height"])]
    radial = ("r", 0.0, size["diameter"] / 2.0)
    return [radial, ("z", 0.0, size["length"])] if section.length else [radial]


def spans_text(section: SectionInput) -> str:
    """The spans as a person writes them."""
    return ", ".join(
        f"{name} from {low * 1e3:.6g} to {high * 1e3:.6g} mm"
        for name, low, high in spans_of(section)
    )


def deepest(section: SectionInput) -> float:
    """The largest depth [m] that a place of this section can have."""
    if section.form in ("round", "ball"):
        return (section.diameter or math.inf) / 2.0
    if section.mesh is not None:  # known when its distances are
        return math.inf
    if section.form in ("tube", "ring"):
        wall = ((section.outside or math.inf) - (section.bore or 0.0)) / 2.0
        return min(wall, section.height or math.inf)
    if section.form == "slab":
        return section.thickness or math.inf
    return min(section.width or math.inf, section.height or math.inf) / 2.0
