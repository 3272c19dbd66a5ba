"""The only place where products compete for austenite.

Model
-----
Each diffusional product keeps a clock that runs with a rate of temperature
alone (see :mod:`midradius.thermo.diffusional`); what it can reach is its limit
at that temperature: the lever rule for ferrite and cementite, the austenite
still there for pearlite and bainite. All run at once. Passes over the products go
from ferrite to bainite and back by turns, so that their order costs no first-order
error. Carbon is a balance: ferrite and cementite change the carbon
of the austenite; pearlite, bainite and martensite take it as it is. Martensite
follows the lowest temperature reached, with the start that belongs to the
carbon of the austenite at that moment.

The kernel sees tables on an even temperature grid and knows no formula, so any
published set of rates, or a measured table, feeds the same code.

Source
------
Additivity: Scheil 1935, Cahn 1956 (remembered). Limits: :mod:`equilibrium`.

Holds for
---------
Cooling and holding. On reheating, products stay: nothing turns back into
austenite (``Tables`` carries no such rate).
"""

from typing import NamedTuple

import numpy as np

from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.compiled import inner_kernel, kernel

# Columns of a node's state. Fractions are by mass; carbon is an inventory in
# mass % of the whole, so the austenite holds STATE_CARBON_AUSTENITE / austenite.
# SELF_TEMPER is the weighted time [s] that martensite has spent, times its fraction.
# KIND says which of the austenites of the tables the node became in its soak.
FERRITE, CEMENTITE, PEARLITE, BAINITE, MARTENSITE = range(5)
CARBON_AUSTENITE, CARBON_MARTENSITE, COLDEST, PEARLITE_HEAT, KIND, SELF_TEMPER = range(5, 11)
N_STATE = 11
N_SCALE = 4  # factors of a node on the rates of ferrite, pearlite, bainite and cementite

# Columns of the table.
(
    H_AUSTENITE,
    H_AUSTENITE_C,
    H_FERRITE,
    H_FERRITE_C,
    H_MARTENSITE,
    H_MARTENSITE_C,
    K_AUSTENITE,
    K_FERRITE,
    K_MARTENSITE,
    RATE_FERRITE,
    RATE_PEARLITE,
    RATE_BAINITE,
    RATE_CEMENTITE,
    LIMIT_FERRITE,
    LIMIT_CEMENTITE,
    CARBON_FERRITE,
    EXPONENT_FERRITE,
    EXPONENT_PEARLITE,
    EXPONENT_BAINITE,
    EXPONENT_CEMENTITE,
    TEMPER_WEIGHT,
) = range(21)
N_COLUMN = 21
AVRAMI = -1  # instead of a row of the clocks: the exponent of the temperature

CEMENTITE_CARBON_PCT = 6.690
NOTHING_LEFT = 1e-9  # austenite below this is taken as gone
LAST = 4096  # cells of a clock
ALL_BUT = 1.0 - 1e-6  # the exponential never ends: above this it has
LONGEST_STRIDE = 5.0  # K of temperature that one pass over the products may cover


class Tables(NamedTuple):
    """One steel as the kernel sees it.

    ``value`` (n_kind, n_temp, n_column) on the even grid ``first + i * step`` [K],
    one kind for each austenite that the soak left in the section.
    ``clock`` holds, one shape after another, the fraction at ``LAST + 1`` even values of
    S; ``back`` the cell of it that holds a fraction, at as many even square roots of the
    fraction and then, falling, of what is left of 1; ``per`` (n_shape,) cells for one unit
    of S. ``shape`` (4,) says which shape ferrite, pearlite and bainite follow, or
    ``AVRAMI``; the last is that of cementite: ``AVRAMI``, or a film that diffusion feeds.
    Martensite ``start`` [K] and ``rate`` [1/K] as ``a - b (1 - exp(-c C))``, (n_kind, 3).
    """

    value: Array
    first: float
    step: float
    clock: Array
    back: IntArray
    per: Array
    shape: IntArray
    start: Array
    rate: Array
    top: float
    transforms: bool


