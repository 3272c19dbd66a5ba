"""Loads of a shift in one tank: first day, periodic state, a cooler that fails.

Model
-----
Each kind of load is solved in its bath twice, immersed into the usual bath and into
one at its limit; between, its heat on time is linear in the bath at immersion, and held
beyond half as much again. The periodic state is the day that ends as it began.

Source
------
Derived; the closed form of equal pulses is ``T_min = Tc + d x / (1 - x)``,
``x = exp(-K tau / C)``, ``d = E / C``.

Holds for
---------
Loads that do not touch; the heat of a load that is in the bath with another is solved
as if alone.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.study.bath import LONGEST_STEP, BathRun, Immersion, Tank, march
from midradius.study.case import Case, Stage, SteelInput
from midradius.study.casefile import read
from midradius.study.casetank import tank_stage
from midradius.study.heatload import (
    STAYS_AT_MOST,
    BathPath,
    Body,
    Given,
    as_slab,
    bodies_of,
    solve,
)
from midradius.study.tankinput import LoadInput, ShiftInput
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault
from midradius.thermo.properties import DENSITY
from midradius.thermo.source import Source

SOURCES = (
    Source("periodic state of a bath", "pulses in a first-order system", "closed form", "derived"),
)

SAME_DAY = 0.02  # K between start and end of the periodic day
MOST_DAYS = 40
FOLLOWED = 4.0 * 3600.0  # s after a single load
OWN = "load of the case"


@dataclass(frozen=True)
class LoadKind:
    """One kind of load with its heats: ``heats`` by film variant, each (cool, warm) bath.

    ``held`` are those in baths that stay as they are: quicker than in any that warms.
    """

    name: str
    bodies: tuple[Body, ...]
    cool: float
    warm: float
    heats: tuple[tuple[Given, Given], ...]
    held: tuple[tuple[Given, Given], ...]

    @property
    def mass(self) -> float:
        """All that goes in [kg]."""
        return sum(body.mass for body in self.bodies)

    @property
    def stay(self) -> float:
        """The longest that it is in the bath, over the films [s]."""
        return max(g.stay for pair in self.heats for g in pair)

    def immersion(self, time: float, variant: IntArray, *, of_any_tank: bool = False) -> Immersion:
        """This load at ``time`` [s] in baths of the film variants ``variant`` (n_bath,).

        ``of_any_tank`` takes the heats in held baths, which no tank exceeds.
        """
        heats = self.held if of_any_tank else self.heats
        stay = max(g.stay for pair in heats for g in pair)

        def heat(seconds: Array, temp: Array) -> Array:
            weight = np.clip((temp - self.cool) / (self.warm - self.cool), -0.5, 1.5)
            curves = np.array(
                [[np.interp(seconds, g.time, g.heat) for g in pair] for pair in heats]
            )
            cool, warm = curves[variant, 0].T, curves[variant, 1].T
            return np.asarray((1.0 - weight) * cool + weight * warm)

        return Immersion(time, stay, self.mass / DENSITY, heat, self.name)


def response_of(tank: Tank, bath: float, solid: float) -> "_Response":
    """What a tank at ``bath`` [K] does with the heat of one load."""
    return _Response(tank, bath, solid)


@dataclass(frozen=True)
class _Response:
    tank: Tank
    bath: float
    solid: float

    def run(self, time: Array, heat: Array) -> BathRun:
        load = Immersion(
            0.0, float(time[-1]), self.solid, lambda s, _: np.interp(s, time, heat)[:, None]
        )
        return march(self.tank, [load], start=np.array([self.bath]), end=float(time[-1]))

    def __call__(self, time: Array, heat: Array) -> BathPath:
        run = self.run(time, heat)
        return BathPath(run.time, run.at_load()[:, 0])


def kind_of(
    name: str,
    bodies: tuple[Body, ...],
    tank: Tank,
    *,
    cool: float,
    warm: float,
    factors: Sequence[float],
    coupled: bool,
) -> LoadKind:
    """Solve one kind of load for each factor on the film, in a cool and in a warm bath [K]."""
    solid = sum(body.mass for body in bodies) / DENSITY
    heats, held = [], []
    for factor in factors:
        plain = solve(bodies, bath=cool, response=None, film_factor=factor)
        longest = STAYS_AT_MOST * plain.stay

        def at(bath: float, warms: bool, factor: float = factor, longest: float = longest) -> Given:
            return solve(
                bodies,
                bath=bath,
                response=response_of(tank, bath, solid) if warms else None,
                film_factor=factor,
                longest=longest,
            )

        held.append((plain, at(warm, warms=False)))
        heats.append((at(cool, warms=True), at(warm, warms=True)) if coupled else held[-1])
    return LoadKind(name, bodies, cool, warm, tuple(heats), tuple(held))


def bodies_of_entry(case: Case, entry: ShiftInput) -> tuple[str, tuple[Body, ...]]:
    """Name and bodies of a load of the shift.

    Raises
    ------
    CaseFaults
        The other case cannot be read.
    InputFault
        It has no load, or no quench in a liquid.
    """
    if entry.case_file is not None:
        other = read(entry.case_file)
        if other.load is None or tank_stage(other.route) is None:
            lacking = "a [load]" if other.load is None else "a quench in a liquid"
            raise InputFault("shift.case", f'"{entry.case_file.name}"', f"a case with {lacking}")
        other = _in_medium_of(other, case)
        return other.title, bodies_of(other)
    if entry.mass is not None:
        assert entry.start_temp and entry.thickness and entry.time, "the reader checked"
        slab = _plain_slab(case, entry)
        (body,) = bodies_of(slab)
        return f"{entry.mass:g} kg, {entry.thickness * 1e3:g} mm thick", (
            replace(body, mass=entry.mass),
        )
    return OWN, bodies_of(case)


def _in_medium_of(other: Case, case: Case) -> Case:
    """Another case quenched in this tank's medium and bath."""
    here, there = tank_stage(case.route), tank_stage(other.route)
    assert here is not None and there is not None
    stage = replace(other.route[there], medium=case.route[here].medium)
    route = tuple(stage if k == there else s for k, s in enumerate(other.route))
    return replace(other, route=route)


