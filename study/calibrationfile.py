"""The calibration of one heat as a TOML file: written once, read back by a case.

The file says which steel it is for; a case with another steel is refused. A standard
error that is not given belongs to a shift that the measurement could not tell.
"""

import math
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import EXTENDED, NAMES
from midradius.thermo.steel import ELEMENTS, Composition, Steel

if TYPE_CHECKING:
    from midradius.thermo.calibration import Shifts

LARGEST = 100_000  # bytes
LONGEST_TEXT = 600  # characters: names or digests of a few files
FORMAT = 1
OWN_COMPOSITION = "own composition"  # of a case: a composition without a name
# Key of the file, attribute of `Shifts`, least and most: the bounds of the fit
KEYS: Mapping[str, tuple[str, float, float]] = {
    "ferrite_pearlite_time_factor": ("diffusional_time", 1.0 / 6.0, 6.0),
    "bainite_time_factor": ("bainite_time", 1.0 / 6.0, 6.0),
    "martensite_start_K": ("martensite_start", -50.0, 50.0),
    "hardness_HV": ("hardness", -60.0, 60.0),
}
TEXTS = ("steel", "measured", "measured_sha256", "program")
_ROUNDING = 1e-9  # of a bound that was written with all its digits
_REMEDY = "`midradius calibrate STEEL --measured curve.csv --save heat.toml` writes one."


@dataclass(frozen=True)
class CalibratedSoak:
    """How the measured heat was austenitised: temperature, time at heat, what that left."""

    austenitize_degC: float
    soak_time_s: float
    grain_astm: float
    carbon_in_solution_pct: float


SOAK_KEYS: Mapping[str, tuple[float, float]] = {
    "austenitize_degC": (500.0, 1400.0),
    "soak_time_s": (0.0, 1e7),
    "grain_astm": (-3.0, 14.0),
    "carbon_in_solution_pct": (0.0, 2.2),
}
# How far apart two soaks leave one heat's transformation alike (estimates)
SOAK_APART_K, GRAIN_APART, CARBON_APART_PCT = 30.0, 1.0, 0.05


@dataclass(frozen=True)
class HeatCalibration:
    """What a calibration file says.

    ``error`` has the order of :data:`KEYS`: relative for the factors, K, HV; None for a
    shift that was held. ``measured`` names the files of the measurement. ``soak`` is None in
    files of earlier versions.
    """

    path: Path
    steel: str
    composition: Composition
    shifts: "Shifts"
    error: tuple[float | None, ...]
    measured: str
    measured_sha256: str
    program: str
    soak: CalibratedSoak | None = None
    kinetics: str = EXTENDED

    @property
    def text(self) -> str:
        """What a result says of it."""
        said = []
        for (attribute, _, _), error, (what, unit) in zip(
            KEYS.values(), self.error, WORDS, strict=True
        ):
            if error is not None:
                said.append(shown(what, unit, getattr(self.shifts, attribute), error))
        return (
            f"calibration {self.path.name} ({', '.join(said)}; standard errors): it belongs to "
            f"the one heat of {self.steel} that {self.measured} was measured on"
        )


WORDS = (
    ("ferrite and pearlite time", "x"),
    ("bainite time", "x"),
    ("martensite start", "K"),
    ("hardness", "HV"),
)


def shown(what: str, unit: str, value: float, error: float) -> str:
    """``bainite time x 1.32 +- 8 %``, ``hardness +12 +- 3 HV``."""
    if unit == "x":
        return f"{what} x {value:.2f} +- {100.0 * error:.0f} %"
    return f"{what} {value:+.1f} +- {error:.1f} {unit}"


