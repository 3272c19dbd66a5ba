"""How large a tank and a cooler must be: least volume, least cooler, the curve between.

Model
-----
Many tanks of the same depth and many coolers of the same kind (conductance and flows
in proportion) go through the same day until it repeats; a pair is good if the bath
stays below its limit, no load raises it by more than the rise allowed, and it is ready
for the next load. The least cooler of a volume is where the margin is nought, linear
between neighbours of a fine grid; likewise the least volume.

Source
------
Derived from the bath's balance. Flow and power: continuity; propellers of 420 rpm by
diameter (read, MacKenzie's table), flow number 0.5 (remembered); power in the oil
common in 1954, US Steel (remembered). Rules of thumb: MacKenzie's columns (read).

Holds for
---------
The loads of the case with their heats in baths that are held, which no warming bath
exceeds: sizes are a little on the safe side. The tank of the case itself is judged
with its load and bath solved as one.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem.fluids import Fluid
from midradius.study.bath import Tank, mixed_temp
from midradius.study.bathcooler import COOLANT_IN, Cooler
from midradius.study.shift import LoadKind, Shift, loads_in, through
from midradius.study.tankinput import TankInput
from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

SOURCES = (
    Source("sizing of a quench tank", "energy balance", "periodic day", "derived"),
    Source("propellers by power", "MacKenzie, quench tank columns", "420 rpm", "read"),
    Source("flow number of a marine propeller", "Q = 0.5 N D^3", "common practice", "remembered"),
    Source("agitation power of quench tanks", "US Steel 1954", "0.005 HP per gallon", "remembered"),
    Source(
        "litres of oil per kg of load", "MacKenzie, sizing columns", "1 gal/lb, 10 l/kg", "read"
    ),
)

N_VOLUME, N_COOLER = 13, 24
LEAST_COOLER, MOST_COOLER = 0.02, 50.0  # times the cooler of the case
STEP = 240.0  # s, longest of a sizing march
PROPELLERS = (  # power [kW], diameter [m], at 7 turns a second
    *((0.75, 0.330), (1.5, 0.381), (2.2, 0.406), (3.7, 0.457), (7.5, 0.533)),
    *((11.2, 0.584), (14.9, 0.610), (18.6, 0.635)),
)
TURNS, FLOW_NUMBER = 7.0, 0.5
GALLON_PER_POUND = 8.345  # l/kg
ONCE = 10.0  # l/kg
POWER_PER_VOLUME = {"oil": 0.985, "water": 0.9}  # kW/m3, 0.005 and 0.0045 HP per US gallon


@dataclass(frozen=True)
class Limits:
    """What the bath must keep [K]; None is no limit."""

    bath: float
    rise: float | None
    ready: float | None


def margin(shift: Shift, limits: Limits) -> Array:
    """Smallest margin of a periodic day to its limits [K], (n_bath,)."""
    runs = (shift.steady, shift.first)
    found = [limits.bath - run.hottest.max(axis=0) for run in runs]
    for load in loads_in(shift.steady, shift.loads, shift.period):
        if limits.rise is not None:
            found.append(limits.rise - load.rise)
        if limits.ready is not None:
            found.append(limits.ready - load.at_next)
    return np.asarray(np.min(found, axis=0))


@dataclass(frozen=True)
class Sizing:
    """Least cooler on volume, least volume; (n_variant, ...) where films vary.

    ``volume`` (n,) [m3] with ``cooler`` (n_variant, n) [W/K], nan where no cooler does
    it; ``per_kelvin_to_duty`` [K] makes its duty at the limit of the bath. ``volume_least``
    (n_variant,) [m3] for the cooler of the case, ``cooler_least`` (n_variant,) [W/K] for
    its volume.
    """

    volume: Array
    cooler: Array
    per_kelvin_to_duty: float
    volume_least: Array
    cooler_least: Array
    volume_given: float
    cooler_given: float
    coolant_in: float


def size(
    tank: Tank,
    loads: Sequence[tuple[LoadKind, float]],
    given: TankInput,
    limits: Limits,
    *,
    period: float,
    morning: float,
    repeats: bool,
    n_variant: int,
) -> Sizing:
    """Size tank and cooler for a day; ``loads`` are kinds with their times [s]."""
    cooler = tank.cooler or Cooler(1e3, COOLANT_IN, 0.0, "")
    lift = limits.bath - cooler.coolant_in
    base = replace(tank, cooler=cooler)

    def margins(volume: Array, cooling: Array) -> Array:
        """(n_variant, n) for n pairs."""
        n = len(volume)
        variant = np.repeat(np.arange(n_variant), n)
        shift = through(
            base,
            [kind.immersion(time, variant, of_any_tank=True) for kind, time in loads],
            period=period,
            morning=np.full(n * n_variant, morning),
            repeats=repeats,
            volume=np.tile(volume, n_variant),
            cooling=np.tile(cooling, n_variant),
            most_days=6,
            same=0.3,
            longest=STEP,
        )
        return margin(shift, limits).reshape(n_variant, n)

    energy = max(max(g.total for pair in kind.held for g in pair) for kind, _ in loads)
    room = max(min(limits.bath - morning, limits.rise or np.inf), 2.0)
    density = float(tank.fluid.density_at(morning))
    simple = energy / (room * density * float(tank.fluid.heat_capacity_at(morning)))
    low, high = 0.45 * simple, max(3.0 * simple, 1.6 * given.volume)
    volume = np.unique(np.append(np.geomspace(low, high, N_VOLUME), given.volume))
    one = (energy * len(loads) / period) / max(lift, 1.0) / cooler.per_kelvin
    cooling = one * np.geomspace(LEAST_COOLER, MOST_COOLER, N_COOLER)
    pair_volume = np.repeat(volume, N_COOLER) / given.volume
    grid = margins(pair_volume, np.tile(cooling, len(volume)))
    grid = grid.reshape(n_variant, len(volume), N_COOLER)
    least = np.array([[_crossing(np.log(cooling), row) for row in one_] for one_ in grid])
    fine = np.geomspace(low, high, 4 * N_VOLUME)
    own = np.full(len(fine), 1.0 if tank.cooler else 0.0)
    by_volume = margins(fine / given.volume, own)
    here = int(np.argmin(np.abs(volume - given.volume)))
    return Sizing(
        volume=volume,
        cooler=np.exp(least) * cooler.per_kelvin,
        per_kelvin_to_duty=lift,
        volume_least=np.exp([max(_crossing(np.log(fine), r), np.log(low)) for r in by_volume]),
        cooler_least=np.exp(least[:, here]) * cooler.per_kelvin,
        volume_given=given.volume,
        cooler_given=tank.cooler.per_kelvin if tank.cooler else 0.0,
        coolant_in=cooler.coolant_in,
    )


def _crossing(x: Array, y: Array) -> float:
    """The least x from which on y stays at or above 0; -inf if it always does, nan if never."""
    bad = np.nonzero(y < 0.0)[0]
    if len(bad) == 0:
        return float("-inf")
    k = int(bad[-1])
    if k == len(x) - 1:
        return float("nan")
    return float(x[k] + (x[k + 1] - x[k]) * (-y[k]) / (y[k + 1] - y[k]))


@dataclass(frozen=True)
class Agitation:
    """Guidance: flow [m3/s], time of one turnover [s], propellers, power [kW]."""

    flow: float
    turnover: float
    propellers: int
    diameter: float
    propeller_power: float
    usual_power: float


def agitation(given: TankInput, fluid: Fluid) -> Agitation | None:
    """What gives the asked velocity through the load, else what the given flow does."""
    flow = given.flow
    if given.velocity is not None and given.passage is not None:
        flow = given.velocity * given.passage
    if flow is None:
        return None
    for count in range(1, 101):
        for power, diameter in PROPELLERS:
            if count * FLOW_NUMBER * TURNS * diameter**3 >= flow:
                usual = POWER_PER_VOLUME["oil" if fluid.kind == "oil" else "water"]
                return Agitation(
                    flow, given.volume / flow, count, diameter, count * power, usual * given.volume
                )
        if count >= 8 and flow > 100.0:
            break
    return Agitation(flow, given.volume / flow, 0, np.nan, np.nan, np.nan)


def rules(
    mass: float, energy: float, volume: float, fluid: Fluid, bath: float
) -> tuple[tuple[str, float, str], ...]:
    """Rules of thumb beside the answer: name, value, unit. Common practice, no answer."""
    fluid_mass = volume * float(fluid.density_at(bath))
    rise = mixed_temp(fluid, fluid_mass, bath, lambda _: energy) - bath
    found = [
        ("this tank", 1e3 * volume / mass, "l per kg of parts and fixtures"),
        ("rise of one load without any loss", rise, "K"),
        (f"usual limit of that rise in {fluid.name}", fluid.rise_usual, "K"),
    ]
    if fluid.kind == "oil":
        found.insert(1, ("rule of one US gallon per pound", GALLON_PER_POUND, "l/kg"))
        found.insert(2, ("rule for a single quench", ONCE, "l/kg"))
        found.insert(3, ("volume by the rule for a single quench", ONCE * mass / 1e3, "m3"))
    if fluid.kind == "polymer":
        found.insert(1, ("rule for polymer, at least", GALLON_PER_POUND, "l/kg"))
        found.insert(2, ("rule for polymer, new tanks", 2.0 * GALLON_PER_POUND, "l/kg"))
    return tuple(found)
