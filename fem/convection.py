"""Convection of a gas on one part: free in still air, forced in a stream.

Model
-----
Free: Churchill & Chu for the horizontal cylinder and the vertical plate,
Churchill for the sphere. Forced: Churchill & Bernstein for the cylinder in
cross flow, the mean of a plate in parallel flow that turns turbulent at
Re = 5e5, Whitaker for the sphere. Properties at the film temperature, the mean
of surface and gas.

Source
------
See ``SOURCES``; gas properties are in ``air.csv`` and ``nitrogen.csv``.

Holds for
---------
Film temperatures 250 to 1200 K. Free: Ra up to 1e12 (sphere 1e11). Forced:
Re 1 to 1e7. A part alone; neighbours in a load change the
flow.
"""

import csv
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Literal

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.source import RangeNote, Source

g = 9.80665  # m/s2, standard gravity
Geometry = Literal["horizontal cylinder", "vertical plate", "sphere"]
Gas = Literal["air", "nitrogen"]

SOURCES = (
    Source(
        "free convection, horizontal cylinder and vertical plate",
        "Churchill & Chu, Int. J. Heat Mass Transfer 18 (1975) 1049 and 1323",
        "as coded in the ht library",
        "read",
    ),
    Source(
        "free convection, sphere",
        "Churchill, Heat Exchanger Design Handbook, 1983",
        "as coded in the ht library",
        "read",
    ),
    Source(
        "forced convection, cylinder in cross flow",
        "Churchill & Bernstein, J. Heat Transfer 99 (1977) 300",
        "as coded in the ht library",
        "read",
    ),
    Source(
        "forced convection, plate in parallel flow",
        "Incropera & DeWitt, Fundamentals of Heat and Mass Transfer",
        "laminar and mixed mean Nusselt number, transition at 5e5",
        "remembered",
    ),
    Source(
        "forced convection, sphere",
        "Whitaker, AIChE J. 18 (1972) 361",
        "without the viscosity ratio: properties at the film temperature",
        "remembered",
    ),
)

REYNOLDS_TRANSITION = 5.0e5
_RAYLEIGH_MAX = {"horizontal cylinder": 1.0e12, "vertical plate": 1.0e12, "sphere": 1.0e11}
_REYNOLDS = (1.0, 1.0e7)
_FILM_TEMP = (250.0, 1200.0)


@dataclass(frozen=True)
class GasTable:
    """Properties of a gas (n,) at ``pressure`` [Pa] on ``temp`` [K].

    ``viscosity`` [Pa s], ``conductivity`` [W/(m K)], ``heat_capacity`` [J/(kg K)],
    ``density`` [kg/m3].
    """

    pressure: float
    temp: Array
    viscosity: Array
    conductivity: Array
    heat_capacity: Array
    density: Array


_PRESSURE: dict[Gas, float] = {"air": 101325.0, "nitrogen": 1.0e6}


def free(
    surface: Array, ambient: float, *, length: float, geometry: Geometry
) -> tuple[Array, tuple[RangeNote, ...]]:
    """Film coefficient of still air [W/(m2 K)], without radiation.

    Parameters
    ----------
    surface
        Surface temperature [K], shape (n,).
    ambient
        Temperature of the air far away [K].
    length
        Diameter of the cylinder or sphere, height of the plate [m].
    geometry
        What the part looks like to the air.

    Returns
    -------
    tuple
        Film coefficient, shape (n,), and notes where the correlation was left.
    """
    import ht

    nusselt_of: dict[Geometry, Callable[[float, float], float]] = {
        "horizontal cylinder": lambda pr, gr: ht.Nu_horizontal_cylinder(
            Pr=pr, Gr=gr, Method="Churchill-Chu"
        ),
        "vertical plate": lambda pr, gr: ht.Nu_free_vertical_plate(
            Pr=pr, Gr=gr, Method="Churchill"
        ),
        "sphere": lambda pr, gr: ht.Nu_sphere_Churchill(Pr=pr, Gr=gr),
    }
    film_temp, mu, k, pr, rho = _at_film("air", surface, ambient)
    grashof = g / film_temp * np.abs(surface - ambient) * length**3 * (rho / mu) ** 2
    correlation = nusselt_of[geometry]
    nusselt = np.array(
        [correlation(float(p), float(gr)) for p, gr in zip(pr, grashof, strict=True)]
    )
    model = f"free convection, {geometry}"
    notes = _outside(model, "film temperature [K]", film_temp, _FILM_TEMP)
    notes += _outside(model, "Rayleigh number", grashof * pr, (0.0, _RAYLEIGH_MAX[geometry]))
    return nusselt * k / length, notes


