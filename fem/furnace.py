"""The media that a part is heated in, and their films.

Model
-----
``q = h(Ts) (Ts - T_furnace)``: free convection of air, a stream across the part,
a constant coefficient, or none, plus radiation to walls at the furnace temperature,
``h_r = eps sigma (Ts^2 + Tf^2) (Ts + Tf)``. A furnace that rises is taken in
pieces of ``PIECE`` with the film of the middle of each.

Source
------
``furnaces.csv`` names work, locator and status of each medium; correlations in
:mod:`convection`, radiation in :mod:`surface`.

Holds for
---------
A single part that sees walls all round, furnace gas and walls at one temperature,
the furnace strong enough to keep it. Packed loads shade each other: an effective
emissivity of 0.4 to 0.6 stands for them (estimate).
"""

import csv
import difflib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Literal, cast

import numpy as np

from midradius.fem.convection import Geometry, forced, free
from midradius.fem.surface import Film, radiation
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source, Status

ZERO_DEGC = 273.15
PIECE = 25.0  # K of a rising furnace that share one film
_COLDEST, _HOTTEST = 240.0, 1500.0

Convection = Literal["free", "stream", "constant", "none"]


@dataclass(frozen=True)
class FurnaceMedium:
    """One heating medium: what it does to a surface, and which furnaces it is meant for.

    ``speed`` [m/s] of a stream, ``htc`` [W/(m2 K)] of a constant film, 0 where there is
    none; ``coldest`` and ``hottest`` [K] bound the furnace; ``uncertainty_pct`` is half
    the width of the band on the film for a single part.
    """

    name: str
    convection: Convection
    speed: float
    htc: float
    radiates: bool
    coldest: float
    hottest: float
    uncertainty_pct: float
    source: Source
    cautions: tuple[str, ...] = ()


def furnace_names() -> tuple[str, ...]:
    """All heating media, in the order in which a person would look for them."""
    return tuple(known.name for known in _media().values())


def furnace_medium(name: str) -> FurnaceMedium:
    """The heating medium of that name; case and blanks do not matter.

    Raises
    ------
    InputFault
        No such medium; the remedy names the nearest one, or all.
    """
    by_key = _media()
    key = _key(name)
    if key in by_key:
        return by_key[key]
    near = [known for known in by_key if known.startswith(key)] if key else []
    near = near or difflib.get_close_matches(key, by_key, n=2, cutoff=0.6)
    listed = "; ".join(furnace_names())
    remedy = f"Choose one of: {listed}."
    if near:
        remedy = "Did you mean " + " or ".join(f'"{by_key[known].name}"' for known in near) + "?"
    raise InputFault("medium", f'"{name}"', "a medium that heats", remedy)


def furnace_film(
    medium: FurnaceMedium, *, furnace: float, length: float, geometry: Geometry, emissivity: float
) -> tuple[Film, tuple[RangeNote, ...]]:
    """The film of a part in a furnace at ``furnace`` [K].

    ``length`` [m] is the diameter of a bar or ball, the height of a plate;
    ``emissivity`` [-] acts where walls radiate. Notes say where a correlation was left.
    """
    temp = _surface_temps(furnace)
    notes: tuple[RangeNote, ...] = ()
    htc = np.full(temp.shape, medium.htc)
    seen = temp <= furnace + PIECE  # no surface gets hotter: correlations are not asked there
    if medium.convection == "free":
        found, notes = free(temp[seen], furnace, length=length, geometry=geometry)
        htc = np.interp(temp, temp[seen], found)
    elif medium.convection == "stream":
        found, notes = forced(
            "air", temp[seen], furnace, length=length, speed=medium.speed, geometry=geometry
        )
        htc = np.interp(temp, temp[seen], found)
    if medium.radiates:
        htc = htc + radiation(temp, furnace, emissivity=emissivity)
    return Film(temp, htc, medium.source.model), notes


@dataclass(frozen=True)
class Rise:
    """The furnace over a piece of time: from ``begin`` to ``end`` [K] in ``span`` [s].

    ``span`` is None for the last piece, which lasts as long as the stage does.
    """

    begin: float
    end: float
    span: float | None


def rises(furnace: float, *, start: float, ramp: float | None) -> tuple[Rise, ...]:
    """The pieces of a furnace that rises by ``ramp`` [K/s] from ``start`` to ``furnace`` [K].

    Without a ramp it is at ``furnace`` from the first moment.
    """
    if ramp is None or furnace <= start:
        return (Rise(furnace, furnace, None),)
    count = int(np.ceil((furnace - start) / PIECE))
    ends = np.linspace(start, furnace, count + 1)
    span = (furnace - start) / count / ramp
    climbing = [Rise(float(a), float(b), span) for a, b in zip(ends[:-1], ends[1:], strict=True)]
    return (*climbing, Rise(furnace, furnace, None))


def _surface_temps(furnace: float) -> Array:
    # denser near the furnace temperature, where free convection falls off steeply
    below = furnace - (furnace - _COLDEST) * np.linspace(1.0, 0.0, 41) ** 2
    return np.unique(np.concatenate([below, furnace + np.array([5.0, PIECE]), [_HOTTEST]]))


def _key(name: str) -> str:
    return "".join(name.lower().split())


@cache
def _media() -> dict[str, FurnaceMedium]:
    text = files("midradius.fem").joinpath("furnaces.csv").read_text(encoding="utf-8")
    return {_key(row["medium"]): _medium(row) for row in csv.DictReader(text.splitlines())}


def _medium(row: dict[str, str]) -> FurnaceMedium:
    name = row["medium"]
    return FurnaceMedium(
        name=name,
        convection=cast(Convection, row["convection"]),
        speed=float(row["stream_m_per_s"] or 0.0),
        htc=float(row["htc_W_per_m2K"] or 0.0),
        radiates=row["radiation"] == "yes",
        coldest=float(row["furnace_min_degC"]) + ZERO_DEGC,
        hottest=float(row["furnace_max_degC"]) + ZERO_DEGC,
        uncertainty_pct=float(row["uncertainty_pct"]),
        source=Source(
            f'film coefficient of "{name}"',
            row["work"],
            row["locator"],
            cast(Status, row["status"]),
        ),
        cautions=tuple(part for part in row["cautions"].split(" | ") if part),
    )
