"""The case format as a JSON Schema, for editors that complete and mark a TOML file.

It says less than the reader: ranges of quantities stand in words only, and what
the blocks ask of each other is not in it. Draft 7, which TOML editors know.
"""

from collections.abc import Mapping, Sequence
from typing import Any

from midradius.fem.furnace import furnace_names
from midradius.fem.media import names
from midradius.thermo.grades import all_grades
from midradius.thermo.ratechoice import DEFAULT, NAMES
from midradius.thermo.steel import ELEMENTS, HARD_BOUNDS
from midradius.thermo.units import Kind, example, pattern, show

from . import casekeys as keys
from . import seriescase as series
from .case import TRADE_TERMS, ZONES
from .schemamesh import mesh_section, outline_section, paths_of
from .tankschema import blocks

Schema = dict[str, Any]


def document() -> Schema:
    """The schema of a case file, ready for ``json.dumps``."""
    return {
        "$schema": "http://json-schema.org/draft-07/schema#",
        "title": "midradius case",
        "description": "Steel, section and route of one part; quantities are texts with a unit.",
        "type": "object",
        "properties": {
            "title": _text("What the part is called.", keys.LONGEST_TITLE),
            "steel": _steel(),
            "section": _section(),
            "temperatures": _temperatures(),
            "route": _route(),
            "need": _needs(),
            "output": {"type": "object", "description": "Where and when the answer is wanted."},
            "grid": _grid(),
            **blocks(),
        },
        "required": ["steel", "route"],
        "oneOf": [
            {
                "properties": {"output": _output(), "route": {"minItems": 2}},
                "required": ["section"],
            },
            {"properties": {"output": _places_of_file()}, "required": ["temperatures"]},
        ],
        "additionalProperties": False,
        "definitions": {
            "medium": {
                "description": "A medium of the catalogue; letter case and blanks do not matter.",
                "type": "string",
                "examples": list(names()),
            },
            "medium_use": {"anyOf": [_to("medium"), _table(_medium(), ())]},
        },
    }


def _steel() -> Schema:
    low, high = keys.GRAIN_RANGE
    amounts = {
        element: {"type": "number", "minimum": HARD_BOUNDS[element][0]}
        | {"maximum": HARD_BOUNDS[element][1], "description": "Mass percent."}
        for element in ELEMENTS
    }
    steel = _table(
        {
            "grade": {
                "type": "string",
                "description": "A grade of the shipped table, by name or number.",
                "examples": [steel.name for steel in all_grades()],
            },
            "composition": _table(amounts, ("C",)),
            "file": _text("TOML or CSV of certificates, beside the case file.", 1000),
            "heat": _text("Which steel of the file, by its heat.", keys.LONGEST_NAME),
            "name": _text("Which steel of the file, by its name.", keys.LONGEST_NAME),
            "austenite_grain": {
                "type": "string",
                "description": f"ASTM {low:g} to {high:g}; left out: from the soak.",
                "pattern": r"^\s*[Aa][Ss][Tt][Mm]\s*-?[0-9]{1,2}(?:\.[0-9]{1,3})?\s*$",
                "examples": ["ASTM 7"],
            },
            "kinetics": {
                "description": f"Set of rates; left out: {DEFAULT.name}.",
                "enum": list(NAMES),
            },
            "transformation": _text("CSV of isothermal transformation of this heat.", 1000),
            "calibration": _text("File of `midradius calibrate --save`, of this heat.", 1000),
        },
        (),
    )
    return steel | {
        "oneOf": [{"required": [key]} for key in keys.STEEL_FROM],
        "not": {"required": ["heat", "name"]},
    }


def _section() -> Schema:
    sizes = {
        name: _quantity("length", keys.DIMENSION_RANGE, name.capitalize() + ".")
        for name in keys.ALL_DIMENSIONS
    }
    bore = _to("medium_use")
    low, high = keys.EMISSIVITY_RANGE
    emissivity = {
        "type": "number",
        "minimum": low,
        "maximum": high,
        "description": "Of the surface, in air and gas; scaled steel 0.8, bright 0.35 to 0.5.",
    }
    finest = _quantity("length", keys.FINEST_RANGE, "Surface cells; left out: as the films ask.")
    place = _quantity("length", keys.PLANE_RANGE, "A coordinate of CAD.")
    forms = [
        _table(
            {"form": {"const": form}}
            | {name: sizes.get(name, bore) for name in (*needed, *keys.OPTIONAL[form])}
            | {"emissivity": emissivity},
            ("form", *needed),
        )
        for form, needed in keys.DIMENSIONS.items()
    ]
    return {
        "type": "object",
        "properties": {"form": {"enum": list(keys.FORMS)}},
        "required": ["form"],
        "oneOf": [*forms, mesh_section(emissivity), outline_section(emissivity, finest, place)],
    }


