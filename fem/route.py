"""A section through all stages of its route, and what that leaves.

The part starts at one temperature, that of the soak, or at the field that a furnace
has left; each stage then has films by zone and an end by time, by a place reaching a
temperature, or both.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from midradius.fem import march
from midradius.fem.coupled import Run, Sink, Surroundings, Until, Watch
from midradius.fem.cutting import AnyCut
from midradius.fem.media import ZERO_DEGC
from midradius.fem.place import Place
from midradius.fem.remains import Remains, remains
from midradius.fem.surface import Film
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import Tables

LONGEST_STAGE = 30.0 * 24.0 * 3600.0  # s, for a stage that ends by temperature only
HOTTER_BY = 2.0  # K by which a bath may exceed the part before it counts as heating


@dataclass(frozen=True)
class Surface:
    """What one zone sees in a stage: a film and the temperature [K] beyond it."""

    label: str
    film: Film
    ambient: float
    ambient_after: float | None = None  # K at the end of a piece; None: constant


@dataclass(frozen=True)
class Piece:
    """A part of a stage, ``duration`` [s] long, with surfaces of its own."""

    duration: float
    surfaces: Mapping[str, Surface]


@dataclass(frozen=True)
class CoolingStage:
    """One stage: its kind, the zones' surfaces, its longest time [s], its condition.

    Where the surroundings change, as a bath does under its load, ``pieces`` go first;
    ``surfaces`` then hold for the rest of the stage.
    """

    kind: str
    label: str
    surfaces: Mapping[str, Surface]
    duration: float | None
    until_place: str | None = None
    until_temp: float | None = None
    pieces: tuple[Piece, ...] = ()


@dataclass(frozen=True)
class StageEnd:
    """How a stage went: times [s], what ended it, heat given off [J per extent].

    ``moments`` (n,) [s] and ``heat_until`` (n,) [J per extent] at the end of each piece.
    """

    start: float
    end: float
    ended_by: str
    heat_given: float
    moments: tuple[float, ...] = ()
    heat_until: tuple[float, ...] = ()


@dataclass(frozen=True)
class History(Remains):
    """What a march leaves.

    ``field`` (n_time, n_node) [K] at ``times`` (n_time,); ``step_times``
    (n_step,), ``watch_temp`` (n_step, n_watch) [K] and ``watch_phases``
    (n_step, n_phase, n_watch); at the end ``temp`` and ``coldest`` (n_node,) [K] and what
    :class:`Remains` names. Heat in J per the section's extent.

    Phases are those at room temperature, the heat of the way there left out of the
    account. Temperatures, times and heat end with the route.
    """

    times: Array
    field: Array
    step_times: Array
    watch_temp: Array
    watch_phases: Array
    temp: Array
    coldest: Array
    stages: tuple[StageEnd, ...]
    heat_before: float
    heat_after: float
    n_step: int
    n_refused: int
    n_newton: int

    @property
    def heat_given(self) -> float:
        """Heat through all surfaces [J per extent]."""
        return sum(stage.heat_given for stage in self.stages)

    @property
    def balance(self) -> float:
        """Enthalpy lost against heat given off, relative to the latter."""
        lost = self.heat_before - self.heat_after
        return abs(lost - self.heat_given) / max(abs(self.heat_given), 1e-300)


def cool(
    cut: AnyCut,
    tables: Tables,
    stages: tuple[CoolingStage, ...],
    *,
    density: float,
    start_temp: Array | float,
    state: Array,
    carbon_pct: float,
    places: Mapping[str, Place],
    watched: tuple[str, ...],
    field_times: Array,
    tolerance: float,
    tell: Callable[[float], None] | None = None,
    scale: Array | None = None,
    first_number: int = 1,
    sink: Sink | None = None,
) -> History:
    """March a cut section through its stages.

    Parameters
    ----------
    cut
        The section with its grid.
    tables
        The steel.
    stages
        After the soak.
    density, start_temp, carbon_pct
        [kg/m3]; [K], one or (n_node,); [mass %].
    state
        Starting state of every node, (n_node, N_STATE).
    places
        Every place a stage or the caller names.
    watched
        The places followed at every step, in this order.
    field_times
        When to keep the whole field [s], ascending; beyond the end of the route
        the last field is kept.
    tolerance
        Local temperature error per step [K].
    tell
        Called with the simulated time [s] now and then.
    scale
        Factors on the rates, as `Run` takes them.
    first_number
        Place of the first stage in the route, for messages.
    sink
        Takes each field as it comes; the history then holds none of them.

    Raises
    ------
    SolverFault
        The solver gave up.
    InputFault
        A bath is hotter than the part when its stage begins, or a stage that
        ends by temperature never gets there.
    """
    body = cut.body
    run = Run(
        body,
        tables,
        density=density,
        temp=np.full(body.n_node, start_temp),
        state=state,
        carbon_pct=carbon_pct,
        watch=Watch(
            np.array([places[name].node for name in watched]),
            np.array([places[name].share for name in watched]),
        ),
        field_times=field_times,
        scale=scale,
        sink=sink,
    )
    ends = []
    for number, stage in enumerate(stages, start=first_number):
        _refuse_heating(stage, number, run.progress.temp)
        begun, before = run.time, run.progress.zone_heat.sum()
        until = None
        if stage.until_place is not None and stage.until_temp is not None:
            place = places[stage.until_place]
            until = Until(place.node, place.share, stage.until_temp)
        ended, moments, given_until = _through(run, body.zones, stage, until, tolerance, tell)
        if ended == "time" and stage.duration is None:
            raise InputFault(
                f"route[{number}].until",
                f'"{stage.until_place} below {_degC(stage.until_temp or 0.0)}"',
                "reached within 30 days",
                "Give the stage a time, or a temperature that its surroundings allow.",
            )
        given = -(run.progress.zone_heat.sum() - before)
        ends.append(StageEnd(begun, run.time, ended, float(given), moments, given_until))
    return _history(run, tuple(ends), field_times)


def _through(
    run: Run,
    zones: tuple[str, ...],
    stage: CoolingStage,
    until: Until | None,
    tolerance: float,
    tell: Callable[[float], None] | None,
) -> tuple[str, tuple[float, ...], tuple[float, ...]]:
    """March one stage, piece by piece; what ended it, and the heat at the end of each."""
    begun, before = run.time, float(run.progress.zone_heat.sum())
    last = begun + (LONGEST_STAGE if stage.duration is None else stage.duration)
    moments: list[float] = []
    heat: list[float] = []
    ended = "time"
    for piece in (*stage.pieces, Piece(np.inf, stage.surfaces)):
        span = min(piece.duration, last - run.time)
        if span <= 1e-9 * last:
            break
        ended = run.stage(
            surroundings(zones, piece.surfaces, run.time, span),
            duration=span,
            tolerance=tolerance,
            until=until,
            carry_on=len(moments) > 0,
            tell=tell,
        )
        moments.append(run.time)
        heat.append(before - float(run.progress.zone_heat.sum()))
        if ended == "limit":
            break
    return ended, tuple(moments), tuple(heat)


def surroundings(
    zones: tuple[str, ...],
    surfaces: Mapping[str, Surface],
    begin: float = 0.0,
    span: float = np.inf,
) -> Surroundings:
    """The zones' films on one common temperature axis, from ``begin`` on for ``span`` [s]."""
    seen = [surfaces[zone] for zone in zones]
    temp = np.unique(np.concatenate([s.film.temp for s in seen]))
    if any(s.ambient_after is not None for s in seen) and np.isfinite(span):
        after = [s.ambient if s.ambient_after is None else s.ambient_after for s in seen]
        ambient = np.array([[s.ambient, end] for s, end in zip(seen, after, strict=True)])
        moment = np.array([begin, begin + span])
    else:
        ambient, moment = np.array([[s.ambient] for s in seen]), np.zeros(1)
    return Surroundings(
        film_temp=temp,
        film_htc=np.array([s.film.at(temp) for s in seen]),
        ambient=ambient,
        moment=moment,
        flux=np.zeros(len(zones)),
    )


