"""The blocks that size a tank, as parts of the case format's JSON Schema."""

from typing import Any

from midradius.thermo.units import Kind, example, pattern, show

from . import casekeys as keys

Schema = dict[str, Any]

_MEANING: dict[str, str] = {
    "volume": "Fluid as filled.",
    "length": "Inside.",
    "width": "Inside.",
    "depth": "Inside, to the lip.",
    "filled_at": "Of the fluid when the volume was measured.",
    "flash_point": "From the data sheet of the oil.",
    "bath_limit": "The bath stays below.",
    "rise_limit": "What one load may add.",
    "ready_at": "The bath is below it before the next load.",
    "freeboard": "From the worst level to the lip.",
    "morning": "The bath as the day begins.",
    "heater_set": "The heater keeps at least.",
    "flow": "Of propeller or pump.",
    "velocity": "Asked through the load.",
    "passage": "Area that the flow passes through.",
    "air": "Beside the tank.",
    "drag_out": "Fluid that leaves with each load.",
    "period": "After which the shift repeats; a day where it is left out.",
}


def blocks() -> dict[str, Schema]:
    """The properties load, tank and shift of a case."""
    mass = _quantity("mass", keys.MASS_RANGE, "Mass.")
    low, high = keys.PIECES_RANGE
    fixture = _table(
        {
            "name": _text("What it is called.", keys.LONGEST_NAME),
            "mass": mass,
            "thickness": _quantity("length", keys.THICKNESS_RANGE, "Of its bars or sheet."),
            "grade": _text("A grade of the table; the part's where left out.", keys.LONGEST_NAME),
        },
        ["mass", "thickness"],
    )
    load = _table(
        {
            "pieces": {"type": "integer", "minimum": low, "maximum": high},
            "length": _quantity("length", keys.PIECE_LENGTH_RANGE, "Of one piece."),
            "piece_mass": mass,
            "fixture": {"type": "array", "items": fixture, "maxItems": keys.FIXTURES_MOST},
        },
        [],
    )
    tank: dict[str, Schema] = {
        name: _quantity(kind, within, _MEANING.get(name, name.capitalize() + "."))
        for name, (kind, within) in keys.TANK_QUANTITIES.items()
    }
    tank["fluid_file"] = _text("CSV or TOML of a fluid of your own.", 1000)
    tank["layers"] = {"type": "integer", "minimum": 1, "maximum": 3}
    tank["lid"] = tank["coupled"] = {"type": "boolean"}
    tank["cooler"] = {
        "anyOf": [_quantity("power", keys.POWER_RANGE, "With the bath at its limit."), _cooler()]
    }
    entry = _table(
        {
            "at": _quantity("duration", (0.0, 7.0 * keys.DAY), "Of the first load."),
            "every": _quantity("duration", (60.0, keys.DAY), "Between loads."),
            "count": {"type": "integer", "minimum": 1, "maximum": keys.LOADS_MOST},
            "case": _text("Another case with a load.", 1000),
            "mass": mass,
            "from": _quantity("temperature", (673.15, keys.TEMP_RANGE[1]), "As it goes in."),
            "thickness": _quantity("length", keys.DIMENSION_RANGE, "Of its pieces."),
            "time": _quantity("duration", keys.STAGE_TIME_RANGE, "In the bath."),
        },
        ["at"],
    )
    described = {"description": "Loads of a day; without keys of its own, that of the case."}
    return {
        "load": load,
        "tank": _table(tank, ["volume"]),
        "shift": {"type": "array", "items": entry, **described},
    }


def _cooler() -> Schema:
    return _table(
        {
            "power": _quantity("power", keys.POWER_RANGE, "With the bath at its limit."),
            "conductance": _quantity("conductance", keys.CONDUCTANCE_RANGE, "UA."),
            "bath_flow": _quantity("mass flow", keys.FLOW_RANGE, "Of the bath."),
            "coolant": {"enum": list(keys.COOLANTS)},
            "coolant_flow": _quantity("mass flow", keys.FLOW_RANGE, "Of water or air."),
            "coolant_in": _quantity("temperature", keys.COOLANT_RANGE, "As it enters."),
            "arrangement": {"enum": list(keys.ARRANGEMENTS)},
            "start": _quantity("temperature", keys.BATH_RANGE, "The thermostat opens from."),
        },
        [],
    )


def _quantity(kind: Kind, within: tuple[float, float], meaning: str) -> Schema:
    low, high = (show(end, kind) for end in within)
    return {
        "type": "string",
        "description": f"{meaning} {low} to {high}.",
        "pattern": pattern(kind),
        "examples": [example(kind)],
    }


def _text(meaning: str, longest: int) -> Schema:
    return {"type": "string", "description": meaning, "minLength": 1, "maxLength": longest}


def _table(properties: dict[str, Schema], required: list[str]) -> Schema:
    table: Schema = {"type": "object", "properties": properties, "additionalProperties": False}
    return table | {"required": required} if required else table
