"""Put one steel's models on the even temperature grid that the kernel reads.

The enthalpies are linearised in carbon about the carbon of the austenite; the
mixture of ferrite and cementite is exactly linear.
"""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from midradius.thermo import (
    autotemper,
    clocks,
    diffusional,
    equilibrium,
    martensite,
    properties,
    ratesets,
)
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.austenite import Austenite
from midradius.thermo.calibration import NONE, Shifts
from midradius.thermo.clocks import Shape
from midradius.thermo.kinetics import Tables
from midradius.thermo.ratechoice import DEFAULT, Kinetics
from midradius.thermo.steel import Steel

COLDEST_K, HOTTEST_K, GRID_K = 230.0, 1500.0, 1.0
_CLOCKED = ("ferrite", "pearlite", "bainite", "cementite")  # as the kernel counts them
NEVER_K = 0.0  # a martensite start that no temperature reaches


def _clocks(shapes: Sequence[Shape], measured: Sequence[str] = ()) -> dict[str, Any]:
    """The clocks of ferrite, pearlite and bainite as fields of ``Tables``; those
    ``measured`` have an exponent instead."""
    distinct = list(dict.fromkeys(shapes))
    found = [clocks.tables(shape, kin.LAST) for shape in distinct]
    first = [k * (kin.LAST + 1) for k in range(len(found))]
    rows = [*(distinct.index(shape) for shape in shapes), 0]
    return {
        "clock": np.concatenate([fraction for fraction, _, _ in found]),
        "back": np.concatenate([cell + k for k, (_, cell, _) in zip(first, found, strict=True)]),
        "per": np.array([kin.LAST / whole for *_, whole in found]),
        "shape": np.array(
            [
                kin.AVRAMI if name in measured else row
                for name, row in zip(_CLOCKED, rows, strict=True)
            ],
            dtype=np.int64,
        ),
    }


def steel_tables(
    steel: Steel, austenite: Austenite, shifts: Shifts = NONE, chosen: Kinetics = DEFAULT
) -> Tables:
    """Tables of one heat of steel after its soak.

    Parameters
    ----------
    steel
        Name and composition [mass %].
    austenite
        What the soak left: carbon in solution and grain.
    shifts
        What distinguishes this heat from its grade.
    chosen
        The rates: a published set, measured curves before it.
    """
    composition = steel.composition
    temp = np.arange(COLDEST_K, HOTTEST_K + 0.5 * GRID_K, GRID_K)
    carbon = austenite.carbon_pct
    value = np.zeros((len(temp), kin.N_COLUMN))
    delta = 0.05
    for column, slope, enthalpy in (
        (kin.H_AUSTENITE, kin.H_AUSTENITE_C, properties.enthalpy_austenite),
        (kin.H_MARTENSITE, kin.H_MARTENSITE_C, properties.enthalpy_martensite),
        (kin.H_FERRITE, kin.H_FERRITE_C, properties.enthalpy_ferrite_cementite),
    ):
        per_pct = (enthalpy(temp, carbon + delta) - enthalpy(temp, carbon - delta)) / (2.0 * delta)
        value[:, slope] = per_pct
        value[:, column] = enthalpy(temp, carbon) - carbon * per_pct
    value[:, kin.K_AUSTENITE] = properties.conductivity_austenite(temp)
    value[:, kin.K_FERRITE] = properties.conductivity_ferrite(temp)
    value[:, kin.K_MARTENSITE] = properties.conductivity_martensite(temp)
    eq = equilibrium.equilibrium(composition)
    value[:, kin.LIMIT_FERRITE] = equilibrium.ferrite_limit(eq, composition.C, temp)
    value[:, kin.LIMIT_CEMENTITE] = equilibrium.cementite_limit(eq, composition.C, temp)
    value[:, kin.CARBON_FERRITE] = eq.ferrite_solubility(temp)
    value[:, kin.TEMPER_WEIGHT] = autotemper.weight(temp)
    measured = put_rates(value, temp, austenite, shifts, chosen)
    active = (
        (value[:, kin.RATE_FERRITE] * value[:, kin.LIMIT_FERRITE] > 0.0)
        | (value[:, kin.RATE_PEARLITE] > 0.0)
        | (value[:, kin.RATE_BAINITE] > 0.0)
        | (value[:, kin.LIMIT_CEMENTITE] > 0.0)
    )
    start, rate = ratesets.martensite_shift(chosen, austenite)
    return Tables(
        value=value[None],
        first=COLDEST_K,
        step=GRID_K,
        **_clocks(ratesets.shapes(chosen, composition), measured),
        start=np.array([martensite.start_coefficients(austenite.composition)])
        + np.array([shifts.martensite_start + start, 0.0, 0.0]),
        rate=np.array([martensite.rate_coefficients(austenite.composition)])
        + np.array([rate, 0.0, 0.0]),
        top=float(temp[active].max() + GRID_K),
        transforms=True,
    )


