"""A section in the furnace: heated up and soaked, each node on its own temperature path.

Same solver as for cooling, on tables of a steel that does not transform
(:func:`midradius.thermo.heatup.heating_tables`): its heat content holds the heat of
transformation. Time counts from when the part comes into the furnace.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from midradius.fem import march
from midradius.fem.coupled import Run, Surroundings, Until, Watch
from midradius.fem.cutting import AnyCut
from midradius.fem.furnace import Rise
from midradius.fem.place import Place
from midradius.fem.route import LONGEST_STAGE, StageEnd
from midradius.fem.surface import Film
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import COLDEST, N_STATE, Tables

ZERO_DEGC = 273.15
Follow = Callable[[float, Array], None]


@dataclass(frozen=True)
class HeatingStage:
    """One stage in the furnace; ``films`` has for each of ``rises`` the zones' films.

    Ends after ``duration`` [s] or when ``until_place`` has passed ``until_temp`` [K],
    whichever comes first; one of them is given. ``number`` is its place in the route.
    """

    kind: str
    label: str
    number: int
    rises: tuple[Rise, ...]
    films: tuple[Mapping[str, Film], ...]
    duration: float | None
    until_place: str | None = None
    until_temp: float | None = None


@dataclass(frozen=True)
class Heating:
    """What the furnace leaves: ``temp`` (n_node,) [K]; ``step_times`` (n_step,) [s] and
    ``watch_temp`` (n_step, n_watch) [K]; stages with the heat taken up counted negative;
    heat [J per extent] before and after."""

    temp: Array
    step_times: Array
    watch_temp: Array
    stages: tuple[StageEnd, ...]
    heat_before: float
    heat_after: float

    @property
    def heat_taken(self) -> float:
        """Heat through all surfaces into the part [J per extent]."""
        return -sum(stage.heat_given for stage in self.stages)

    @property
    def balance(self) -> float:
        """Enthalpy gained against heat taken up, relative to the latter."""
        gained = self.heat_after - self.heat_before
        return abs(gained - self.heat_taken) / max(abs(self.heat_taken), 1e-300)


def heat_up(
    cut: AnyCut,
    tables: Tables,
    stages: tuple[HeatingStage, ...],
    *,
    density: float,
    start_temp: float,
    places: Mapping[str, Place],
    watched: tuple[str, ...],
    tolerance: float,
    follow: Follow,
) -> Heating:
    """March a cut section through its furnace stages.

    Parameters
    ----------
    cut, tables
        The section with its grid, and the steel on heating.
    stages
        Those before anything cools, the soak last.
    density, start_temp
        [kg/m3], [K].
    places, watched
        Every place a stage or the caller names; those followed, in their order.
    tolerance
        Local temperature error per step [K].
    follow
        Called with time [s] and temperatures (n_node,) [K] after every step.

    Raises
    ------
    SolverFault
        The solver gave up.
    InputFault
        A stage that ends by temperature never gets there.
    """
    n = cut.body.n_node
    state = np.zeros((n, N_STATE))
    state[:, COLDEST] = start_temp
    run = Run(
        cut.body,
        tables,
        density=density,
        temp=np.full(n, start_temp),
        state=state,
        carbon_pct=0.0,
        watch=Watch(
            np.array([places[name].node for name in watched]),
            np.array([places[name].share for name in watched]),
        ),
        field_times=np.zeros(0),
        rows=1,
    )
    ends = tuple(_stage(run, cut.body.zones, stage, places, tolerance, follow) for stage in stages)
    steps = run.history
    return Heating(
        temp=run.progress.temp.copy(),
        step_times=steps[:, 0, 0],
        watch_temp=steps[:, 1:, 0],
        stages=ends,
        heat_before=run.heat_at_start,
        heat_after=run.heat(),
    )


def _stage(
    run: Run,
    zones: tuple[str, ...],
    stage: HeatingStage,
    places: Mapping[str, Place],
    tolerance: float,
    follow: Follow,
) -> StageEnd:
    begun, before = run.time, run.progress.zone_heat.sum()
    until = None
    if stage.until_place is not None and stage.until_temp is not None:
        place = places[stage.until_place]
        # The march stops a sum of temperatures that falls: here its negative does.
        until = Until(place.node, -place.share, -stage.until_temp)
    longest = LONGEST_STAGE if stage.duration is None else stage.duration
    ended = "time"
    for rise, films in zip(stage.rises, stage.films, strict=True):
        left = begun + longest - run.time
        if left <= 1e-6:
            break
        span = left if rise.span is None else min(rise.span, left)
        ended = run.stage(
            _around(zones, films, rise, run.time),
            duration=span,
            tolerance=tolerance,
            until=until,
            first_step=float(run.progress.clock[march.STEP]) if run.time > begun else None,
            tell=lambda now: follow(now, run.progress.temp),
        )
        if ended == "limit":
            break
    if ended == "time" and stage.duration is None:
        raise InputFault(
            f"route[{stage.number}].until",
            f'"{stage.until_place} above {(stage.until_temp or 0.0) - ZERO_DEGC:.4g} degC"',
            "reached within 30 days",
            "Give the stage a time, or a temperature further below the furnace.",
        )
    given = -(run.progress.zone_heat.sum() - before)
    return StageEnd(begun, run.time, ended, float(given))


def _around(
    zones: tuple[str, ...], films: Mapping[str, Film], rise: Rise, now: float
) -> Surroundings:
    temp = np.unique(np.concatenate([films[zone].temp for zone in zones]))
    climbs = rise.span is not None
    ends = [rise.begin, rise.end] if climbs else [rise.end]
    return Surroundings(
        film_temp=temp,
        film_htc=np.array([films[zone].at(temp) for zone in zones]),
        ambient=np.array([ends] * len(zones)),
        moment=np.array([now, now + (rise.span or 0.0)][: len(ends)]),
        flux=np.zeros(len(zones)),
    )
