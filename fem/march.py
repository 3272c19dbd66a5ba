"""March a section in time: step by step as large as the accuracy allows.

Model
-----
The error of a step is taken from the third difference of the temperatures over
it and the step before; the step is repeated where it is too large. Along the
way the march keeps fields at asked times on the parabola through the stage
values, follows named places, and notes when each node cools through 800, 700
and 500 degC.

Source
------
Step control by the local error of a second-order method: Hairer, Norsett &
Wanner, Solving Ordinary Differential Equations I, sec. II.4 (remembered).
"""

import numpy as np

from midradius.fem.heat import (
    EXPLICIT,
    GAMMA,
    IMPLICIT,
    Body,
    Control,
    Progress,
    Skin,
    heat_rate,
    stage,
)
from midradius.fem.linear import Scheme
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import inner_kernel, kernel
from midradius.thermo.kinetics import N_STATE, Tables, enthalpy_node

ERROR_CONSTANT = (-3.0 * GAMMA**2 + 4.0 * GAMMA - 2.0) / (12.0 * (2.0 - GAMMA))

REACHED_END, REACHED_LIMIT, PAUSED, GAVE_UP = range(4)
NEWTON_SHARE = 0.02  # last move of Newton's method against the tolerance of a step
NEWTON_MOST = 1e-3  # K
SMALLEST_STEP = 1e-9  # s

# What is noted per node the first time it cools through 800, 700 and 500 degC.
MARKS_K = (1073.15, 973.15, 773.15)
N_MARK = 4  # three times and the cooling rate at the second

(
    TIME,
    STEP,
    STEP_BEFORE,
    TAKEN,
    REFUSED,
    ITERATIONS,
    FIELD_ROW,  # fields kept so far
    HISTORY_ROW,
    FIELD_TAKEN,  # of these, fetched by the caller; their rows may be used again
) = range(9)
N_CLOCK = 9


@kernel
def _mark(marks: Array, start: float, step: float, first: float, middle: float, end: float) -> None:
    """Note when a node first cools through the marks, on the step's parabola."""
    # T(s) = first + s (b + c s), through the three stage values.
    c = ((end - first) - (middle - first) / GAMMA) / (1.0 - GAMMA)
    b = end - first - c
    for k in range(3):
        level = MARKS_K[k]
        if marks[k] >= 0.0 or end > level or first < level or end >= first:
            continue
        gap = level - first
        root = b * b + 4.0 * c * gap
        s = gap / (end - first)
        if root > 0.0:
            # The stable form of the quadratic's smaller root.
            below = b - np.sqrt(root)
            if below != 0.0:
                t = -2.0 * (-gap) / below
                if 0.0 <= t <= 1.0:
                    s = t
        marks[k] = start + s * step
        if k == 1:
            marks[3] = -(b + 2.0 * c * s) / step


@inner_kernel
def _ahead(
    older: float, old: float, now: float, since_old: float, since_older: float, ahead: float
) -> float:
    """How much further after ``ahead`` seconds, on the parabola through three values.

    The bend may change the straight guess by half: far ahead a parabola goes anywhere.
    """
    slope = (now - old) / since_old
    straight = slope * ahead
    bend = (slope - (now - older) / since_older) / (since_older - since_old)
    bent = bend * ahead * (ahead + since_old)
    most = 0.5 * abs(straight)
    return straight + min(max(bent, -most), most)


