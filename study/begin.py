"""What cooling starts from: the temperatures and the austenite that the soak has left."""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from midradius.fem.cutting import AnyCut
from midradius.fem.heatup import Heating, heat_up
from midradius.fem.place import Place
from midradius.study.case import Case
from midradius.study.heatsetup import HeatSetup
from midradius.thermo import austenite as soaking
from midradius.thermo import equilibrium, properties
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import initial_state, stacked, steel_tables
from midradius.thermo.austenite import Austenite
from midradius.thermo.calibration import Shifts
from midradius.thermo.heatup import heating_tables
from midradius.thermo.kinetics import N_SCALE, Tables
from midradius.thermo.nodeclocks import clock_factors
from midradius.thermo.ratechoice import Kinetics
from midradius.thermo.soaked import Paths, Soaked, alike, initial_states
from midradius.thermo.steel import Composition, Steel

# Heating takes few steps; its error stays in the field that cooling starts from.
FINER = 0.3


@dataclass(frozen=True)
class Begun:
    """A section at the end of its soak: ``temp`` (n_node,) [K], states and clocks' factors
    as `fem.coupled.Run` takes them, the tables of its austenites; ``heating`` is None
    where the whole section is taken to be at the soak temperature."""

    temp: Array
    state: Array
    scale: Array
    tables: Tables
    soaked: Soaked
    heating: Heating | None


def begin(
    case: Case,
    furnace: HeatSetup,
    cut: AnyCut,
    *,
    places: Mapping[str, Place],
    watched: tuple[str, ...],
    tolerance: float,
) -> Begun:
    """Heat and soak a section, or take it as soaked throughout.

    Raises
    ------
    SolverFault, InputFault
        As `heat_up` and `thermo.austenite.soak`.
    """
    steel, n_node = case.steel.steel, cut.body.n_node
    at, time = case.soak.at, case.soak.time
    assert at is not None and time is not None, "a soak has both"
    if not furnace.stages:
        left = soaking.soak(steel, at, time, grain_astm=case.steel.grain_astm)
        soaked = alike(left, at, time, n_node)
        return Begun(
            temp=np.full(n_node, at),
            state=initial_state(left, steel.composition.C, at, n_node),
            scale=np.ones((n_node, N_SCALE)),
            tables=_tables(steel, soaked.kinds, case.steel.shifts, case.steel.kinetics),
            soaked=soaked,
            heating=None,
        )
    paths = Paths(steel, np.full(n_node, furnace.start_temp))
    heating = heat_up(
        cut,
        _on_heating(steel.composition),
        furnace.stages,
        density=properties.DENSITY,
        start_temp=furnace.start_temp,
        places=places,
        watched=watched,
        tolerance=FINER * tolerance,
        follow=paths.follow,
    )
    soaked = paths.end(case.steel.grain_astm)
    ae1 = equilibrium.equilibrium(steel.composition).ae1
    tables = _tables(steel, soaked.kinds, case.steel.shifts, case.steel.kinetics)
    return Begun(
        temp=heating.temp,
        state=initial_states(soaked, heating.temp, ae1),
        scale=clock_factors(soaked, tables, case.steel.shifts, case.steel.kinetics),
        tables=tables,
        soaked=soaked,
        heating=heating,
    )


# The runs of one case on several grids share their tables.
@lru_cache(maxsize=8)
def _tables(steel: Steel, kinds: tuple[Austenite, ...], shifts: Shifts, chosen: Kinetics) -> Tables:
    return stacked([steel_tables(steel, kind, shifts, chosen) for kind in kinds])


@lru_cache(maxsize=8)
def _on_heating(composition: Composition) -> Tables:
    return heating_tables(composition)
