"""What an open bath loses through its surface: radiation, convection, evaporation.

Model
-----
Radiation to surroundings at the air's temperature; free convection of a hot plate
that faces up, ``q = 1.52 dT^(4/3)``. Water evaporates ``g = (25 + 19 v)(x_s - x)``
kg/(m2 h), x kg of water per kg of dry air, up to 60 degC; above, the heat that this
gives at 60 degC grows as the published losses of open tanks do. Oil and salt do not
evaporate. A lid stops all of it; walls lose nothing: the bath is judged on the hot side.

Source
------
Evaporation: Engineering ToolBox, evaporation from a water surface (read). Losses of
open tanks above 60 degC: Engineering ToolBox, still air of 15.6 degC (read).
Convection: McAdams 1954, plate facing up (remembered). Vapour pressure: Magnus formula
with the coefficients of Alduchov & Eskridge 1996 (remembered). Heat of evaporation:
IAPWS by CoolProp 8.0 (derived).

Holds for
---------
Still air of 0 to 40 degC above baths of 10 to 93 degC (water). Radiation and convection
are added to the evaporation of the formula: the sum is 5 to 14 % above the published
losses of open tanks. Draught over the surface, and spray of a pump, lose more.
"""

import numpy as np

from midradius.fem.fluids import Fluid
from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

SOURCES = (
    Source("evaporation of open water", "Engineering ToolBox", "(25 + 19 v) A (xs - x)", "read"),
    Source("losses of open water tanks", "Engineering ToolBox", "still air 15.6 degC", "read"),
    Source("convection of a bath surface", "McAdams 1954", "hot plate facing up", "remembered"),
    Source("vapour pressure of water", "Alduchov & Eskridge 1996", "Magnus form", "remembered"),
    Source("heat of evaporation", "IAPWS formulation, by CoolProp 8.0", "saturation", "derived"),
)

ZERO_DEGC = 273.15
STEFAN_BOLTZMANN = 5.670374419e-8
EMISSIVITY_OIL, EMISSIVITY_WATER = 0.9, 0.95
CONVECTION = 1.52  # W/(m2 K^(4/3))
AIR_PRESSURE = 101_325.0
HUMIDITY = 0.5  # of the air above the bath [estimate]
STILL = 0.0  # m/s
EVAPORATION_TO = 60.0 + ZERO_DEGC
_TABLE_DEGC = np.array([43.3, 48.9, 60.0, 71.1, 82.2, 93.3])
_TABLE = np.array([1041.0, 1483.0, 2587.0, 4133.0, 6309.0, 9464.0])  # W/m2
_HFG_DEGC = np.array([0.0, 20.0, 40.0, 60.0, 80.0, 100.0])
_HFG = np.array([2500.9, 2453.5, 2406.0, 2357.7, 2308.0, 2256.5]) * 1e3


def vapour_pressure(temp: Array | float) -> Array:
    """Saturation pressure of water [Pa] at ``temp`` [K]."""
    celsius = np.asarray(temp, dtype=np.float64) - ZERO_DEGC
    return np.asarray(610.94 * np.exp(17.625 * celsius / (celsius + 243.04)))


def evaporation(
    temp: Array | float, *, air: float, humidity: float = HUMIDITY, speed: float = STILL
) -> Array:
    """Water lost per area [kg/(m2 s)] by the published formula, bath ``temp`` [K], air [K]."""

    def content(pressure: Array) -> Array:
        return 0.622 * pressure / (AIR_PRESSURE - pressure)

    wet = content(np.minimum(vapour_pressure(temp), 0.9 * AIR_PRESSURE))
    dry = content(humidity * vapour_pressure(air))
    return np.asarray((25.0 + 19.0 * speed) * np.maximum(wet - dry, 0.0) / 3600.0)


def heat_of_evaporation(temp: Array | float) -> Array:
    """Heat of evaporation of water [J/kg] at ``temp`` [K]."""
    celsius = np.asarray(temp, dtype=np.float64) - ZERO_DEGC
    return np.asarray(np.interp(celsius, _HFG_DEGC, _HFG))


def dry_loss(temp: Array | float, *, air: float, emissivity: float) -> Array:
    """Radiation with convection [W/m2] from ``temp`` [K] to ``air`` [K]; negative if colder."""
    temp = np.asarray(temp, dtype=np.float64)
    hotter = temp - air
    convection = CONVECTION * np.sign(hotter) * np.abs(hotter) ** (4.0 / 3.0)
    return np.asarray(emissivity * STEFAN_BOLTZMANN * (temp**4 - air**4) + convection)


def surface_loss(fluid: Fluid, temp: Array | float, *, air: float) -> tuple[Array, Array]:
    """Heat [W/m2] and water [kg/(m2 s)] that an open surface at ``temp`` [K] gives off."""
    temp = np.asarray(temp, dtype=np.float64)
    emissivity = EMISSIVITY_WATER if fluid.aqueous else EMISSIVITY_OIL
    dry = dry_loss(temp, air=air, emissivity=emissivity)
    if not fluid.aqueous:
        return dry, np.zeros_like(dry)
    low = np.minimum(temp, EVAPORATION_TO)
    wet = evaporation(low, air=air) * heat_of_evaporation(low)
    celsius = np.minimum(temp - ZERO_DEGC, _TABLE_DEGC[-1])
    table = np.exp(np.interp(celsius, _TABLE_DEGC, np.log(_TABLE)))
    hot = temp > EVAPORATION_TO
    at_60 = evaporation(EVAPORATION_TO, air=air) * heat_of_evaporation(EVAPORATION_TO)
    wet = np.where(hot, at_60 * table / _TABLE[2], wet)
    return dry + wet, wet / heat_of_evaporation(temp)
