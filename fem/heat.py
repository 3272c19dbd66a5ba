"""The heat solver: conduction, surface films, transformation, in one implicit step.

Model
-----
``d(m h(T, f))/dt = sum of conductances k A/d (T_j - T_i) + surface + source`` at
every control volume, with the enthalpy of the whole mixture, so that the heat of
each transformation appears at the temperature where it happens and nowhere else.
Time: the two-stage method of Bank et al., trapezoid then BDF2, L-stable, second
order, step by step as large as the accuracy allows. The transformation follows
the temperature path of each stage inside Newton's iteration; what the iteration
leaves over is carried into the next step, so that the balance closes over the
run. The solver knows no steel: it reads :class:`~midradius.thermo.kinetics.Tables`.

Source
------
Bank, Coughran, Fichtner, Grosse, Rose & Smith, IEEE Trans. Electron Devices 32
(1985) 1992; Hosea & Shampine, Appl. Numer. Math. 20 (1996) 21 (both remembered;
the observed order is tested).
"""

from typing import NamedTuple

import numpy as np

from midradius.fem.linear import Scheme, solve
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.compiled import kernel
from midradius.thermo.kinetics import N_STATE, Tables, advance, enthalpy_node

GAMMA = 2.0 - np.sqrt(2.0)  # where the first stage ends, as a share of the step
IMPLICIT = 1.0 - np.sqrt(2.0) / 2.0  # weight of the newest rate in both stages
EXPLICIT = np.sqrt(2.0) / 4.0  # weight of the two older rates in the second
MOST_ITERATIONS = 12
INEXACT = 0.005  # error of a move against the move itself
CAREFUL = 0.3  # share of the tolerance that an extrapolated error may use
CLOSELY = 0.01  # accuracy of a small move against the tolerance
SURELY_FALLS = 0.3  # ratio of two moves up to which Newton's method is trusted to go on so


class Body(NamedTuple):
    """The section as the kernel sees it; ``mass`` [kg], the rest as in ControlVolumes."""

    mass: Array
    volume: Array
    tail: IntArray
    head: IntArray
    conductance_length: Array
    face_node: IntArray
    face_area: Array
    face_zone: IntArray


class Skin(NamedTuple):
    """What surrounds it: per zone a film curve, an ambient over time, a flux.

    ``htc`` (n_zone, n_temp) [W/(m2 K)] on the grid of the tables, ``ambient``
    (n_zone, n_moment) [K] at ``moment`` (n_moment,) [s], ``flux`` (n_zone,)
    [W/m2] into the part; ``source`` (n_source, n_node) [W/m3] at
    ``source_moment`` (n_source,) [s].
    """

    htc: Array
    ambient: Array
    moment: Array
    flux: Array
    source: Array
    source_moment: Array


class Control(NamedTuple):
    """How far and how finely: times [s], tolerances [K], the condition that ends it."""

    end: float
    tolerance: float
    bend: float
    longest: float
    limit_node: IntArray
    limit_share: Array
    limit_temp: float


class Progress(NamedTuple):
    """What a march changes in place; see :func:`midradius.fem.coupled.begin`.

    ``clock``: time, next step, previous step (0 when there is none), steps
    taken, steps refused, Newton iterations, next output row, next history row, output
    rows fetched.
    """

    clock: Array
    temp: Array
    older: Array
    book: Array
    state: Array
    scale: Array
    carbon: Array
    zone_heat: Array
    marks: Array
    field_moment: Array
    field: Array
    watch_node: IntArray
    watch_share: Array
    history: Array


@kernel
def _cell(moment: Array, now: float) -> int:
    """The interval of ascending moments that holds ``now``; the last one beyond the end."""
    low, high = 0, len(moment) - 1
    while high - low > 1:
        middle = (low + high) // 2
        if moment[middle] < now:
            low = middle
        else:
            high = middle
    return low


@kernel
def _between(table: Array, moment: Array, row: int, now: float) -> float:
    """Linear interpolation in time of one row; the ends hold."""
    n = len(moment)
    value: float = table[row, 0]
    if n > 1 and now >= moment[n - 1]:
        value = table[row, n - 1]
    elif n > 1 and now > moment[0]:
        k = _cell(moment, now)
        share = (now - moment[k]) / (moment[k + 1] - moment[k])
        value = table[row, k] + share * (table[row, k + 1] - table[row, k])
    return value


