"""Radial conduction in a long round that does not transform, under a flux or a film.

Model
-----
Control volumes from the axis to the surface, finer toward it; backward Euler in the
enthalpy (its secant over each step), conductivity at the mean of neighbours, three passes
per step. Half a step of lag is the error in time: steps are kept short instead.

Source
------
Own scheme; its curves stand beside those of another solver in the tests.

Holds for
---------
Length several times the diameter, the same film all round: one dimension.
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from midradius.fem.probemetal import FIRST_K, STEP_K, ProbeMetal
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel

N_NODE = 41
GRADING = 1.5
PASSES = 3
LONGEST_STEP = 1.0 / 1600.0  # of radius squared over diffusivity: 5 ms in the standard probe


class Rod(NamedTuple):
    """Radii [m], volumes [m2 per radian], conductances' lengths (face over distance) [-], and
    the tables of the metal; ``sensor`` and ``share``: the node below the thermocouple and the
    weight of the next one."""

    radius: Array
    volume: Array
    length: Array
    conductivity: Array
    enthalpy: Array
    sensor: int
    share: float


def rod(metal: ProbeMetal, *, diameter: float, sensor_depth: float) -> Rod:
    """A round of ``diameter`` [m] with its thermocouple ``sensor_depth`` [m] below the surface."""
    outside = 0.5 * diameter
    share = np.linspace(0.0, 1.0, N_NODE)
    radius = outside * (1.0 - (1.0 - share) ** GRADING)
    face = 0.5 * (radius[1:] + radius[:-1])
    edges = np.concatenate([[0.0], face, [outside]])
    place = min(max(outside - sensor_depth, 0.0), outside)
    below = min(int(np.searchsorted(radius, place, side="right")) - 1, N_NODE - 2)
    weight = (place - radius[below]) / (radius[below + 1] - radius[below])
    return Rod(
        radius=radius,
        volume=0.5 * np.diff(edges**2),
        length=face / np.diff(radius),
        conductivity=metal.conductivity,
        enthalpy=metal.enthalpy,
        sensor=below,
        share=float(weight),
    )


@dataclass(frozen=True)
class Cooled:
    """A march under a film: thermocouple and surface temperature [K] at ``time`` [s]."""

    time: Array
    sensor: Array
    surface: Array


def cool_rod(
    body: Rod,
    *,
    start: float,
    bath: float,
    film_temp: Array,
    film_htc: Array,
    time: Array,
    coarse: float = 1.0,
) -> Cooled:
    """Cool a rod from a uniform ``start`` [K] in a ``bath`` [K].

    ``film_temp`` [K] rises, ``film_htc`` [W/(m2 K)], (n_knot,) each, ends held; ``time`` [s]
    rises from the start, (n_time,). ``coarse`` lengthens the steps.
    """
    most = coarse * _longest_step(body)
    sensor, surface = _under_film(body, start, bath, film_temp, film_htc, time, most)
    return Cooled(time, sensor, surface)


def _longest_step(body: Rod) -> float:
    middle = len(body.conductivity) // 2
    slope = (body.enthalpy[middle + 1] - body.enthalpy[middle - 1]) / (2.0 * STEP_K)
    return float(LONGEST_STEP * body.radius[-1] ** 2 * slope / body.conductivity[middle])


@kernel
def _lookup(table: Array, temp: float) -> float:
    place = (temp - FIRST_K) / STEP_K
    cell = min(max(int(place), 0), len(table) - 2)
    low: float = table[cell]
    high: float = table[cell + 1]
    return low + (place - cell) * (high - low)


@kernel
def _eliminate(work: Array, before: Array, stiff: float, gained: float, after: Array) -> None:
    """Solve the step in rows 0 and 1 of ``work`` from the axis outward, then back.

    The surface node has ``stiff`` on its diagonal and ``gained`` on the known side;
    ``before`` and ``after`` (n_node,) may be one array.
    """
    n = len(before)
    for i in range(n):
        left = work[1, i - 1] if i > 0 else 0.0
        right = work[1, i] if i < n - 1 else stiff
        diagonal = work[0, i] + left + right
        known = work[0, i] * before[i]
        if i == n - 1:
            known += gained
        if i > 0:
            diagonal -= left * work[2, i - 1]
            known += left * work[3, i - 1]
        work[2, i] = work[1, i] / diagonal if i < n - 1 else 0.0
        work[3, i] = known / diagonal
    after[n - 1] = work[3, n - 1]
    for i in range(n - 2, -1, -1):
        after[i] = work[3, i] + work[2, i] * after[i + 1]


@kernel
def step(
    body: Rod,
    before: Array,
    after: Array,
    work: Array,
    span: float,
    flux: float,
    htc: float,
    bath: float,
) -> None:
    """One step: ``after`` (n_node,) holds a guess and gets the answer.

    Heat leaves by ``flux`` [W/m2] plus ``htc`` [W/(m2 K)] times surface over ``bath`` [K].
    ``work`` is scratch, (4, n_node): what is in it afterwards is the matrix of the step
    (capacity over time in row 0, conductances in row 1).
    """
    n = len(before)
    outside = body.radius[n - 1]
    for _ in range(PASSES):
        for i in range(n):
            change = after[i] - before[i]
            if abs(change) > 1e-3:
                gained = _lookup(body.enthalpy, after[i]) - _lookup(body.enthalpy, before[i])
                capacity = gained / change
            else:
                capacity = _lookup(body.enthalpy, before[i] + 0.5) - _lookup(
                    body.enthalpy, before[i] - 0.5
                )
            work[0, i] = capacity * body.volume[i] / span
            if i < n - 1:
                work[1, i] = body.length[i] * _lookup(
                    body.conductivity, 0.5 * (after[i] + after[i + 1])
                )
        _eliminate(work, before, outside * htc, outside * (htc * bath - flux), after)


@kernel
def sensitivity(body: Rod, work: Array, slope: Array) -> None:
    """Lead ``slope`` (n_node,), temperature by unit outward flux, through the step in ``work``."""
    _eliminate(work, slope, 0.0, -body.radius[len(slope) - 1], slope)


@kernel
def read(body: Rod, values: Array) -> float:
    """A field at the thermocouple."""
    low: float = values[body.sensor]
    high: float = values[body.sensor + 1]
    return low + body.share * (high - low)


@kernel
def film_at(film_temp: Array, film_htc: Array, surface: float) -> float:
    """The film at a surface temperature [K]; ends held."""
    n = len(film_temp)
    if surface <= film_temp[0]:
        first: float = film_htc[0]
        return first
    if surface >= film_temp[n - 1]:
        last: float = film_htc[n - 1]
        return last
    i = np.searchsorted(film_temp, surface) - 1
    share = (surface - film_temp[i]) / (film_temp[i + 1] - film_temp[i])
    value: float = film_htc[i] + share * (film_htc[i + 1] - film_htc[i])
    return value


@kernel
def _under_film(
    body: Rod,
    start: float,
    bath: float,
    film_temp: Array,
    film_htc: Array,
    time: Array,
    most: float,
) -> tuple[Array, Array]:
    n = len(body.radius)
    before = np.full(n, start)
    after = before.copy()
    work = np.zeros((4, n))
    sensor = np.empty(len(time))
    surface = np.empty(len(time))
    sensor[0] = surface[0] = start
    for k in range(1, len(time)):
        gap = time[k] - time[k - 1]
        count = max(1, int(np.ceil(gap / most)))
        for _ in range(count):
            # the film of the temperature in the middle of the step
            guess = 0.5 * (before[n - 1] + after[n - 1])
            step(
                body,
                before,
                after,
                work,
                gap / count,
                0.0,
                film_at(film_temp, film_htc, guess),
                bath,
            )
            guess = 0.5 * (before[n - 1] + after[n - 1])
            step(
                body,
                before,
                after,
                work,
                gap / count,
                0.0,
                film_at(film_temp, film_htc, guess),
                bath,
            )
            last = before
            before = after
            after = last
            # a straight line on as the guess of the next step
            for i in range(n):
                after[i] = 2.0 * before[i] - last[i]
        sensor[k] = read(body, before)
        surface[k] = before[n - 1]
    return sensor, surface
