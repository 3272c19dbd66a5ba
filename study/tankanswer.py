"""The answer of ``midradius tank``: load and bath as one, the day, the size, the checks."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from midradius.fem import fluids
from midradius.fem.fluids import Fluid
from midradius.fem.media import medium
from midradius.study import bath as baths
from midradius.study import bathcooler, bathloss, heatload, shift, sizing, tanksafety
from midradius.study.bath import Tank
from midradius.study.case import Case, MediumUse, position
from midradius.study.casemedium import effective_bath
from midradius.study.casetank import tank_stage
from midradius.study.heatload import STAYS_AT_MOST, Body, Given, bodies_of, solve
from midradius.study.setup import coordinates_of
from midradius.study.shift import OWN, Failure, LoadInBath, LoadKind, Shift, response_of
from midradius.study.sizing import Agitation, Limits, Sizing
from midradius.study.tankfluid import fluid_of
from midradius.study.tankinput import ShiftInput
from midradius.study.tanksafety import FREEBOARD, Check
from midradius.study.tanksetup import limits_of, tank_of
from midradius.study.tanksetup import told as assumed
from midradius.study.worth import worth
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.properties import DENSITY
from midradius.thermo.source import RangeNote, Source

ZERO_DEGC = 273.15
OWN_FILM_PCT = 30.0  # uncertainty of a film curve of the user's own [estimate]
DAY = 86_400.0
ONE_BATH = 5.0  # K around the bath of a film curve before it is said that it is kept
LEAST_WARMER = 10.0  # K between the two baths in which loads are solved
VARIANTS = ("film as given", "stronger film", "weaker film")


@dataclass(frozen=True)
class CoreEffect:
    """Hardness of the core [HV] and the bath behind it: uncoupled, first load, worst load."""

    uncoupled_hv: float
    first_hv: float
    worst_hv: float
    worst_start: float


@dataclass(frozen=True)
class TankAnswer:
    """Everything the command says. Runs hold three baths: the film as given and its band."""

    case: Case
    tank: Tank
    fluid: Fluid
    flash: float | None
    film_max: float | None
    limits: Limits
    uncertainty_pct: float
    kinds: tuple[LoadKind, ...]
    owns: tuple[Given, ...]
    own_bodies: tuple[Body, ...]
    day: Shift
    loads: tuple[LoadInBath, ...]
    level: Array | None
    level_volume: Array
    lip: float | None
    failure: Failure | None
    sizing: Sizing
    agitation: Agitation | None
    core: CoreEffect
    checks: tuple[Check, ...]
    rules: tuple[tuple[str, float, str], ...]
    cautions: tuple[str, ...]
    assumptions: tuple[str, ...]
    notes: tuple[RangeNote, ...]
    sources: tuple[Source, ...]
    balance: float

    @property
    def acceptable(self) -> bool:
        """Whether every check was judged and is met."""
        return self.verdict == "acceptable"

    @property
    def verdict(self) -> tanksafety.Verdict:
        """Acceptable, not acceptable, or not judged in full."""
        return tanksafety.verdict(self.checks)

    @property
    def own_band(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """Heat to the bath [J] and its peak [W] of the case's load, each lowest and highest
        over the film variants."""
        totals, peaks = [g.total for g in self.owns], [g.peak for g in self.owns]
        return (min(totals), max(totals)), (min(peaks), max(peaks))

    @property
    def own(self) -> Given:
        """The case's load in its first bath, film as given."""
        return self.owns[0]

    @property
    def limit_is_safe(self) -> bool:
        """Whether the limit of the bath is one that a size may be given for."""
        return tanksafety.limit_is_safe(
            self.fluid, flash=self.flash, limit=self.limits.bath, film_max=self.film_max
        )

    @property
    def hottest(self) -> Array:
        """Hottest bath by film variant [K], over the first and the periodic day."""
        runs = (self.day.first, self.day.steady)
        return np.asarray(np.max([run.hottest.max(axis=0) for run in runs], axis=0))


Say = Callable[[str], None]


