"""What fills a quench tank: density, heat capacity and heat content on temperature.

Model
-----
Mineral oil of specific gravity s at 15.6 degC, T in degC:
``cp = (1.685 + 0.0034 T) / sqrt(s)`` kJ/(kg K), ``k = 0.1172 (1 - 0.00054 T) / s``
W/(m K), ``density = 1000 s - 0.65 (T - 15)`` kg/m3. Other fluids: tables, linear
between their points. The heat content is the integral of cp from 0 degC.

Source
------
Oil: Cragoe, NBS Misc. Publ. 97, 1929 (remembered). ``fluids_list.csv`` and
``fluids.csv`` name a work, a locator and a status in every row.

Holds for
---------
The span of each table; oil 0 to 260 degC. Beyond it density and cp keep their end
values, so that a bath that runs away can be followed, and ``range_notes`` says so.
Flash points are those of usual oils, not of yours: take it from the data sheet.
"""

import csv
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Literal, cast

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source, Status

ZERO_DEGC = 273.15
FluidKind = Literal["oil", "water", "brine", "polymer", "salt"]
KINDS: tuple[FluidKind, ...] = ("oil", "water", "brine", "polymer", "salt")
AQUEOUS: tuple[FluidKind, ...] = ("water", "brine", "polymer")

SOURCES = (
    Source(
        "density and heat of mineral oil",
        "Cragoe 1929, NBS Misc. Publ. 97",
        "cp, k, density",
        "remembered",
    ),
    Source("density and heat of water", "IAPWS formulation, by CoolProp 8.0", "1 atm", "derived"),
    Source("density and heat of brine", "Melinder 2010, by CoolProp 8.0", "10 % NaCl", "derived"),
    Source("density and heat of polymer and salt baths", "fluids.csv", "by row", "remembered"),
)

OIL_SPAN_DEGC = (0.0, 260.0)
_OIL_EXPANSION = 0.65  # kg/m3 per K
# Even grid of the heat content, wide enough for a bath that runs away.
_GRID = np.arange(-50.0, 900.25, 0.25) + ZERO_DEGC


@dataclass(frozen=True)
class Fluid:
    """One fluid on its temperatures.

    ``temp`` (n,) [K] ascending with ``density`` [kg/m3], ``heat_capacity``
    [J/(kg K)] and ``conductivity`` [W/(m K)] (nan where not known), (n,) each.
    ``flash`` [K] is None where there is none, ``flash_given`` says that it is of this very
    oil and not only usual for its kind. ``work_min`` to ``work_max`` [K] is
    the usual working range, ``rise_usual`` [K] the usual limit of one load.
    """

    name: str
    kind: FluidKind
    temp: Array
    density: Array
    heat_capacity: Array
    conductivity: Array
    source: Source
    flash: float | None = None
    flash_given: bool = False
    work_min: float = ZERO_DEGC
    work_max: float = ZERO_DEGC + 100.0
    rise_usual: float = 40.0
    viscosity_40: float | None = None

    @property
    def aqueous(self) -> bool:
        """Whether water evaporates from its surface."""
        return self.kind in AQUEOUS

    def density_at(self, temp: Array | float) -> Array:
        """Density [kg/m3] at temperatures [K] of any shape; the ends hold."""
        return np.asarray(np.interp(temp, self.temp, self.density))

    def heat_capacity_at(self, temp: Array | float) -> Array:
        """Heat capacity [J/(kg K)] at temperatures [K] of any shape; the ends hold."""
        return np.asarray(np.interp(temp, self.temp, self.heat_capacity))

    def enthalpy(self, temp: Array | float) -> Array:
        """Heat content above 0 degC [J/kg] at temperatures [K] of any shape."""
        return np.asarray(np.interp(temp, _GRID, _content(self)))

    def temp_of(self, enthalpy: Array | float) -> Array:
        """The temperature [K] of a heat content [J/kg], inverse of :meth:`enthalpy`."""
        return np.asarray(np.interp(enthalpy, _content(self), _GRID))


def oil(
    specific_gravity: float,
    *,
    name: str = "mineral oil",
    source: Source = SOURCES[0],
    flash: float | None = None,
) -> Fluid:
    """A mineral oil of that specific gravity (0.8 to 1.0)."""
    s = specific_gravity
    celsius = np.linspace(*OIL_SPAN_DEGC, 27)
    return Fluid(
        name=name,
        kind="oil",
        temp=celsius + ZERO_DEGC,
        density=1000.0 * s - _OIL_EXPANSION * (celsius - 15.0),
        heat_capacity=1e3 * (1.685 + 0.0034 * celsius) / np.sqrt(s),
        conductivity=0.1172 * (1.0 - 0.00054 * celsius) / s,
        source=source,
        flash=flash,
        work_min=40.0 + ZERO_DEGC,
        work_max=80.0 + ZERO_DEGC,
    )


