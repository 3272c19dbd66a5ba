"""How far the model was off where somebody has measured, by class of steel.

Model
-----
Each row of ``uncertainty.csv`` holds the absolute errors of one class of steel in one
set of published readings: number, median, 90th percentile, worst. The percentile is
the ``ceil(0.9 (n + 1))``-th smallest of ``n`` errors: a further reading of the same
kind errs less with a chance of at least 90 %, whatever the shape of the errors. It
needs 9 readings; below that the cell is empty and the quantity counts as not
measured. Where two sets exist the wider one rules. What is not measured has a wider
figure, marked as an estimate (below, each with its reason).

Source
------
Order statistics: Wilks, Ann. Math. Statist. 12 (1941) 91. Limits of an alloyed steel:
EN 10020, table 1. Both remembered. The readings: tests/published, where
``measure_uncertainty.py`` writes the table from runs of the whole job.

Holds for
---------
Parts as cooled from the austenite, and tempered ones of the class that has such
readings. The error of a film that is not the named one (an
old oil, a packed load) is in it only as far as the readings had such films.
"""

import csv
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from importlib import resources

from midradius.thermo.source import Source
from midradius.thermo.steel import Composition

SOURCE = Source("error against published readings", "uncertainty.csv", "by class", "derived")

PLAIN = "plain carbon below 0.6 % C"
HIGH_CARBON = "plain carbon of 0.6 % C and more"
ALLOY = "Cr, CrMo and NiCrMo of 0.25 to 0.6 % C"
CASE_HARDENING = "alloy steel below 0.25 % C"
OTHER = "other"
CLASSES = (PLAIN, HIGH_CARBON, ALLOY, CASE_HARDENING, OTHER)
CASE_HARDENING_PCT, HIGH_CARBON_PCT = 0.25, 0.6
# Above one of these a steel is alloyed, mass % [EN 10020, remembered]
ALLOYED_PCT = {"Cr": 0.30, "Ni": 0.30, "Mo": 0.08}
ALLOYED_OTHERWISE_PCT = {"Mn": 1.65, "Si": 0.60, "V": 0.10, "B": 0.0008, "W": 0.30, "Co": 0.30}
TEMPERED, AS_COOLED = "tempered", "as cooled"

# Estimates. A class without readings is taken to be twice as far off as alloy steels.
UNMEASURED_TIMES = 2.0
# ISO 18265 gives strength from hardness as a mean of many steels (% of the strength).
CONVERSION_PCT = 5.0
# Yield follows from hardness or from Gladman's equation, checked on four bars only.
YIELD_PCT = 15.0
# Rates are known to a factor 2 in time; with the exponent 2 of the rate law that is a
# factor 4 in the logarithm of what is left: 1 - f goes to the powers 4 and 1/4.
FRACTION_POWER = 4.0
FRACTION_FLOOR = 0.01
# A film of cementite by a diffusion model with one constant for all steels.
FILM_TIMES = 3.0
FILM_FLOOR_UM = 0.05
# Grain numbers: a fine-grain steel stays finer than the growth law says.
GRAIN_COARSER, GRAIN_FINER = 1.5, 3.0
GRAIN_READ = 0.5  # of a grain number that the case gives: it is read to half a number


@dataclass(frozen=True)
class Measured:
    """One row of the table; ``p90`` is None with fewer than 9 readings."""

    steel_class: str
    quantity: str
    unit: str
    n: int
    median: float
    p90: float | None
    worst: float
    condition: str
    data: str
    how: str
    measured_on: str
    status: str


@dataclass(frozen=True)
class Spread:
    """How far the truth may lie below and above a computed value, at 90 %."""

    below: float
    above: float
    basis: str
    measured: bool


def steel_class(composition: Composition) -> str:
    """The class of a steel whose errors count for it."""
    amounts = composition.as_dict()
    if any(amounts[name] >= limit for name, limit in ALLOYED_OTHERWISE_PCT.items()):
        return OTHER
    high = composition.C >= HIGH_CARBON_PCT
    if any(amounts[name] >= limit for name, limit in ALLOYED_PCT.items()):
        if composition.C < CASE_HARDENING_PCT:
            return CASE_HARDENING
        return OTHER if high else ALLOY
    return HIGH_CARBON if high else PLAIN


def percentile_90(errors: Sequence[float]) -> float | None:
    """The error that a further reading stays below with a chance of 90 %; None below n = 9."""
    ranked = sorted(abs(error) for error in errors)
    place = math.ceil(0.9 * (len(ranked) + 1))
    return ranked[place - 1] if place <= len(ranked) else None


@cache
def rows() -> tuple[Measured, ...]:
    """The shipped table."""
    path = resources.files("midradius.study").joinpath("uncertainty.csv")
    table = csv.DictReader(path.read_text(encoding="utf-8").splitlines())
    return tuple(
        Measured(
            steel_class=row["steel_class"],
            quantity=row["quantity"],
            unit=row["unit"],
            n=int(row["n"]),
            median=float(row["median"]),
            p90=float(row["p90"]) if row["p90"] else None,
            worst=float(row["worst"]),
            condition=row["condition"],
            data=row["data"],
            how=row["how"],
            measured_on=row["measured_on"],
            status=row["status"],
        )
        for row in table
    )


