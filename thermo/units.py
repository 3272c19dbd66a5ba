"""Text with a unit, read into SI: a closed list of units for each kind of quantity.

``parse("300 mm", "length")`` is 0.3. A text is one number and one unit; only a
duration may be a sum (``"4 h 30 min"``). Nothing is evaluated or guessed: a
decimal comma, a bare number or a unit of another kind is an error that names
the cure. A temperature and a temperature difference are different kinds.

Source
------
Factors are exact by definition: SI Brochure, 9th edition 2019, table 8 (min, h,
d, t, l, bar) and NIST SP 811, 2008, appendix B (in, ft, lb, gal, hp, psi, degF).
Remembered, all exact; the products are rounded once.
"""

import difflib
import math
import re
import unicodedata
from decimal import Context, Decimal
from fractions import Fraction
from typing import Literal, get_args

from .errors import InputFault

Kind = Literal[
    "length",
    "temperature",
    "temperature difference",
    "duration",
    "heat-transfer coefficient",
    "mass",
    "volume",
    "velocity",
    "pressure",
    "power",
    "heating rate",
    "area",
    "mass flow",
    "volume flow",
    "conductance",
]
KINDS: tuple[Kind, ...] = get_args(Kind)

# Unit: (factor to SI, offset added before the factor), as decimal text.
_Unit = tuple[str, str]
_LB = "0.45359237"
_INCH = "0.0254"
_FOOT = "0.3048"
_FILM_BTU = "5.678263341113488"  # 1055.05585262 J / (3600 s * 0.3048 m * 0.3048 m * 5/9 K)
_KELVIN: _Unit = ("1", "0")
_CELSIUS: _Unit = ("1", "273.15")
_FAHRENHEIT: _Unit = ("5/9", "459.67")

UNITS: dict[Kind, dict[str, _Unit]] = {
    "length": {
        "mm": ("0.001", "0"),
        "cm": ("0.01", "0"),
        "m": ("1", "0"),
        "um": ("0.000001", "0"),
        "μm": ("0.000001", "0"),
        "in": (_INCH, "0"),
        "inch": (_INCH, "0"),
        "ft": (_FOOT, "0"),
    },
    "temperature": {
        "degC": _CELSIUS,
        "°C": _CELSIUS,
        "C": _CELSIUS,
        "K": _KELVIN,
        "degF": _FAHRENHEIT,
        "°F": _FAHRENHEIT,
        "F": _FAHRENHEIT,
    },
    "temperature difference": {"K": _KELVIN},
    "duration": {
        "s": ("1", "0"),
        "min": ("60", "0"),
        "h": ("3600", "0"),
        "d": ("86400", "0"),
    },
    "heat-transfer coefficient": {
        "W/(m2 K)": ("1", "0"),
        "W/m2K": ("1", "0"),
        "kW/(m2 K)": ("1000", "0"),
        "kW/m2K": ("1000", "0"),
        "BTU/(h ft2 degF)": (_FILM_BTU, "0"),
    },
    "mass": {
        "kg": ("1", "0"),
        "g": ("0.001", "0"),
        "t": ("1000", "0"),
        "lb": (_LB, "0"),
    },
    "volume": {
        "m3": ("1", "0"),
        "l": ("0.001", "0"),
        "L": ("0.001", "0"),
        "gal": ("0.003785411784", "0"),
    },
    "velocity": {"m/s": ("1", "0"), "mm/s": ("0.001", "0"), "ft/s": (_FOOT, "0")},
    "pressure": {
        "Pa": ("1", "0"),
        "kPa": ("1000", "0"),
        "MPa": ("1000000", "0"),
        "bar": ("100000", "0"),
        "psi": ("6894.757293168361", "0"),
    },
    "power": {
        "W": ("1", "0"),
        "kW": ("1000", "0"),
        "MW": ("1000000", "0"),
        "hp": ("745.6998715822702", "0"),
    },
    "heating rate": {"K/h": ("1/3600", "0"), "K/min": ("1/60", "0"), "K/s": ("1", "0")},
    "area": {"m2": ("1", "0"), "cm2": ("0.0001", "0"), "ft2": ("0.09290304", "0")},
    "mass flow": {"kg/s": ("1", "0"), "kg/min": ("1/60", "0"), "kg/h": ("1/3600", "0")},
    "volume flow": {
        "m3/s": ("1", "0"),
        "m3/h": ("1/3600", "0"),
        "l/s": ("0.001", "0"),
        "l/min": ("0.001/60", "0"),
    },
    "conductance": {"W/K": ("1", "0"), "kW/K": ("1000", "0")},
}
_EXAMPLE: dict[Kind, str] = {
    "length": "300 mm",
    "temperature": "860 degC",
    "temperature difference": "0.5 K",
    "duration": "45 s",
    "heat-transfer coefficient": "600 W/(m2 K)",
    "mass": "850 kg",
    "volume": "20 m3",
    "velocity": "0.5 m/s",
    "pressure": "10 bar",
    "power": "250 kW",
    "heating rate": "100 K/h",
    "area": "4 m2",
    "mass flow": "5 kg/s",
    "volume flow": "30 m3/h",
    "conductance": "4 kW/K",
}
# Ways of writing that people use and that are not in the list: what to write.
_MEANT: dict[Kind, dict[str, str]] = {
    "length": {'"': "in", "''": "in", "inches": "in", "'": "ft", "feet": "ft", "metre": "m"},
    "temperature": {"deg": "degC", "°": "degC", "grad": "degC", "celsius": "degC"},
    "temperature difference": {"deg": "K", "°": "K"},
    "duration": {
        "sec": "s",
        "seconds": "s",
        "minutes": "min",
        "mins": "min",
        "hr": "h",
        "hrs": "h",
        "hour": "h",
        "hours": "h",
        "day": "d",
        "days": "d",
    },
    "mass": {"tonne": "t", "kilo": "kg"},
    "volume": {"litre": "l", "liter": "l"},
}
_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_ONE = re.compile(rf"({_NUMBER})\s*([^\s0-9.,+-].*)", re.DOTALL)
_BARE = re.compile(_NUMBER)
_PART = re.compile(r"([0-9]+\.?[0-9]*|\.[0-9]+)\s*([a-z]+)\s*")
_COMMA = re.compile(r"([+-]?[0-9]+),([0-9]+)(\s*[^\s0-9.,].*)?", re.DOTALL)
_NOT_FINITE = re.compile(r"[+-]?(?:nan|inf|infinity)\b.*", re.IGNORECASE | re.DOTALL)
_LONGEST = 80  # characters of a quantity; a longer text is a slip, not a number
_EXACT = Context(prec=60, Emax=999_999, Emin=-999_999, traps=[])