def _temperatures() -> Schema:
    """Histories from elsewhere; which keys a kind of file takes, the reader says."""

    def unit(known: Mapping[str, object], meaning: str) -> Schema:
        return {"enum": list(known), "description": meaning}

    columns = {
        "time": _text("Heading of the times.", keys.LONGEST_TITLE),
        "places": {
            "type": "object",
            "description": "Heading of the temperatures by name of the place.",
        },
    }
    return _table(
        {
            "file": _text(f"Beside the case file: {', '.join(series.KINDS)}.", 1000),
            "time_unit": unit(series.TIME_UNITS, "Of the times in the file."),
            "temperature_unit": unit(series.TEMPERATURE_UNITS, "Of the temperatures."),
            "length_unit": unit(series.LENGTH_UNITS, "Of the points of a mesh."),
            "array": _text("Name of the temperature in a mesh file.", keys.LONGEST_TITLE),
            "columns": _table(columns, ("time",)),
            "decimal": {"enum": list(series.DECIMALS), "description": "Decimal sign of a CSV."},
            "starts_at": _quantity(
                "duration", keys.FIELD_TIME_RANGE, "Time in the file at which the soak ends."
            ),
        },
        ("file",),
    )


def _route() -> Schema:
    time = _quantity("duration", keys.STAGE_TIME_RANGE, "How long the stage lasts.")
    at = _quantity("temperature", keys.SOAK_RANGE, "Furnace temperature, above Ae1.")
    soak = _table({"stage": {"const": "soak"}, "at": at, "time": time}, keys.SOAK)
    zones = sorted({zone for known in ZONES.values() for zone in known} | {"near end", "far end"})
    cooling = {
        **_medium(),
        "time": time,
        "until": {
            "type": "string",
            "description": "A place, below and a temperature.",
            "pattern": _until_pattern("below"),
            "examples": ["core below 150 degC"],
        },
        "faces": _table({zone: _to("medium_use") for zone in zones}, ())
        | {"additionalProperties": _to("medium_use")},  # a mesh has groups of any name
    }
    heating: dict[str, Schema] = {
        "stage": {"const": "heat"},
        "medium": {
            "description": "What the part is heated in; letter case and blanks do not matter.",
            "type": "string",
            "examples": list(furnace_names()),
        },
        "furnace": _quantity("temperature", keys.FURNACE_RANGE, "Of the furnace."),
        "from": _quantity("temperature", keys.TEMP_RANGE, "Of the part; left out: 20 degC."),
        "ramp": _quantity("heating rate", keys.RAMP_RANGE, "Of the furnace from there on."),
        "time": time,
        "until": {
            "type": "string",
            "description": "A place, above and a temperature.",
            "pattern": _until_pattern("above"),
            "examples": ["core above 850 degC"],
        },
    }
    stages = [_table({"stage": {"const": kind}, **cooling}, ("stage",)) for kind in keys.COOLS]
    tempering = _quantity("temperature", (keys.TEMPER_COLDEST, keys.TEMPER_HOTTEST), "Below Ae1.")
    stages.append(
        _table({"stage": {"const": "temper"}, "at": tempering, "time": time}, keys.TEMPER)
    )
    return {
        "type": "array",
        "description": "What heats, one soak, the stages that cool in their order, tempers last.",
        "minItems": 1,
        "maxItems": keys.STAGES_MOST,
        "items": {
            "type": "object",
            "properties": {"stage": {"enum": list(keys.STAGES)}},
            "required": ["stage"],
            "oneOf": [_table(heating, ("stage", "medium", "furnace")), soak, *stages],
        },
    }


def _needs() -> Schema:
    units = dict.fromkeys(unit for known in keys.NEED_UNITS.values() for unit in known)
    number = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
    written = "|".join([*(unit for unit in units if unit != "ASTM"), "HBW", "N/mm2"])
    limit = {
        "type": "string",
        "pattern": rf"^\s*(?:{number}\s*(?:{written})|[Aa][Ss][Tt][Mm]\s*{number})\s*$",
        "examples": ["28 HRC", "900 MPa", "5 %", "8 mm", "ASTM 5"],
    }
    common: dict[str, Schema] = {
        "at_least": limit,
        "at_most": limit,
        "between": {"type": "array", "items": limit, "minItems": 2, "maxItems": 2},
    }
    place = _text("A place of the output, a trade term, a depth, or everywhere.", 200)
    kinds = [name for name in keys.QUANTITIES if name not in (keys.DEPTH, keys.GRAIN)]
    to = {
        "type": "string",
        "description": "To what the depth counts.",
        "examples": ["50 HRC", "50 % martensite"],
    }
    need = {
        "type": "object",
        "properties": {"quantity": {"enum": list(keys.QUANTITIES)}},
        "required": ["quantity"],
        "oneOf": [
            _table({"quantity": {"enum": kinds}, "position": place, **common}, ("position",)),
            _table({"quantity": {"const": keys.GRAIN}, "position": place, **common}, ()),
            _table({"quantity": {"const": keys.DEPTH}, "to": to, **common}, ("to",)),
        ],
        "anyOf": [{"required": ["at_least"]}, {"required": ["at_most"]}, {"required": ["between"]}],
    }
    return {
        "type": "array",
        "description": "What the drawing asks for, each with its limit.",
        "items": need,
        "maxItems": keys.NEEDS_MOST,
    }


