"""The words of the case format: its keys, its closed lists, its ranges.

The reader, the writer and the schema for editors take them from here, so that
they cannot differ.
"""

from collections.abc import Mapping

from midradius.thermo.phases import PHASE_NAMES
from midradius.thermo.units import Kind

from .case import Form, StageKind

ZERO_DEGC = 273.15

TOP = (
    *("title", "steel", "section", "temperatures", "route", "need", "output", "grid"),
    *("load", "tank", "shift"),
)
STEEL = (
    *("grade", "composition", "file", "heat", "name", "austenite_grain", "calibration"),
    *("kinetics", "transformation"),
)
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
MESH = ("form", "file", "length_unit", "sense", "symmetry", "emissivity")
OUTLINE = (
    *("form", "file", "sense", "length_unit", "layers", "slice", "finest"),
    *("symmetry", "emissivity"),
)
SLICE = ("point", "normal", "axis")
FORMS: tuple[Form, ...] = (*DIMENSIONS, "mesh", "outline")
FINEST_RANGE = (1e-6, 1.0)
PLANE_RANGE = (-1e3, 1e3)
LAYERS_MOST = 100
LENGTH_UNITS = ("m", "cm", "mm", "in", "ft")
EMISSIVITY_RANGE = (0.05, 1.0)
ALL_DIMENSIONS = ("thickness", "diameter", "length", "outside", "bore", "width", "height")
STAGES: tuple[StageKind, ...] = ("heat", "soak", "transfer", "quench", "hold", "temper")
COOLS: tuple[StageKind, ...] = ("transfer", "quench", "hold")
HEAT = ("stage", "medium", "furnace", "from", "ramp", "time", "until")
SOAK = ("stage", "at", "time")
TEMPER = ("stage", "at", "time")
COOLING = ("stage", "medium", "bath", "film", "time", "until", "faces")
MEDIUM = ("medium", "bath", "film")
OUTPUT = ("positions", "fields", "times", "paths", "format", "pictures")
PATH = ("name", "from", "to", "points")
FORMATS = ("vtu", "vtkhdf")
PICTURES = ("charts", "scenes")
POSITION = ("name", "depth", "at")
GRID = ("cells", "accuracy")
NEED = ("position", "quantity", "at_least", "at_most", "between", "to")
DEPTH, FILM, GRAIN = "hardened depth", "cementite film", "grain"
OF_MARTENSITE = "% martensite"
QUANTITIES = ("hardness", "tensile", "yield", *PHASE_NAMES, DEPTH, FILM, GRAIN)
OWN_COMPOSITION = "own composition"

DIMENSION_RANGE = (0.5e-3, 10.0)
WALL_MIN = 0.5e-3
STAGE_TIME_RANGE = (0.1, 30.0 * 86_400.0)
FIELD_TIME_RANGE = (0.0, 30.0 * 86_400.0)
# The thermal properties hold from 250 to 1500 K; a whole number of degC inside.
TEMP_RANGE = (253.15, 1493.15)
SOAK_RANGE = (600.0 + ZERO_DEGC, TEMP_RANGE[1])
FURNACE_RANGE = (100.0 + ZERO_DEGC, 1200.0 + ZERO_DEGC)
RAMP_RANGE = (1.0 / 3600.0, 10.0)
TEMPER_COLDEST, TEMPER_HOTTEST = 50.0 + ZERO_DEGC, 727.0 + ZERO_DEGC  # or Ae1 of the steel
GRAIN_RANGE = (-1.0, 14.0)
FIELDS_RANGE = (2, 1000)
CELLS_RANGE = (4, 5000)
CELLS_MOST = 1_000_000
ACCURACY_RANGE = (0.01, 20.0)
STAGES_MOST = 50
PLACES_MOST = 200
PATHS_MOST = 20
PATH_POINTS = (2, 2001)
TIMES_MOST = 1000
LONGEST_NAME = 60
LONGEST_TITLE = 200
NEEDS_MOST = 100
MARTENSITE_RANGE = (1.0, 99.0)
# Units of a limit and their ranges: those in which thermo.conversion converts.
NEED_UNITS: Mapping[str, Mapping[str, tuple[float, float]]] = {
    "hardness": {"HRC": (20.0, 68.0), "HV": (50.0, 1200.0), "HB": (76.0, 617.0)},
    "tensile": {"MPa": (255.0, 2180.0), "ksi": (37.0, 316.0)},
    "yield": {"MPa": (50.0, 2500.0), "ksi": (8.0, 360.0)},
    **dict.fromkeys(PHASE_NAMES, {"%": (0.0, 100.0)}),
    DEPTH: {"mm": (0.0, 10_000.0), "in": (0.0, 390.0)},
    FILM: {"um": (0.0, 1000.0)},
    GRAIN: {"ASTM": (-3.0, 14.0)},
}
NEED_WHY: Mapping[str, str] = {
    "HRC": "Rockwell C ends there: below 20 HRC ask in HB or HV.",
    "HB": "Brinell ends there: above 617 HB ask in HRC or HV.",
    "MPa": "Strength follows from hardness between these ends only.",
    "ksi": "Strength follows from hardness between these ends only.",
}
LENGTHS: Mapping[str, float] = {"mm": 1e-3, "in": 0.0254}

