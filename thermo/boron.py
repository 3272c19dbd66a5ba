"""What soluble boron does to the times of ferrite, pearlite and bainite.

Model
-----
Boron multiplies the ideal diameter by ``1 + 1.5 (0.9 - C)``. Conduction takes time with
the square of a diameter, so all diffusional times are multiplied by the square of it:
4.2 at 0.2 % C, 1.9 at 0.65 %, nothing from 0.9 % on. From 5 ppm the amount does not matter.

Source
------
Factor of the diameter: Llewellyn & Cook, Met. Technol. 1 (1974) 517 (remembered), as in
`hardenability`. The square is derived from conduction; that it acts on all three products
alike is an estimate, since the factor was measured on half martensite.

Holds for
---------
0.15 to 0.6 % C, 5 to 50 ppm of boron that titanium or aluminium has kept from nitrogen.
Austenitised below 1000 degC: hotter, boron leaves the grain boundaries it acts on.
"""

from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

SOURCES = (
    Source(
        "boron in the times of ferrite, pearlite, bainite",
        "Llewellyn & Cook 1974, factor of the ideal diameter, squared",
        "Met. Technol. 1, 517",
        "remembered",
    ),
)
EFFECTIVE_PCT = 0.0005
CARBON_RANGE = (0.15, 0.6)


def acts(composition: Composition) -> bool:
    """Whether there is boron enough."""
    return composition.B >= EFFECTIVE_PCT


def diameter_factor(composition: Composition) -> float:
    """Factor on the ideal diameter [-], 1 or more."""
    return 1.0 + 1.5 * max(0.9 - composition.C, 0.0) if acts(composition) else 1.0


def time_factor(composition: Composition) -> float:
    """Factor on the times of all diffusional products [-], 1 or more."""
    return diameter_factor(composition) ** 2


def range_notes(composition: Composition) -> list[RangeNote]:
    """That the boron is taken as effective, and where its factor leaves its range."""
    if not acts(composition):
        return []
    model = SOURCES[0].model
    said = f"{composition.B:g} %, times x {time_factor(composition):.2f}"
    notes = [RangeNote(model, "B", said, "boron that titanium or aluminium keeps from nitrogen")]
    low, high = CARBON_RANGE
    if not low <= composition.C <= high:
        notes.append(RangeNote(model, "C", f"{composition.C:g} %", f"{low:g} to {high:g} %"))
    return notes
