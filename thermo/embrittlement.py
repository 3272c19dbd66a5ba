"""Ranges in which a temper makes steel brittle, which its hardness does not show.

Model
-----
Temper embrittlement, held at or cooled slowly through 575 to 350 degC; tempered
martensite embrittlement at 250 to 400 degC, where soft steel is blue brittle. Prone to
the first: Mn or Cr + Ni of 0.5 % and more with less than 0.15 % Mo, and Cr + Ni of 3 %
and more with any. A warning in words only: impurities (P, Sn, Sb, As) decide, and no
loss of toughness is computed.

Source
------
General practice of tempering (remembered); the amounts are chosen here (estimate).

Holds for
---------
Low-alloy steels. Silence is no promise of toughness.
"""

from collections.abc import Sequence

from midradius.thermo.source import Source
from midradius.thermo.steel import Composition
from midradius.thermo.tempering import ZERO_DEGC, Temper

SOURCE = Source(
    "embrittlement by tempering", "general practice", "ranges of temperature", "estimate"
)
NEAR_AE1 = 20.0  # K
SLOW_RANGE_DEGC = (350.0, 575.0)
BLUE_RANGE_DEGC = (250.0, 400.0)


def cautions(composition: Composition, tempers: Sequence[Temper], *, ae1: float) -> tuple[str, ...]:
    """Warnings for a treatment, the nearness of its hottest stage to ``ae1`` [K] among them."""
    c = composition
    lines = []
    temps = [stage.temp - ZERO_DEGC for stage in tempers]
    hottest = max(temps, default=0.0)
    if hottest > ae1 - ZERO_DEGC - NEAR_AE1:
        lines.append(
            f"A temper at {hottest:.0f} degC lies within {NEAR_AE1:.0f} K of Ae1"
            f" ({ae1 - ZERO_DEGC:.0f} degC): where the furnace or the composition strays, austenite"
            " forms and turns to fresh martensite on cooling."
        )
    prone = c.Cr + c.Ni >= 3.0 or (c.Mo < 0.15 and (c.Mn >= 0.5 or c.Cr + c.Ni >= 0.5))
    if prone and any(_within(temp, SLOW_RANGE_DEGC) for temp in temps):
        lines.append(
            "Temper embrittlement: this steel can lose toughness when held at 350 to 575 degC,"
            " which the hardness does not show."
        )
    elif prone and hottest > SLOW_RANGE_DEGC[1]:
        lines.append(
            "Temper embrittlement: cool this steel fast from the temper through 575 to 350 degC;"
            " in a slowly cooled part it can lose toughness, which the hardness does not show."
        )
    if any(_within(temp, BLUE_RANGE_DEGC) for temp in temps):
        lines.append(
            "A temper at 250 to 400 degC embrittles tempered martensite (blue brittleness in soft"
            " steel): avoid the range where the part must be tough."
        )
    return tuple(lines)


def _within(value: float, ends: tuple[float, float]) -> bool:
    return ends[0] <= value <= ends[1]
