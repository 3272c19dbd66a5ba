"""A bath cooler as one number: heat per kelvin between the bath and what cools it.

Model
-----
``Q = K (T_bath - T_coolant_in)``, ``K = effectiveness x C_min``, the effectiveness of
the exchanger on its number of transfer units. A cooler given by its duty has
``K = duty / (bath limit - T_coolant_in)``.

Source
------
Effectiveness: the ``ht`` library (read), functions of Kays & London.

Holds for
---------
Constant flows and a constant overall coefficient: a cold thick oil passes less, and
fouling takes its part; size with the coefficient of the dirty state.
"""

from dataclasses import dataclass

from midradius.study.tankinput import CoolerInput
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

SOURCES = (Source("effectiveness of a heat exchanger", "ht library", "Kays & London", "read"),)

ZERO_DEGC = 273.15
COOLANT_CP = {"water": 4180.0, "air": 1006.0}  # J/(kg K)
COOLANT_IN = 25.0 + ZERO_DEGC  # taken where the case does not say, and told
# Single-pass crossflow by its published approximation for two unmixed sides.
_SUBTYPE = {"counterflow": "counterflow", "parallel": "parallel", "crossflow": "crossflow"}


@dataclass(frozen=True)
class Cooler:
    """Heat per kelvin [W/K], temperature of the coolant that enters [K], flow of the bath."""

    per_kelvin: float
    coolant_in: float
    bath_flow: float  # kg/s through the cooler; 0 where not known
    text: str


def effectiveness(
    conductance: float, hot_capacity: float, cold_capacity: float, arrangement: str
) -> float:
    """Effectiveness [-] of an exchanger of UA [W/K] between two capacity flows [W/K]."""
    from ht import effectiveness_from_NTU

    least, most = sorted((hot_capacity, cold_capacity))
    share = effectiveness_from_NTU(  # type: ignore[no-untyped-call]
        NTU=conductance / least, Cr=least / most, subtype=_SUBTYPE[arrangement]
    )
    return float(share)


def cooler_of(given: CoolerInput | None, *, bath_cp: float, bath_limit: float) -> Cooler | None:
    """The cooler of a tank whose fluid has ``bath_cp`` [J/(kg K)]; limit of the bath [K].

    Raises
    ------
    InputFault
        The coolant is not colder than the limit of the bath.
    """
    if given is None:
        return None
    coolant_in = COOLANT_IN if given.coolant_in is None else given.coolant_in
    if coolant_in >= bath_limit - 1.0:
        raise InputFault(
            "tank.cooler.coolant_in",
            f'"{coolant_in - ZERO_DEGC:.4g} degC"',
            f"colder than the limit of the bath, {bath_limit - ZERO_DEGC:.4g} degC",
            "What is as hot as the bath does not cool it.",
        )
    if given.power is not None:
        per_kelvin = given.power / (bath_limit - coolant_in)
        text = f"{given.power / 1e3:.4g} kW with the bath at {bath_limit - ZERO_DEGC:.4g} degC"
        return Cooler(per_kelvin, coolant_in, 0.0, text)
    assert given.conductance and given.bath_flow and given.coolant_flow, "the reader checked"
    hot = given.bath_flow * bath_cp
    cold = given.coolant_flow * COOLANT_CP[given.coolant]
    share = effectiveness(given.conductance, hot, cold, given.arrangement)
    text = (
        f"UA {given.conductance / 1e3:.4g} kW/K against {given.coolant}, {given.arrangement}, "
        f"effectiveness {share:.4f}"
    )
    return Cooler(share * min(hot, cold), coolant_in, given.bath_flow, text)
