"""Which rates a steel transforms with: a published set by name, measured curves before it.

No arrays here: a case that is only checked needs none.
"""

import difflib
from dataclasses import dataclass

from midradius.thermo.errors import InputFault

EXTENDED = "Li 1998, extended"  # by `thermo.extension`
LI, KIRKALDY = "Li 1998", "Kirkaldy-Venugopalan 1984"
NAMES = (EXTENDED, LI, KIRKALDY)
ZERO_DEGC = 273.15


@dataclass(frozen=True)
class MeasuredProduct:
    """Avrami growth of one product, ``X = 1 - exp(-(t / time)^exponent)``, by temperature.

    ``temp`` [K] rises, (n_temp,); ``time`` [s] and ``exponent`` [-] belong to it. Between
    two temperatures the logarithm of the time and the exponent go straight; outside them
    nothing forms.
    """

    product: str
    temp: tuple[float, ...]
    time: tuple[float, ...]
    exponent: tuple[float, ...]


@dataclass(frozen=True)
class Measured:
    """What was measured on a heat, from the file ``name``.

    ``points`` are the measured ones: product, temperature [K], time [s] and share [-].
    ``martensite_start`` [K] and ``martensite_rate`` [1/K] are None where the formulas hold.
    """

    name: str
    products: tuple[MeasuredProduct, ...]
    points: tuple[tuple[str, float, float, float], ...] = ()
    martensite_start: float | None = None
    martensite_rate: float | None = None


@dataclass(frozen=True)
class Kinetics:
    """The set of rates called ``name``; ``measured`` replaces those that it holds."""

    name: str = EXTENDED
    measured: Measured | None = None

    @property
    def text(self) -> str:
        """What a result says of it."""
        named = f"{self.name} (the default)" if self.name == EXTENDED else self.name
        if self.measured is None:
            return f"Rates of ferrite, pearlite and bainite: {named}."
        said = [
            f"{one.product} {one.temp[0] - ZERO_DEGC:.0f} to {one.temp[-1] - ZERO_DEGC:.0f} degC"
            for one in self.measured.products
        ]
        if self.measured.martensite_start is not None:
            said.append(f"Ms {self.measured.martensite_start - ZERO_DEGC:.0f} degC")
        return (
            f"Transformation as measured in {self.measured.name}: {', '.join(said)}; a measured"
            f" product forms at no other temperature. The rest: {named}. It holds for the heat"
            " and the austenitising of the measurement."
        )


DEFAULT = Kinetics()


def named(text: str) -> str:
    """The set that ``text`` means; letter case and blanks do not count.

    Raises
    ------
    InputFault
        There is no such set.
    """
    plain = {_plain(name): name for name in NAMES}
    found = plain.get(_plain(text))
    if found is not None:
        return found
    near = difflib.get_close_matches(_plain(text[:60]), plain, n=1)
    remedy = f'Write "{plain[near[0]]}" if that is meant.' if near else ""
    raise InputFault("kinetics", f'"{text}"', " or ".join(f'"{n}"' for n in NAMES), remedy)


def _plain(text: str) -> str:
    return "".join(letter for letter in text.casefold() if letter.isalnum())
