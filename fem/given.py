"""Temperatures that come from elsewhere: another analysis, or thermocouples.

`follow` carries every node along its `Histories` three times: straight lines through all
samples, straight lines through every second one, and a cubic through all.

Model
-----
What straight lines between samples cost falls with the square of the time between them,
so that a third of what leaving out every second sample changes is the error left
(Richardson); so it is for constituents. Hardness also follows the cooling rate at 700 degC,
the slope of a line, whose error falls with the time itself: all that the leaving out changes
is stated. Where a curve bends so fast that neither holds yet, the difference to the cubic
tells it as well; the larger of the two is taken.

Source
------
Error of linear interpolation ``h^2 T'' / 8``: any book of numerical analysis.

Holds for
---------
Samples that show the curve. A peak or a plateau that falls between all samples leaves no
trace in them, and none in the estimate.
"""

from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from midradius.fem.coupled import NEVER_MARKED
from midradius.fem.follow import carry, end_slopes, slopes
from midradius.fem.histories import Histories
from midradius.fem.march import N_MARK
from midradius.fem.remains import Remains, remains
from midradius.thermo.arrays import Array, BoolArray, IntArray
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import CARBON_AUSTENITE, COLDEST, KIND, N_SCALE, Tables
from midradius.thermo.source import Source

SOURCES = (
    Source("resampling error", "Richardson; Fritsch & Butland 1984", "eq. of slopes", "remembered"),
)
HALVED = 1.0 / 3.0  # of what every second sample changes is the error of all of them
FEWEST = 5  # samples: fewer cannot tell their own error
COLDEST_K, HOTTEST_K = 250.0, 1500.0  # where the thermal properties are known
REHEATED_K = 5.0  # above Ae1 and what was reached: beyond a thermocouple's noise [estimate]
TRANSFORMED = 0.01  # of the mass, that must not turn back
PER_THREAD = 20_000  # nodes below which a second thread costs more than it gives


@dataclass(frozen=True)
class Followed:
    """What the nodes became, three ways, and what was seen on the way.

    ``lines``, ``halved``, ``cubic`` as the module says; ``times`` (n_time,) [s] since the
    start and ``watched`` (n_time, n_watch) [K]; ``first`` and ``last`` (n_node,) [K];
    ``widest`` (n_node,): index of the sample before the largest fall while the node could
    transform, -1 where there was none; ``high`` and ``fall`` [K]: from where, and how far.
    """

    lines: Remains
    halved: Remains
    cubic: Remains
    times: Array
    watched: Array
    first: Array
    last: Array
    coldest: Array
    widest: IntArray
    high: Array
    fall: Array


