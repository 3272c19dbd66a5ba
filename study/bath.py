"""The bath of a quench tank through time: one mass of fluid, or a few stacked layers.

Model
-----
Per layer ``dE/dt = load + heater + agitator - cooler - surface``, E the heat content
of the layer's mass. Heater and cooler open in proportion over a band of 4 K, which
stands for the mean of an on-off thermostat. Drag-out and evaporation are topped up
with make-up at the air's temperature, so that the mass stays. The load heats the
layer that holds it; layers exchange what agitation and cooler pump from one to the
next, and turn over at once where a lower one is the warmer (heat content per kg).
All of a step is counted by the same rates that move the bath: its account closes to
rounding.

Many baths are marched at once: arrays have the shape (n_bath,), fields (n_bath, n_layer).

Source
------
Energy balance (derived); theta method, implicit, 0.55. Layers: engineering estimate.

Holds for
---------
A bath below its boiling and flash point. One layer: the fluid is turned over in less
than a minute; else the local rise is larger and layers say how much, roughly.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem.fluids import Fluid
from midradius.study.bathcooler import Cooler
from midradius.study.bathloss import surface_loss
from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

SOURCES = (
    Source("bath of a quench tank", "energy balance", "theta method", "derived"),
    Source(
        "stacked layers of a weakly mixed bath", "1 to 3 plane layers", "own judgement", "estimate"
    ),
)

BAND = 4.0  # K over which a thermostat opens
THETA = 0.55
LONGEST_STEP = 60.0  # s
SHARE_BELOW, SHARE_BESIDE = 0.25, 0.5  # of the fluid, below and beside the load [estimate]
_PROBE = 0.01  # K, of the numerical slope
_LOSS_GRID = np.arange(-30.0, 700.5, 0.5) + 273.15


@dataclass(frozen=True)
class Tank:
    """A tank as the march sees it; W, K, kg, m2, kg/s. ``fill_mass`` of the case's volume."""

    fluid: Fluid
    fill_mass: float
    area: float
    air: float
    cooler: Cooler | None = None
    cooler_start: float = 0.0
    heater: float = 0.0
    heater_set: float = 0.0
    agitator: float = 0.0
    mixing: float = 0.0
    n_layer: int = 1
    lid: bool = False
    drag_out: float = 0.0


@dataclass(frozen=True)
class Immersion:
    """A load that goes in at ``time`` [s] and stays for ``stay`` [s], displacing ``solid`` [m3].

    ``heat`` gives, from the seconds since immersion (n,) and the bath's temperature then
    (n_bath,) [K], the heat given until each second, (n, n_bath) [J].
    """

    time: float
    stay: float
    solid: float
    heat: Callable[[Array, Array], Array]
    name: str = "load"


@dataclass(frozen=True)
class BathRun:
    """What a march leaves: ``temp`` (n_time, n_bath, n_layer) [K] at ``time`` (n_time,) [s].

    Heats [J] are totals, (n_time, n_bath), by name in ``heat``: load, heater, agitator,
    cooler, surface, drag-out (the last three leave the bath). ``evaporated`` [kg].
    ``balance`` (n_bath,) is the account's relative gap.
    """

    time: Array
    temp: Array
    heat: dict[str, Array]
    evaporated: Array
    content: Array
    start_temp: Array
    balance: Array

    @property
    def hottest(self) -> Array:
        """The hottest layer, (n_time, n_bath) [K]."""
        return np.asarray(self.temp.max(axis=2))

    def at_load(self) -> Array:
        """The layer that holds the load, (n_time, n_bath) [K]."""
        return self.temp[:, :, load_layer(self.temp.shape[2])]


def load_layer(n_layer: int) -> int:
    """The layer, counted from the bottom, that holds the load."""
    return min(1, n_layer - 1)


def shares(n_layer: int) -> Array:
    """The fluid's shares by layer from the bottom, (n_layer,)."""
    if n_layer == 3:
        return np.array([SHARE_BELOW, SHARE_BESIDE, 1.0 - SHARE_BELOW - SHARE_BESIDE])
    return np.full(n_layer, 1.0 / n_layer)


def times_of(
    tank: Tank,
    loads: Sequence[Immersion],
    end: float,
    *,
    smallest_volume: float,
    longest: float = LONGEST_STEP,
) -> Array:
    """Moments [s] of a march: dense after each immersion, never wider than ``longest``."""
    if tank.n_layer > 1:
        flow = tank.mixing + (tank.cooler.bath_flow if tank.cooler else 0.0)
        least = tank.fill_mass * smallest_volume * float(shares(tank.n_layer).min())
        longest = min(longest, 0.4 * least / max(flow, 1e-9))
    moments = [np.arange(0.0, end, longest)]
    for load in loads:
        near = np.concatenate([[0.0], np.geomspace(0.5, max(load.stay, 1.0), 60)])
        moments.append(load.time + near)
    found = np.unique(np.round(np.concatenate(moments), 6))
    # The end itself, exactly: a rounded one would leave out the last of the heat.
    return np.append(found[found < end - 1e-5], end)


