"""Carbon of a slowly cooled steel from its proeutectoid ferrite or cementite.

Model
-----
The lever rule at Ae1, solved for carbon. With ``f`` by mass, ``x`` the carbon of
the austenite that becomes pearlite: ``C = x - f (x - x_ferrite)`` below the
eutectoid, ``C = x + f (6.69 - x)`` above. A micrograph shows volume:
``f = V rho / (V rho + (1 - V) rho_pearlite)``. Both steps are monotone, so the
ends of the interval of the count are the ends of the interval of carbon. What is
not known of the eutectoid itself is a second, separate term.

Source
------
Lever rule, boundaries, alloy shifts: `thermo.equilibrium` (derived). Densities at
20 degC: ferrite without carbon 7870 (Miettinen 1997, known at second hand),
cementite 7680 (remembered), pearlite their mixture (derived); alloying moves
ferrite and pearlite alike and is left out. Half-widths of the eutectoid: spread
of textbooks and of our own computation; for alloying the difference between our
shifts and Bain's chart, largest for molybdenum (estimate).

Holds for
---------
Plain and low-alloy steel, 0.03 to 1.5 % C, cooled so slowly that pearlite forms
near Ae1. Faster cooling leaves less than the lever rule: with pearlite at 700
instead of 727 degC, 0.45 % C shows 0.37 of ferrite instead of 0.42 and is read
as 0.49 % C. Which of the two phases was counted, the caller must say: 5 % by
volume is a plain steel of 0.72 % or of 1.05 % C.
"""

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from midradius.thermo import equilibrium as diagram
from midradius.thermo.arrays import Array
from midradius.thermo.equilibrium import Equilibrium, Invariants, equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.pointcount import CountedFraction
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import HARD_BOUNDS, Composition

MODEL = "carbon by the lever rule"
SOURCES = (
    *diagram.SOURCES,
    Source("density of ferrite", "Miettinen 1997", "Met. Mater. Trans. B 28B, 281", "remembered"),
    Source("density of cementite", "textbooks", "7680 kg/m3", "remembered"),
    Source("half-width of the eutectoid", "spread of published values", "-", "estimate"),
)

FERRITE_DENSITY = 7870.0  # kg/m3 at 20 degC
CEMENTITE_DENSITY = 7680.0
HOTTEST_AUSTENITE = 1147.0 + 273.15  # K, the eutectic: no austenite holds more carbon
# Half-widths [mass %]: textbooks 0.76 to 0.77, 0.019 to 0.022, 6.67 to 6.70
EUTECTOID_HALF_WIDTH, FERRITE_HALF_WIDTH, CEMENTITE_HALF_WIDTH = 0.01, 0.003, 0.02
# and of the eutectoid carbon for 1 mass % of an element
ALLOY_HALF_WIDTH = {"Mn": 0.02, "Si": 0.03, "Cr": 0.02, "Ni": 0.02, "Mo": 0.2}

Product = Literal["ferrite", "cementite"]
Basis = Literal["volume", "mass"]
Values = Array | float


@dataclass(frozen=True)
class CarbonEstimate:
    """Carbon [mass %] with the interval that the count alone leaves.

    ``relative_accuracy`` is half that interval over the carbon [-].
    ``invariants_pct`` is the half-width that comes on top, at worst, for what is
    not known of the eutectoid. ``mass_fraction`` is the measured one.
    """

    carbon_pct: float
    low_pct: float
    high_pct: float
    level: float
    relative_accuracy: float
    invariants_pct: float
    mass_fraction: float
    product: Product
    invariants: Invariants
    notes: tuple[RangeNote, ...]


def eutectoid(eq: Equilibrium) -> Invariants:
    """The eutectoid of a steel: where its moved boundaries meet, as slow cooling uses it."""
    return Invariants(
        temp=eq.ae1,
        austenite_pct=eq.eutectoid_carbon_pct,
        ferrite_pct=float(eq.ferrite_solubility(eq.ae1)),
        cementite_pct=diagram.CEMENTITE_CARBON_PCT,
    )


def mass_fraction(carbon_pct: Values, *, product: Product, invariants: Invariants) -> Array:
    """Mass fraction of ``product`` after slow cooling, shape of ``carbon_pct`` [mass %].

    Raises
    ------
    InputFault
        Carbon on the other side of the eutectoid, or beyond the end of the lever.
    """
    point, carbon = invariants, np.asarray(carbon_pct, dtype=np.float64)
    ends = (point.austenite_pct, _far_end(product, point))
    outside = ~((carbon >= min(ends)) & (carbon <= max(ends)))
    if np.any(outside):
        raise InputFault(
            f"carbon beside proeutectoid {product}",
            f"{float(carbon[outside].flat[0]):g} %",
            f"{min(ends):.3f} to {max(ends):.3f} %",
            "The other phase forms on the other side of the eutectoid.",
        )
    return np.asarray((point.austenite_pct - carbon) / (ends[0] - ends[1]))


def carbon_of_fraction(fraction: Values, *, product: Product, invariants: Invariants) -> Array:
    """Carbon [mass %] of a mass ``fraction`` of ``product``, any shape; the inverse.

    Continues the straight line outside 0 to 1: `estimate` is what refuses.
    """
    near = invariants.austenite_pct
    return np.asarray(near - np.asarray(fraction) * (near - _far_end(product, invariants)))


def _far_end(product: Product, point: Invariants) -> float:
    return point.ferrite_pct if product == "ferrite" else point.cementite_pct


