"""What a path of temperature leaves at a node, once it is at room temperature.

Model
-----
After the last stage the austenite that is left follows the martensite curve to
:data:`ROOM_TEMP`, in no time: nothing diffusional forms on the way.

Holds for
---------
Routes that end below some 200 degC; above it bainite could still form on the way.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.assemble import fractions
from midradius.thermo.compiled import kernel
from midradius.thermo.kinetics import (
    CARBON_AUSTENITE,
    CARBON_MARTENSITE,
    PEARLITE,
    PEARLITE_HEAT,
    SELF_TEMPER,
    Tables,
    advance,
)
from midradius.thermo.phases import AUSTENITE, MARTENSITE

PART_OF_AUSTENITE = 1e-6  # less austenite than this has no carbon content to speak of
ROOM_TEMP = 293.15  # K


@dataclass(frozen=True)
class Remains:
    """Of every node: ``phases`` (n_phase, n_node) at room temperature;
    ``carbon_austenite_pct``, ``carbon_martensite_pct``, ``pearlite_temp`` [K],
    ``time_800_500`` [s], ``rate_700`` [K/s], ``self_temper`` [s], (n_node,) each and nan
    where there is none; the last is the time of `thermo.autotemper`.
    """

    phases: Array
    carbon_austenite_pct: Array
    carbon_martensite_pct: Array
    pearlite_temp: Array
    time_800_500: Array
    rate_700: Array
    self_temper: Array


@kernel
def _to_room(states: Array, temp: Array, scales: Array, tables: Tables) -> None:
    for i in range(len(temp)):
        advance(states, i, temp[i], ROOM_TEMP, 0.0, scales, tables, False)


def remains(states: Array, temp: Array, scales: Array, marks: Array, tables: Tables) -> Remains:
    """What is left of every node.

    Parameters
    ----------
    states
        At the end of the path, (n_node, N_STATE); taken to room temperature in place.
    temp
        At the end of the path [K], (n_node,).
    scales
        Factors on the rates, (n_node, N_SCALE).
    marks
        Times [s] at which each node first cooled through 800, 700 and 500 degC and the
        rate [K/s] at the second, negative where it did not, (n_node, 4).
    tables
        The steel.
    """
    _to_room(states, temp, scales, tables)
    carbon, pearlite = states[:, CARBON_AUSTENITE], states[:, PEARLITE]
    phases = fractions(states)
    austenite, martensite = phases[AUSTENITE], phases[MARTENSITE]
    some, hard = austenite > PART_OF_AUSTENITE, martensite > PART_OF_AUSTENITE
    marked = marks >= 0.0
    both = marked[:, 0] & marked[:, 2]
    formed = pearlite > PART_OF_AUSTENITE
    return Remains(
        phases=phases,
        carbon_austenite_pct=np.where(some, carbon / np.where(some, austenite, 1.0), np.nan),
        carbon_martensite_pct=np.where(
            hard, states[:, CARBON_MARTENSITE] / np.where(hard, martensite, 1.0), np.nan
        ),
        pearlite_temp=np.where(
            formed, states[:, PEARLITE_HEAT] / np.where(formed, pearlite, 1.0), np.nan
        ),
        time_800_500=np.where(both, marks[:, 2] - marks[:, 0], np.nan),
        rate_700=np.where(marked[:, 1], marks[:, 3], np.nan),
        self_temper=np.where(
            hard, states[:, SELF_TEMPER] / np.where(hard, martensite, 1.0), np.nan
        ),
    )