def _degC(temp: float) -> str:
    return f"{temp - ZERO_DEGC:.4g} degC"


def _refuse_heating(stage: CoolingStage, number: int, temp: Array) -> None:
    hottest = float(temp.max())
    for zone, surface in stage.surfaces.items():
        if surface.film.htc.max() > 0.0 and surface.ambient > hottest + HOTTER_BY:
            raise InputFault(
                f"route[{number}].bath",
                f'"{_degC(surface.ambient)}" on "{zone}"',
                f"colder than the part, which is at {_degC(hottest)} by then",
                "Heating up again is not computed: end the stage before earlier, or cool the bath.",
            )


def _history(run: Run, stages: tuple[StageEnd, ...], times: Array) -> History:
    p = run.progress
    steps = run.history
    field = run.fields()
    heat_after, coldest = run.heat(), run.coldest
    left = remains(p.state, p.temp, p.scale, p.marks, run.tables)
    return History(
        times=np.array(times),
        field=field,
        step_times=steps[:, 0, 0],
        watch_temp=steps[:, 1:, 0],
        watch_phases=np.concatenate(
            [
                1.0 - steps[:, 1:, 1:].sum(axis=2, keepdims=True),
                steps[:, 1:, 1:],
            ],
            axis=2,
        ).transpose(0, 2, 1),
        temp=p.temp.copy(),
        coldest=coldest,
        **vars(left),
        stages=stages,
        heat_before=run.heat_at_start,
        heat_after=heat_after,
        n_step=int(p.clock[march.TAKEN]),
        n_refused=int(p.clock[march.REFUSED]),
        n_newton=int(p.clock[march.ITERATIONS]),
    )