def march(
    tank: Tank,
    loads: Sequence[Immersion],
    *,
    start: Array,
    end: float,
    volume: Array | None = None,
    cooling: Array | None = None,
    cooler_fails_at: Array | float = np.inf,
    longest: float = LONGEST_STEP,
) -> BathRun:
    """March baths from 0 to ``end`` [s].

    Parameters
    ----------
    tank, loads
        The tank and what goes in, in the order of time.
    start
        Temperatures at the start [K], (n_bath, n_layer) or (n_bath,).
    volume, cooling
        Factors on the tank's mass and area, and on its cooler, (n_bath,); 1 by default.
    cooler_fails_at
        From then on no cooler [s], one moment or (n_bath,).
    longest
        Longest step [s].
    """
    start = np.asarray(start, dtype=np.float64)
    if start.ndim == 1:
        start = np.repeat(start[:, None], tank.n_layer, axis=1)
    n_bath = len(start)
    volume = np.ones(n_bath) if volume is None else np.asarray(volume, dtype=np.float64)
    cooling = np.ones(n_bath) if cooling is None else np.asarray(cooling, dtype=np.float64)
    mass = tank.fill_mass * volume[:, None] * shares(tank.n_layer)[None, :]
    rates = _Rates(tank, mass, volume, cooling)
    time = times_of(tank, loads, end, smallest_volume=float(volume.min()), longest=longest)
    layer = load_layer(tank.n_layer)
    content = mass * tank.fluid.enthalpy(start)
    first = content.sum(axis=1)
    temp = start.copy()
    kept, heats = [temp], [np.zeros((6, n_bath))]
    water, evaporated = np.zeros(n_bath), [np.zeros(n_bath)]
    contents = [first]
    begun: dict[int, Array] = {}
    starts = np.full((len(loads), n_bath), np.nan)
    fails = np.broadcast_to(np.asarray(cooler_fails_at, dtype=np.float64), (n_bath,))
    order = sorted(range(len(loads)), key=lambda k: loads[k].time)
    for now, after in zip(time[:-1], time[1:], strict=True):
        span = after - now
        given, dragged = np.zeros(n_bath), np.zeros(n_bath)
        for k in order:
            load = loads[k]
            if load.time > now + 1e-9:
                break
            if k not in begun:
                starts[k] = temp[:, layer]
                seconds = np.minimum(time[time >= load.time - 1e-9] - load.time, load.stay)
                begun[k] = np.vstack([load.heat(seconds, starts[k]), np.zeros(n_bath)])
                made = tank.fluid.enthalpy(starts[k]) - tank.fluid.enthalpy(tank.air)
                dragged += tank.drag_out * made
            row = int(np.searchsorted(time, now)) - int(np.searchsorted(time, load.time - 1e-9))
            given += begun[k][row + 1] - begun[k][row]
        source = np.zeros_like(mass)
        source[:, layer] = given - dragged
        open_now = np.where(now < fails - 1e-9, 1.0, 0.0)
        content, temp, moved, lost = rates.step(content, temp, source, span, open_now)
        heats.append(heats[-1] + np.array([given, *moved, dragged]))
        water = water + lost
        evaporated.append(water)
        kept.append(temp)
        contents.append(content.sum(axis=1))
    total = np.array(heats)
    names = ("load", "heater", "agitator", "cooler", "surface", "drag-out")
    heat = {name: total[:, k] for k, name in enumerate(names)}
    into = heat["load"][-1] + heat["heater"][-1] + heat["agitator"][-1]
    out = heat["cooler"][-1] + heat["surface"][-1] + heat["drag-out"][-1]
    gap = np.abs(contents[-1] - first - into + out)
    scale = np.abs(into) + np.abs(out) + 1e-9 * np.abs(first) + 1.0
    return BathRun(
        time, np.array(kept), heat, np.array(evaporated), np.array(contents), starts, gap / scale
    )