def _plain_slab(case: Case, entry: ShiftInput) -> Case:
    number = tank_stage(case.route)
    assert number is not None
    route = (
        Stage("soak", at=entry.start_temp, time=3600.0),
        Stage("quench", time=entry.time, medium=case.route[number].medium),
    )
    steel = SteelInput(case.steel.steel, case.steel.grain_astm)
    slab = as_slab(replace(case, route=route), entry.thickness or 0.0, steel)
    return replace(slab, load=LoadInput(piece_mass=entry.mass))


@dataclass(frozen=True)
class Shift:
    """Baths through a day: ``first`` from the morning, ``steady`` the periodic day.

    ``loads`` are those of the day; ``steady`` is ``first`` for a load alone.
    """

    loads: tuple[Immersion, ...]
    period: float
    first: BathRun
    steady: BathRun
    days: int
    settled: bool


def through(
    tank: Tank,
    loads: Sequence[Immersion],
    *,
    period: float,
    morning: Array,
    repeats: bool,
    volume: Array | None = None,
    cooling: Array | None = None,
    most_days: int = MOST_DAYS,
    same: float = SAME_DAY,
    longest: float = LONGEST_STEP,
) -> Shift:
    """March a day, and on until a day ends as it began.

    ``morning`` (n_bath,) [K]; ``volume``, ``cooling`` and ``longest`` as in `bath.march`.
    """

    def day(start: Array) -> BathRun:
        return march(
            tank, loads, start=start, end=period, volume=volume, cooling=cooling, longest=longest
        )

    first = day(morning)
    run, days, settled = first, 1, not repeats
    while repeats and days < most_days:
        begun = run.temp[0]
        if float(np.abs(run.temp[-1] - begun).max()) < same:
            settled = True
            break
        run, days = day(run.temp[-1]), days + 1
    return Shift(tuple(loads), period, first, run, days, settled)


