"""At which temperature a steel is austenitised where nobody says it.

Model
-----
The temperature that the end-quench standard of the grade asks for. ASTM A255 goes by
carbon: to 0.25 % 925, to 0.36 % 870, above 845 degC; with 2.5 % nickel or more 845, 815
and 800 degC. Some grades of EN ISO 683 have their own. Where that is less than 30 K
above the steel's own Ae3, or a hypereutectoid steel's Ae1, it is raised to 50 K above.

Source
------
ASTM A255, table of normalising and austenitising temperatures by steel series
(remembered; here by nickel in place of series). EN ISO 683-1, -2, -3: end-quench
temperatures (remembered). 50 K above Ae3: common practice (estimate).

Holds for
---------
The steels of `thermo.grades`, 30 min at heat. A works' own practice is always better.
"""

from dataclasses import dataclass

from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.source import Source
from midradius.thermo.steel import Steel

SOURCES = (
    Source("austenitising temperature by carbon", "ASTM A255", "table 1", "remembered"),
    Source("austenitising temperature by grade", "EN ISO 683", "end-quench test", "remembered"),
)
ZERO_DEGC = 273.15
SOAK_TIME = 1800.0  # s, 30 min at heat: ISO 642, ASTM A255
LEAST_ABOVE, RAISED_ABOVE = 30.0, 50.0
RICH_NICKEL_PCT = 2.5
# carbon up to [mass %], degC, degC of the steels rich in nickel
_BY_CARBON = ((0.25, 925.0, 845.0), (0.36, 870.0, 815.0), (10.0, 845.0, 800.0))
_BY_GRADE = {
    "C45E": 850.0, "42CrMo4": 850.0, "34CrMo4": 850.0, "50CrMo4": 850.0, "51CrV4": 850.0,
    "16MnCr5": 900.0, "20MnCr5": 900.0, "18CrNiMo7-6": 860.0,
}  # fmt: skip


@dataclass(frozen=True)
class Austenitizing:
    """A temperature [K] and, in words, where it comes from."""

    temp: float
    reason: str


def austenitizing(steel: Steel) -> Austenitizing:
    """Default austenitising temperature of a steel."""
    c = steel.composition
    carbon, rich = c.C, c.Ni >= RICH_NICKEL_PCT
    if steel.name in _BY_GRADE:
        degc, reason = _BY_GRADE[steel.name], "EN ISO 683 end-quench test, from memory"
    else:
        _, lean, nickel = next(row for row in _BY_CARBON if carbon <= row[0])
        degc = nickel if rich else lean
        reason = f"ASTM A255 by carbon{' and nickel' if rich else ''}, from memory"
    eq = equilibrium(c)
    hypo = carbon <= eq.eutectoid_carbon_pct
    name, line = ("Ae3", eq.ae3) if hypo else ("Ae1", eq.ae1)
    if degc + ZERO_DEGC < line + LEAST_ABOVE:
        return Austenitizing(
            line + RAISED_ABOVE, f"{RAISED_ABOVE:.0f} K above {name}, common practice"
        )
    return Austenitizing(degc + ZERO_DEGC, reason)