@inner_kernel
def _place_of(fraction: float, first: int, clock: Array, back: IntArray) -> float:
    """Place in a clock of a fraction: the exact inverse of the table that `_grown` reads.

    A second table only finds the cell; were the place read from it, each round trip
    would shift the fraction a little and the shifts would add up.
    """
    if fraction <= 0.0:
        return 0.0
    if fraction <= 0.5:
        cell = back[2 * first + int(np.sqrt(fraction) * LAST)]
    else:
        cell = back[2 * first + 2 * LAST + 1 - int(np.sqrt(max(1.0 - fraction, 0.0)) * LAST)]
    while cell > first and clock[cell] > fraction:
        cell -= 1
    while cell < first + LAST - 1 and clock[cell + 1] < fraction:
        cell += 1
    place: float = cell - first + (fraction - clock[cell]) / (clock[cell + 1] - clock[cell])
    return place


@inner_kernel
def _grown(
    present: float,
    limit: float,
    ticks: float,
    shape: int,
    exponent: float,
    per: float,
    clock: Array,
    back: IntArray,
) -> tuple[float, float]:
    """Amount after ``ticks`` of the clock, and its derivative by the clock."""
    if ticks <= 0.0 or limit <= NOTHING_LEFT or present >= limit:
        return present, 0.0
    if shape == AVRAMI:
        return _avrami(present, limit, ticks, exponent)
    first = shape * (LAST + 1)
    place = (_place_of(present / limit, first, clock, back) / per + ticks) * per
    if place >= LAST:
        return limit, 0.0
    cell = int(place)
    at = first + cell
    slope = clock[at + 1] - clock[at]
    share = clock[at] + (place - cell) * slope
    return max(limit * share, present), limit * slope * per


@inner_kernel
def _avrami(present: float, limit: float, ticks: float, exponent: float) -> tuple[float, float]:
    """As `_grown` with ``X = 1 - exp(-S^n)``: the clock goes on from the time that this
    temperature would have needed for what is there."""
    share = present / limit
    if share > ALL_BUT:
        return limit, 0.0
    if ticks <= 0.0:
        return present, 0.0
    clock = ticks
    if share > 0.0:
        clock += (-np.log1p(-share)) ** (1.0 / exponent)
    extended = clock**exponent
    left = np.exp(-extended)
    return max(-limit * np.expm1(-extended), present), limit * left * exponent * extended / clock


@inner_kernel
def _at(value: Array, row: int, share: float, column: int) -> float:
    """A column of the table between two rows."""
    low: float = value[row, column]
    high: float = value[row + 1, column]
    return low + share * (high - low)


@inner_kernel
def _temper(
    states: Array, node: int, temp: float, span: float, value: Array, tables: Tables
) -> None:
    """Count a span of time for the martensite that is there."""
    grid = (temp - tables.first) / tables.step
    row = min(max(int(grid), 0), value.shape[0] - 2)
    steady = _at(value, row, grid - row, TEMPER_WEIGHT)
    states[node, SELF_TEMPER] += states[node, MARTENSITE] * steady * span