def pearlite_density(carbon_pct: float) -> float:
    """Density [kg/m3] of ferrite without carbon and cementite that hold ``carbon_pct``."""
    share = carbon_pct / diagram.CEMENTITE_CARBON_PCT
    return 1.0 / ((1.0 - share) / FERRITE_DENSITY + share / CEMENTITE_DENSITY)


def mass_of_volume(volume: Values, *, product: Product, pearlite_pct: float) -> Array:
    """Mass fraction of ``product`` from its volume fraction, the rest pearlite; any shape."""
    return _weighed(volume, _density(product) / pearlite_density(pearlite_pct))


def volume_of_mass(mass: Values, *, product: Product, pearlite_pct: float) -> Array:
    """Volume fraction of ``product`` from its mass fraction, the rest pearlite; any shape."""
    return _weighed(mass, pearlite_density(pearlite_pct) / _density(product))


def _density(product: Product) -> float:
    return FERRITE_DENSITY if product == "ferrite" else CEMENTITE_DENSITY


def _weighed(fraction: Values, ratio: float) -> Array:
    share = np.asarray(fraction, dtype=np.float64)
    return np.asarray(share * ratio / (share * ratio + (1.0 - share)))


def estimate(
    counted: CountedFraction,
    *,
    composition: Composition,
    product: str | None,
    basis: Basis,
    invariants: Invariants | None = None,
) -> CarbonEstimate:
    """Carbon of a slowly cooled steel from a measured fraction.

    Parameters
    ----------
    counted
        The fraction with its interval: `thermo.pointcount`.
    composition
        Mass percent of the alloying elements; its carbon is not used.
    product
        ``"ferrite"`` or ``"cementite"``, whichever was counted.
    basis
        What ``counted`` is a share of; a point count gives volume.
    invariants
        Another eutectoid than the steel's own, as for one with the customary
        values.

    Raises
    ------
    InputFault
        Product not named (the fault gives both answers), or a fraction that no
        steel can have.
    """
    eq = equilibrium(composition)
    if product not in ("ferrite", "cementite"):
        raise _ambiguous(counted.fraction, eq, product, basis)
    phase: Product = "ferrite" if product == "ferrite" else "cementite"
    point = eutectoid(eq) if invariants is None else invariants
    measured = np.array([counted.fraction, counted.low, counted.high])
    masses = _to_mass(measured, phase, point, basis)
    most = _largest(phase, point, eq)
    if not 0.0 <= masses[0] <= most:
        raise _impossible(phase, float(masses[0]), most)
    carbons = carbon_of_fraction(masses, product=phase, invariants=point)
    low, high = sorted(carbons[1:].tolist())
    carbon = float(carbons[0])
    return CarbonEstimate(
        carbon_pct=carbon,
        low_pct=low,
        high_pct=high,
        level=counted.level,
        relative_accuracy=0.5 * (high - low) / carbon,
        invariants_pct=_half_width(float(masses[0]), phase, composition),
        mass_fraction=float(masses[0]),
        product=phase,
        invariants=point,
        notes=(*counted.notes, *diagram.range_notes(composition), *_carbon_notes(low, high)),
    )


def _to_mass(fraction: Array, product: Product, point: Invariants, basis: Basis) -> Array:
    if basis == "mass":
        return fraction
    return mass_of_volume(fraction, product=product, pearlite_pct=point.austenite_pct)


def _largest(product: Product, point: Invariants, eq: Equilibrium) -> float:
    """Most that the lever gives: all of the steel, or what the richest austenite sheds."""
    if product == "ferrite":
        return 1.0
    richest = float(eq.austenite_vs_cementite(HOTTEST_AUSTENITE))
    return float(mass_fraction(richest, product=product, invariants=point))


def _half_width(mass: float, product: Product, composition: Composition) -> float:
    """Half-width of carbon [mass %] that the invariants leave, all errors the same way."""
    near = EUTECTOID_HALF_WIDTH + sum(
        width * float(getattr(composition, name)) for name, width in ALLOY_HALF_WIDTH.items()
    )
    far = FERRITE_HALF_WIDTH if product == "ferrite" else CEMENTITE_HALF_WIDTH
    return (1.0 - mass) * near + mass * far


def _carbon_notes(low_pct: float, high_pct: float) -> list[RangeNote]:
    least, most = HARD_BOUNDS["C"]
    if least <= low_pct and high_pct <= most:
        return []
    value = f"{low_pct:.3f} to {high_pct:.3f} %"
    return [RangeNote(MODEL, "carbon", value, f"{least:g} to {most:g} %")]


def _ambiguous(fraction: float, eq: Equilibrium, product: str | None, basis: Basis) -> InputFault:
    answers: list[str] = []
    products: tuple[Product, Product] = ("ferrite", "cementite")
    point = eutectoid(eq)
    for phase in products:
        mass = float(_to_mass(np.asarray(fraction), phase, point, basis))
        if 0.0 <= mass <= _largest(phase, point, eq):
            carbon = float(carbon_of_fraction(mass, product=phase, invariants=point))
            answers.append(f"{carbon:.2f} % C if it is {phase}")
    fits = f"This fraction means {', '.join(answers)}." if answers else "No steel has as much."
    return InputFault(
        "proeutectoid phase",
        "not given" if product is None else f'"{product}"',
        "ferrite (below the eutectoid) or cementite (above it)",
        fits,
    )


def _impossible(product: Product, mass: float, most: float) -> InputFault:
    if math.isnan(mass) or product == "ferrite":
        remedy = "Give the share of the whole section."
    else:
        remedy = "More is cast iron, or cementite of pearlite was counted."
    return InputFault(
        f"mass fraction of proeutectoid {product}", f"{mass:.4g}", f"0 to {most:.4g}", remedy
    )