def answer(case: Case, *, say: Say | None = None) -> TankAnswer:
    """Solve loads, day and size of a case's tank.

    Raises
    ------
    InputFault
        The case has no tank or load, or asks for what cannot be.
    SolverFault
        A load and its bath do not settle.
    """
    tell = say or (lambda _: None)
    given, number = case.tank, tank_stage(case.route)
    if given is None or case.load is None or number is None:
        lacking = "tank" if given is None else "load" if case.load is None else "route"
        raise InputFault(lacking, "missing", f"given as [{lacking}]", "The README shows a case.")
    use = case.route[number].medium
    assert use is not None
    bath = effective_bath(use)
    if bath is None:
        raise InputFault(f"route[{number}].bath", "missing", "given for a tank")
    fluid = fluid_of(use, given.fluid_file)
    limits, flash, told = limits_of(given, fluid, bath)
    tank, more = tank_of(given, fluid, bath, limits.bath)
    morning = bath if given.morning is None else given.morning
    known = medium(use.name) if use.name and use.film_file is None else None
    band = known.uncertainty_pct if known else OWN_FILM_PCT
    factors = (1.0, 1.0 + band / 100.0, 1.0 - band / 100.0)
    warm = max(limits.bath, bath + LEAST_WARMER)
    tell("loads")
    bodies = bodies_of(case)
    loads: list[tuple[LoadKind, float]] = []
    kinds: list[LoadKind] = []
    for entry in case.shift or (_ALONE,):
        name, its = (OWN, bodies) if entry is _ALONE else shift.bodies_of_entry(case, entry)
        kind = shift.kind_of(
            name, its, tank, cool=bath, warm=warm, factors=factors, coupled=given.coupled
        )
        kinds.append(kind)
        loads += [(kind, moment) for moment in entry.moments]
    loads.sort(key=lambda item: item[1])
    tell("day")
    period = given.period or DAY
    overlapping = _in_time(loads, period)
    day = shift.through(
        tank,
        [kind.immersion(time, np.arange(len(factors))) for kind, time in loads],
        period=period,
        morning=np.full(len(factors), morning),
        repeats=bool(case.shift),
    )
    rows = shift.loads_in(day.steady, day.loads, period)
    failure = shift.cooler_failure(tank, loads, day, limit=limits.bath)
    owns, core, gap = _own(bodies, tank, day, bath, factors, coupled=given.coupled)
    volume = np.ones(len(factors))
    occupied = np.maximum(
        baths.level_volume(tank, day.first, day.loads, volume).max(axis=0),
        baths.level_volume(tank, day.steady, day.loads, volume).max(axis=0),
    )
    floor = (given.length or 0.0) * (given.width or 0.0)
    level = occupied / floor if floor else None
    tell("size")
    sized = sizing.size(
        tank,
        loads,
        given,
        limits,
        period=period,
        morning=morning,
        repeats=bool(case.shift),
        n_variant=len(factors),
    )
    hottest = float(max(run.hottest.max() for run in (day.first, day.steady)))
    checks = tanksafety.checks(
        fluid,
        flash=flash,
        flash_given=given.flash_point is not None or fluid.flash_given,
        film_max=known.bath_max if known else None,
        limit=limits.bath,
        hottest=hottest,
        rise=float(max(row.rise.max() for row in rows)),
        rise_limit=limits.rise,
        at_next=float(max(row.at_next.max() for row in rows)),
        ready=limits.ready,
        level=float(level.max()) if level is not None else None,
        lip=given.depth,
        freeboard=FREEBOARD if given.freeboard is None else given.freeboard,
        settled=day.settled,
        cut_short=any(g.cut_short for kind in kinds for pair in kind.heats for g in pair),
    )
    cautions = list(tanksafety.cautions(fluid))
    if failure and flash is not None and failure.band[1] > flash - tanksafety.FLASH_MARGIN:
        cautions.insert(
            0,
            "If the cooler fails as the worst load goes in, the bath comes within 50 K of the"
            " flash point under that load alone.",
        )
    setups = [body.setup for kind in kinds for body in kind.bodies]
    return TankAnswer(
        case=case,
        tank=tank,
        fluid=fluid,
        flash=flash,
        film_max=known.bath_max if known else None,
        limits=limits,
        uncertainty_pct=band,
        kinds=tuple(kinds),
        owns=owns,
        own_bodies=bodies,
        day=day,
        loads=rows,
        level=level,
        level_volume=occupied,
        lip=given.depth,
        failure=failure,
        sizing=sized,
        agitation=sizing.agitation(given, fluid),
        core=core,
        checks=checks,
        rules=sizing.rules(
            sum(body.mass for body in bodies), owns[0].total, given.volume, fluid, bath
        ),
        cautions=tuple(dict.fromkeys([*cautions, *(known.cautions if known else ())])),
        assumptions=(*told, *more, *overlapping, *assumed(case, given)),
        notes=_notes(fluid, day, use, [n for s in setups for n in s.notes]),
        sources=_sources(fluid, [s for x in setups for s in x.sources]),
        balance=max(gap, *(own.balance for own in owns), float(day.steady.balance.max())),
    )


_ALONE = ShiftInput(0.0)