def names() -> tuple[str, ...]:
    """All shipped fluids."""
    return tuple(_fluids())


def fluid(name: str) -> Fluid:
    """The shipped fluid of that name.

    Raises
    ------
    InputFault
        No such fluid.
    """
    found = _fluids().get(name)
    if found is None:
        allowed = "one of: " + "; ".join(names())
        raise InputFault("fluid", f'"{name}"', allowed, "Or give a file of your own.")
    return found


def of_medium(medium: str) -> Fluid | None:
    """What a tank of that medium holds; None for a gas."""
    for start, name in _OF_MEDIUM.items():
        if medium.startswith(start):
            return fluid(name)
    return None


def range_notes(fluid: Fluid, *, coldest: float, hottest: float) -> tuple[RangeNote, ...]:
    """Notes for bath temperatures [K] beyond the fluid's table."""
    low, high = float(fluid.temp[0]), float(fluid.temp[-1])
    allowed = f"{low - ZERO_DEGC:.4g} to {high - ZERO_DEGC:.4g} degC"
    return tuple(
        RangeNote(f"properties of {fluid.name}", "bath", f"{t - ZERO_DEGC:.4g} degC", allowed)
        for t, left in ((coldest, coldest < low - 0.5), (hottest, hottest > high + 0.5))
        if left
    )


_OF_MEDIUM: Mapping[str, str] = {
    "mineral oil": "medium quench oil",
    "slow oil": "slow quench oil",
    "fast oil": "fast quench oil",
    "water": "water",
    "brine": "brine",
    "polymer 10 %": "polymer 10 %",
    "polymer 20 %": "polymer 20 %",
    "nitrate salt": "nitrate salt",
}
_CONTENT: dict[int, tuple[Fluid, Array]] = {}


def _content(fluid: Fluid) -> Array:
    """Heat content on the even grid; kept, since a bath asks for it at every step."""
    kept = _CONTENT.get(id(fluid))
    if kept is None or kept[0] is not fluid:
        cp = fluid.heat_capacity_at(_GRID)
        total = np.concatenate([[0.0], np.cumsum(0.5 * (cp[1:] + cp[:-1]) * np.diff(_GRID))])
        kept = fluid, total - np.interp(ZERO_DEGC, _GRID, total)
        _CONTENT[id(fluid)] = kept
    return kept[1]


def _rows(file: str) -> Iterable[dict[str, str]]:
    text = files("midradius.fem").joinpath(file).read_text(encoding="utf-8")
    return csv.DictReader(text.splitlines())


@cache
def _fluids() -> dict[str, Fluid]:
    points: dict[str, list[dict[str, str]]] = {}
    for row in _rows("fluids.csv"):
        points.setdefault(row["fluid"], []).append(row)
    return {row["fluid"]: _fluid(row, points) for row in _rows("fluids_list.csv")}


def _fluid(row: Mapping[str, str], points: Mapping[str, list[dict[str, str]]]) -> Fluid:
    name = row["fluid"]
    made = Source(f"properties of {name}", row["work"], row["locator"], cast(Status, row["status"]))
    kelvin = {
        key: float(row[f"{key}_degC"]) + ZERO_DEGC if row[f"{key}_degC"] else None
        for key in ("flash", "work_min", "work_max")
    }
    if row["specific_gravity"]:
        base = oil(float(row["specific_gravity"]))
        temp, density, cp, conductivity = (
            base.temp,
            base.density,
            base.heat_capacity,
            base.conductivity,
        )
    else:
        table = points[name]
        temp = np.array([float(r["temp_degC"]) + ZERO_DEGC for r in table])
        density = np.array([float(r["density_kg_per_m3"]) for r in table])
        cp = np.array([float(r["heat_capacity_J_per_kgK"]) for r in table])
        conductivity = np.array([float(r["conductivity_W_per_mK"] or "nan") for r in table])
        first = table[0]
        made = Source(
            f"properties of {name}",
            first["work"],
            first["locator"],
            cast(Status, first["status"]),
        )
    viscosity = row["viscosity_40_mm2_per_s"]
    return Fluid(
        name=name,
        kind=cast(FluidKind, row["kind"]),
        temp=temp,
        density=density,
        heat_capacity=cp,
        conductivity=conductivity,
        source=made,
        flash=kelvin["flash"],
        work_min=kelvin["work_min"] or ZERO_DEGC,
        work_max=kelvin["work_max"] or ZERO_DEGC,
        rise_usual=float(row["rise_usual_K"]),
        viscosity_40=float(viscosity) * 1e-6 if viscosity else None,
    )