@dataclass
class _Way:
    """One of the three ways: it has a life, hence not frozen."""

    states: Array
    marks: Array
    scales: Array
    tables: Tables

    def go(
        self,
        start: float,
        span: float,
        temp: tuple[Array, Array],
        slope: tuple[Array, Array] | None = None,
    ) -> None:
        n = len(self.states)
        slope0, slope1 = slope or temp
        cuts = np.linspace(0, n, 1 + max(1, min(4, n // PER_THREAD))).astype(int)

        def part(k: int) -> None:
            own = slice(cuts[k], cuts[k + 1])
            carry(
                self.states[own],
                self.marks[own],
                self.scales[own],
                self.tables,
                start,
                span,
                temp[0][own],
                temp[1][own],
                slope0[own],
                slope1[own],
                slope is not None,
            )

        if len(cuts) == 2:
            part(0)
            return
        with ThreadPoolExecutor() as pool:
            for _ in pool.map(part, range(len(cuts) - 1)):
                pass

    def end(self, temp: Array) -> Remains:
        return remains(self.states, temp, self.scales, self.marks, self.tables)


def follow(
    given: Histories,
    tables: Tables,
    *,
    state: Array,
    starts: float | None,
    ae1: float,
    watch: IntArray,
    tell: Callable[[float, float], None] | None = None,
) -> Followed:
    """Carry every node along its own history.

    Parameters
    ----------
    given, tables
        The temperatures and the steel.
    state
        Of one node at the end of the soak, (N_STATE,).
    starts
        The time in the file [s] at which the soak ends; None: its first.
    ae1
        Below it a history may not begin, above it none may come back [K].
    watch
        Nodes whose whole history is kept, (n_watch,).
    tell
        Called with the time and the last one [s] now and then.

    Raises
    ------
    InputFault
        Too few samples, a temperature that is missing or outside 250 to 1500 K, a
        history that begins below ``ae1`` or comes back above it.
    """
    times, rows = _trimmed(given, starts)
    last = len(times) - 1
    spans = np.diff(times)
    first = next(rows)
    _refuse_cold_begin(given, first, ae1, times[0] if starts is None else starts)
    ways = [_way(given.n_node, state, first, tables) for _ in range(3)]
    lines, halved, cubic = ways
    before = float(lines.states[0, :5].sum())
    start_of_martensite = _martensite_start(state, tables)
    watched = np.empty((last + 1, len(watch)))
    watched[0] = first[watch]
    widest = np.full(given.n_node, -1)
    high, fall = np.zeros(given.n_node), np.zeros(given.n_node)
    at = times - times[0]
    older, old = first, first  # the samples before the present one
    slope = first
    for k in range(1, last + 1):
        temp = next(rows)
        _refuse_strange(given, temp, times[k])
        watched[k] = temp[watch]
        left = lines.states[:, :5].sum(axis=1)
        larger = _larger_fall(old, temp, left, (start_of_martensite, tables.top), fall)
        widest[larger], high[larger], fall[larger] = k - 1, old[larger], (old - temp)[larger]
        lines.go(at[k - 1], spans[k - 1], (old, temp))
        seen = lines.states[:, COLDEST]
        _refuse_reheated(given, temp, seen, left - before, ae1, times[k])
        if k % 2 == 0:
            halved.go(at[k - 2], at[k] - at[k - 2], (older, temp))
        elif k == last:
            halved.go(at[k - 1], spans[k - 1], (old, temp))
        if k > 1:
            gaps, rises = (spans[k - 2], spans[k - 1]), (old - older, temp - old)
            if k == 2:
                slope = end_slopes(gaps, rises)
            here = slopes(gaps, rises)
            cubic.go(at[k - 2], spans[k - 2], (older, old), (slope, here))
            slope = here
            if k == last:
                end = end_slopes(gaps[::-1], rises[::-1])
                cubic.go(at[k - 1], spans[k - 1], (old, temp), (slope, end))
        older, old = old, temp
        if tell is not None:
            tell(float(at[k]), float(at[-1]))
    coldest = lines.states[:, COLDEST].copy()
    return Followed(
        lines=lines.end(old),
        halved=halved.end(old),
        cubic=cubic.end(old),
        times=at,
        watched=watched,
        first=first,
        last=old,
        coldest=coldest,
        widest=widest,
        high=high,
        fall=fall,
    )


def _way(n_node: int, state: Array, first: Array, tables: Tables) -> _Way:
    states = np.tile(state, (n_node, 1))
    states[:, COLDEST] = first
    marks = np.full((n_node, N_MARK), NEVER_MARKED)
    return _Way(states, marks, np.ones((n_node, N_SCALE)), tables)


def _martensite_start(state: Array, tables: Tables) -> float:
    carbon = state[CARBON_AUSTENITE] / max(1.0 - state[:5].sum(), 1e-9)
    a, b, c = tables.start[int(state[KIND])]
    return float(a - b * (1.0 - np.exp(-c * carbon)))


def _trimmed(given: Histories, starts: float | None) -> tuple[Array, Iterator[Array]]:
    """Times from the end of the soak on, and the samples; the first may lie between two."""
    times = given.times
    begin = float(times[0]) if starts is None else starts
    if not times[0] <= begin < times[-1]:
        raise InputFault(
            "temperatures.starts_at",
            f'"{begin:.6g} s"',
            f"within the file, which runs from {times[0]:.6g} to {times[-1]:.6g} s",
            "It is the time in the file at which the soak ends.",
        )
    skipped = int(np.searchsorted(times, begin, side="right")) - 1
    kept = np.concatenate([[begin], times[skipped + 1 :]])
    if len(kept) < FEWEST:
        raise InputFault(
            "temperatures.file",
            f"{len(kept)} samples from the end of the soak on",
            f"at least {FEWEST}",
            "Fewer cannot tell how far the curve between them is off: write more of them.",
        )
    share = (begin - times[skipped]) / (times[skipped + 1] - times[skipped])

    def rows() -> Iterator[Array]:
        source = given.samples()
        for _ in range(skipped):
            next(source)
        low = next(source)
        high = next(source)
        _refuse_strange(given, low, times[skipped])
        _refuse_strange(given, high, times[skipped + 1])
        yield low + share * (high - low)
        yield high
        yield from source

    return kept, rows()


def _larger_fall(
    old: Array, temp: Array, present: Array, within: tuple[float, float], fall: Array
) -> BoolArray:
    """Where a node that can still transform falls farther than before."""
    inside = np.minimum(old, within[1]) - np.maximum(temp, within[0])
    return (inside > 0.0) & (old - temp > fall) & (present < 1.0 - TRANSFORMED)


def _refuse_strange(given: Histories, temp: Array, time: float) -> None:
    fine = (temp >= COLDEST_K) & (temp <= HOTTEST_K)
    if fine.all():
        return
    node = int(np.argmin(fine))
    value = temp[node]
    if np.isnan(value):
        raise InputFault(
            "temperatures.file",
            f"no number for {given.called(node)} at {time:.6g} s",
            "a temperature at every sample",
            "Take the sample or the node out; nothing is filled in.",
        )
    raise InputFault(
        "temperatures.file",
        f"{value - 273.15:.4g} degC for {given.called(node)} at {time:.6g} s",
        f"{COLDEST_K - 273.15:.0f} to {HOTTEST_K - 273.15:.0f} degC",
        "Check temperature_unit, and the array or column.",
    )


def _refuse_cold_begin(given: Histories, temp: Array, ae1: float, time: float) -> None:
    node = int(np.argmin(temp))
    if temp[node] >= ae1:
        return
    raise InputFault(
        "temperatures.starts_at",
        f"{given.called(node)} is at {temp[node] - 273.15:.4g} degC at {time:.6g} s",
        f"above Ae1, {ae1 - 273.15:.0f} degC, at every node when the soak ends",
        "What transformed before is not in the file. Name the time at which the soak ends as"
        ' starts_at = "12 min", or check temperature_unit.',
    )


def _refuse_reheated(
    given: Histories, temp: Array, coldest: Array, formed: Array, ae1: float, time: float
) -> None:
    back = (temp > ae1 + REHEATED_K) & (temp > coldest + REHEATED_K) & (formed > TRANSFORMED)
    if not back.any():
        return
    node = int(np.argmax(back))
    raise InputFault(
        "temperatures.file",
        f"{given.called(node)} comes back to {temp[node] - 273.15:.4g} degC at {time:.6g} s,"
        f" when {100.0 * formed[node]:.0f} % had transformed",
        f"below Ae1, {ae1 - 273.15:.0f} degC, once it has transformed",
        "Austenite that forms again is not computed. Let starts_at name the end of the last"
        " heating, or end the file before.",
    )