@inner_kernel
def advance(
    states: Array,
    node: int,
    from_temp: float,
    to_temp: float,
    span: float,
    scales: Array,
    tables: Tables,
    backward: bool,
) -> float:
    """Take one node along a straight temperature path; its state changes in place.

    Parameters
    ----------
    states, node
        All states, shape (n_node, N_STATE), and the node to advance.
    from_temp, to_temp
        Temperatures at the ends of the path [K].
    span
        Duration [s].
    scales
        Factors on the rates of ferrite, pearlite, bainite and cementite,
        shape (n_node, N_SCALE).
    tables
        The steel.
    backward
        Whether the first pass goes from bainite to ferrite; callers alternate.

    Returns
    -------
    float
        How the enthalpy changes with ``to_temp`` through the fractions alone
        [J/(kg K)]: what Newton's method needs to see the latent heat coming.
    """
    austenite = 1.0
    for i in range(5):
        austenite -= states[node, i]
    kind = int(states[node, KIND])
    value, start_of, rate_of = tables.value[kind], tables.start[kind], tables.rate[kind]
    if austenite <= NOTHING_LEFT or not tables.transforms:
        states[node, COLDEST] = min(states[node, COLDEST], to_temp)
        if states[node, MARTENSITE] > 0.0:
            _temper(states, node, 0.5 * (from_temp + to_temp), span, value, tables)
        return 0.0
    clock, back, pers, shapes = tables.clock, tables.back, tables.per, tables.shape
    last = value.shape[0] - 2
    stride = to_temp - from_temp
    # Divisions are what costs most at a node where nothing happens.
    n_pass = 1 + int(abs(stride) * (1.0 / LONGEST_STRIDE))
    pace = 1.0 / n_pass if n_pass > 1 else 1.0
    per_kelvin = 1.0 / tables.step
    part = span * pace
    slope: float = 0.0
    for lap in range(n_pass):
        place = (lap + 0.5) * pace
        temp = from_temp + place * stride
        grid = (temp - tables.first) * per_kelvin
        row = min(max(int(grid), 0), last)
        share = grid - row
        carbon = states[node, CARBON_AUSTENITE] / austenite
        # Latent heats of this moment [J/kg], for the derivative only.
        h_austenite = value[row, H_AUSTENITE] + carbon * value[row, H_AUSTENITE_C]
        h_product = value[row, H_FERRITE] + carbon * value[row, H_FERRITE_C]
        by_temp = (h_product - h_austenite) * part * place * per_kelvin
        for turn in range(3):
            which = turn if (lap % 2 == 0) != backward else 2 - turn
            column = RATE_FERRITE + which
            rate = _at(value, row, share, column)
            if which > 0 and rate > 0.0:
                product = PEARLITE if which == 1 else BAINITE
                present = states[node, product]
                ticks = rate * scales[node, which] * part
                bent = value[row, column + (EXPONENT_FERRITE - RATE_FERRITE)]
                shape = shapes[which]
                grown, per = _grown(
                    present, present + austenite, ticks, shape, bent, pers[shape], clock, back
                )
                more = grown - present
                if more > 0.0:
                    carbon = states[node, CARBON_AUSTENITE] / austenite
                    states[node, product] = grown
                    states[node, CARBON_AUSTENITE] -= more * carbon
                    if which == 1:
                        states[node, PEARLITE_HEAT] += more * temp
                    austenite -= more
                steep = value[row + 1, column] - value[row, column]
                slope += by_temp * per * scales[node, which] * steep
            elif which == 0:
                present = states[node, FERRITE]
                limit = min(_at(value, row, share, LIMIT_FERRITE), present + austenite)
                if rate > 0.0 and limit > present:
                    ticks = rate * scales[node, 0] * part
                    bent = value[row, EXPONENT_FERRITE]
                    shape = shapes[0]
                    grown, per = _grown(
                        present, limit, ticks, shape, bent, pers[shape], clock, back
                    )
                    more = grown - present
                    states[node, FERRITE] = grown
                    states[node, CARBON_AUSTENITE] -= more * value[row, CARBON_FERRITE]
                    austenite -= more
                    steep = value[row + 1, column] - value[row, column]
                    slope += by_temp * per * scales[node, 0] * steep
                present = states[node, CEMENTITE]
                limit = min(_at(value, row, share, LIMIT_CEMENTITE), present + austenite)
                if limit > present:
                    rate = _at(value, row, share, RATE_CEMENTITE)
                    ticks = rate * scales[node, 3] * part
                    if shapes[3] == AVRAMI:
                        bent = value[row, EXPONENT_CEMENTITE]
                        more = _avrami(present, limit, ticks, bent)[0] - present
                    else:
                        filled = 1.0 - (1.0 - (present / limit) ** 2) * np.exp(-ticks)
                        more = limit * np.sqrt(filled) - present
                    if more > 0.0:
                        states[node, CEMENTITE] += more
                        states[node, CARBON_AUSTENITE] -= more * CEMENTITE_CARBON_PCT
                        austenite -= more
            if austenite <= NOTHING_LEFT:
                states[node, COLDEST] = min(states[node, COLDEST], to_temp)
                if states[node, MARTENSITE] > 0.0:
                    _temper(states, node, temp, (n_pass - lap) * part, value, tables)
                return slope
        fresh: float = 0.0
        reached = from_temp + (lap + 1.0) * pace * stride
        if reached < states[node, COLDEST] and reached < start_of[0]:  # carbon only lowers it
            carbon = states[node, CARBON_AUSTENITE] / austenite
            start = start_of[0] - start_of[1] * (1.0 - np.exp(-start_of[2] * carbon))
            if reached < start:
                speed = rate_of[0] - rate_of[1] * (1.0 - np.exp(-rate_of[2] * carbon))
                under = min(start, states[node, COLDEST]) - reached
                more = austenite * -np.expm1(-speed * under)
                fresh = more
                states[node, MARTENSITE] += more
                states[node, CARBON_MARTENSITE] += more * carbon
                states[node, CARBON_AUSTENITE] -= more * carbon
                austenite -= more
                if lap == n_pass - 1:
                    h_martensite = value[row, H_MARTENSITE] + carbon * value[row, H_MARTENSITE_C]
                    slope += (h_austenite - h_martensite) * speed * austenite
        states[node, COLDEST] = min(states[node, COLDEST], reached)
        hard = states[node, MARTENSITE] - 0.5 * fresh
        if hard > 0.0:
            states[node, SELF_TEMPER] += hard * part * _at(value, row, share, TEMPER_WEIGHT)
    return slope


