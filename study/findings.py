"""What a run found, in the units of a result: of every node, and at one place."""

from collections.abc import Mapping
from typing import TypedDict

import numpy as np

from midradius.fem.media import ZERO_DEGC
from midradius.fem.remains import Remains
from midradius.fem.section import Place
from midradius.study.case import Asked
from midradius.study.result import Position, SoakFields
from midradius.study.soaktext import soak_fields
from midradius.study.worth import Worth
from midradius.thermo import conversion, equilibrium, network, ratesets
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.austenite import Austenite
from midradius.thermo.phases import PHASE_NAMES


class Fields(TypedDict):
    """The fields of a `Result` that belong to nodes at the end."""

    phases: Array
    hardness_hv: Array
    hardness_as_quenched_hv: Array
    yield_mpa: Array
    time_800_500_s: Array
    rate_700_K_per_s: Array
    austenite_carbon_pct: Array
    pearlite_formed_at_degC: Array
    ferrite_grain_um: Array
    pearlite_spacing_um: Array
    cementite_film_um: Array
    cementite_network: IntArray
    impact_transition_degC: Array
    soaked: SoakFields


def fields(left: Remains, value: Worth) -> Fields:
    """What is known of every node."""
    return Fields(
        phases=value.phases,
        hardness_hv=value.hardness_hv,
        hardness_as_quenched_hv=value.as_quenched_hv,
        yield_mpa=value.yield_mpa,
        time_800_500_s=left.time_800_500,
        rate_700_K_per_s=left.rate_700,
        austenite_carbon_pct=left.carbon_austenite_pct,
        pearlite_formed_at_degC=left.pearlite_temp - ZERO_DEGC,
        ferrite_grain_um=1e6 * value.scales.ferrite_grain,
        pearlite_spacing_um=1e6 * value.scales.pearlite_spacing,
        cementite_film_um=_film_um(value),
        cementite_network=value.scales.network,
        impact_transition_degC=value.scales.impact_transition - ZERO_DEGC,
        soaked=soak_fields(value.soaked),
    )


def here(values: Array, at: Place) -> float:
    """A field at a place."""
    used = at.share != 0.0  # a neighbour that does not count may have no value
    return float((values[at.node[used]] * at.share[used]).sum())


def position(
    name: str,
    left: Remains,
    value: Worth,
    at: Place,
    *,
    time_error_hv: float,
    grid_error_hv: float,
) -> Position:
    """What is known of one place."""

    def read(values: Array) -> float:
        return here(values, at)

    hv, sizes, soaked = read(value.hardness_hv), value.scales, value.soaked
    film = read(_film_um(value))
    return Position(
        name=name,
        depth_mm=at.depth * 1e3,
        coordinates_mm=tuple(each * 1e3 for each in at.coordinates),
        hardness_hv=hv,
        hardness_hrc=_known(float(conversion.hv_to_hrc(np.array(hv)))),
        hardness_hb=_known(float(conversion.hv_to_hb(np.array(hv)))),
        hardness_as_quenched_hv=read(value.as_quenched_hv),
        tensile_mpa=_known(float(conversion.hv_to_uts(np.array(hv)))),
        yield_mpa=_known(read(value.yield_mpa)),
        phases={phase: read(value.phases[k]) for k, phase in enumerate(PHASE_NAMES)},
        time_800_500_s=_known(read(left.time_800_500)),
        rate_700_K_per_s=_known(read(left.rate_700)),
        austenite_carbon_pct=read(left.carbon_austenite_pct),
        ferrite_grain_um=_known(1e6 * read(sizes.ferrite_grain)),
        pearlite_spacing_um=_known(1e6 * read(sizes.pearlite_spacing)),
        cementite_film_um=_known(film),
        cementite_network=(
            network.NAMES[int(network.network(np.array(1e-6 * film)))] if film == film else None
        ),
        impact_transition_degC=_known(read(sizes.impact_transition) - ZERO_DEGC),
        soak_degC=read(soaked.hottest) - ZERO_DEGC,
        carbon_in_solution_pct=read(soaked.carbon_pct),
        undissolved_ferrite=read(soaked.ferrite),
        undissolved_cementite=read(soaked.cementite),
        austenite_grain_astm=_known(read(soaked.grain_astm)),
        austenite_grain_um=_known(1e6 * read(soaked.grain_mean_intercept)),
        hardness_time_error_hv=time_error_hv,
        hardness_grid_error_hv=grid_error_hv,
    )


def critical_degC(case: Asked, left: Austenite) -> Mapping[str, float]:
    """The critical temperatures of the steel and of its austenite [degC]."""
    eq = equilibrium.equilibrium(case.steel.steel.composition)
    rich = np.isfinite(eq.acm) and eq.acm > eq.ae1
    chosen = case.steel.kinetics
    start = ratesets.martensite_start(chosen, left)
    return {
        "Acm" if rich else "Ae3": (eq.acm if rich else eq.ae3) - ZERO_DEGC,
        "Ae1": eq.ae1 - ZERO_DEGC,
        "Bs": ratesets.bainite_start(chosen, left.composition) - ZERO_DEGC,
        "Ms": start + (case.steel.shifts.martensite_start - ZERO_DEGC),
    }


def _film_um(value: Worth) -> Array:
    film = 1e6 * value.scales.cementite_film
    return film if value.scales.hypereutectoid else np.full_like(film, np.nan)


def _known(value: float) -> float | None:
    return value if np.isfinite(value) else None