def parse(text: object, kind: Kind) -> float:
    """The SI value of a text such as ``"300 mm"``.

    Parameters
    ----------
    text
        One number and one unit; anything but a string is a fault.
    kind
        Which list of units applies.

    Returns
    -------
    float
        m, K, s, W/(m2 K), kg, m3, m/s, Pa, W, m2, kg/s, m3/s or W/K. May be negative; a temperature
        is never below absolute zero.

    Raises
    ------
    InputFault
        With the kind as quantity; its remedy says what to write instead.
    """
    if not isinstance(text, str):
        raise _fault(kind, text, _quoted_remedy(text, kind))
    body = text.strip()
    if len(body) > _LONGEST:
        raise _fault(kind, body[:40] + "...", "Write one number and one unit.")
    if _NOT_FINITE.fullmatch(body):
        raise _fault(kind, text, "Write a finite number.")
    if comma := _COMMA.fullmatch(body):
        raise _fault(kind, text, _comma_remedy(*comma.groups(default="")))
    if _BARE.fullmatch(body):
        raise _fault(kind, text, f'Add the unit, for example "{body} {_first(kind)}".')
    if kind == "duration" and (parts := _compound(body)):
        return _sum_of(parts, text)
    found = _ONE.fullmatch(body)
    if not found:
        raise _fault(kind, text, "Write one number and one unit, without arithmetic.")
    number, unit = found[1], _plain(found[2])
    if unit not in UNITS[kind]:
        raise _fault(kind, text, _unit_remedy(number, unit, kind))
    value = _convert(number, UNITS[kind][unit])
    if not math.isfinite(value):
        raise _fault(kind, text, "Write a finite number.")
    if kind == "temperature" and value < 0.0:
        raise _fault(kind, text, "Nothing is colder than -273.15 degC.")
    return value


def show(value: float, kind: Kind) -> str:
    """A text that :func:`parse` reads back to exactly ``value``, in a usual unit if one does."""
    candidates: dict[Kind, tuple[str, ...]] = {
        "length": ("mm",) if value < 10.0 else ("m",),
        "temperature": ("degC",),
        "duration": _usual_durations(value),
        "heating rate": ("K/h",),
    }
    for unit in candidates.get(kind, ()):
        factor, offset = UNITS[kind][unit]
        number = f"{value / float(Fraction(factor)) - float(offset):.9g}"
        if "e" not in number and parse(f"{number} {unit}", kind) == value:
            return f"{number} {unit}"
    number = repr(float(value)).removesuffix(".0")
    return f"{number} {_si(kind)}"