def put_rates(
    value: Array, temp: Array, austenite: Austenite, shifts: Shifts, chosen: Kinetics
) -> tuple[str, ...]:
    """Write the clock rates of an austenite; the products that have measured ones.

    ``value`` (n_temp, n_column) changes in place, ``temp`` (n_temp,) [K].
    """
    # Rates and martensite belong to the austenite as it is: without the chromium
    # that undissolved carbide holds.
    soaked = equilibrium.equilibrium(austenite.composition)
    rates = ratesets.rates(chosen, austenite, temp, soaked)
    value[:, kin.RATE_FERRITE] = rates.ferrite / shifts.diffusional_time
    value[:, kin.RATE_PEARLITE] = rates.pearlite / shifts.diffusional_time
    value[:, kin.RATE_BAINITE] = rates.bainite / shifts.bainite_time
    value[:, kin.RATE_CEMENTITE] = diffusional.cementite_rate(
        temp, carbon_pct=austenite.carbon_pct, grain_intercept=austenite.grain_mean_intercept
    )
    return ratesets.put_measured(chosen, temp, value)


def stacked(kinds: Sequence[Tables]) -> Tables:
    """One table set of several austenites of a steel; a state's KIND counts from 0."""
    return kinds[0]._replace(
        value=np.concatenate([kind.value for kind in kinds]),
        start=np.concatenate([kind.start for kind in kinds]),
        rate=np.concatenate([kind.rate for kind in kinds]),
        top=max(kind.top for kind in kinds),
    )


def initial_state(austenite: Austenite, carbon_pct: float, temp: float, n_node: int) -> Array:
    """State of every node at the end of the soak, shape (n_node, N_STATE)."""
    state = np.zeros((n_node, kin.N_STATE))
    state[:, kin.FERRITE] = austenite.ferrite
    state[:, kin.CEMENTITE] = austenite.cementite
    left = 1.0 - austenite.ferrite - austenite.cementite
    state[:, kin.CARBON_AUSTENITE] = left * austenite.carbon_pct
    state[:, kin.COLDEST] = temp
    return state


def fractions(state: Array) -> Array:
    """Phase fractions (n_phase, n_node) from states (n_node, N_STATE)."""
    products = state[:, :5].T
    return np.concatenate([1.0 - products.sum(axis=0, keepdims=True), products])


def inert_tables(
    conductivity: Callable[[Array], Array],
    enthalpy: Callable[[Array], Array],
    *,
    first: float,
    last: float,
    step: float,
) -> Tables:
    """Tables of a material that does not transform, for proving the heat solver.

    ``conductivity`` [W/(m K)] and ``enthalpy`` [J/kg] are functions of
    temperature [K]; they are read at even steps and linear between.
    """
    temp = np.arange(first, last + 0.5 * step, step)
    value = np.zeros((len(temp), kin.N_COLUMN))
    value[:, kin.H_AUSTENITE] = enthalpy(temp)
    value[:, kin.K_AUSTENITE] = conductivity(temp)
    return Tables(
        value=value[None],
        first=first,
        step=step,
        **_clocks((clocks.LI,) * 3),
        start=np.array([[NEVER_K, 0.0, 0.0]]),
        rate=np.zeros((1, 3)),
        top=NEVER_K,
        transforms=False,
    )
