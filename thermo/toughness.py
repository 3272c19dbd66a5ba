"""Impact transition of ferrite with little pearlite.

Model
-----
``ITT = -19 + 44 Si + 700 sqrt(N) + 2.2 P - 11.5 d^-1/2`` [degC], the temperature at which
a notched bar takes 27 J: silicon and free nitrogen in mass percent, pearlite ``P`` in
percent, ferrite grain ``d`` in mm. Nitrogen that the analysis does not give is 0.005 %.

Source
------
Pickering, Physical Metallurgy and the Design of Steels (1978) (remembered). The relation
for all shares of pearlite (Gladman & Pickering) needs the size of the pearlite colonies,
which nothing here computes: it is not used.

Holds for
---------
Carbon-manganese steel of ferrite and up to 20 % pearlite, 95 % of the structure at least;
everywhere else nan. Nothing of tempered martensite or bainite, of thick sections' own
triaxiality, inclusions or precipitates. An indication, no acceptance value: what a part
must take is tested.
"""

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.phases import FERRITE, PEARLITE
from midradius.thermo.source import Source
from midradius.thermo.steel import Composition
from midradius.thermo.strength import NITROGEN_PCT

SOURCE = Source(
    "impact transition of ferrite with pearlite",
    "Pickering, Physical Metallurgy and the Design of Steels (1978)",
    "27 J, below 20 % pearlite",
    "remembered",
)
ZERO_DEGC = 273.15
MOST_PEARLITE, LEAST_OF_BOTH = 0.20, 0.95
MOST_CARBON_PCT = 0.20  # of a steel that 20 % pearlite could hold
# Alloy beyond which a steel is no longer carbon-manganese, mass % [EN 10020, remembered]
ALLOY_PCT = {"Cr": 0.30, "Ni": 0.30, "Mo": 0.08, "V": 0.10, "Cu": 0.40, "Si": 0.60, "Mn": 1.65}


def applies(composition: Composition) -> bool:
    """Whether the relation can hold for some structure of a steel."""
    amounts = composition.as_dict()
    plain = all(amounts[name] < limit for name, limit in ALLOY_PCT.items())
    return plain and composition.C <= MOST_CARBON_PCT


def impact_transition(fractions: Array, composition: Composition, *, grain: Array) -> Array:
    """Temperature [K] of 27 J, (n_node,); nan outside the range of the relation.

    Parameters
    ----------
    fractions
        Mass fractions in phase order, (n_phase, n_node).
    composition
        The steel [mass %].
    grain
        Ferrite grain diameter [m], (n_node,).
    """
    pearlite, both = fractions[PEARLITE], fractions[FERRITE] + fractions[PEARLITE]
    inside = (both >= LEAST_OF_BOTH) & (pearlite <= MOST_PEARLITE) & (grain > 0.0)
    inside &= applies(composition)
    nitrogen = composition.N or NITROGEN_PCT
    root = np.where(inside, 1e3 * grain, 1.0) ** -0.5
    degc = (
        -19.0
        + 44.0 * composition.Si
        + 700.0 * np.sqrt(nitrogen)
        + 2.2 * 100.0 * pearlite
        - 11.5 * root
    )
    return np.where(inside, degc + ZERO_DEGC, np.nan)
