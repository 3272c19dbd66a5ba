"""The parts of the JSON Schema that belong to meshes: the section, paths across it."""

from typing import Any

from . import casekeys as keys

Schema = dict[str, Any]

_TAKEN: Schema = {
    "sense": {
        "enum": ["plane", "axisymmetric", "solid"],
        "description": "A long bar, a body of revolution about x = 0, or the whole part.",
    },
    "symmetry": {
        "type": "array",
        "items": {"type": "string"},
        "description": "Groups and planes that no heat passes.",
        "examples": [["cut face", "x = 0"]],
    },
}


def mesh_section(emissivity: Schema) -> Schema:
    """``[section]`` with ``form = "mesh"``."""
    return {
        "type": "object",
        "properties": {
            "form": {"const": "mesh"},
            "file": {"type": "string", "description": "A mesh file, its path from this file."},
            "length_unit": {"enum": list(keys.LENGTH_UNITS)},
            **_TAKEN,
            "emissivity": emissivity,
        },
        "additionalProperties": False,
        "required": ["form", "file", "length_unit", "sense"],
    }


def outline_section(emissivity: Schema, finest: Schema, place: Schema) -> Schema:
    """``[section]`` with ``form = "outline"``; ``place`` is a coordinate of the slicing plane."""
    direction = {"type": "array", "items": {"type": "number"}, "minItems": 3, "maxItems": 3}
    point = {"type": "array", "items": place, "minItems": 3, "maxItems": 3}
    return {
        "type": "object",
        "properties": {
            "form": {"const": "outline"},
            "file": {
                "type": "string",
                "description": "A .dxf, .step or .stp file, its path from this file.",
            },
            **_TAKEN,
            "length_unit": {
                "enum": list(keys.LENGTH_UNITS),
                "description": "Of a drawing that states none.",
            },
            "layers": {
                "type": "array",
                "items": {"type": "string"},
                "minItems": 1,
                "maxItems": keys.LAYERS_MOST,
                "description": "Layers of a drawing that are read; all that are shown if left out.",
            },
            "slice": {
                "type": "object",
                "description": "The plane of the section through a solid.",
                "properties": {
                    "point": point,
                    "normal": direction,
                    "axis": direction | {"description": "Up in the section; that of rotation."},
                },
                "additionalProperties": False,
                "required": ["point", "normal"],
            },
            "finest": finest,
            "emissivity": emissivity,
        },
        "additionalProperties": False,
        "required": ["form", "file", "sense"],
    }


def paths_of(length: Schema) -> Schema:
    """``[[output.paths]]``; ``length`` is the schema of a coordinate."""
    low, high = keys.PATH_POINTS
    point = {"type": "array", "items": length, "minItems": 1, "maxItems": 3}
    return {
        "type": "array",
        "description": "Straight paths across the section, written into paths.csv.",
        "maxItems": keys.PATHS_MOST,
        "items": {
            "type": "object",
            "properties": {
                "name": {"type": "string", "minLength": 1, "maxLength": keys.LONGEST_NAME},
                "from": point,
                "to": point,
                "points": {"type": "integer", "minimum": low, "maximum": high},
            },
            "additionalProperties": False,
            "required": ["name", "from", "to"],
        },
    }
