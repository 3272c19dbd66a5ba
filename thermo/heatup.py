"""A steel that is heated up: its heat content and conductivity on the way to austenite.

Model
-----
Below Ae1 ferrite and cementite. The pearlite turns into austenite evenly over
``PEARLITE_SPAN`` from Ae1 on; above that the lever rule shares the steel between
austenite and what is left of ferrite or cementite. Every temperature has one
enthalpy, so the heat of transformation is taken up between Ae1 and Ae3 (Acm) and
nowhere else; conductivity is the mean by mass.

Source
------
Amounts: :mod:`equilibrium` (derived). Enthalpies and conductivities:
:mod:`properties`. ``PEARLITE_SPAN``: Ac1 by Andrews 1965 lies 5 to 20 K above Ae1
(estimate).

Holds for
---------
The slow heating of a furnace, where a steel stays near equilibrium. Heated at
some kelvin a second (salt bath at the surface, induction) it transforms hotter by
tens of kelvin, and carbides dissolve late.
"""

import numpy as np

from midradius.thermo import assemble, properties
from midradius.thermo.arrays import Array
from midradius.thermo.equilibrium import (
    CEMENTITE_CARBON_PCT,
    Equilibrium,
    equilibrium,
    lever_cementite,
    lever_ferrite,
)
from midradius.thermo.kinetics import Tables
from midradius.thermo.source import Source
from midradius.thermo.steel import Composition

SOURCE = Source(
    "heat taken up on heating",
    "thermo.heatup",
    "equilibrium amounts, pearlite over 10 K",
    "derived",
)

PEARLITE_SPAN = 10.0  # K from Ae1 on, over which pearlite turns into austenite


def austenite_share(eq: Equilibrium, temp: Array) -> tuple[Array, Array]:
    """Mass fraction of austenite [-] and the carbon it holds [mass % of the whole].

    ``temp`` [K], shape (n,), as in slow heating; both have its shape.
    """
    carbon = eq.composition.C
    whole = eq.ae1 + PEARLITE_SPAN
    reached = np.maximum(temp, whole)
    ferrite, cementite = np.zeros(temp.shape), np.zeros(temp.shape)
    if carbon <= eq.eutectoid_carbon_pct:
        ferrite = np.where(reached < eq.ae3, lever_ferrite(eq, carbon, reached), 0.0)
    else:
        cementite = np.where(reached < eq.acm, lever_cementite(eq, carbon, reached), 0.0)
    solved = np.minimum(eq.ferrite_solubility(reached), carbon)
    share = 1.0 - ferrite - cementite
    held = carbon - ferrite * solved - cementite * CEMENTITE_CARBON_PCT
    ramp = np.clip((temp - eq.ae1) / PEARLITE_SPAN, 0.0, 1.0)
    return ramp * share, ramp * held


def enthalpy(composition: Composition, temp: Array) -> Array:
    """Enthalpy on heating [J/kg] above that of ferrite and cementite at 20 degC; ``temp`` (n,)."""
    share, held = austenite_share(equilibrium(composition), temp)
    some = share > 0.0
    in_austenite = np.where(some, held / np.where(some, share, 1.0), composition.C)
    left = 1.0 - share
    in_rest = np.where(left > 0.0, (composition.C - held) / np.where(left > 0.0, left, 1.0), 0.0)
    return np.asarray(
        share * properties.enthalpy_austenite(temp, in_austenite)
        + left * properties.enthalpy_ferrite_cementite(temp, in_rest)
    )


def conductivity(composition: Composition, temp: Array) -> Array:
    """Conductivity on heating [W/(m K)], ``temp`` (n,) [K]."""
    share, _ = austenite_share(equilibrium(composition), temp)
    return np.asarray(
        share * properties.conductivity_austenite(temp)
        + (1.0 - share) * properties.conductivity_ferrite(temp)
    )


def heating_tables(composition: Composition) -> Tables:
    """A steel on heating as the heat solver reads it: a material that does not transform."""
    return assemble.inert_tables(
        lambda temp: conductivity(composition, temp),
        lambda temp: enthalpy(composition, temp),
        first=assemble.COLDEST_K,
        last=assemble.HOTTEST_K,
        step=assemble.GRID_K,
    )