def refuse_other_steel(calibration: HeatCalibration, steel: Steel) -> None:
    """A calibration serves the steel it was measured on.

    Raises
    ------
    InputFault
        Another composition, or another name where both have one.
    """
    named = OWN_COMPOSITION not in (calibration.steel, steel.name)
    ours, theirs = (item.as_dict() for item in (steel.composition, calibration.composition))
    apart = [
        f"{element} {ours[element]:g} instead of {theirs[element]:g} %"
        for element in ELEMENTS
        if not math.isclose(ours[element], theirs[element], rel_tol=0.0, abs_tol=_ROUNDING)
    ]
    if named and calibration.steel != steel.name:
        apart.insert(0, f"{steel.name} instead of {calibration.steel}")
    if apart:
        raise InputFault(
            "calibration",
            f'"{calibration.path.name}" of {calibration.steel}',
            f"that of the steel of the case ({', '.join(apart[:4])})",
            "Calibrate this steel with a curve of its own heat, or leave the calibration out.",
        )


def refuse_other_rates(calibration: HeatCalibration, kinetics: str) -> None:
    """Shifts serve the set of rates that they were fitted to.

    Raises
    ------
    InputFault
        Another set.
    """
    if calibration.kinetics != kinetics:
        raise InputFault(
            "calibration",
            f'"{calibration.path.name}"',
            f'one fitted to kinetics = "{kinetics}" (it is to "{calibration.kinetics}")',
            "Calibrate the heat with these rates, or leave the calibration out.",
        )


def read_calibration(path: Path) -> HeatCalibration:
    """The calibration of a file.

    Raises
    ------
    InputFault
        No such file, or one that does not hold a calibration; the first thing wrong.
    """
    from midradius.thermo.calibration import Shifts

    data = _toml(path)
    head = _table(data, "calibration")
    if head.get("format") != FORMAT:
        raise _fault("calibration.format", head.get("format"), f"{FORMAT}", _REMEDY)
    texts = {key: head.get(key) for key in TEXTS}
    for key, text in texts.items():
        if not isinstance(text, str) or not (text.isprintable() and 1 <= len(text) <= LONGEST_TEXT):
            raise _fault(f"calibration.{key}", text, "a text of one line")
    amounts = _table(head, "composition", "calibration.")
    for element, amount in amounts.items():
        if element not in ELEMENTS:
            raise _fault("calibration.composition", element, "elements in mass percent")
        _number(f"calibration.composition.{element}", amount, 0.0, 100.0)
    if "C" not in amounts:
        raise _fault("calibration.composition.C", None, "given")
    kinetics = head.get("kinetics", EXTENDED)
    if kinetics not in NAMES:
        raise _fault("calibration.kinetics", kinetics, " or ".join(NAMES))
    shifts = _table(data, "shifts")
    errors = _table(data, "standard_errors")
    for name, table in (("shifts", shifts), ("standard_errors", errors)):
        for key in table:
            if key not in KEYS:
                raise _fault(name, key, f"one of {', '.join(KEYS)}")
    values, widths = {}, []
    for key, (attribute, low, high) in KEYS.items():
        values[attribute] = _number(f"shifts.{key}", shifts.get(key), low, high)
        widths.append(
            _number(f"standard_errors.{key}", errors[key], 0.0, high) if key in errors else None
        )
    return HeatCalibration(
        path=path,
        composition=Composition(**{key: float(str(amount)) for key, amount in amounts.items()}),
        shifts=Shifts(**values),
        error=tuple(widths),
        soak=_soak(data),
        kinetics=str(kinetics),
        **{key: str(text) for key, text in texts.items()},
    )


def _soak(data: Mapping[str, object]) -> CalibratedSoak | None:
    if "soak" not in data:
        return None
    table = _table(data, "soak")
    for key in table:
        if key not in SOAK_KEYS:
            raise _fault("soak", key, f"one of {', '.join(SOAK_KEYS)}")
    return CalibratedSoak(
        **{
            key: _number(f"soak.{key}", table.get(key), *within)
            for key, within in SOAK_KEYS.items()
        }
    )


