"""The blocks of a case that size a tank: ``[load]``, ``[tank]``, ``[[shift]]``."""

from typing import cast

from midradius.fem.media import medium
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.steel import Steel

from . import casekeys as keys
from .case import SectionInput, Stage
from .casetable import Table
from .tankfluid import fluid_fault
from .tankinput import (
    Arrangement,
    CoolantKind,
    CoolerInput,
    FixtureInput,
    LoadInput,
    ShiftInput,
    TankInput,
)

_LENGTH_FORMS = ("round", "tube", "bar")


def tank_blocks(
    top: Table, section: SectionInput | None, route: tuple[Stage, ...]
) -> tuple[LoadInput | None, TankInput | None, tuple[ShiftInput, ...]]:
    """Load, tank and shift of a case file; faults are noted."""
    load_table = top.table("load", "[load]")
    tank_table = top.table("tank", "[tank]")
    load = _load(load_table, section) if load_table else None
    tank = _tank(tank_table) if tank_table else None
    shift = _shift(top, tank)
    if top.has("tank") and not top.has("load"):
        top.missing("load", "given beside a tank", "Write [load] with pieces = 6.")
    if top.has("shift") and not top.has("tank"):
        top.fault("shift", "left out where there is no tank", "Add [tank] with its volume.")
    if top.has("tank") and route and not top.notes.has(("route",)) and tank_stage(route) is None:
        remedy = "A tank needs a quench in oil, water, brine, polymer, salt or a film curve."
        top.fault("tank", "left out where no stage is a quench in a liquid", remedy)
    return load, tank, shift


def tank_stage(route: tuple[Stage, ...]) -> int | None:
    """Which stage of the route happens in the tank: the last quench in a liquid."""
    for number in range(len(route) - 1, -1, -1):
        use = route[number].medium
        if route[number].kind != "quench" or use is None:
            continue
        if use.film_file is not None or medium(use.name or "").kind == "liquid":
            return number
    return None


def _load(table: Table, section: SectionInput | None) -> LoadInput | None:
    table.only(keys.LOAD)
    pieces = table.integer("pieces", keys.PIECES_RANGE)
    length = table.quantity("length", "length", keys.PIECE_LENGTH_RANGE)
    piece_mass = table.quantity("piece_mass", "mass", keys.MASS_RANGE)
    if table.has("length") and table.has("piece_mass"):
        table.fault("piece_mass", "left out where a length is given", "Keep one of the two.")
    if section:
        mesh = section.mesh
        long = section.form in _LENGTH_FORMS and section.length is None
        long |= mesh is not None and mesh.sense == "plane"
        if table.has("length") and not long:
            allowed = f'left out for form = "{section.form}"'
            table.fault("length", allowed, "The section says how large a piece is.")
        if long and not table.has("length") and not table.has("piece_mass"):
            table.missing("length", f'given for form = "{section.form}"', "Or give piece_mass.")
        if mesh is not None and mesh.symmetry and not table.has("piece_mass"):
            remedy = "The mesh may hold a part of the piece only: give the mass of the whole."
            table.missing("piece_mass", "given for a mesh with symmetry", remedy)
        if section.form == "slab" and not table.has("piece_mass"):
            table.missing("piece_mass", 'given for form = "slab"', 'Such as piece_mass = "85 kg".')
    fixtures: list[FixtureInput] = []
    for key, value in table.items("fixture", "[[load.fixture]]"):
        if isinstance(value, dict):
            inner = Table(value, key, table.notes)
            if fixture := _fixture(inner, len(fixtures)):
                fixtures.append(fixture)
        else:
            table.notes.add(key, value, "a table, written as [[load.fixture]]")
    if len(fixtures) > keys.FIXTURES_MOST:
        table.refuse("fixture", f"at most {keys.FIXTURES_MOST} fixtures are read", "")
    if table.notes.has(table.place):
        return None
    return LoadInput(1 if pieces is None else pieces, length, piece_mass, tuple(fixtures))