@kernel
def heat_rate(
    temp: Array,
    conductivity: Array,
    body: Body,
    skin: Skin,
    tables: Tables,
    now: float,
    rate: Array,
    weight: Array,
    stiff: Array,
    zone_rate: Array,
) -> None:
    """Heat into each node [W], edge conductances, and how faces stiffen the node."""
    n_moment = len(skin.source_moment)
    if n_moment == 1 or now <= skin.source_moment[0]:
        for i in range(len(temp)):
            rate[i] = body.volume[i] * skin.source[0, i]
    else:
        k = _cell(skin.source_moment, now)
        share = (now - skin.source_moment[k]) / (skin.source_moment[k + 1] - skin.source_moment[k])
        share = min(share, 1.0)  # the ends hold, as they do for an ambient
        for i in range(len(temp)):
            source = skin.source[k, i] + share * (skin.source[k + 1, i] - skin.source[k, i])
            rate[i] = body.volume[i] * source
    for e in range(len(body.tail)):
        i, j = body.tail[e], body.head[e]
        conductance = body.conductance_length[e] * 0.5 * (conductivity[i] + conductivity[j])
        weight[e] = conductance
        flow = conductance * (temp[j] - temp[i])
        rate[i] += flow
        rate[j] -= flow
    stiff[:] = 0.0
    zone_rate[:] = 0.0
    last = skin.htc.shape[1] - 2
    for f in range(len(body.face_node)):
        i, zone, area = body.face_node[f], body.face_zone[f], body.face_area[f]
        grid = (temp[i] - tables.first) / tables.step
        row = min(max(int(grid), 0), last)
        share = min(max(grid - row, 0.0), 1.0)
        steep = skin.htc[zone, row + 1] - skin.htc[zone, row]
        film = skin.htc[zone, row] + share * steep
        hotter = temp[i] - _between(skin.ambient, skin.moment, zone, now)
        flow = area * (skin.flux[zone] - film * hotter)
        rate[i] += flow
        zone_rate[zone] += flow
        stiff[i] += area * (film + steep / tables.step * hotter)


@kernel
def stage(
    how: Scheme,
    body: Body,
    skin: Skin,
    tables: Tables,
    progress: Progress,
    known: Array,
    from_temp: Array,
    from_state: Array,
    span: float,
    share: float,
    now: float,
    tolerance: float,
    temp: Array,
    state: Array,
    conductivity: Array,
    rate: Array,
    weight: Array,
    stiff: Array,
    zone_rate: Array,
    work: Array,
    backward: bool,
) -> int:
    """One implicit stage by Newton's method; returns the iterations, 0 if it failed."""
    n = len(temp)
    stored, capacity, move, rest = work[0], work[1], work[2], work[3]
    before, enough = 0.0, False
    for iteration in range(MOST_ITERATIONS):
        for i in range(n):
            for column in range(N_STATE):  # assigning whole rows compiles error texts
                state[i, column] = from_state[i, column]
            slope = 0.0
            if min(from_temp[i], temp[i]) < tables.top:
                slope = advance(
                    state, i, from_temp[i], temp[i], span, progress.scale, tables, backward
                )
            energy, cp, conductivity[i] = enthalpy_node(
                state[i], temp[i], progress.carbon[i], tables
            )
            stored[i] = body.mass[i] * energy
            # A growing product below its nose counts against the capacity; the
            # matrix keeps half the capacity so that it stays positive.
            capacity[i] = body.mass[i] * max(cp + slope, 0.5 * cp)
        heat_rate(temp, conductivity, body, skin, tables, now, rate, weight, stiff, zone_rate)
        if enough:
            return iteration
        for i in range(n):
            rest[i] = known[i] + share * rate[i] - stored[i]
            capacity[i] = max(capacity[i] + share * stiff[i], 0.2 * capacity[i])
        for e in range(len(weight)):
            weight[e] *= share
        # The next move corrects what an iterative scheme leaves of a large one.
        accuracy = CLOSELY * tolerance
        if solve(how, capacity, weight, rest, move, accuracy, INEXACT) < 0:
            return 0
        most = 0.0
        for i in range(n):
            temp[i] += move[i]
            most = max(most, abs(move[i]))
        if not most < 1e4:
            return 0
        # What is left falls at least as fast from this move as this one fell.
        falls = most / before if before > 0.0 else 1.0
        left = most * falls / (1.0 - falls) if falls < SURELY_FALLS else most
        enough = most < tolerance or left < CAREFUL * tolerance
        before = most
    return 0