def soak_differences(calibration: HeatCalibration, other: CalibratedSoak) -> tuple[str, ...]:
    """In words, where another soak is too far from that of the calibration to share it."""
    own = calibration.soak
    if own is None:
        return ()
    found = []
    if abs(own.austenitize_degC - other.austenitize_degC) > SOAK_APART_K:
        found.append(f"soak {other.austenitize_degC:.0f} degC, not {own.austenitize_degC:.0f}")
    if abs(own.grain_astm - other.grain_astm) > GRAIN_APART:
        found.append(f"grain ASTM {other.grain_astm:.1f}, not {own.grain_astm:.1f}")
    if abs(own.carbon_in_solution_pct - other.carbon_in_solution_pct) > CARBON_APART_PCT:
        theirs, ours = other.carbon_in_solution_pct, own.carbon_in_solution_pct
        found.append(f"{theirs:.2f} % C in solution, not {ours:.2f}")
    return tuple(found)


def dumps(calibration: HeatCalibration, remarks: tuple[str, ...] = ()) -> str:
    """The TOML text of a calibration, every figure exact; ``remarks`` become comments."""
    amounts = calibration.composition.as_dict().items()
    written = ", ".join(f"{element} = {amount!r}" for element, amount in amounts if amount)
    lines = ["# Calibration of one heat. It says nothing of another heat of the grade."]
    lines += [f"# {line}" for line in remarks]
    lines += ["", "[calibration]", f"format = {FORMAT}"]
    lines += [f"{key} = {_quoted(getattr(calibration, key))}" for key in TEXTS]
    if calibration.kinetics != EXTENDED:
        lines.append(f"kinetics = {_quoted(calibration.kinetics)}")
    lines += [f"composition = {{ {written} }}", "", "[shifts]"]
    for key, (attribute, _, _) in KEYS.items():
        lines.append(f"{key} = {float(getattr(calibration.shifts, attribute))!r}")
    lines += ["", "# Relative for the factors; one that is missing was held.", "[standard_errors]"]
    for key, error in zip(KEYS, calibration.error, strict=True):
        if error is not None:
            lines.append(f"{key} = {float(error)!r}")
    if calibration.soak is not None:
        lines += ["", "# How the measured heat was austenitised, and what that left.", "[soak]"]
        soak = calibration.soak
        lines += [f"{key} = {float(getattr(soak, key))!r}" for key in SOAK_KEYS]
    return "\n".join(lines) + "\n"


def _toml(path: Path) -> Mapping[str, object]:
    what = "a TOML file that `midradius calibrate --save` wrote"
    if path.exists() and not path.is_file():
        raise _fault("file", path.name, what, "This is no ordinary file.")
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST + 1)
        if len(data) > LARGEST:
            raise _fault("file", path.name, what, "It is larger than 100 kB.")
        return tomllib.loads(data.decode("utf-8-sig"))
    except FileNotFoundError:
        raise _fault("file", path.name, what, f"There is no such file. {_REMEDY}") from None
    except OSError as error:
        raise _fault("file", path.name, what, f"{error.strerror or error}.") from None
    except (ValueError, RecursionError) as error:
        raise _fault("file", path.name, what, f"Not TOML: {error}.") from None


def _table(data: Mapping[str, object], name: str, place: str = "") -> Mapping[str, object]:
    found = data.get(name)
    if not isinstance(found, dict):
        raise _fault(place + name, found, "a table", _REMEDY)
    return found


def _number(name: str, value: object, low: float, high: float) -> float:
    if isinstance(value, int | float) and not isinstance(value, bool):
        margin = _ROUNDING * max(abs(low), abs(high))
        if low - margin <= value <= high + margin:
            return float(value)
    raise _fault(name, value, f"a number, {low:.4g} to {high:.4g}")


def _fault(name: str, value: object, allowed: str, remedy: str = "") -> InputFault:
    text = "missing" if value is None else str(value)[:60]
    said = "".join(c if c.isprintable() else "?" for c in text)
    return InputFault(name, said, allowed, remedy)


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c.isprintable() else "?" for c in escaped) + '"'
