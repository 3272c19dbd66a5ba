"""One heat of steel: its composition in mass percent, checked before anything is computed.

Holds for
---------
Plain carbon and low-alloy steels, 0.03 to 1.5 % C. The hard bounds below are
where the models of this package stop making sense, chosen here (estimate);
narrower ranges that a published model states are notes, not faults, and are
given by the model itself through `outside`.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields

from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source

SOURCE = Source(
    model="bounds of composition",
    work="chosen here from the ranges of the models in this package",
    locator="thermo.steel",
    status="estimate",
)


@dataclass(frozen=True)
class Composition:
    """Mass percent of each element; the rest is iron."""

    C: float
    Mn: float = 0.0
    Si: float = 0.0
    Cr: float = 0.0
    Ni: float = 0.0
    Mo: float = 0.0
    V: float = 0.0
    Cu: float = 0.0
    P: float = 0.0
    S: float = 0.0
    Al: float = 0.0
    N: float = 0.0
    B: float = 0.0
    Ti: float = 0.0
    Nb: float = 0.0
    W: float = 0.0
    Co: float = 0.0

    def as_dict(self) -> dict[str, float]:
        """Mass percent by element symbol, zeros included."""
        return {name: float(getattr(self, name)) for name in ELEMENTS}


ELEMENTS: tuple[str, ...] = tuple(item.name for item in fields(Composition))


@dataclass(frozen=True)
class Steel:
    """A composition with the name and the standard it was taken from.

    ``status`` says whether the numbers were ``read``, ``remembered`` or
    ``given`` by the user.
    """

    name: str
    composition: Composition
    standard: str
    status: str


# Mass percent, (lowest, highest) that the models are asked about at all.
HARD_BOUNDS: Mapping[str, tuple[float, float]] = {
    "C": (0.03, 1.5),
    "Mn": (0.0, 3.0),
    "Si": (0.0, 3.0),
    "Cr": (0.0, 4.0),
    "Ni": (0.0, 5.0),
    "Mo": (0.0, 1.5),
    "V": (0.0, 0.5),
    "Cu": (0.0, 1.0),
    "P": (0.0, 0.15),
    "S": (0.0, 0.4),
    "Al": (0.0, 1.5),
    "N": (0.0, 0.05),
    "B": (0.0, 0.01),
    "Ti": (0.0, 0.3),
    "Nb": (0.0, 0.2),
    "W": (0.0, 2.0),
    "Co": (0.0, 2.0),
}
HIGHEST_ALLOY_SUM = 8.0  # Mn + Si + Cr + Ni + Mo: a low-alloy steel ends well before this

# Above these an element does something that no model here represents.
UNSEEN_ABOVE: Mapping[str, float] = {
    "Cu": 0.5,
    "S": 0.1,
    "Al": 0.1,
    "N": 0.02,
    "Ti": 0.05,
    "Nb": 0.05,
    "W": 0.1,
    "Co": 0.1,
}


def check(composition: Composition) -> list[InputFault]:
    """Everything that makes a composition unusable, all at once.

    Returns
    -------
    list[InputFault]
        Empty when the composition can be computed. Faults name the element as
        ``composition.Mn``.
    """
    faults = []
    for element, (low, high) in HARD_BOUNDS.items():
        amount = getattr(composition, element)
        if not low <= amount <= high:  # true for nan as well
            faults.append(
                InputFault(
                    f"composition.{element}",
                    f"{amount:g} %",
                    f"{low:g} to {high:g} % by mass",
                    _remedy(element, amount, high),
                )
            )
    amounts = [amount for amount in composition.as_dict().values() if math.isfinite(amount)]
    total = sum(amounts)
    if total >= 100.0:
        faults.append(
            InputFault(
                "sum of composition",
                f"{total:g} %",
                "below 100 % by mass",
                "Leave room for the iron.",
            )
        )
    alloy = sum(getattr(composition, element) for element in ("Mn", "Si", "Cr", "Ni", "Mo"))
    if not faults and alloy > HIGHEST_ALLOY_SUM:
        faults.append(
            InputFault(
                "Mn + Si + Cr + Ni + Mo",
                f"{alloy:g} %",
                f"at most {HIGHEST_ALLOY_SUM:g} % by mass",
                "The models hold for low-alloy steels only.",
            )
        )
    return faults


def _remedy(element: str, amount: float, high: float) -> str:
    if not math.isfinite(amount):
        return "Give a number."
    if amount < 0.0:
        return "A mass percent cannot be negative."
    if element == "C" and amount < high:
        return "With less carbon than this there is no hardening to compute."
    return "The models hold for plain carbon and low-alloy steels only."


def outside(
    composition: Composition, *, model: str, limits: Mapping[str, tuple[float, float]]
) -> tuple[RangeNote, ...]:
    """Notes for every element outside the range that ``model`` was made for.

    Parameters
    ----------
    model
        Name of the model as a report prints it.
    limits
        Lowest and highest mass percent by element symbol.
    """
    notes = []
    for element, (low, high) in limits.items():
        amount = getattr(composition, element)
        if not low <= amount <= high:
            notes.append(RangeNote(model, element, f"{amount:g} %", f"{low:g} to {high:g} %"))
    return tuple(notes)


def range_notes(composition: Composition) -> tuple[RangeNote, ...]:
    """Notes for elements whose effect no model of the package represents."""
    limits = {element: (0.0, high) for element, high in UNSEEN_ABOVE.items()}
    return outside(composition, model="all models (effect not represented)", limits=limits)
