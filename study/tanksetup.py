"""From the tank of a case to the tank that is marched, and to a section in its bath."""

from dataclasses import replace

import numpy as np

from midradius.fem.fluids import Fluid
from midradius.fem.media import medium
from midradius.study.bath import Tank
from midradius.study.bathcooler import cooler_of
from midradius.study.case import Case
from midradius.study.casemedium import effective_bath
from midradius.study.casetank import tank_stage
from midradius.study.heatload import STAYS_AT_MOST, bodies_of, degC, solve, stages_in
from midradius.study.setup import Setup
from midradius.study.shift import response_of
from midradius.study.sizing import Limits
from midradius.study.tankfluid import fluid_of
from midradius.study.tankinput import TankInput
from midradius.study.tanksafety import FREEBOARD, cautions
from midradius.thermo.errors import InputFault
from midradius.thermo.properties import DENSITY
from midradius.thermo.source import RangeNote

ZERO_DEGC = 273.15
AIR = 20.0 + ZERO_DEGC
TURNED_OVER = 60.0  # s within which a bath counts as well mixed


def tank_of(
    given: TankInput, fluid: Fluid, bath: float, limit: float
) -> tuple[Tank, tuple[str, ...]]:
    """The tank as the march sees it, and what was taken where the case does not say."""
    taken = []
    filled = AIR if given.filled_at is None else given.filled_at
    if fluid.kind == "salt" and given.filled_at is None:
        filled = bath
    taken.append(
        f"{given.volume:g} m3 of {fluid.name} as filled at {filled - ZERO_DEGC:.4g} degC; the"
        " mass stays, evaporation and drag-out are topped up."
    )
    if given.length and given.width:
        area = given.length * given.width
    else:
        area = given.volume ** (2.0 / 3.0)
        taken.append(f"The open surface is taken as that of a cube, {area:.3g} m2.")
    cooler = cooler_of(given.cooler, bath_cp=float(fluid.heat_capacity_at(limit)), bath_limit=limit)
    start = bath
    if given.cooler is not None:
        start = bath if given.cooler.start is None else given.cooler.start
        if given.cooler.coolant_in is None:
            taken.append("The coolant enters at 25 degC.")
        taken.append(f"The cooler opens from {start - ZERO_DEGC:.4g} degC over 4 K.")
    mixing, n_layer = 0.0, 1
    if given.flow is not None:
        mixing = given.flow * float(fluid.density_at(bath))
        if given.volume / given.flow > TURNED_OVER:
            n_layer = 3
            taken.append(
                f"One turnover takes {given.volume / given.flow:.0f} s, more than a minute:"
                " three stacked layers."
            )
    elif given.layers is None:
        taken.append("No flow is given: the bath is taken as well mixed.")
    elif given.layers > 1:
        taken.append("No flow is given: nothing but the cooler's own flow mixes the layers.")
    n_layer = n_layer if given.layers is None else given.layers
    air = AIR if given.air is None else given.air
    density = float(fluid.density_at(filled))
    tank = Tank(
        fluid=fluid,
        fill_mass=given.volume * density,
        area=area,
        air=air,
        cooler=cooler,
        cooler_start=start,
        heater=given.heater or 0.0,
        heater_set=bath if given.heater_set is None else given.heater_set,
        agitator=given.agitator or 0.0,
        mixing=mixing,
        n_layer=n_layer,
        lid=given.lid,
        drag_out=(given.drag_out or 0.0) * density,
    )
    return tank, tuple(taken)