@kernel
def advance_node(
    state: Array, from_temp: float, to_temp: float, span: float, scale: Array, tables: Tables
) -> float:
    """`advance` for a single state, shape (N_STATE,), with its own ``scale`` (N_SCALE,)."""
    one = state.reshape(1, N_STATE)
    return advance(one, 0, from_temp, to_temp, span, scale.reshape(1, N_SCALE), tables, False)


@inner_kernel
def enthalpy_node(
    state: Array, temp: float, initial_carbon: float, tables: Tables
) -> tuple[float, float, float]:
    """Enthalpy [J/kg], its slope at fixed fractions [J/(kg K)], conductivity [W/(m K)]."""
    austenite = 1.0
    for i in range(5):
        austenite -= state[i]
    martensite = state[MARTENSITE]
    rest = 1.0 - austenite - martensite
    carbon_a = state[CARBON_AUSTENITE]
    carbon_m = state[CARBON_MARTENSITE]
    carbon_rest = initial_carbon - carbon_a - carbon_m
    value = tables.value[int(state[KIND])]
    grid = (temp - tables.first) / tables.step
    row = min(max(int(grid), 0), value.shape[0] - 2)
    share = grid - row
    here = value[row]
    there = value[row + 1]
    low = (
        austenite * here[H_AUSTENITE]
        + carbon_a * here[H_AUSTENITE_C]
        + rest * here[H_FERRITE]
        + carbon_rest * here[H_FERRITE_C]
        + martensite * here[H_MARTENSITE]
        + carbon_m * here[H_MARTENSITE_C]
    )
    high = (
        austenite * there[H_AUSTENITE]
        + carbon_a * there[H_AUSTENITE_C]
        + rest * there[H_FERRITE]
        + carbon_rest * there[H_FERRITE_C]
        + martensite * there[H_MARTENSITE]
        + carbon_m * there[H_MARTENSITE_C]
    )
    low_k = austenite * here[K_AUSTENITE] + rest * here[K_FERRITE] + martensite * here[K_MARTENSITE]
    high_k = (
        austenite * there[K_AUSTENITE] + rest * there[K_FERRITE] + martensite * there[K_MARTENSITE]
    )
    return (
        low + share * (high - low),
        (high - low) / tables.step,
        low_k + share * (high_k - low_k),
    )
