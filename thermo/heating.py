"""Where a steel starts and ends to become austenite on heating: Ac1 and Ac3.

Source
------
Andrews, J. Iron Steel Inst. 203 (1965) 721, linear in the elements, square root
in carbon for Ac3 (formulas read in a handbook; the root and the signs of P, Al
and Ti, lost there in print, from memory).

Holds for
---------
Below 0.6 % C. These lie 5 to 20 K above equilibrium: use them to choose a soak,
not to compute what transforms.
"""

import math

from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition, outside

SOURCE = Source(
    model="Ac1 and Ac3 on heating",
    work="Andrews 1965",
    locator="J. Iron Steel Inst. 203, 721",
    status="remembered",
)
ZERO_DEGC = 273.15


def ac1(composition: Composition) -> float:
    """Ac1 [K]."""
    c = composition
    degc = 723.0 - 10.7 * c.Mn - 16.9 * c.Ni + 29.1 * c.Si + 16.9 * c.Cr + 6.38 * c.W
    return degc + ZERO_DEGC


def ac3(composition: Composition) -> float:
    """Ac3 [K]."""
    c = composition
    formers = 44.7 * c.Si + 104.0 * c.V + 31.5 * c.Mo + 13.1 * c.W
    formers += 700.0 * c.P + 400.0 * c.Al + 400.0 * c.Ti
    holders = 15.2 * c.Ni + 30.0 * c.Mn + 11.0 * c.Cr + 20.0 * c.Cu
    return 910.0 - 203.0 * math.sqrt(c.C) + formers - holders + ZERO_DEGC


def range_notes(composition: Composition) -> tuple[RangeNote, ...]:
    """Notes when the carbon is beyond the range of the formulas."""
    return outside(composition, model=SOURCE.model, limits={"C": (0.0, 0.6)})
