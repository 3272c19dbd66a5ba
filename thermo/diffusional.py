"""How fast ferrite, pearlite, bainite and grain-boundary cementite form.

Model
-----
Isothermal time to the fraction ``X`` of what can form is ``tau0(T) S(X)`` with
``S(X) = int_0^X dx / (x^(0.4(1-x)) (1-x)^(0.4x))``. In rate form the clock
``S`` runs with ``1/tau0(T)``, whatever the path of the temperature: additivity
is exact by construction. Here are the ``1/tau0`` of one steel, those of pearlite on the
shape that `thermo.extension` gives its clock.

Cementite on the grain faces of hypereutectoid austenite takes carbon from its
own grain, a sphere whose surface is held at Acm: ``z = (f/f_max)^2`` follows
``dz/dt = (pi^2 D / R^2)(1 - z)``.

Source
------
Li, Niebuhr, Meekisho & Atteridge, Metall. Mater. Trans. B 29 (1998) 661: rates
(remembered, supported by end-quench bands). Sphere series in the form of
Vermeulen, Ind. Eng. Chem. 45 (1953) 1664 (remembered). Diffusion of carbon:
Agren, Scripta Metall. 20 (1986) 1507 (remembered; agrees with read mobilities).

Holds for
---------
About C 0.1 to 0.6, Mn < 1.8, Si < 0.6, Ni < 3.5, Cr < 1.6, Mo < 0.6 mass %,
ASTM grain 4 to 10 (remembered). Rich carbon, manganese and warm pearlite go on by
`thermo.extension`; without it, and in the bainite start, carbon is held at 0.77 %.
"""

from dataclasses import dataclass
from functools import partial

import numpy as np

from midradius.thermo import extension
from midradius.thermo.arrays import Array
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

GAS_CAL = 1.987  # cal/(mol K), as printed
KELVIN = 273.15
CARBON_CAP_PCT = 0.77
PEARLITE_POWER, PEARLITE_CAL = 3, 27500.0
RESIDUAL_MO_PCT = 0.03  # below it the square root of Mo would act on a residue

SOURCES = (
    Source(
        "ferrite, pearlite, bainite rates",
        "Li, Niebuhr, Meekisho & Atteridge, Metall. Mater. Trans. B 29 (1998)",
        "p. 661, constants",
        "remembered",
    ),
    Source(
        "grain-boundary cementite",
        "Vermeulen, Ind. Eng. Chem. 45 (1953); Agren, Scripta Metall. 20 (1986)",
        "sphere series; carbon diffusion",
        "remembered",
    ),
)

_RANGES = {
    "C": (0.1, 0.6),
    "Mn": (0.0, 1.8),
    "Si": (0.0, 0.6),
    "Ni": (0.0, 3.5),
    "Cr": (0.0, 1.6),
    "Mo": (0.0, 0.6),
}


@dataclass(frozen=True)
class Rates:
    """Clock rates ``1/tau0`` [1/s] of one steel, shape (n_temp,) each."""

    ferrite: Array
    pearlite: Array
    bainite: Array


def bainite_start(composition: Composition) -> float:
    """Bainite start [K] that belongs to the rates (Li et al. 1998)."""
    c = composition
    carbon = min(c.C, CARBON_CAP_PCT)
    return 637.0 - 58.0 * carbon - 35.0 * c.Mn - 15.0 * c.Ni - 34.0 * c.Cr - 41.0 * c.Mo + KELVIN