def _medium() -> dict[str, Schema]:
    return {
        "medium": _to("medium"),
        "bath": _quantity("temperature", keys.TEMP_RANGE, "Of the bath or the gas."),
        "film": _text("CSV of surface_degC, htc_W_per_m2K, beside the case file.", 1000),
    }


def _output() -> Schema:
    depth = _quantity("length", (0.0, keys.DIMENSION_RANGE[1]), "Below the nearest surface.")
    place = {
        "type": "string",
        "pattern": _place_pattern(),
        "examples": [*TRADE_TERMS, "12 mm below surface"],
    }
    named = _table(
        {
            "name": _text("A name of your own.", keys.LONGEST_NAME),
            "depth": depth,
            "at": {"type": "array", "items": depth, "minItems": 1, "maxItems": 3},
        },
        ("name",),
    ) | {"oneOf": [{"required": ["depth"]}, {"required": ["at"]}]}
    times = _quantity("duration", keys.FIELD_TIME_RANGE, "Time since the end of the soak.")
    low, high = keys.FIELDS_RANGE
    return _table(
        {
            "positions": {
                "type": "array",
                "items": {"anyOf": [place, named]},
                "minItems": 1,
                "maxItems": keys.PLACES_MOST,
            },
            "paths": paths_of(depth),
            "fields": {"type": "integer", "minimum": low, "maximum": high},
            "format": {
                "enum": list(keys.FORMATS),
                "description": "vtkhdf takes large fields while the run goes on.",
            },
            "pictures": {
                "enum": list(keys.PICTURES),
                "description": "scenes adds pictures of the part itself.",
            },
            "times": {
                "type": "array",
                "items": times,
                "minItems": 1,
                "maxItems": keys.TIMES_MOST,
            },
        },
        (),
    ) | {"not": {"required": ["fields", "times"]}}


def _places_of_file() -> Schema:
    """``[output]`` beside temperatures from elsewhere."""
    reach = (-keys.DIMENSION_RANGE[1], keys.DIMENSION_RANGE[1])
    along = _quantity("length", reach, "Coordinate.")
    point = _table(
        {
            "name": _text("A name of your own.", keys.LONGEST_NAME),
            "node": {"type": "integer", "minimum": 0, "description": "Of the mesh, from 0."},
            "at": {"type": "array", "items": along, "minItems": 1, "maxItems": 3},
        },
        ("name",),
    ) | {"oneOf": [{"required": ["node"]}, {"required": ["at"]}]}
    place = _text("A place that [temperatures] names.", keys.LONGEST_NAME)
    return _table(
        {
            "positions": {
                "type": "array",
                "items": {"anyOf": [place, point]},
                "minItems": 1,
                "maxItems": keys.PLACES_MOST,
            }
        },
        (),
    )


def _grid() -> Schema:
    low, high = keys.CELLS_RANGE
    count = {"type": "integer", "minimum": low, "maximum": high}
    return _table(
        {
            "cells": {"anyOf": [count, {"type": "array", "items": count, "maxItems": 2}]},
            "accuracy": _quantity("temperature difference", keys.ACCURACY_RANGE, "Asked for."),
        },
        (),
    )


def _quantity(kind: Kind, within: tuple[float, float], meaning: str) -> Schema:
    low, high = (show(end, kind) for end in within)
    return {
        "type": "string",
        "description": f"{meaning} {low} to {high}.",
        "pattern": pattern(kind),
        "examples": [example(kind)],
    }


def _until_pattern(sense: str) -> str:
    return rf"^.*\S +{sense} " + pattern("temperature").removeprefix("^")


def _place_pattern() -> str:
    depth = pattern("length").removeprefix("^").removesuffix(r"\s*$")
    terms = "|".join(TRADE_TERMS)
    return rf"^(?:{terms}|{depth}\s* below surface)$"


def _text(meaning: str, longest: int) -> Schema:
    return {"type": "string", "description": meaning, "minLength": 1, "maxLength": longest}


def _table(properties: Mapping[str, Schema], required: Sequence[str]) -> Schema:
    table: Schema = {
        "type": "object",
        "properties": dict(properties),
        "additionalProperties": False,
    }
    return table | {"required": list(required)} if required else table


def _to(definition: str) -> Schema:
    return {"$ref": f"#/definitions/{definition}"}