def _fixture(table: Table, number: int) -> FixtureInput | None:
    table.only(keys.FIXTURE)
    name = table.text("name", keys.LONGEST_NAME)
    mass = table.quantity("mass", "mass", keys.MASS_RANGE)
    thickness = table.quantity("thickness", "length", keys.THICKNESS_RANGE)
    for key, example in (("mass", "150 kg"), ("thickness", "10 mm")):
        if not table.has(key):
            table.missing(key, "given for a fixture", f'Such as {key} = "{example}".')
    steel = _grade(table)
    if mass is None or thickness is None or table.notes.has(table.place):
        return None
    return FixtureInput(name or f"fixture {number + 1}", mass, thickness, steel)


def _grade(table: Table) -> Steel | None:
    name = table.text("grade", keys.LONGEST_NAME)
    if name is None:
        return None
    try:
        return grade(name)
    except InputFault as fault:
        table.fault("grade", fault.allowed, fault.remedy)
        return None


def _tank(table: Table) -> TankInput | None:
    table.only(keys.TANK)
    size = {
        name: table.quantity(name, kind, within)
        for name, (kind, within) in keys.TANK_QUANTITIES.items()
    }
    if not table.has("volume"):
        low, high = keys.TANK_QUANTITIES["volume"][1]
        table.missing("volume", f"{low:g} to {high:g} m3", 'Such as volume = "20 m3".')
    sides = [name for name in ("length", "width", "depth") if table.has(name)]
    if sides and len(sides) < 3:
        for name in ("length", "width", "depth"):
            if not table.has(name):
                table.missing(name, f"given beside {sides[0]}", "Inside, the depth to the lip.")
    elif sides and all(size[name] for name in ("length", "width", "depth", "volume")):
        whole = (size["length"] or 0.0) * (size["width"] or 0.0) * (size["depth"] or 0.0)
        if (size["volume"] or 0.0) >= whole:
            table.fault("volume", f"below {whole:.4g} m3, what the tank holds to its lip")
    if table.has("velocity") != table.has("passage"):
        lacking = "passage" if table.has("velocity") else "velocity"
        table.missing(lacking, "given, or both left out", "Velocity through which area?")
    if table.has("heater_set") and not table.has("heater"):
        table.missing("heater", "given beside heater_set", 'Such as heater = "60 kW".')
    layers = table.integer("layers", (1, 3))
    lid, coupled = _flag(table, "lid"), _flag(table, "coupled")
    cooler = _cooler(table)
    fluid_file = None
    if file := table.text("fluid_file", 1000):
        fluid_file = table.notes.folder / file
        if fault := fluid_fault(fluid_file):
            table.fault("fluid_file", fault.allowed, fault.remedy)
    volume = size.pop("volume")
    if volume is None or table.notes.has(table.place):
        return None
    return TankInput(
        volume=volume,
        **size,
        fluid_file=fluid_file,
        cooler=cooler,
        layers=layers,
        lid=bool(lid),
        coupled=coupled is not False,
    )


def _flag(table: Table, name: str) -> bool | None:
    value = table.raw(name)
    if value is None or isinstance(value, bool):
        return value
    table.fault(name, "true or false, without quotes")
    return None