def rates(
    composition: Composition,
    temp: Array,
    *,
    carbon_pct: float,
    grain_astm: float,
    ae3: float,
    ae1: float,
    extended: bool = True,
) -> Rates:
    """Clock rates of the three diffusional products.

    Parameters
    ----------
    composition
        The steel [mass %].
    temp
        Temperatures [K], shape (n_temp,).
    carbon_pct
        Carbon of the austenite when cooling starts [mass %].
    grain_astm
        Prior austenite grain, ASTM E112 number.
    ae3, ae1
        Equilibrium temperatures of that austenite [K].
    extended
        Whether `thermo.extension` goes on where the regression ends.

    Returns
    -------
    Rates
        ``1/tau0`` [1/s]; zero where there is no driving force.
    """
    c = composition
    carbon = min(carbon_pct, CARBON_CAP_PCT)
    of_carbon = partial(_exponent, carbon=carbon_pct if extended else carbon, extended=extended)
    manganese = extension.manganese_exponent(4.36, c.Mn) if extended else 4.36 * c.Mn
    molybdenum = c.Mo if c.Mo >= RESIDUAL_MO_PCT else 0.0
    ferrite = np.exp(
        1.00
        + of_carbon(6.31)
        + 1.78 * c.Mn
        + 0.31 * c.Si
        + 1.12 * c.Ni
        + 2.70 * c.Cr
        + 4.06 * molybdenum
    )
    pearlite = np.exp(
        -4.25
        + of_carbon(4.12)
        + manganese
        + 0.44 * c.Si
        + 1.71 * c.Ni
        + 3.33 * c.Cr
        + 5.19 * np.sqrt(molybdenum)
    )
    bainite = np.exp(
        -10.23 + of_carbon(10.18) + 0.85 * c.Mn + 0.55 * c.Ni + 0.90 * c.Cr + 0.36 * molybdenum
    )
    start = bainite_start(Composition(**{**vars(c), "C": carbon}))
    by_pearlite = _clock(temp, ae1, PEARLITE_POWER, PEARLITE_CAL, 0.32 * grain_astm, pearlite)
    if extended:
        share = extension.pearlite_share(
            ae1 - temp, c, power=PEARLITE_POWER, activation=PEARLITE_CAL / GAS_CAL
        )
        by_pearlite = by_pearlite * share * extension.pearlite_pace()
    return Rates(
        ferrite=_clock(temp, ae3, 3, 23500.0, 0.41 * grain_astm, ferrite),
        pearlite=by_pearlite,
        bainite=_clock(temp, start, 2, 27500.0, 0.29 * grain_astm, bainite),
    )


def _exponent(coefficient: float, *, carbon: float, extended: bool) -> float:
    return extension.carbon_exponent(coefficient, carbon) if extended else coefficient * carbon


def _clock(
    temp: Array, top: float, power: int, activation_cal: float, grain: float, factor: float
) -> Array:
    undercooling = np.maximum(top - temp, 0.0)
    clock: Array = (
        2.0**grain * undercooling**power * np.exp(-activation_cal / (GAS_CAL * temp)) / factor
    )
    return clock


def carbon_diffusivity(temp: Array, carbon_pct: Array | float) -> Array:
    """Diffusion coefficient of carbon in austenite [m2/s] (Agren 1986).

    ``temp`` [K] and ``carbon_pct`` [mass %] broadcast against each other.
    """
    carbon = np.asarray(carbon_pct, dtype=np.float64)
    atoms = carbon / 12.011
    fraction = atoms / (atoms + (100.0 - carbon) / 55.845)
    y = fraction / (1.0 - fraction)
    diffusivity: Array = (
        4.53e-7
        * (1.0 + y * (1.0 - y) * 8339.9 / temp)
        * np.exp(-(1.0 / temp - 2.221e-4) * (17767.0 - 26436.0 * y))
    )
    return diffusivity


def cementite_rate(temp: Array, *, carbon_pct: float, grain_intercept: float) -> Array:
    """Rate ``pi^2 D / R^2`` [1/s] of the grain-face film, shape of ``temp``.

    ``grain_intercept`` is the mean intercept [m]; the sphere that a film feeds
    from has R = 0.75 of it.
    """
    radius = 0.75 * grain_intercept
    return np.pi**2 * carbon_diffusivity(temp, carbon_pct) / radius**2


def range_notes(composition: Composition, carbon_pct: float, grain_astm: float) -> list[RangeNote]:
    """Where the rates are used outside the range of their regression."""
    notes = []
    for element, (low, high) in _RANGES.items():
        value = carbon_pct if element == "C" else getattr(composition, element)
        if not low <= value <= high:
            notes.append(
                RangeNote(SOURCES[0].model, element, f"{value:g} %", f"{low:g} to {high:g} %")
            )
    if not 4.0 <= grain_astm <= 10.0:
        notes.append(RangeNote(SOURCES[0].model, "grain", f"ASTM {grain_astm:.1f}", "ASTM 4 to 10"))
    return notes