def widest(
    steel_class: str, quantity: str, unit: str, condition: str = AS_COOLED
) -> Measured | None:
    """The row with the largest 90th percentile, None where none has one."""
    wanted = (steel_class, quantity, unit, condition)
    known = [
        row
        for row in rows()
        if (row.steel_class, row.quantity, row.unit, row.condition) == wanted
        and row.p90 is not None
    ]
    return max(known, key=lambda row: row.p90 or 0.0, default=None)


def hardness(composition: Composition, unit: str, value: float, *, condition: str) -> Spread:
    """Of a hardness ``value`` in HRC, or in HV or HB where the error goes with the value."""
    kind = "HRC" if unit == "HRC" else "%"
    figure, basis, known = _hardness_figure(composition, kind, condition)
    error = figure if kind == "HRC" else 0.01 * figure * value
    return Spread(error, error, basis, known)


def _hardness_figure(
    composition: Composition, kind: str, condition: str
) -> tuple[float, str, bool]:
    """Error in HRC or percent, its basis, and whether it was measured."""
    own = steel_class(composition)
    found = widest(own, "hardness", kind, condition)
    if found and found.p90 is not None:
        return found.p90, _basis(found), True
    alloy = [widest(ALLOY, "hardness", kind, known) for known in (AS_COOLED, condition)]
    figure = max((UNMEASURED_TIMES * (row.p90 or 0.0) for row in alloy if row), default=math.inf)
    hard = HIGH_CARBON if composition.C >= HIGH_CARBON_PCT else own
    worse = widest(hard, "hardness", kind)
    figure = max(
        figure, (worse.p90 or 0.0) if worse else 0.0, _seen(own, "hardness", kind, condition)
    )
    basis = (
        f"not measured on 9 readings ({own}, {condition}): a wider estimate, {figure:.3g} {kind}"
    )
    return figure, basis, False


def _seen(steel_class: str, quantity: str, unit: str, condition: str) -> float:
    """The worst error however few the readings: no estimate is narrower."""
    wanted = (steel_class, quantity, unit, condition)
    seen = [
        row.worst
        for row in rows()
        if (row.steel_class, row.quantity, row.unit, row.condition) == wanted
    ]
    return max(seen, default=0.0)


def tensile(composition: Composition, value: float, *, condition: str) -> Spread:
    """Of a tensile strength, in its unit: the error of the hardness and of its conversion."""
    figure, basis, known = _tensile_figure(composition, condition)
    return Spread(0.01 * figure * value, 0.01 * figure * value, basis, known)


def yield_strength(composition: Composition, value: float, *, condition: str) -> Spread:
    """Of a yield strength, in its unit: that of the tensile strength and of the ratio."""
    own = steel_class(composition)
    found = widest(own, "yield", "%", condition)
    if found and found.p90 is not None:
        return Spread(0.01 * found.p90 * value, 0.01 * found.p90 * value, _basis(found), True)
    figure = math.hypot(_tensile_figure(composition, condition)[0], YIELD_PCT)
    figure = max(figure, _seen(own, "yield", "%", condition))
    basis = f"not measured on 9 readings ({own}, {condition}): a wider estimate, {figure:.3g} %"
    return Spread(0.01 * figure * value, 0.01 * figure * value, basis, False)


def _tensile_figure(composition: Composition, condition: str) -> tuple[float, str, bool]:
    """Error in percent, its basis, and whether it was measured."""
    own = steel_class(composition)
    found = widest(own, "tensile", "%", condition)
    if found and found.p90 is not None:
        return found.p90, _basis(found), True
    of_hardness, _, _ = _hardness_figure(composition, "%", condition)
    figure = max(math.hypot(of_hardness, CONVERSION_PCT), _seen(own, "tensile", "%", condition))
    basis = f"not measured on 9 readings ({own}, {condition}): a wider estimate, {figure:.3g} %"
    return figure, basis, False


def _basis(row: Measured) -> str:
    return (
        f"measured: 90 % of {row.n} readings within {row.p90:.3g} {row.unit}"
        f" ({row.data}, {row.steel_class})"
    )


def fraction(value: float, *, hardened: bool) -> Spread:
    """Of a phase fraction [-]; ``hardened``: martensite, what the other products leave."""
    small = min(max(1.0 - value if hardened else value, 0.0), 1.0)
    high = 1.0 - (1.0 - small) ** FRACTION_POWER
    low = 1.0 - (1.0 - small) ** (1.0 / FRACTION_POWER)
    up, down = max(high - small, FRACTION_FLOOR), max(small - low, FRACTION_FLOOR)
    below, above = (up, down) if hardened else (down, up)
    basis = "not measured for phases: an estimate, rates wrong by a factor 2 in time"
    return Spread(below, above, basis, False)


def cementite_film(value_um: float) -> Spread:
    """Of the thickness of a grain-boundary film [um]."""
    above = max((FILM_TIMES - 1.0) * value_um, FILM_FLOOR_UM)
    below = max((1.0 - 1.0 / FILM_TIMES) * value_um, FILM_FLOOR_UM)
    basis = f"not measured for cementite films: an estimate, a factor {FILM_TIMES:g}"
    return Spread(below, above, basis, False)


def grain(*, given: bool) -> Spread:
    """Of an ASTM grain number; ``given``: by the case, not by the growth law."""
    if given:
        return Spread(GRAIN_READ, GRAIN_READ, "the grain that the case gives, to half", False)
    basis = "not measured for enough grains: an estimate, fine-grain steel stays finer"
    return Spread(GRAIN_COARSER, GRAIN_FINER, basis, False)