def _cooler(table: Table) -> CoolerInput | None:
    if isinstance(table.raw("cooler"), str):
        power = table.quantity("cooler", "power", keys.POWER_RANGE)
        return None if power is None else CoolerInput(power=power)
    inner = table.table("cooler", '"250 kW" or [tank.cooler]')
    if inner is None:
        return None
    inner.only(keys.COOLER)
    power = inner.quantity("power", "power", keys.POWER_RANGE)
    conductance = inner.quantity("conductance", "conductance", keys.CONDUCTANCE_RANGE)
    bath_flow = inner.quantity("bath_flow", "mass flow", keys.FLOW_RANGE)
    coolant_flow = inner.quantity("coolant_flow", "mass flow", keys.FLOW_RANGE)
    coolant_in = inner.quantity("coolant_in", "temperature", keys.COOLANT_RANGE)
    start = inner.quantity("start", "temperature", keys.BATH_RANGE)
    coolant = inner.choice("coolant", keys.COOLANTS)
    arrangement = inner.choice("arrangement", keys.ARRANGEMENTS)
    exchanger = ("conductance", "bath_flow", "coolant_flow")
    given = [name for name in exchanger if inner.has(name)]
    if inner.has("power") and given:
        inner.fault(given[0], "left out where a power is given", "Keep one of the two.")
    if not inner.has("power"):
        for name in exchanger:
            if not inner.has(name):
                inner.missing(name, "given, unless power is", 'Such as power = "250 kW".')
    if inner.notes.has(inner.place):
        return None
    return CoolerInput(
        power=power,
        conductance=conductance,
        bath_flow=bath_flow,
        coolant=cast(CoolantKind, coolant or "water"),
        coolant_flow=coolant_flow,
        coolant_in=coolant_in,
        arrangement=cast(Arrangement, arrangement or "counterflow"),
        start=start,
    )


def _shift(top: Table, tank: TankInput | None) -> tuple[ShiftInput, ...]:
    found: list[ShiftInput] = []
    for key, value in top.items("shift", "[[shift]] before each load"):
        if not isinstance(value, dict):
            top.notes.add(key, value, "a table, written as [[shift]]")
            continue
        entry = _entry(Table(value, key, top.notes))
        if entry:
            found.append(entry)
    period = (tank.period if tank else None) or keys.DAY
    if sum(entry.count for entry in found) > keys.LOADS_MOST:
        top.refuse("shift", f"shift has more than {keys.LOADS_MOST} loads", "Write fewer.")
    for number, entry in enumerate(found):
        if entry.moments[-1] >= period:
            allowed = f"such that its last load goes in before {period / 3600.0:g} h"
            where = (*top.key("shift"), number, "count" if entry.count > 1 else "at")
            top.notes.add(where, entry.moments[-1] / 3600.0, allowed, "That is the period.")
    return tuple(found)


def _entry(table: Table) -> ShiftInput | None:
    table.only(keys.SHIFT)
    at = table.quantity("at", "duration", (0.0, 7.0 * keys.DAY))
    if not table.has("at"):
        table.missing("at", "the time of the first load", 'Such as at = "0 h".')
    every = table.quantity("every", "duration", (60.0, keys.DAY))
    count = table.integer("count", (1, keys.LOADS_MOST))
    if table.has("count") and (count or 1) > 1 and not table.has("every"):
        table.missing("every", "given beside count", 'Such as every = "1 h".')
    mass = table.quantity("mass", "mass", keys.MASS_RANGE)
    start_temp = table.quantity("from", "temperature", (673.15, keys.TEMP_RANGE[1]))
    thickness = table.quantity("thickness", "length", keys.DIMENSION_RANGE)
    time = table.quantity("time", "duration", keys.STAGE_TIME_RANGE)
    inline = ("mass", "from", "thickness", "time")
    given = [name for name in inline if table.has(name)]
    if given and table.has("case"):
        table.fault("case", f"left out where {given[0]} is given", "Keep one of the two.")
    elif given:
        for name in inline:
            if not table.has(name):
                table.missing(name, f"given beside {given[0]}", "A load by its mass needs all.")
    case_file = None
    if file := table.text("case", 1000):
        case_file = table.notes.folder / file
        if not case_file.is_file():
            remedy = "There is no such file; the path counts from this one."
            table.fault("case", "a case file with a [load]", remedy)
    if at is None or table.notes.has(table.place):
        return None
    return ShiftInput(
        at, every, 1 if count is None else count, case_file, mass, start_temp, thickness, time
    )