def _in_time(loads: list[tuple[LoadKind, float]], period: float) -> tuple[str, ...]:
    """Refuses a load that is still in the bath as the period ends, whose heat would be lost;
    says where loads are in the bath together."""
    lines: list[str] = []
    for (kind, time), after in zip(loads, [*loads[1:], None], strict=True):
        short = any(g.cut_short for pair in kind.heats for g in pair)
        if time + kind.stay > period and not short:
            raise InputFault(
                "tank.period",
                f"{period / 3600.0:.4g} h",
                f"at least {(time + kind.stay) / 3600.0:.4g} h: the load of"
                f" {time / 3600.0:.4g} h is in the bath for up to {kind.stay / 60.0:.3g} min",
                "Lengthen the period, or begin the day as a load goes in.",
            )
        if after is not None and time + kind.stay > after[1] + 1.0 and not lines:
            lines.append(
                f"Loads are in the bath together from {after[1] / 3600.0:.4g} h on: the heat of"
                " each is solved as if it were alone."
            )
    return tuple(lines)


def _own(
    bodies: tuple[Body, ...],
    tank: Tank,
    day: Shift,
    bath: float,
    factors: tuple[float, ...],
    *,
    coupled: bool,
) -> tuple[tuple[Given, ...], CoreEffect, float]:
    """The case's own load in its first bath, by film; its core there and in the worst bath;
    the gap between the load's heat and the bath's."""
    starts = [
        float(run.start_temp[k, 0])
        for run in (day.first, day.steady)
        for k, load in enumerate(day.loads)
        if load.name == OWN
    ]
    first, worst = (starts[0], max(starts)) if starts else (bath, bath)
    solid = sum(body.mass for body in bodies) / DENSITY

    def in_bath(start: float, factor: float = 1.0) -> Given:
        response = response_of(tank, start, solid) if coupled else None
        return solve(
            bodies,
            bath=start if coupled else bath,
            response=response,
            film_factor=factor,
            longest=STAYS_AT_MOST * plain.stay,
        )

    plain = solve(bodies, bath=bath, response=None)
    owns = tuple(in_bath(first, factor) for factor in factors)
    one = owns[0]
    run = response_of(tank, first, solid).run(one.time, one.heat)
    gap = abs(float(run.heat["load"][-1, 0]) - one.total) / abs(one.total)
    held, own_bath, hot = (_core_hv(bodies[0], g) for g in (plain, one, in_bath(worst)))
    return owns, CoreEffect(held, own_bath, hot, worst), max(gap, float(run.balance[0]))


def _core_hv(body: Body, given: Given) -> float:
    value = worth(body.case, body.begun.soaked, given.part).hardness_hv
    at = body.cut.place(coordinates_of(body.cut.section, position("core")))
    return float((value[at.node] * at.share).sum())


def _notes(
    fluid: Fluid, day: Shift, use: MediumUse, others: list[RangeNote]
) -> tuple[RangeNote, ...]:
    coldest = float(min(run.temp.min() for run in (day.first, day.steady)))
    hottest = float(max(run.temp.max() for run in (day.first, day.steady)))
    found = list(fluids.range_notes(fluid, coldest=coldest, hottest=hottest))
    runs = f"{coldest - ZERO_DEGC:.3g} to {hottest - ZERO_DEGC:.3g} degC"
    name = f"film coefficient in {fluid.name}"
    if use.film_file is not None:
        low = high = effective_bath(use) or coldest
        if coldest < low - ONE_BATH or hottest > high + ONE_BATH:
            allowed = f"{low - ZERO_DEGC:.4g} degC, its only bath; the film is kept"
            found.append(RangeNote(name, "bath through the day", runs, allowed))
        return tuple(dict.fromkeys([*found, *others]))
    known = medium(use.name or "")
    low, high = known.holds_min, known.holds_max
    if coldest < known.bath_min:
        allowed = f"from {known.bath_min - ZERO_DEGC:.4g} degC; below, the film of that is kept"
        found.append(RangeNote(name, "coldest bath", f"{coldest - ZERO_DEGC:.3g} degC", allowed))
    if coldest < low or hottest > high:
        found.append(
            RangeNote(
                name,
                "bath through the day",
                runs,
                f"{low - ZERO_DEGC:.4g} to {high - ZERO_DEGC:.4g} degC",
            )
        )
    return tuple(dict.fromkeys([*found, *others]))


def _sources(fluid: Fluid, others: list[Source]) -> tuple[Source, ...]:
    found = [fluid.source]
    for module in (heatload, baths, bathcooler, bathloss, shift, sizing, tanksafety):
        found += module.SOURCES
    return tuple(dict.fromkeys([*found, *others]))