def limits_of(
    given: TankInput, fluid: Fluid, bath: float
) -> tuple[Limits, float | None, tuple[str, ...]]:
    """Limits of the bath, flash point [K], and what was taken where the case does not say.

    Raises
    ------
    InputFault
        The limit is not above the bath of the route.
    """
    taken = []
    limit = given.bath_limit
    if limit is None:
        limit = max(fluid.work_max, bath + 5.0)
        taken.append(
            f"No bath_limit is given: {limit - ZERO_DEGC:.4g} degC is taken, the usual end of the"
            f" working range of {fluid.name}."
        )
    if limit <= bath:
        raise InputFault(
            "tank.bath_limit",
            f'"{limit - ZERO_DEGC:.4g} degC"',
            f"above the bath of the route, {bath - ZERO_DEGC:.4g} degC",
            "A load warms the bath: leave room.",
        )
    flash = given.flash_point if given.flash_point is not None else fluid.flash
    unknown = given.flash_point is None and not fluid.flash_given
    if fluid.kind == "oil" and unknown and flash is not None:
        taken.append(
            f"No flash_point is given: {flash - ZERO_DEGC:.4g} degC is usual and can only refuse,"
            " not accept; take that of your oil from its data sheet."
        )
    return Limits(limit, given.rise_limit, given.ready_at), flash, tuple(taken)


def told(case: Case, given: TankInput) -> tuple[str, ...]:
    """What else an answer takes for granted."""
    lines = [
        "All pieces of a load see the bath as one; the walls of the tank lose no heat.",
    ]
    if not given.coupled:
        lines.append("Coupling is off: the load sees the bath of the route throughout.")
    number = tank_stage(case.route)
    use = case.route[number].medium if number is not None else None
    stirred = use is not None and (use.name or "").endswith("agitated")
    if stirred and given.velocity is not None and not 0.35 <= given.velocity <= 0.7:
        lines.append(
            f"Films are those of about 0.5 m/s past the parts, not of {given.velocity:g} m/s."
        )
    if case.load and not case.load.fixtures:
        lines.append("No basket or fixture is given: nothing but the pieces warms the bath.")
    if given.freeboard is None and given.depth is not None:
        lines.append(f"Freeboard {1e3 * FREEBOARD:.0f} mm (an estimate; 250 mm is better).")
    return tuple(lines)


def in_bath(case: Case, setup: Setup) -> Setup:
    """The stages of a case whose bath warms under the whole load; as given without a tank.

    The bath starts as the route says; what the load does to it is solved first, on a
    coarse grid, and the section then sees that bath.
    """
    given, number = case.tank, tank_stage(case.route)
    if given is None or case.load is None or number is None:
        return setup
    use = case.route[number].medium
    bath = effective_bath(use) if use is not None else None
    assert use is not None and bath is not None, "the reader checked"
    fluid = fluid_of(use, given.fluid_file)
    if not given.coupled:
        line = "Coupling is off: the load does not warm the bath."
        return replace(setup, assumptions=(*setup.assumptions, line))
    limits, _, taken = limits_of(given, fluid, bath)
    tank, more = tank_of(given, fluid, bath, limits.bath)
    bodies = bodies_of(case)
    solid = sum(body.mass for body in bodies) / DENSITY
    longest = STAYS_AT_MOST * solve(bodies, bath=bath, response=None).stay
    found = solve(bodies, bath=bath, response=response_of(tank, bath, solid), longest=longest)
    hottest = float(np.max(found.path.temp[found.path.time <= found.stay]))
    lines = (
        f"The bath warms under the load of the case from {degC(bath)} to {degC(hottest)}, and the"
        " section sees it so; `midradius tank` says whether the tank is acceptable.",
        *taken,
        *more,
    )
    beyond = []
    if use.film_file is None and hottest > (most := medium(use.name or "").bath_max):
        allowed = f"up to {degC(most)}; above, the film of that is kept: figures are out of range"
        name = f"film coefficient in {fluid.name}"
        beyond.append(RangeNote(name, "hottest bath", degC(hottest), allowed))
    return replace(
        setup,
        notes=(*setup.notes, *beyond),
        stages=stages_in(setup, case, found.path, longest=longest if found.cut_short else None),
        assumptions=(*setup.assumptions, *lines),
        cautions=tuple(dict.fromkeys([*setup.cautions, *cautions(fluid)])),
        sources=tuple(dict.fromkeys([*setup.sources, fluid.source])),
    )
