"""The words of the case format: its keys, its closed lists, its ranges.

The reader, the writer and the schema for editors take them from here, so that
they cannot differ.
"""

from collections.abc import Mapping

from .case import Form, StageKind

ZERO_DEGC = 273.15

TOP = ("title", "steel", "section", "route", "output", "grid")
LATER: Mapping[str, str] = {
    "need": "Requirements are not judged by this version: take the table out and compare "
    "the summary with them yourself.",
    "load": "The heat of a whole load is not computed by this version: take the table out.",
    "tank": "A tank and its cooler are not computed by this version: take the table out.",
}
STEEL = ("grade", "composition", "file", "heat", "name", "austenite_grain")
STEEL_FROM = ("grade", "composition", "file")
DIMENSIONS: Mapping[Form, tuple[str, ...]] = {
    "slab": ("thickness",),
    "round": ("diameter",),
    "tube": ("outside", "bore"),
    "ball": ("diameter",),
    "bar": ("width", "height"),
    "ring": ("outside", "bore", "height"),
}
OPTIONAL: Mapping[Form, tuple[str, ...]] = {
    "slab": (),
    "round": ("length",),
    "tube": ("bore_medium",),
    "ball": (),
    "bar": (),
    "ring": ("bore_medium",),
}
EMISSIVITY_RANGE = (0.05, 1.0)
ALL_DIMENSIONS = ("thickness", "diameter", "length", "outside", "bore", "width", "height")
STAGES: tuple[StageKind, ...] = ("soak", "transfer", "quench", "hold", "temper")
COOLS: tuple[StageKind, ...] = ("transfer", "quench", "hold")
SOAK = ("stage", "at", "time")
TEMPER = ("stage", "at", "time")
COOLING = ("stage", "medium", "bath", "film", "time", "until", "faces")
MEDIUM = ("medium", "bath", "film")
OUTPUT = ("positions", "fields", "times")
POSITION = ("name", "depth", "at")
GRID = ("cells", "accuracy")
OWN_COMPOSITION = "own composition"

DIMENSION_RANGE = (0.5e-3, 10.0)
WALL_MIN = 0.5e-3
STAGE_TIME_RANGE = (0.1, 30.0 * 86_400.0)
FIELD_TIME_RANGE = (0.0, 30.0 * 86_400.0)
# The thermal properties hold from 250 to 1500 K; a whole number of degC inside.
TEMP_RANGE = (253.15, 1493.15)
SOAK_RANGE = (600.0 + ZERO_DEGC, TEMP_RANGE[1])
TEMPER_COLDEST, TEMPER_HOTTEST = 50.0 + ZERO_DEGC, 727.0 + ZERO_DEGC  # or Ae1 of the steel
GRAIN_RANGE = (-1.0, 14.0)
FIELDS_RANGE = (2, 1000)
CELLS_RANGE = (4, 5000)
CELLS_MOST = 1_000_000
ACCURACY_RANGE = (0.01, 20.0)
STAGES_MOST = 50
PLACES_MOST = 200
TIMES_MOST = 1000
LONGEST_NAME = 60
LONGEST_TITLE = 200
