"""Where the answer is wanted in temperatures from elsewhere: places, points, nodes; needs there."""

from . import casekeys as keys
from .case import EVERYWHERE, Need, Outputs, PositionInput
from .caselines import KeyPath
from .caseneed import needs
from .casetable import Table, nearest, one_of, quantity
from .seriescase import MESH, TABLE, GivenInput

_POINT = '{ name = "bore", node = 17 } or { name = "bore", at = ["10 mm", "0 mm", "40 mm"] }'
_REACH = (-keys.DIMENSION_RANGE[1], keys.DIMENSION_RANGE[1])
_MOST_NODES = 100_000_000


def places(top: Table, given: GivenInput | None) -> Outputs:
    """``[output]`` beside temperatures; without it every place of the file."""
    mesh = given is not None and given.kind == MESH
    table = top.table("output", "[output]")
    if table is None:
        if mesh and not top.has("output"):
            remedy = f"Write [output] and below it positions = [{_POINT.split(' or ')[0]}]."
            top.missing("output", "given where the temperatures are those of a mesh", remedy)
        return Outputs(())
    why = "Times and fields are those of the file: take it out."
    table.only(("positions",), dict.fromkeys(keys.OUTPUT, why))
    items = table.items("positions", f"[{_POINT}]")
    if len(items) > keys.PLACES_MOST:
        table.refuse("positions", f"positions has more than {keys.PLACES_MOST} items", "")
        return Outputs(())
    found: list[PositionInput] = []
    for key, value in items:
        place = _place(table, key, value, given)
        if place and place.name in [other.name for other in found]:
            table.notes.add(key, value, "named once", "Take the second one out.")
        elif place:
            found.append(place)
    if mesh and not items and not table.has("positions"):
        table.missing("positions", f"at least one place of the mesh, such as {_POINT}")
    elif table.raw("positions") == []:
        table.fault("positions", "at least one place", "Or leave it out.")
    return Outputs(tuple(found))


def _place(
    table: Table, key: KeyPath, value: object, given: GivenInput | None
) -> PositionInput | None:
    if isinstance(value, dict):
        if given is not None and given.kind == TABLE:
            table.notes.add(key, value, "the name of a place", "A CSV has no points, only columns.")
            return None
        return _point(Table(value, key, table.notes))
    if not isinstance(value, str) or not value.strip():
        table.notes.add(key, value, f"the name of a place, or {_POINT}")
        return None
    if given is not None and given.kind == MESH:
        table.notes.add(key, value, f"a point: {_POINT}", "A mesh does not say where that is.")
        return None
    if given is not None and given.columns and value not in given.columns:
        known = tuple(given.columns)
        table.notes.add(
            key, value, f"a place of the columns: {one_of(known)}", nearest(value, known)
        )
        return None
    return PositionInput(value, "place of the file")


def _point(table: Table) -> PositionInput | None:
    table.only(("name", "node", "at"))
    name = table.text("name", keys.LONGEST_NAME)
    if not table.has("name"):
        table.missing("name", "a text in quotes, of your own")
    elif name is not None and (name != name.strip() or name == EVERYWHERE):
        table.fault("name", "a name of your own, without blanks at its ends")
        return None
    if table.has("node") == table.has("at"):
        table.missing("node", "given, or else at", f"Write one of {_POINT}.")
        return None
    if table.has("node"):
        node = table.integer("node", (0, _MOST_NODES))
        return PositionInput(name, "node", node=node) if name and node is not None else None
    at = [
        quantity(table.notes, key, value, "length", _REACH)
        for key, value in table.items("at", '["10 mm", "0 mm", "40 mm"]')
    ]
    known = tuple(value for value in at if value is not None)
    if len(known) < len(at) or not name:
        return None
    if not 1 <= len(known) <= 3:
        table.fault("at", "one to three coordinates")
        return None
    return PositionInput(name, "coordinates", coordinates=known)


def needs_at(top: Table, outputs: Outputs, given: GivenInput | None) -> tuple[Need, ...]:
    """``[[need]]`` at places of the file; one that asks for a depth is refused."""
    known = _known(outputs, given)
    raw = top.raw("need")
    asked = dict.fromkeys(place.name for place in outputs.positions)
    for k, item in enumerate(raw if isinstance(raw, list) else []):
        if not isinstance(item, dict):
            continue
        if item.get("quantity") == keys.DEPTH:
            remedy = "Ask for the hardness at a place instead."
            sentence = f"a {keys.DEPTH} needs a section: temperatures alone have no profile"
            top.notes.refuse(("need", k, "quantity"), sentence, remedy)
        position = item.get("position")
        if not isinstance(position, str) or position == EVERYWHERE:
            continue
        asked[position] = None
        if known and position not in known:
            allowed = one_of((*known, EVERYWHERE))
            remedy = nearest(position, known)
            top.notes.add(("need", k, "position"), position, allowed, remedy)
    places = tuple(PositionInput(name, "place of the file") for name in asked)
    return needs(top, None, Outputs(places))


def _known(outputs: Outputs, given: GivenInput | None) -> tuple[str, ...]:
    """Names that a need may use; empty where only the file knows."""
    named = tuple(place.name for place in outputs.positions)
    columns = tuple(given.columns) if given is not None else ()
    open_ended = given is None or (given.kind != MESH and not columns)
    return () if open_ended else tuple(dict.fromkeys((*named, *columns)))
