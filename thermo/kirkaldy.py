"""How fast ferrite, pearlite and bainite form, by the set of 1984.

Model
-----
Time to the fraction ``X`` of what can form: ``tau0(T) I(X)``, ``I`` with the power 2/3
(`clocks`), that of bainite bent by the alloys. All three run at once and share what is
left, as with the default set; the authors stopped ferrite and pearlite at Bs.

Source
------
Kirkaldy & Venugopalan, in Phase Transformations in Ferrous Alloys, AIME 1984: ferrite,
pearlite, bainite as printed in Saunders & Miodownik, CALPHAD, 1998, eqs. 11.9 to 11.13
(read, from a scan). That copy shows 24.4 Mo for ferrite; 244 stands in Watt et al. 1988
and Li et al. 1998 (remembered) and is taken. Bend of bainite and Bs: remembered.

Holds for
---------
C below 0.7, Mn + Si + Ni + Cr + Mo below 2.75 mass % (printed for the version of 1978).
Steels with none of Mn, Ni, Cr, Mo have no ferrite time here and are refused. Alloy
steels harden too little: 4340 ends at 42 HRC at J8, its band at 52 to 60.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.clocks import Shape
from midradius.thermo.diffusional import GAS_CAL, KELVIN, Rates
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

MOST_CARBON_PCT, MOST_ALLOY_PCT = 0.7, 2.75
POWER = 2.0 / 3.0

SOURCES = (
    Source(
        "ferrite, pearlite, bainite rates (Kirkaldy-Venugopalan 1984)",
        "Saunders & Miodownik, CALPHAD: A Comprehensive Guide, 1998",
        "eqs. 11.9 to 11.13; 244 Mo, bend and Bs from memory",
        "remembered",
    ),
)


def bainite_start(composition: Composition) -> float:
    """Bainite start [K] that belongs to the rates."""
    c = composition
    alloy = 35.0 * c.Mn + 75.0 * c.Si + 15.3 * c.Ni + 34.0 * c.Cr + 41.2 * c.Mo
    return 656.0 - 57.7 * c.C - alloy + KELVIN


def shapes(composition: Composition) -> tuple[Shape, Shape, Shape]:
    """Shapes of ferrite, pearlite and bainite."""
    c = composition
    bend = 1.9 * c.C + 2.5 * c.Mn + 0.9 * c.Ni + 1.7 * c.Cr + 4.0 * c.Mo - 2.6
    return Shape(POWER), Shape(POWER), Shape(POWER, max(bend, 0.0))


def rates(
    composition: Composition, temp: Array, *, grain_astm: float, ae3: float, ae1: float
) -> Rates:
    """Clock rates of the three products; arguments as in `diffusional.rates`.

    ``composition`` is that of the austenite, its carbon in solution.

    Raises
    ------
    InputFault
        A steel without any of Mn, Ni, Cr and Mo.
    """
    c = composition
    ferrite = 59.6 * c.Mn + 1.45 * c.Ni + 67.7 * c.Cr + 244.0 * c.Mo
    if ferrite <= 0.0:
        raise InputFault(
            "composition",
            "without Mn, Ni, Cr and Mo",
            "one with some of them for the kinetics of 1984",
            'Give the manganese of the heat, or take kinetics = "Li 1998".',
        )
    pearlite = 1.79 + 5.42 * (c.Cr + c.Mo + 4.0 * c.Mo * c.Ni)
    bainite = 1e-4 * (2.34 + 10.1 * c.C + 3.8 * c.Cr + 19.0 * c.Mo)
    grain = 2.0 ** (0.5 * (grain_astm - 1.0))
    thermal = GAS_CAL * temp
    slow = np.exp(27500.0 / thermal) + (0.01 * c.Cr + 0.52 * c.Mo) * np.exp(37500.0 / thermal)

    def under(top: float) -> Array:
        return np.maximum(top - temp, 0.0)

    return Rates(
        ferrite=grain * under(ae3) ** 3 * np.exp(-23500.0 / thermal) / ferrite,
        pearlite=grain * under(ae1) ** 3 / (pearlite * slow),
        bainite=grain * under(bainite_start(c)) ** 2 * np.exp(-27500.0 / thermal) / bainite,
    )


def range_notes(composition: Composition, carbon_pct: float) -> list[RangeNote]:
    """Where the rates are used outside the range of their source."""
    c = composition
    model, notes = SOURCES[0].model, []
    if carbon_pct >= MOST_CARBON_PCT:
        notes.append(RangeNote(model, "C", f"{carbon_pct:g} %", f"below {MOST_CARBON_PCT:g} %"))
    alloy = c.Mn + c.Si + c.Ni + c.Cr + c.Mo
    if alloy >= MOST_ALLOY_PCT:
        said = f"below {MOST_ALLOY_PCT:g} %"
        notes.append(RangeNote(model, "Mn + Si + Ni + Cr + Mo", f"{alloy:.3g} %", said))
    return notes
