"""Load, tank and shift of a case as TOML lines that read back as the same."""

from pathlib import Path

from midradius.thermo.units import Kind, show

from . import casekeys as keys
from .tankinput import CoolerInput, FixtureInput, LoadInput, ShiftInput, TankInput

_COOLER: tuple[tuple[str, Kind], ...] = (
    ("power", "power"),
    ("conductance", "conductance"),
    ("bath_flow", "mass flow"),
    ("coolant_flow", "mass flow"),
    ("coolant_in", "temperature"),
    ("start", "temperature"),
)


def tank_lines(
    load: LoadInput | None, tank: TankInput | None, shift: tuple[ShiftInput, ...], folder: Path
) -> list[str]:
    """The lines of the three blocks, empty where there are none."""
    lines: list[str] = []
    if load is not None:
        lines += ["", "[load]", f"pieces = {load.pieces}"]
        lines += _given("length", load.length, "length")
        lines += _given("piece_mass", load.piece_mass, "mass")
        for fixture in load.fixtures:
            lines += ["", "[[load.fixture]]", *_fixture(fixture)]
    if tank is not None:
        lines += ["", "[tank]", *_tank(tank, folder)]
    for entry in shift:
        lines += ["", "[[shift]]", *_entry(entry, folder)]
    return lines


def _given(name: str, value: float | None, kind: Kind) -> list[str]:
    return [] if value is None else [f'{name} = "{show(value, kind)}"']


def _fixture(fixture: FixtureInput) -> list[str]:
    lines = [f"name = {_quoted(fixture.name)}"]
    lines += _given("mass", fixture.mass, "mass")
    lines += _given("thickness", fixture.thickness, "length")
    if fixture.steel is not None:
        lines.append(f"grade = {_quoted(fixture.steel.name)}")
    return lines


def _tank(tank: TankInput, folder: Path) -> list[str]:
    lines: list[str] = []
    for name, (kind, _) in keys.TANK_QUANTITIES.items():
        lines += _given(name, getattr(tank, name), kind)
    if tank.fluid_file is not None:
        lines.append(f"fluid_file = {_quoted(_beside(tank.fluid_file, folder))}")
    if tank.layers is not None:
        lines.append(f"layers = {tank.layers}")
    if tank.lid:
        lines.append("lid = true")
    if not tank.coupled:
        lines.append("coupled = false")
    if tank.cooler is not None:
        lines += ["", "[tank.cooler]", *_cooler(tank.cooler)]
    return lines


def _cooler(cooler: CoolerInput) -> list[str]:
    lines: list[str] = []
    for name, kind in _COOLER:
        lines += _given(name, getattr(cooler, name), kind)
    return [*lines, f'coolant = "{cooler.coolant}"', f'arrangement = "{cooler.arrangement}"']


def _entry(entry: ShiftInput, folder: Path) -> list[str]:
    lines = _given("at", entry.at, "duration") + _given("every", entry.every, "duration")
    lines.append(f"count = {entry.count}")
    if entry.case_file is not None:
        lines.append(f"case = {_quoted(_beside(entry.case_file, folder))}")
    lines += _given("mass", entry.mass, "mass") + _given("from", entry.start_temp, "temperature")
    lines += _given("thickness", entry.thickness, "length")
    return lines + _given("time", entry.time, "duration")


def _beside(path: Path, folder: Path) -> str:
    inside = path.is_relative_to(folder)
    return (path.relative_to(folder) if inside else path).as_posix()


def _quoted(text: str) -> str:
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'
