"""Film coefficient of a surface on its temperature, radiation included.

Model
-----
``q = h(Ts) (Ts - T_ambient)``. Liquids: the curves of ``media``, linear in the
surface temperature and, where a medium has two tables, in the bath temperature.
Gases: ``convection`` plus ``h_r = eps sigma (Ts^2 + Ta^2) (Ts + Ta)`` to
surroundings at the gas temperature.

Source
------
Each medium names its own; ``convection.SOURCES``; radiation is exact for a grey
part in a large enclosure. Emissivity of oxidised steel 0.78-0.82 at 125-525 degC
and 0.89 at 1227 degC: FLIR emissivity table, read.

Holds for
---------
The span of the curve. Beyond it the end value is held and ``beyond`` says so.
"""

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from midradius.fem.convection import Geometry, forced, free
from midradius.fem.filmfile import read_curve
from midradius.fem.media import ZERO_DEGC, Curve, Medium, check_bath, curves
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote

# CODATA 2018, exact; importing scipy.constants for it costs more than it saves.
STEFAN_BOLTZMANN = 5.670374419e-8
SCALED_STEEL = 0.80
"""Emissivity of hot-worked or furnace-scaled steel."""

FAN_SPEED = 5.0
NITROGEN_SPEED = 20.0
_HOTTEST = 1300.0 + ZERO_DEGC
_N_GAS = 65


@dataclass(frozen=True)
class Film:
    """Total film coefficient ``htc`` (n,) [W/(m2 K)] on surface ``temp`` (n,) [K].

    ``temp`` increases strictly. The temperature that the heat flows to is not
    part of the film.
    """

    temp: Array
    htc: Array
    name: str = "film curve"

    def at(self, surface: Array) -> Array:
        """Film coefficient at surface temperatures [K] of any shape; ends held."""
        return np.asarray(np.interp(surface, self.temp, self.htc))


def film(
    medium: Medium,
    *,
    bath: float,
    length: float,
    geometry: Geometry,
    emissivity: float = SCALED_STEEL,
) -> tuple[Film, tuple[RangeNote, ...]]:
    """The film of one medium on one part.

    Parameters
    ----------
    medium
        From ``media.medium``.
    bath
        Temperature of the bath, or of gas and surroundings [K].
    length
        Diameter of a bar or ball, height of a plate [m]; a gas needs it, a
        liquid does not.
    geometry
        What the part looks like to a gas.
    emissivity
        Of the part [-]; used in gases only.

    Returns
    -------
    tuple
        The film, and a note for each model that was left.

    Raises
    ------
    InputFault
        Bath outside the medium's limits, length not positive, emissivity not
        above 0 and up to 1.
    """
    notes = check_bath(medium, bath)
    if medium.kind != "gas":
        return Film(*_from_tables(curves(medium), bath), medium.source.model), notes
    if not 0.0 < length < np.inf:
        raise InputFault("length", f"{length:g} m", "more than 0 m", "Give the diameter or height.")
    if not 0.0 < emissivity <= 1.0:
        raise InputFault(
            "emissivity",
            f"{emissivity:g}",
            "more than 0, and 1 at most",
            "Scaled steel has 0.8, bright steel 0.35 to 0.5.",
        )
    temp = _gas_temps(bath)
    if medium.name == "still air":
        htc, more = free(temp, bath, length=length, geometry=geometry)
    elif medium.name == "fan air":
        htc, more = forced("air", temp, bath, length=length, speed=FAN_SPEED, geometry=geometry)
    else:
        htc, more = forced(
            "nitrogen", temp, bath, length=length, speed=NITROGEN_SPEED, geometry=geometry
        )
    htc = htc + radiation(temp, bath, emissivity=emissivity)
    return Film(temp, htc, medium.source.model), notes + more


def radiation(surface: Array, surroundings: float, *, emissivity: float) -> Array:
    """Radiation as a film coefficient [W/(m2 K)], shape of ``surface`` [K]."""
    squares = surface**2 + surroundings**2
    return np.asarray(emissivity * STEFAN_BOLTZMANN * squares * (surface + surroundings))


def beyond(film: Film, *, coldest: float, hottest: float) -> tuple[RangeNote, ...]:
    """Notes for surface temperatures [K] that left the span of the film."""
    low, high = float(film.temp[0]), float(film.temp[-1])
    allowed = f"{low - ZERO_DEGC:.4g} to {high - ZERO_DEGC:.4g} degC"
    return tuple(
        RangeNote(film.name, "surface temperature", f"{temp - ZERO_DEGC:.4g} degC", allowed)
        for temp, left in ((coldest, coldest < low), (hottest, hottest > high))
        if left
    )


def film_from_csv(path: Path | str) -> Film:
    """A film curve of the user's own: ``surface_degC, htc_W_per_m2K`` in a CSV file.

    Raises
    ------
    InputFault
        The file cannot be read or is not such a curve; the text names the line.
    """
    surface_degC, htc = read_curve(Path(path))
    return Film(surface_degC + ZERO_DEGC, htc, f'film curve "{Path(path).name}"')


def _gas_temps(ambient: float) -> Array:
    # denser near the gas temperature, where free convection falls off steeply
    return ambient + (_HOTTEST - ambient) * np.linspace(0.0, 1.0, _N_GAS) ** 2


def _from_tables(tables: tuple[Curve, ...], bath: float) -> tuple[Array, Array]:
    if not tables:  # insulated
        return np.array([ZERO_DEGC, _HOTTEST]), np.zeros(2)
    temp, htc = _between(tables, bath)
    if bath < temp[0]:  # convection alone holds down to the bath itself
        temp, htc = np.insert(temp, 0, bath), np.insert(htc, 0, htc[0])
    return temp, htc


def _between(tables: tuple[Curve, ...], bath: float) -> tuple[Array, Array]:
    baths = np.array([table.bath for table in tables])
    if len(tables) == 1 or bath <= baths[0]:
        return tables[0].temp, tables[0].htc
    if bath >= baths[-1]:
        return tables[-1].temp, tables[-1].htc
    upper = int(np.searchsorted(baths, bath))
    cold, warm = tables[upper - 1], tables[upper]
    weight = (bath - cold.bath) / (warm.bath - cold.bath)
    temp = np.union1d(cold.temp, warm.temp)
    htc_cold = np.interp(temp, cold.temp, cold.htc)
    htc_warm = np.interp(temp, warm.temp, warm.htc)
    return temp, (1.0 - weight) * htc_cold + weight * htc_warm