@kernel
def march(
    how: Scheme,
    body: Body,
    skin: Skin,
    tables: Tables,
    control: Control,
    progress: Progress,
    most_steps: int,
) -> int:
    """Advance ``progress`` until the end, the limit, or ``most_steps`` steps.

    Returns REACHED_END, REACHED_LIMIT, PAUSED (so many steps are done, or the window of
    kept fields is full) or GAVE_UP. On GAVE_UP the state is that of the last accepted step.
    """
    n = len(body.mass)
    clock = progress.clock
    temp, older = progress.temp, progress.older
    middle, end = np.empty(n), np.empty(n)
    passed = np.empty(n)  # the middle of the step before; on the chord when a march goes on
    for i in range(n):
        passed[i] = older[i] + GAMMA * (temp[i] - older[i])
    state1, state2 = np.empty((n, N_STATE)), np.empty((n, N_STATE))
    conductivity = np.empty(n)
    rate0, rate1, rate2 = np.empty(n), np.empty(n), np.empty(n)
    weight, stiff = np.empty(len(body.tail)), np.empty(n)
    n_zone = len(skin.flux)
    zone0, zone1, zone2 = np.empty(n_zone), np.empty(n_zone), np.empty(n_zone)
    known, work = np.empty(n), np.empty((4, n))
    newton = min(NEWTON_SHARE * control.tolerance, NEWTON_MOST)
    n_watch = progress.history.shape[1]

    for i in range(n):
        conductivity[i] = enthalpy_node(progress.state[i], temp[i], progress.carbon[i], tables)[2]
    heat_rate(temp, conductivity, body, skin, tables, clock[TIME], rate0, weight, stiff, zone0)
    taken = 0
    while True:
        remaining = control.end - clock[TIME]
        if remaining <= 1e-9 * max(1.0, control.end):
            return REACHED_END
        if taken >= most_steps or clock[HISTORY_ROW] >= progress.history.shape[0]:
            return PAUSED
        step = min(clock[STEP], control.longest)
        if step >= remaining:
            step = remaining
        elif step > 0.5 * remaining:
            step = 0.5 * remaining
        # Fields kept in a window that is smaller than their number: wait for room, and
        # never step over more of them than the window holds.
        window, row = progress.field.shape[0], int(clock[FIELD_ROW])
        free = window - (row - int(clock[FIELD_TAKEN]))
        reach = clock[TIME] + step * (1.0 + 1e-12)
        if row + free < len(progress.field_moment) and progress.field_moment[row + free] <= reach:
            if free < window:
                return PAUSED
            step = progress.field_moment[row + window - 1] - clock[TIME]
        if step < SMALLEST_STEP:
            return GAVE_UP
        before = clock[STEP_BEFORE]

        # Guess on the last parabola, then the two stages.
        for i in range(n):
            middle[i] = temp[i]
            if before > 0.0:
                middle[i] += _ahead(
                    older[i], passed[i], temp[i], (1.0 - GAMMA) * before, before, GAMMA * step
                )
            known[i] = progress.book[i] + IMPLICIT * step * rate0[i]
        used = stage(
            how,
            body,
            skin,
            tables,
            progress,
            known,
            temp,
            progress.state,
            GAMMA * step,
            IMPLICIT * step,
            clock[TIME] + GAMMA * step,
            newton,
            middle,
            state1,
            conductivity,
            rate1,
            weight,
            stiff,
            zone1,
            work,
            clock[TAKEN] % 2 == 1,
        )
        clock[ITERATIONS] += used
        if used > 0:
            for i in range(n):
                end[i] = middle[i] + (1.0 / GAMMA - 1.0) * (middle[i] - temp[i])
                if before > 0.0:
                    end[i] = middle[i] + _ahead(
                        passed[i],
                        temp[i],
                        middle[i],
                        GAMMA * step,
                        GAMMA * step + (1.0 - GAMMA) * before,
                        (1.0 - GAMMA) * step,
                    )
                known[i] = progress.book[i] + EXPLICIT * step * (rate0[i] + rate1[i])
            used = stage(
                how,
                body,
                skin,
                tables,
                progress,
                known,
                middle,
                state1,
                (1.0 - GAMMA) * step,
                IMPLICIT * step,
                clock[TIME] + step,
                newton,
                end,
                state2,
                conductivity,
                rate2,
                weight,
                stiff,
                zone2,
                work,
                clock[TAKEN] % 2 == 0,
            )
            clock[ITERATIONS] += used
        if used == 0:
            clock[REFUSED] += 1
            clock[STEP] = 0.25 * step
            continue

        # Error of the step from the third difference over it and the step before;
        # bend: how far the stage value lies off the chord the kinetics follow.
        error, bend = 0.0, 0.0
        for i in range(n):
            bent = abs(middle[i] - temp[i] - GAMMA * (end[i] - temp[i]))
            bend = max(bend, bent)
            if before > 0.0:
                d01 = (temp[i] - older[i]) / before
                d12 = (middle[i] - temp[i]) / (GAMMA * step)
                d23 = (end[i] - middle[i]) / ((1.0 - GAMMA) * step)
                d012 = (d12 - d01) / (before + GAMMA * step)
                d123 = (d23 - d12) / step
                third = (d123 - d012) / (before + step)
                error = max(error, abs(6.0 * ERROR_CONSTANT * step**3 * third))
        ratio = max(error / control.tolerance, (bend / control.bend) ** 1.5)
        factor = 3.0 if ratio <= 0.0 else min(3.0, max(0.2, 0.9 * ratio ** (-1.0 / 3.0)))
        if ratio > 1.5:
            clock[REFUSED] += 1
            clock[STEP] = step * min(factor, 0.7)
            continue

        # Stop exactly where the condition is met.
        if len(control.limit_node) > 0:
            value0, value1, value2 = 0.0, 0.0, 0.0
            for k in range(len(control.limit_node)):
                i, part = control.limit_node[k], control.limit_share[k]
                value0 += part * temp[i]
                value1 += part * middle[i]
                value2 += part * end[i]
            if value2 < control.limit_temp - 0.01 and step > 1e-6:
                share = (value0 - control.limit_temp) / (value0 - value2)
                if value1 < control.limit_temp:
                    share = GAMMA * (value0 - control.limit_temp) / (value0 - value1)
                elif value1 > value2:
                    share = GAMMA + (1.0 - GAMMA) * (value1 - control.limit_temp) / (
                        value1 - value2
                    )
                clock[STEP] = step * min(max(share, 1e-3), 0.9999)
                continue

        start = clock[TIME]
        for i in range(n):
            progress.book[i] += step * (EXPLICIT * (rate0[i] + rate1[i]) + IMPLICIT * rate2[i])
            _mark(progress.marks[i], start, step, temp[i], middle[i], end[i])
        for zone in range(n_zone):
            progress.zone_heat[zone] += step * (
                EXPLICIT * (zone0[zone] + zone1[zone]) + IMPLICIT * zone2[zone]
            )
        while row < len(progress.field_moment) and progress.field_moment[row] <= start + step * (
            1.0 + 1e-12
        ):
            s = (progress.field_moment[row] - start) / step
            for i in range(n):
                c = ((end[i] - temp[i]) - (middle[i] - temp[i]) / GAMMA) / (1.0 - GAMMA)
                progress.field[row % window, i] = temp[i] + s * (end[i] - temp[i] - c + c * s)
            row += 1
        clock[FIELD_ROW] = row
        for i in range(n):
            older[i] = temp[i]
            passed[i] = middle[i]
            temp[i] = end[i]
            rate0[i] = rate2[i]
            for column in range(N_STATE):
                progress.state[i, column] = state2[i, column]
        for zone in range(n_zone):
            zone0[zone] = zone2[zone]
        clock[TIME] = start + step
        clock[STEP_BEFORE] = step
        clock[STEP] = step * factor
        clock[TAKEN] += 1
        taken += 1
        row = int(clock[HISTORY_ROW])
        progress.history[row, 0, 0] = clock[TIME]
        for k in range(n_watch - 1):
            for column in range(6):
                progress.history[row, k + 1, column] = 0.0
            for m in range(progress.watch_node.shape[1]):
                i, part = progress.watch_node[k, m], progress.watch_share[k, m]
                progress.history[row, k + 1, 0] += part * temp[i]
                for column in range(5):
                    progress.history[row, k + 1, column + 1] += part * progress.state[i, column]
        clock[HISTORY_ROW] = row + 1
        if len(control.limit_node) > 0:
            value2 = 0.0
            for k in range(len(control.limit_node)):
                value2 += control.limit_share[k] * temp[control.limit_node[k]]
            if value2 <= control.limit_temp + 0.01:
                return REACHED_LIMIT