def pattern(kind: Kind) -> str:
    """A regular expression (ECMA 262 and Python) for the texts of one kind."""
    units = "|".join(re.escape(unit).replace(r"\ ", " ") for unit in UNITS[kind])
    one = rf"{_NUMBER}\s*(?:{units})"
    if kind == "duration":
        part = r"(?:[0-9]+\.?[0-9]*|\.[0-9]+)\s*"
        several = r"\s*".join(rf"(?:{part}{unit})?" for unit in ("d", "h", "min", "s"))
        one = rf"{one}|(?=[0-9.]){several}"
    return rf"^\s*(?:{one})\s*$"


def example(kind: Kind) -> str:
    """A text of this kind, for messages and editors."""
    return _EXAMPLE[kind]


def _convert(number: str, unit: _Unit) -> float:
    factor, offset = unit
    top, _, bottom = factor.partition("/")
    value = _EXACT.add(_EXACT.create_decimal(number), Decimal(offset))
    value = _EXACT.divide(_EXACT.multiply(value, Decimal(top)), Decimal(bottom or "1"))
    return float(value)


def _compound(body: str) -> list[tuple[str, str]]:
    parts = [(part[1], part[2]) for part in _PART.finditer(body)]
    whole = _PART.sub("", body) == ""
    known = all(unit in UNITS["duration"] for _, unit in parts)
    return parts if whole and known and len(parts) > 1 else []


def _sum_of(parts: list[tuple[str, str]], text: str) -> float:
    order = ["d", "h", "min", "s"]
    places = [order.index(unit) for _, unit in parts]
    if places != sorted(set(places)):
        remedy = 'Write each unit once, the largest first, such as "4 h 30 min".'
        raise _fault("duration", text, remedy)
    total = Decimal(0)
    for number, unit in parts:
        factor = Decimal(UNITS["duration"][unit][0])
        total = _EXACT.add(total, _EXACT.multiply(Decimal(number), factor))
    return float(total)


def _fault(kind: Kind, value: object, remedy: str) -> InputFault:
    shown = f'"{value}"' if isinstance(value, str) else str(value)
    return InputFault(kind, shown, f"a {kind} in {_listed(kind)}", remedy)


def _listed(kind: Kind) -> str:
    """The units of a kind in words, one spelling of each."""
    first = {size: name for name, size in reversed(UNITS[kind].items())}
    names = [name for name, size in UNITS[kind].items() if first[size] == name]
    return ", ".join(names[:-1]) + f" or {names[-1]}" if len(names) > 1 else names[0]


def _quoted_remedy(value: object, kind: Kind) -> str:
    if isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value):
        return f'Write number and unit in quotes, for example "{value} {_first(kind)}".'
    return f'Write number and unit in quotes, for example "{_EXAMPLE[kind]}".'


def _comma_remedy(whole: str, part: str, unit: str) -> str:
    point = f'Write "{whole}.{part}{unit}": the decimal sign is a point.'
    if len(part) == 3 and whole.lstrip("+-") != "0":
        return f'Write "{whole}.{part}{unit}" or "{whole}{part}{unit}", whichever is meant.'
    return point


def _unit_remedy(number: str, unit: str, kind: Kind) -> str:
    if kind == "duration" and unit == "m":
        return f'"m" is the metre; for minutes write "{number} min".'
    if kind == "temperature difference" and unit in UNITS["temperature"]:
        scale = "a step of 1 degF is 5/9 K" if "F" in unit else "a step of 1 degC is 1 K"
        return f"A difference is given in K; {scale}."
    for other in KINDS:
        if unit in UNITS[other] and other != "temperature difference":
            return f'"{unit}" is a unit of {other}; write for example "{_EXAMPLE[kind]}".'
    meant = _MEANT.get(kind, {}).get(unit.casefold())
    if unit[0] in "*/+-^()=<>~":
        return "Write one number and one unit, without arithmetic."
    if meant is None and "/" not in unit:
        folded = {known.casefold(): known for known in reversed(UNITS[kind])}
        near = difflib.get_close_matches(unit.casefold(), folded, n=1, cutoff=0.5)
        meant = folded[near[0]] if near else None
    if meant is None:
        return f'The unit "{unit[:20]}" is not known; write for example "{_EXAMPLE[kind]}".'
    return f'The unit "{unit}" is not known; write "{number} {meant}" if that is meant.'


def _plain(unit: str) -> str:
    """One spelling for what looks alike: micro sign, degree Celsius sign, spaces."""
    return " ".join(unicodedata.normalize("NFKC", unit).split())


def _first(kind: Kind) -> str:
    return next(iter(UNITS[kind]))


def _si(kind: Kind) -> str:
    return next(name for name, unit in UNITS[kind].items() if unit == ("1", "0"))


def _usual_durations(value: float) -> tuple[str, ...]:
    if value >= 3600.0:
        return ("h", "min")
    return ("min",) if value >= 120.0 else ()
