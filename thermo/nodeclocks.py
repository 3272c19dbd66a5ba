"""How much faster or slower each node's clocks run than those of its kind.

Model
-----
A node takes the tables of the nearest of a few austenites (`Soaked.kinds`). What still
differs is a factor on its clocks: the ratio of the rates of its own carbon in solution
and grain to those of the kind, at the temperature where the kind is quickest. Grain
enters all published sets as ``2^(a G)``: that part is exact at every temperature. The
carbon enters as a factor and through the equilibrium temperatures: the factor is exact,
their shift from one kind to the next is not followed (2 to 3 K where carbon is spread
over 0.3 %). A rate that was measured is the same for every node.

Source
------
The rates of the chosen set; nothing is added to them.

Holds for
---------
Sections whose austenites lie on the line from the coldest to the hottest soak.
"""

from dataclasses import replace

import numpy as np

from midradius.thermo import assemble
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.austenite import Austenite, intercept_of
from midradius.thermo.calibration import Shifts
from midradius.thermo.kinetics import Tables
from midradius.thermo.ratechoice import Kinetics
from midradius.thermo.soaked import BETWEEN, Soaked

_RATES = (kin.RATE_FERRITE, kin.RATE_PEARLITE, kin.RATE_BAINITE, kin.RATE_CEMENTITE)
_LIMITS = {0: kin.LIMIT_FERRITE, 3: kin.LIMIT_CEMENTITE}


def clock_factors(soaked: Soaked, tables: Tables, shifts: Shifts, chosen: Kinetics) -> Array:
    """Factors on the clocks of every node, (n_node, N_SCALE).

    Parameters
    ----------
    soaked
        What the soak left.
    tables
        Those of its kinds, stacked.
    shifts, chosen
        What the tables were made with.
    """
    factors = np.ones((len(soaked.kind), kin.N_SCALE))
    there = soaked.austenitised
    own = np.array([kind.grain_astm for kind in soaked.kinds])[soaked.kind]
    finer = np.where(there, soaked.grain_astm - own, 0.0)
    if len(soaked.kinds) == 1 and not finer.any():
        return factors
    temp: Array = tables.first + tables.step * np.arange(float(tables.value.shape[1]))
    fine = np.array([_rates(temp, each, shifts, chosen) for each in soaked.fine])
    carbons = np.array([each.carbon_pct for each in soaked.fine])
    order = np.argsort(carbons)
    first = soaked.kinds[0]
    doubled = _rates(temp, _finer(first), shifts, chosen)
    for k in range(len(soaked.kinds)):
        nodes = there & (soaked.kind == k)
        for column in range(kin.N_SCALE):
            speed = fine[BETWEEN * k][:, column]
            limit = tables.value[k][:, _LIMITS[column]] if column in _LIMITS else 1.0
            forms = speed * limit
            at = int(np.argmax(forms if forms.max() > 0.0 else speed))
            here = fine[:, at, column]
            if not here.min() > 0.0:
                continue
            by_carbon = np.interp(soaked.carbon_pct[nodes], carbons[order], np.log(here[order]))
            exponent = np.log2(doubled[at, column] / fine[0, at, column])
            factors[nodes, column] = np.exp(by_carbon - np.log(here[BETWEEN * k])) * 2.0 ** (
                exponent * finer[nodes]
            )
    return factors


def _rates(temp: Array, austenite: Austenite, shifts: Shifts, chosen: Kinetics) -> Array:
    """Rates of the four products, (n_temp, 4)."""
    value = np.zeros((len(temp), kin.N_COLUMN))
    assemble.put_rates(value, temp, austenite, shifts, chosen)
    return np.asarray(value[:, _RATES])


def _finer(austenite: Austenite) -> Austenite:
    """The same austenite one grain number finer."""
    number = austenite.grain_astm + 1.0
    return replace(austenite, grain_astm=number, grain_mean_intercept=intercept_of(number))