class _Rates:
    """The rates of one march; it holds the tables that all steps read."""

    def __init__(self, tank: Tank, mass: Array, volume: Array, cooling: Array) -> None:
        self.tank, self.mass = tank, mass
        loss, water = surface_loss(tank.fluid, _LOSS_GRID, air=tank.air)
        made_up = np.maximum(tank.fluid.enthalpy(_LOSS_GRID) - tank.fluid.enthalpy(tank.air), 0.0)
        area = 0.0 if tank.lid else tank.area
        self.loss, self.water = area * (loss + water * made_up), area * water
        # A larger tank of the same depth: its surface grows as its volume.
        self.spread = volume
        self.per_kelvin = cooling * (tank.cooler.per_kelvin if tank.cooler else 0.0)

    def of(self, temp: Array, cooled: Array) -> tuple[Array, Array, Array]:
        """Heater, cooler and surface [W] of layer temperatures, (n_bath,) each.

        ``cooled`` (n_bath,) is 1 where the cooler works and 0 where it failed.
        """
        tank = self.tank
        low, high = temp[:, 0], temp[:, -1]
        heater = tank.heater * np.clip((tank.heater_set - low) / BAND, 0.0, 1.0)
        cooler = np.zeros(len(temp))
        if tank.cooler is not None:
            opened = np.clip((high - tank.cooler_start) / BAND, 0.0, 1.0)
            hotter = np.maximum(high - tank.cooler.coolant_in, 0.0)
            cooler = cooled * self.per_kelvin * opened * hotter
        surface = self.spread * np.interp(high, _LOSS_GRID, self.loss)
        return heater, cooler, surface

    def into(self, temp: Array, cooled: Array) -> tuple[Array, Array]:
        """Heat into each layer [W], and (heater, agitator, cooler, surface) [W]."""
        tank = self.tank
        heater, cooler, surface = self.of(temp, cooled)
        agitator = np.full(len(temp), tank.agitator)
        rate = tank.agitator * self.mass / self.mass.sum(axis=1, keepdims=True)
        rate[:, 0] += heater - cooler
        rate[:, -1] -= surface
        return rate, np.array([heater, agitator, cooler, surface])

    def between(self, temp: Array, cooled: Array) -> Array:
        """Heat that flows carry between layers [W], (n_bath, n_layer); its sum is 0."""
        tank = self.tank
        rate = np.zeros_like(temp)
        if tank.n_layer == 1:
            return rate
        h = tank.fluid.enthalpy(temp)
        swapped = tank.mixing * (h[:, :-1] - h[:, 1:])
        rate[:, 1:] += swapped
        rate[:, :-1] -= swapped
        if tank.cooler is not None and tank.cooler.bath_flow > 0.0:
            flow = cooled * tank.cooler.bath_flow  # from the top through the cooler to the bottom
            rate[:, 0] += flow * (h[:, -1] - h[:, 0])
            rate[:, 1:] += flow[:, None] * (h[:, :-1] - h[:, 1:])
        return rate

    def step(
        self, content: Array, temp: Array, source: Array, span: float, cooled: Array
    ) -> tuple[Array, Array, Array, Array]:
        """One step; the new content and temperatures, heats moved [J], water lost [kg]."""
        fluid, on = self.tank.fluid, cooled
        rate0, parts0 = self.into(temp, on)
        fixed = content + source + span * self.between(temp, on)
        known = fixed + (1.0 - THETA) * span * rate0
        guess = fluid.temp_of(fixed / self.mass)
        for _ in range(3):
            rate, _parts = self.into(guess, on)
            steeper = (self.into(guess + _PROBE, on)[0] - rate) / _PROBE
            left = known + THETA * span * rate - self.mass * fluid.enthalpy(guess)
            slope = self.mass * fluid.heat_capacity_at(guess) - THETA * span * steeper
            guess = np.clip(guess + left / slope, 230.0, 1100.0)
        rate1, parts1 = self.into(guess, on)
        after = fixed + span * ((1.0 - THETA) * rate0 + THETA * rate1)
        after = _turned(after, self.mass)
        area_water = self.spread * np.interp(guess[:, -1], _LOSS_GRID, self.water)
        moved = span * ((1.0 - THETA) * parts0 + THETA * parts1)
        return after, fluid.temp_of(after / self.mass), moved, span * area_water


def _turned(content: Array, mass: Array) -> Array:
    """Layers after what is warm below has risen."""
    for _ in range(mass.shape[1] - 1):
        for low in range(mass.shape[1] - 1):
            pair = content[:, low : low + 2]
            weight = mass[:, low : low + 2]
            warm = pair[:, 0] / weight[:, 0] > pair[:, 1] / weight[:, 1]
            mean = pair.sum(axis=1) / weight.sum(axis=1)
            content[:, low : low + 2] = np.where(warm[:, None], mean[:, None] * weight, pair)
    return content


def level_volume(tank: Tank, run: BathRun, loads: Sequence[Immersion], volume: Array) -> Array:
    """Fluid with what is immersed in it [m3], (n_time, n_bath)."""
    mass = tank.fill_mass * volume[:, None] * shares(tank.n_layer)[None, :]
    fluid = (mass[None] / tank.fluid.density_at(run.temp)).sum(axis=2)
    solid = np.zeros(len(run.time))
    for load in loads:
        inside = (run.time >= load.time - 1e-9) & (run.time <= load.time + load.stay + 1e-9)
        solid[inside] += load.solid
    return np.asarray(fluid + solid[:, None])


def mixed_temp(
    fluid: Fluid, mass: float, start: float, heat: Callable[[float], Array | float]
) -> float:
    """Where a bath ends that keeps all the heat of a load [K].

    ``heat`` gives what the load gives off [J] until it is at a temperature [K]; ``mass``
    [kg] of fluid at ``start`` [K].
    """
    low, high = start, 1100.0
    first = mass * float(fluid.enthalpy(start))
    for _ in range(60):
        middle = 0.5 * (low + high)
        if mass * float(fluid.enthalpy(middle)) - first < float(heat(middle)):
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def without_losses(tank: Tank) -> Tank:
    """The same tank without cooler, heater, agitator and surface: what a load alone does."""
    return replace(tank, cooler=None, heater=0.0, agitator=0.0, lid=True, drag_out=0.0)
