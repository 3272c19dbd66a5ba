"""The media that a part is cooled in, by the names that a heat treater uses.

Model
-----
A liquid is a curve of the film coefficient on the surface temperature, linear
between the knots of ``media.csv``. A gas has no table: ``surface`` computes it
from correlations for the size of the part. The still and the agitated variant
of a medium are two media; "agitated" is a flow of about 0.5 m/s past the part.

Source
------
``media_list.csv`` lists the media, ``media.csv`` their curves; each row names
its work, locator and status. Most are engineering estimates. Rows "measured ..."
(Buczek & Telejko 2013, abstract) are kept beside ours for comparison and are not
offered as media, because their bath temperatures were not published with them.

Holds for
---------
A single part. Each medium states its uncertainty and the range of bath
temperatures that its table is meant for; in packed racks allow half as much
again and more.
"""

import csv
import difflib
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Literal, cast

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source, Status

ZERO_DEGC = 273.15

Kind = Literal["liquid", "gas", "ideal"]


@dataclass(frozen=True)
class Medium:
    """One medium and where its film coefficients hold.

    Temperatures are of the bath (or gas) [K]. Outside ``bath_min`` to
    ``bath_max`` the medium is refused; outside ``holds_min`` to ``holds_max``
    the nearest table is used and noted. ``bath_default`` is None where a
    default would be a hidden choice. ``uncertainty_pct`` is half the width of
    the band on the film coefficient for a single part.
    """

    name: str
    kind: Kind
    bath_min: float
    bath_max: float
    bath_default: float | None
    holds_min: float
    holds_max: float
    uncertainty_pct: float
    source: Source
    cautions: tuple[str, ...] = ()


@dataclass(frozen=True)
class Curve:
    """Film coefficient ``htc`` (n,) [W/(m2 K)] on surface ``temp`` (n,) [K] at one bath [K]."""

    bath: float
    temp: Array
    htc: Array


# Agitated oils that have no table of their own: factors on the still table for a
# flow of 0.5 m/s, below, at and above the boiling peak [estimate].
_AGITATED_FROM = {
    "mineral oil, agitated": "mineral oil, still",
    "slow oil, agitated": "slow oil, still",
}
CONVECTION_FACTOR, PEAK_FACTOR, BLANKET_FACTOR = 2.0, 1.15, 1.6


def names() -> tuple[str, ...]:
    """All media, in the order in which a person would look for them."""
    return tuple(known.name for known in _media().values())


def medium(name: str) -> Medium:
    """The medium of that name; case and blanks do not matter.

    Raises
    ------
    InputFault
        No such medium; the remedy names the nearest ones.
    """
    by_key = _media()
    key = _key(name)
    found = by_key.get(key)
    if found is not None:
        return found
    near = [known for known in by_key if known.startswith(key)] if key else []
    near = near or difflib.get_close_matches(key, by_key, n=2, cutoff=0.7)
    remedy = "Give a film curve of your own, or choose a medium of the list."
    if near:
        remedy = "Did you mean " + " or ".join(f'"{by_key[known].name}"' for known in near) + "?"
    allowed = "one of: " + "; ".join(names())
    raise InputFault("medium", f'"{name}"', allowed, remedy)


def check_bath(medium: Medium, bath: float) -> tuple[RangeNote, ...]:
    """Refuse a bath [K] that the medium cannot have; note one its table is not meant for.

    Raises
    ------
    InputFault
        ``bath`` lies outside ``bath_min`` to ``bath_max`` or is not a number.
    """
    if not medium.bath_min <= bath <= medium.bath_max:
        raise InputFault(
            "bath",
            f'"{_degC(bath)} degC"',
            f'{_degC(medium.bath_min)} to {_degC(medium.bath_max)} degC for "{medium.name}"',
            "Change the bath temperature, or choose another medium.",
        )
    if medium.holds_min <= bath <= medium.holds_max:
        return ()
    allowed = f"{_degC(medium.holds_min)} to {_degC(medium.holds_max)} degC"
    return (RangeNote(medium.source.model, "bath", f"{_degC(bath)} degC", allowed),)


def curves(medium: Medium) -> tuple[Curve, ...]:
    """The tables of a liquid (or the jet), coldest bath first; none for a gas.

    Agitated oils without a table are made from the still one: knots colder than
    the boiling peak times 2, the peak times 1.15, hotter knots times 1.6.
    """
    still = _AGITATED_FROM.get(medium.name)
    if still is None:
        return _tables().get(medium.name, ())
    return tuple(_agitated(curve) for curve in _tables()[still])


def _agitated(still: Curve) -> Curve:
    peak = int(np.argmax(still.htc))
    knot = np.arange(still.htc.size)
    factor = np.where(knot < peak, CONVECTION_FACTOR, BLANKET_FACTOR)
    factor[peak] = PEAK_FACTOR
    return Curve(still.bath, still.temp, still.htc * factor)


def _key(name: str) -> str:
    return "".join(name.lower().split())


def _rows(file: str) -> Iterable[dict[str, str]]:
    text = files("midradius.fem").joinpath(file).read_text(encoding="utf-8")
    return csv.DictReader(text.splitlines())


@cache
def _media() -> dict[str, Medium]:
    return {_key(row["medium"]): _row_medium(row) for row in _rows("media_list.csv")}


def _row_medium(row: dict[str, str]) -> Medium:
    def kelvin(column: str) -> float:
        return float(row[column]) + ZERO_DEGC

    name = row["medium"]
    return Medium(
        name=name,
        kind=cast(Kind, row["kind"]),
        bath_min=kelvin("bath_min_degC"),
        bath_max=kelvin("bath_max_degC"),
        bath_default=kelvin("bath_default_degC") if row["bath_default_degC"] else None,
        holds_min=kelvin("holds_min_degC"),
        holds_max=kelvin("holds_max_degC"),
        uncertainty_pct=float(row["uncertainty_pct"]),
        source=Source(
            f'film coefficient of "{name}"',
            row["work"],
            row["locator"],
            cast(Status, row["status"]),
        ),
        cautions=tuple(part for part in row["cautions"].split(" | ") if part),
    )


@cache
def _tables() -> dict[str, tuple[Curve, ...]]:
    rows: dict[str, dict[float, list[tuple[float, float]]]] = {}
    for row in _rows("media.csv"):
        by_bath = rows.setdefault(row["medium"], {})
        knots = by_bath.setdefault(float(row["bath_degC"]) + ZERO_DEGC, [])
        knots.append((float(row["surface_degC"]) + ZERO_DEGC, float(row["htc_W_per_m2K"])))
    return {
        name: tuple(_curve(bath, by_bath[bath]) for bath in sorted(by_bath))
        for name, by_bath in rows.items()
    }


def _curve(bath: float, knots: list[tuple[float, float]]) -> Curve:
    temp, htc = np.array(knots, dtype=np.float64).T
    temp.flags.writeable = htc.flags.writeable = False  # shared through the cache
    return Curve(bath, temp, htc)


def _degC(temp: float) -> str:
    return f"{temp - ZERO_DEGC:.4g}"
