"""The only place where products compete for austenite.

Model
-----
Each diffusional product keeps a clock that runs with a rate of temperature
alone (see :mod:`midradius.thermo.diffusional`); what it can reach is its limit
at that temperature: the lever rule for ferrite and cementite, the austenite
still there for pearlite and bainite. All run at once. A step is split in two
halves, ferrite to bainite and back, so that the order of the products costs no
first-order error. Carbon is a balance: ferrite and cementite change the carbon
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

from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel

# Columns of a node's state. Fractions are by mass; carbon is an inventory in
# mass % of the whole, so the austenite holds STATE_CARBON_AUSTENITE / austenite.
FERRITE, CEMENTITE, PEARLITE, BAINITE, MARTENSITE = range(5)
CARBON_AUSTENITE, CARBON_MARTENSITE, COLDEST, PEARLITE_HEAT = range(5, 9)
N_STATE = 9

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
) = range(16)
N_COLUMN = 16

CEMENTITE_CARBON_PCT = 6.690
NOTHING_LEFT = 1e-9  # austenite below this is taken as gone
LONGEST_STRIDE = 10.0  # K of temperature that one split step may cover


class Tables(NamedTuple):
    """One steel as the kernel sees it.

    ``value`` (n_temp, n_column) on the even grid ``first + i * step`` [K];
    ``clock`` (n_clock,) the fraction at even values of S from 0 to ``whole``;
    ``back`` (n_back,) S at even values of the square root of the fraction;
    martensite start [K] and rate [1/K] as ``a - b (1 - exp(-c C))``.
    """

    value: Array
    first: float
    step: float
    clock: Array
    back: Array
    whole: float
    start: Array
    rate: Array
    top: float
    transforms: bool


@kernel
def _clock_of(fraction: float, tables: Tables) -> float:
    """S of a fraction: the exact inverse of the table that `_grown` reads.

    A second table only finds the cell; were S read from it, each round trip
    would shift the fraction a little and the shifts would add up.
    """
    if fraction <= 0.0:
        return 0.0
    low = min(fraction, 1.0 - fraction)
    back = tables.back
    near = min(int(np.sqrt(max(low, 0.0)) * (len(back) - 1)), len(back) - 1)
    guess = back[near] if fraction <= 0.5 else tables.whole - back[near]
    clock = tables.clock
    per = (len(clock) - 1) / tables.whole
    cell = min(max(int(guess * per), 0), len(clock) - 2)
    while cell > 0 and clock[cell] > fraction:
        cell -= 1
    while cell < len(clock) - 2 and clock[cell + 1] < fraction:
        cell += 1
    ticks: float = (cell + (fraction - clock[cell]) / (clock[cell + 1] - clock[cell])) / per
    return ticks


@kernel
def _grown(present: float, limit: float, ticks: float, tables: Tables) -> tuple[float, float]:
    """Amount after ``ticks`` of the clock, and its derivative by the clock."""
    if ticks <= 0.0 or limit <= NOTHING_LEFT or present >= limit:
        return present, 0.0
    clock = _clock_of(present / limit, tables) + ticks
    if clock >= tables.whole:
        return limit, 0.0
    per = (len(tables.clock) - 1) / tables.whole
    place = clock * per
    cell = min(int(place), len(tables.clock) - 2)
    slope = tables.clock[cell + 1] - tables.clock[cell]
    share = tables.clock[cell] + (place - cell) * slope
    return max(limit * share, present), limit * slope * per


@kernel
def advance_node(
    state: Array, from_temp: float, to_temp: float, span: float, scale: Array, tables: Tables
) -> float:
    """Take one node along a straight temperature path; the state changes in place.

    Parameters
    ----------
    state
        The node's state, shape (N_STATE,).
    from_temp, to_temp
        Temperatures at the ends of the path [K].
    span
        Duration [s].
    scale
        Factors on the rates of ferrite, pearlite and bainite, shape (3,).
    tables
        The steel.

    Returns
    -------
    float
        How the enthalpy changes with ``to_temp`` through the fractions alone
        [J/(kg K)]: what Newton's method needs to see the latent heat coming.
    """
    austenite = 1.0
    for i in range(5):
        austenite -= state[i]
    if austenite <= NOTHING_LEFT or not tables.transforms:
        state[COLDEST] = min(state[COLDEST], to_temp)
        return 0.0
    if from_temp > tables.top and to_temp > tables.top:
        return 0.0

    value = tables.value
    last = value.shape[0] - 2
    stride = to_temp - from_temp
    n_half = 2 * (1 + int(abs(stride) / LONGEST_STRIDE))
    part = span / n_half
    slope: float = 0.0
    for half in range(n_half):
        place = (half + 0.5) / n_half
        temp = from_temp + place * stride
        grid = (temp - tables.first) / tables.step
        row = min(max(int(grid), 0), last)
        share = grid - row
        here = value[row]
        there = value[row + 1]
        carbon = state[CARBON_AUSTENITE] / austenite
        # Latent heats of this moment [J/kg], for the derivative only.
        h_austenite = here[H_AUSTENITE] + carbon * here[H_AUSTENITE_C]
        h_product = here[H_FERRITE] + carbon * here[H_FERRITE_C]
        by_temp = (h_product - h_austenite) * part * place / tables.step
        for turn in range(3):
            which = turn if half % 2 == 0 else 2 - turn
            if which == 0:
                rate = here[RATE_FERRITE] + share * (there[RATE_FERRITE] - here[RATE_FERRITE])
                limit = here[LIMIT_FERRITE] + share * (there[LIMIT_FERRITE] - here[LIMIT_FERRITE])
                limit = min(limit, state[FERRITE] + austenite)
                grown, per = _grown(state[FERRITE], limit, rate * scale[0] * part, tables)
                more = grown - state[FERRITE]
                if more > 0.0:
                    state[FERRITE] = grown
                    state[CARBON_AUSTENITE] -= more * here[CARBON_FERRITE]
                    austenite -= more
                slope += by_temp * per * scale[0] * (there[RATE_FERRITE] - here[RATE_FERRITE])
                limit = here[LIMIT_CEMENTITE] + share * (
                    there[LIMIT_CEMENTITE] - here[LIMIT_CEMENTITE]
                )
                limit = min(limit, state[CEMENTITE] + austenite)
                if limit > state[CEMENTITE]:
                    rate = here[RATE_CEMENTITE] + share * (
                        there[RATE_CEMENTITE] - here[RATE_CEMENTITE]
                    )
                    filled = (state[CEMENTITE] / limit) ** 2
                    filled = 1.0 - (1.0 - filled) * np.exp(-rate * part)
                    more = limit * np.sqrt(filled) - state[CEMENTITE]
                    if more > 0.0:
                        state[CEMENTITE] += more
                        state[CARBON_AUSTENITE] -= more * CEMENTITE_CARBON_PCT
                        austenite -= more
            else:
                column = RATE_PEARLITE if which == 1 else RATE_BAINITE
                product = PEARLITE if which == 1 else BAINITE
                rate = here[column] + share * (there[column] - here[column])
                present = state[product]
                grown, per = _grown(
                    present, present + austenite, rate * scale[which] * part, tables
                )
                more = grown - present
                if more > 0.0:
                    carbon = state[CARBON_AUSTENITE] / austenite
                    state[product] = grown
                    state[CARBON_AUSTENITE] -= more * carbon
                    if which == 1:
                        state[PEARLITE_HEAT] += more * temp
                    austenite -= more
                slope += by_temp * per * scale[which] * (there[column] - here[column])
            if austenite <= NOTHING_LEFT:
                state[COLDEST] = min(state[COLDEST], to_temp)
                return slope
        reached = from_temp + (half + 1.0) / n_half * stride
        if reached < state[COLDEST]:
            carbon = state[CARBON_AUSTENITE] / austenite
            start = tables.start[0] - tables.start[1] * (1.0 - np.exp(-tables.start[2] * carbon))
            if reached < start:
                speed = tables.rate[0] - tables.rate[1] * (1.0 - np.exp(-tables.rate[2] * carbon))
                under = min(start, state[COLDEST]) - reached
                more = austenite * -np.expm1(-speed * under)
                state[MARTENSITE] += more
                state[CARBON_MARTENSITE] += more * carbon
                state[CARBON_AUSTENITE] -= more * carbon
                austenite -= more
                if half == n_half - 1:
                    h_martensite = here[H_MARTENSITE] + carbon * here[H_MARTENSITE_C]
                    slope += (h_austenite - h_martensite) * speed * austenite
            state[COLDEST] = reached
    return slope


@kernel
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
    value = tables.value
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