def forced(
    gas: Gas, surface: Array, ambient: float, *, length: float, speed: float, geometry: Geometry
) -> tuple[Array, tuple[RangeNote, ...]]:
    """Film coefficient of a gas stream [W/(m2 K)], without radiation.

    ``speed`` [m/s] is that of the free stream at the gas's pressure (air at one
    atmosphere, nitrogen at 10 bar absolute); a cylinder is crossed, a plate is
    swept along ``length``. Other parameters and result as in ``free``.
    """
    film_temp, mu, k, pr, rho = _at_film(gas, surface, ambient)
    reynolds = rho * speed * length / mu
    if geometry == "horizontal cylinder":
        nusselt = _cross_flow(reynolds, pr)
    elif geometry == "vertical plate":
        nusselt = plate_nusselt(reynolds, pr)
    else:
        nusselt = sphere_nusselt(reynolds, pr)
    model = f"forced convection, {geometry}"
    notes = _outside(model, "film temperature [K]", film_temp, _FILM_TEMP)
    notes += _outside(model, "Reynolds number", reynolds, _REYNOLDS)
    return nusselt * k / length, notes


def plate_nusselt(reynolds: Array, prandtl: Array) -> Array:
    """Mean Nusselt number [-] of a plate in parallel flow, laminar then turbulent."""
    laminar = 0.664 * np.sqrt(reynolds)
    mixed = 0.037 * reynolds**0.8 - 871.0
    factor = np.where(reynolds <= REYNOLDS_TRANSITION, laminar, mixed)
    return np.asarray(factor * np.cbrt(prandtl))


def sphere_nusselt(reynolds: Array, prandtl: Array) -> Array:
    """Mean Nusselt number [-] of a sphere in a stream."""
    return np.asarray(
        2.0 + (0.4 * np.sqrt(reynolds) + 0.06 * np.cbrt(reynolds) ** 2) * prandtl**0.4
    )


def _cross_flow(reynolds: Array, prandtl: Array) -> Array:
    import ht

    correlation = ht.conv_external.Nu_cylinder_Churchill_Bernstein
    pairs = zip(reynolds, prandtl, strict=True)
    return np.array([correlation(Re=float(re), Pr=float(pr)) for re, pr in pairs])


def _at_film(gas: Gas, surface: Array, ambient: float) -> tuple[Array, Array, Array, Array, Array]:
    table = gas_table(gas)
    film_temp = 0.5 * (surface + ambient)

    def at(column: Array) -> Array:
        return np.asarray(np.interp(film_temp, table.temp, column))

    mu, k, cp = at(table.viscosity), at(table.conductivity), at(table.heat_capacity)
    # density times temperature is nearly constant in a gas: interpolated without a kink
    rho = at(table.density * table.temp) / film_temp
    return film_temp, mu, k, mu * cp / k, rho


def _outside(
    model: str, quantity: str, values: Array, limits: tuple[float, float]
) -> tuple[RangeNote, ...]:
    low, high = limits
    worst = [
        value
        for value, left in (
            (float(values.min()), values.min() < low),
            (float(values.max()), values.max() > high),
        )
        if left
    ]
    allowed = f"{low:.4g} to {high:.4g}"
    return tuple(RangeNote(model, quantity, f"{value:.3g}", allowed) for value in worst)


@cache
def gas_table(gas: Gas) -> GasTable:
    """The shipped property table of a gas, read once."""
    text = files("midradius.fem").joinpath(f"{gas}.csv").read_text(encoding="utf-8")
    rows = list(csv.DictReader(text.splitlines()))

    def column(name: str, unit: float) -> Array:
        values = np.array([float(row[name]) for row in rows]) * unit
        values.flags.writeable = False  # shared through the cache
        return values

    return GasTable(
        pressure=_PRESSURE[gas],
        temp=column("temp_K", 1.0),
        viscosity=column("viscosity_uPa_s", 1.0e-6),
        conductivity=column("conductivity_mW_per_mK", 1.0e-3),
        heat_capacity=column("heat_capacity_J_per_kgK", 1.0),
        density=column("density_kg_per_m3", 1.0),
    )
