"""From a section, a steel's tables and surroundings to a march, and back to arrays."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from midradius.fem import march
from midradius.fem.heat import Body, Control, Progress, Skin
from midradius.fem.linear import Scheme, scheme
from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import SolverFault
from midradius.thermo.kinetics import COLDEST, N_SCALE, Tables, enthalpy_node

HISTORY_ROWS = 512  # accepted steps between two looks at the outside world
FIELD_WINDOW = 8  # fields held at least at a time where a sink takes them
WINDOW_SIZE = 8_000_000  # temperatures held at a time, if that is more fields
NEVER_MARKED = -1.0

Sink = Callable[[float, Array], None]
"""Takes a moment [s] and the field then [K], (n_node,), which is its own only during the call."""


@dataclass(frozen=True)
class Watch:
    """Places followed at every step: weights ``share`` (n_watch, m) on ``node``."""

    node: IntArray
    share: Array


@dataclass(frozen=True)
class Surroundings:
    """Per zone a film curve, an ambient temperature and a heat flux.

    ``film_temp`` (n,) [K] with ``film_htc`` (n_zone, n) [W/(m2 K)] linear
    between and held outside; ``ambient`` (n_zone, n_moment) [K] at ``moment``
    (n_moment,) [s]; ``flux`` (n_zone,) [W/m2] into the part; ``source``
    (n_source, n_node) [W/m3] at ``source_moment`` (n_source,) [s].
    """

    film_temp: Array
    film_htc: Array
    ambient: Array
    moment: Array
    flux: Array
    source: Array | None = None
    source_moment: Array | None = None


@dataclass(frozen=True)
class Until:
    """A place (weights on nodes) that must have cooled to ``temp`` [K]."""

    node: IntArray
    share: Array
    temp: float


class Run:
    """A section on its way through a route; it has a life, hence a class.

    Parameters
    ----------
    body
        The section.
    tables
        The material.
    density
        [kg/m3], the same at all temperatures so that mass is conserved.
    temp
        Starting temperatures [K], shape (n_node,).
    state
        Starting states, shape (n_node, N_STATE).
    carbon_pct
        Carbon of the steel [mass %].
    watch
        Places followed at every step.
    field_times
        When to keep the whole field [s], ascending.
    sink
        Takes each field as it comes, in order; else all are held until the end.
    rows
        Accepted steps between two calls of ``tell``.
    scale
        Factors on the rates of ferrite, pearlite, bainite and cementite, (n_node, N_SCALE).
    """

    def __init__(
        self,
        body: ControlVolumes,
        tables: Tables,
        *,
        density: float,
        temp: Array,
        state: Array,
        carbon_pct: float,
        watch: Watch,
        field_times: Array,
        scale: Array | None = None,
        rows: int = HISTORY_ROWS,
        sink: Sink | None = None,
    ) -> None:
        n = body.n_node
        self._volumes = body
        self.tables = tables
        self._scheme: Scheme = scheme(body)
        self._body = Body(
            mass=body.volume * density,
            volume=np.ascontiguousarray(body.volume),
            tail=body.edge[:, 0].astype(np.uint32),
            head=body.edge[:, 1].astype(np.uint32),
            conductance_length=np.ascontiguousarray(body.conductance_length),
            face_node=body.face_node,
            face_area=body.face_area,
            face_zone=body.face_zone,
        )
        self._history: list[Array] = []
        self._sink = sink
        held = len(field_times)
        if sink is not None:
            held = min(held, max(FIELD_WINDOW, WINDOW_SIZE // n))
        clock = np.zeros(march.N_CLOCK)
        self.progress = Progress(
            clock=clock,
            temp=np.array(temp, dtype=np.float64),
            older=np.array(temp, dtype=np.float64),
            book=np.zeros(n),
            state=np.array(state, dtype=np.float64),
            scale=np.ones((n, N_SCALE)) if scale is None else np.array(scale, dtype=np.float64),
            carbon=np.full(n, carbon_pct),
            zone_heat=np.zeros(max(len(body.zones), 1)),
            marks=np.full((n, march.N_MARK), NEVER_MARKED),
            field_moment=np.array(field_times, dtype=np.float64),
            field=np.full((held, n), np.nan),
            watch_node=watch.node,
            watch_share=watch.share,
            history=np.zeros((rows, len(watch.node) + 1, 6)),
        )
        self.progress.book[:] = self._body.mass * self.enthalpy()
        self.heat_at_start = float(self.progress.book.sum())
        self._note_start()

    def _note_start(self) -> None:
        p = self.progress
        first = np.zeros((1, len(p.watch_node) + 1, 6))
        first[0, 1:, 0] = (p.temp[p.watch_node] * p.watch_share).sum(axis=1)
        for column in range(5):
            part = p.state[p.watch_node, column]
            first[0, 1:, column + 1] = (part * p.watch_share).sum(axis=1)
        self._history.append(first)
        now = int((p.field_moment <= 0.0).sum())
        p.field[:now] = p.temp
        p.clock[march.FIELD_ROW] = now
        self._hand_over()

    def _hand_over(self) -> None:
        """Give the sink what the window holds, so that its rows can be used again."""
        if self._sink is None:
            return
        p = self.progress
        done = int(p.clock[march.FIELD_ROW])
        for row in range(int(p.clock[march.FIELD_TAKEN]), done):
            self._sink(float(p.field_moment[row]), p.field[row % len(p.field)])
        p.clock[march.FIELD_TAKEN] = done

    def fields(self) -> Array:
        """All fields (n_time, n_node) [K], the last temperatures for moments after the end.

        With a sink the rest goes there, and none is left here.
        """
        p = self.progress
        first = int(p.clock[march.FIELD_ROW])
        if self._sink is None:
            field = p.field.copy()
            field[first:] = p.temp
            return field
        for moment in p.field_moment[first:]:
            self._sink(float(moment), p.temp)
        p.clock[march.FIELD_ROW] = p.clock[march.FIELD_TAKEN] = len(p.field_moment)
        return np.empty((0, len(p.temp)))

    def enthalpy(self) -> Array:
        """Enthalpy of every node now [J/kg], shape (n_node,)."""
        p = self.progress
        return np.array(
            [
                enthalpy_node(p.state[i], p.temp[i], p.carbon[i], self.tables)[0]
                for i in range(len(p.temp))
            ]
        )

    def heat(self) -> float:
        """Heat in the section now [J per extent of the sense]."""
        return float((self._body.mass * self.enthalpy()).sum())

    def stage(
        self,
        around: Surroundings,
        *,
        duration: float,
        tolerance: float,
        until: Until | None = None,
        first_step: float | None = None,
        longest: float = np.inf,
        carry_on: bool = False,
        tell: Callable[[float], None] | None = None,
    ) -> str:
        """March through one stage.

        Parameters
        ----------
        around
            The surroundings of this stage.
        duration
            The longest the stage may last [s].
        tolerance
            Local temperature error that one step may make [K].
        until
            Ends the stage earlier.
        first_step
            First time step [s]; by default from the finest cell.
        longest
            Longest time step [s].
        carry_on
            The surroundings go on smoothly from the stage before: steps and their
            error control do too.
        tell
            Called with the simulated time [s] now and then.

        Returns
        -------
        str
            ``"time"`` or ``"limit"``, whichever ended it.

        Raises
        ------
        SolverFault
            When Newton's method fails at the smallest step.
        """
        clock = self.progress.clock
        if until is not None and (self.progress.temp[until.node] * until.share).sum() <= until.temp:
            return "limit"
        grid = self.tables.first + self.tables.step * np.arange(self.tables.value.shape[1])
        n_node = self._volumes.n_node
        skin = Skin(
            htc=np.array([np.interp(grid, around.film_temp, row) for row in around.film_htc]),
            ambient=np.atleast_2d(np.asarray(around.ambient, dtype=np.float64)),
            moment=np.asarray(around.moment, dtype=np.float64),
            flux=np.asarray(around.flux, dtype=np.float64),
            source=np.zeros((1, n_node)) if around.source is None else around.source,
            source_moment=np.zeros(1) if around.source_moment is None else around.source_moment,
        )
        control = Control(
            end=float(clock[march.TIME] + duration),
            tolerance=float(tolerance),  # a whole number would compile everything anew
            bend=10.0 * float(tolerance),
            longest=float(longest),
            limit_node=np.empty(0, dtype=np.int64) if until is None else until.node,
            limit_share=np.empty(0) if until is None else until.share,
            limit_temp=0.0 if until is None else until.temp,
        )
        if not carry_on:
            clock[march.STEP] = first_step if first_step is not None else self._first_step(skin)
            clock[march.STEP_BEFORE] = 0.0
        while True:
            clock[march.HISTORY_ROW] = 0
            status = march.march(
                self._scheme,
                self._body,
                skin,
                self.tables,
                control,
                self.progress,
                len(self.progress.history),
            )
            self._history.append(self.progress.history[: int(clock[march.HISTORY_ROW])].copy())
            self._hand_over()
            if tell is not None:
                tell(float(clock[march.TIME]))
            if status == march.GAVE_UP:
                raise SolverFault(
                    f"The heat solver gave up at {clock[march.TIME]:.6g} s: no time step above "
                    f"{march.SMALLEST_STEP:g} s converged. A film curve with a jump, or a cell "
                    "far smaller than its neighbours, is the usual cause."
                )
            if status == march.REACHED_LIMIT:
                return "limit"
            if status == march.REACHED_END:
                return "time"

    def _first_step(self, skin: Skin) -> float:
        """A hundredth of the time in which the quickest surface cell would cool."""
        p, body = self.progress, self._body
        quickest = 1e3
        for node, area, zone in zip(body.face_node, body.face_area, body.face_zone, strict=True):
            row = int((p.temp[node] - self.tables.first) / self.tables.step)
            film = skin.htc[zone, min(max(row, 0), skin.htc.shape[1] - 1)]
            if film * area > 0.0:
                quickest = min(quickest, body.mass[node] * 600.0 / (film * area))
        return max(1e-2 * quickest, 1e-6)

    @property
    def time(self) -> float:
        """Simulated time [s]."""
        return float(self.progress.clock[march.TIME])

    @property
    def history(self) -> Array:
        """All steps: (n_step, n_watch + 1, 6); row 0 of axis 1 holds the time."""
        return np.concatenate(self._history)

    @property
    def coldest(self) -> Array:
        """Lowest temperature each node has reached [K]."""
        return self.progress.state[:, COLDEST].copy()