DAY = 86_400.0
LOAD = ("pieces", "length", "piece_mass", "fixture")
FIXTURE = ("name", "mass", "thickness", "grade")
COOLER = (
    *("power", "conductance", "bath_flow", "coolant", "coolant_flow", "coolant_in"),
    *("arrangement", "start"),
)
COOLANTS = ("water", "air")
ARRANGEMENTS = ("counterflow", "parallel", "crossflow")
SHIFT = ("at", "every", "count", "case", "mass", "from", "thickness", "time")
PIECES_RANGE = (1, 100_000)
PIECE_LENGTH_RANGE = (1e-3, 50.0)
MASS_RANGE = (1e-3, 1e6)
THICKNESS_RANGE = (0.5e-3, 0.5)
FIXTURES_MOST = 20
LOADS_MOST = 200
POWER_RANGE = (1.0, 1e8)
CONDUCTANCE_RANGE = (1.0, 1e7)
FLOW_RANGE = (1e-3, 1e4)
BATH_RANGE = (ZERO_DEGC - 20.0, ZERO_DEGC + 550.0)
COOLANT_RANGE = (ZERO_DEGC - 20.0, ZERO_DEGC + 90.0)
# The quantities of [tank], by name: kind and range.
TANK_QUANTITIES: Mapping[str, tuple[Kind, tuple[float, float]]] = {
    "volume": ("volume", (0.01, 10_000.0)),
    "length": ("length", (0.1, 100.0)),
    "width": ("length", (0.1, 100.0)),
    "depth": ("length", (0.1, 30.0)),
    "filled_at": ("temperature", BATH_RANGE),
    "flash_point": ("temperature", (ZERO_DEGC + 50.0, ZERO_DEGC + 400.0)),
    "bath_limit": ("temperature", BATH_RANGE),
    "rise_limit": ("temperature difference", (0.5, 300.0)),
    "ready_at": ("temperature", BATH_RANGE),
    "freeboard": ("length", (0.0, 3.0)),
    "morning": ("temperature", BATH_RANGE),
    "heater": ("power", POWER_RANGE),
    "heater_set": ("temperature", BATH_RANGE),
    "agitator": ("power", POWER_RANGE),
    "flow": ("volume flow", (1e-5, 100.0)),
    "velocity": ("velocity", (0.01, 10.0)),
    "passage": ("area", (1e-3, 1000.0)),
    "air": ("temperature", (ZERO_DEGC - 20.0, ZERO_DEGC + 60.0)),
    "drag_out": ("volume", (0.0, 100.0)),
    "period": ("duration", (3600.0, 7.0 * DAY)),
}
TANK = (*TANK_QUANTITIES, "fluid_file", "cooler", "layers", "lid", "coupled")