@dataclass(frozen=True)
class Failure:
    """The cooler fails just as a load goes in, that load whose bath then gets hottest.

    ``at`` [s] is that load's time; ``hottest`` [K] under it alone, ``band`` over the film
    variants. If loads go on: the hottest bath [K] of any such failure, and the shortest
    time [s] until the limit is passed (nan: never that day).
    """

    at: float
    hottest: float
    band: tuple[float, float]
    hottest_if_loads_go_on: float
    passes_limit_after: float


def cooler_failure(
    tank: Tank, loads: Sequence[tuple[LoadKind, float]], shift: Shift, *, limit: float
) -> Failure | None:
    """What a failed cooler does to the loads of the periodic day; None without a cooler.

    A failure at immersion is the worst of those while the load is in: every later one
    lets the cooler take out more. ``loads`` are kinds with their times [s] in order;
    the baths of ``shift`` are the film variants.
    """
    if tank.cooler is None:
        return None
    n_variant = shift.steady.temp.shape[1]
    variant = np.tile(np.arange(n_variant), len(loads))
    times = np.array([time for _, time in loads])
    run = march(
        tank,
        [kind.immersion(time, variant) for kind, time in loads],
        start=np.tile(shift.steady.temp[0], (len(loads), 1)),
        end=shift.period,
        cooler_fails_at=np.repeat(times, n_variant),
    )
    hottest = run.hottest.reshape(len(run.time), len(loads), n_variant)
    alone, going_on, passed = [], [], []
    for k, time in enumerate(times):
        until = np.min(times[times > time], initial=shift.period)
        since = run.time >= time
        alone.append(hottest[since & (run.time <= until), k].max(axis=0))
        going_on.append(float(hottest[since, k].max()))
        over = run.time[since & (hottest[:, k].max(axis=1) > limit)]
        passed.append(float(over[0] - time) if len(over) else np.inf)
    worst = int(np.argmax([one.max() for one in alone]))
    soonest = min(passed)
    return Failure(
        at=float(times[worst]),
        hottest=float(alone[worst][0]),
        band=(float(alone[worst].min()), float(alone[worst].max())),
        hottest_if_loads_go_on=max(going_on),
        passes_limit_after=soonest if np.isfinite(soonest) else float("nan"),
    )


@dataclass(frozen=True)
class LoadInBath:
    """One load of a day, (n_bath,) each: bath at immersion, hottest, rise [K]; at the next
    load [K], or at the end of the day; time until the bath is back within 1 K [s] or nan."""

    name: str
    time: float
    before: Array
    hottest: Array
    rise: Array
    at_next: Array
    recovered: Array


def loads_in(run: BathRun, loads: Sequence[Immersion], period: float) -> tuple[LoadInBath, ...]:
    """What each load did to the bath in one day."""
    found = []
    order = sorted(loads, key=lambda load: load.time)
    for load, after in zip(order, [*order[1:], None], strict=True):
        until = after.time if after else period
        start = int(np.searchsorted(run.time, load.time - 1e-9))
        end = int(np.searchsorted(run.time, until - 1e-9))
        temp = run.hottest[start : end + 1]
        before = run.at_load()[start]
        peak = temp.argmax(axis=0)
        cold = temp <= before[None, :] + 1.0
        cold &= np.arange(len(temp))[:, None] > peak[None, :]
        back = run.time[start + cold.argmax(axis=0)] - load.time
        recovered = np.where(cold.any(axis=0), back, np.nan)
        hottest = temp.max(axis=0)
        found.append(
            LoadInBath(load.name, load.time, before, hottest, hottest - before, temp[-1], recovered)
        )
    return tuple(found)
