"""The rates where their regression ends: rich carbon, manganese, warm pearlite.

Model
-----
The exponentials of Li et al. grow without end, eight times in time from 0.4 to 0.6 % C for
bainite, where hardenability saturates. Grossmann's ideal diameter ``D`` says how the
time that austenite lasts depends on composition: an ideal quench cools two rounds alike
when their times are as ``D^2``. So above ``CARBON_PCT``, where the carbon factor of ASTM
A255 leaves its straight line, all three products take their carbon from the square of
that factor; and pearlite takes its manganese from the square of the manganese factor, on
both sides of ``MANGANESE_PCT``, the aim of most carbon steels, where both agree by choice.

Pearlite near A1: with Li's cube of the undercooling the pearlite of carbon steel takes
twice as long at 650 degC as at its nose, in the I-T diagram of 1080 seven times as long.
The rate is divided by what it exceeds the diagram by, both taken as one at
``NOSE_UNDERCOOLING``. Chromium, nickel and molybdenum raise the nose instead: the
correction fades out, as a power, up to the sum of the limits between carbon and alloy
steel.

The same diagram has ten times the time of 1 % at 99 % of pearlite, Li's shape of the clock
19 times: pearlite takes the power 0.55 (`thermo.clocks`), which makes it ten, and keeps
Li's time of half.

Manganese that sulphur binds as MnS hardens nothing: `soluble_manganese`.

Source
------
Factors: ASTM A255 (remembered). Time and diameter: Grossmann's ideal quench, in which all
times go with the square of the diameter (derived). I-T diagram of 1080: U.S. Steel, times
of 1 and 99 % (remembered; the time of half is their geometric mean). Limits of carbon
steel: EN 10020, 0.30 Cr, 0.30 Ni, 0.08 % Mo (remembered). MnS: atomic weights. What
ordinary steel holds of sulphur: estimate.

Holds for
---------
0.39 to 0.90 % C, the carbon factor being held above; to 1.95 % Mn, beyond which Li's
exponential goes on. Diagram: 52 to 162 K below Ae1, its ratio going on straight in the
logarithm nearer to Ae1.
"""

import math

import numpy as np

from midradius.thermo import clocks
from midradius.thermo.arrays import Array
from midradius.thermo.hardenability import carbon_factor, manganese_factor
from midradius.thermo.source import Source
from midradius.thermo.steel import Composition

SOURCES = (
    Source("carbon and manganese in the rates", "ASTM A255", "square of the factors", "remembered"),
    Source(
        "pearlite near A1", "I-T diagrams, U.S. Steel, 1080", "times of 1 and 99 %", "remembered"
    ),
)

CARBON_PCT, MOST_CARBON_PCT = 0.39, 0.90
MANGANESE_PCT, MOST_MANGANESE_PCT = 0.75, 1.95
MANGANESE_PER_SULPHUR = 54.938 / 32.06
ORDINARY_SULPHUR_PCT = 0.03  # what the steels of the regressions hold anyway (estimate)
ALLOY_PCT = 0.30 + 0.30 + 0.08
# Undercooling below Ae1 [K]; begin and end of pearlite in 1080 [s].
DIAGRAM = (
    (52.0, 15.0, 250.0),
    (77.0, 5.5, 50.0),
    (107.0, 2.2, 20.0),
    (132.0, 1.3, 11.0),
    (162.0, 0.8, 7.5),
)
PEARLITE_SHAPE = clocks.Shape(0.55)
NOSE_UNDERCOOLING = DIAGRAM[-1][0]
AE1_1080 = 1000.15  # K


def carbon_exponent(coefficient: float, carbon_pct: float) -> float:
    """Logarithm of the time that carbon [mass %] adds; ``coefficient`` [1/mass %] is Li's."""
    if carbon_pct <= CARBON_PCT:
        return coefficient * carbon_pct
    rich = carbon_factor(min(carbon_pct, MOST_CARBON_PCT)) / carbon_factor(CARBON_PCT)
    return coefficient * CARBON_PCT + 2.0 * math.log(rich)


def manganese_exponent(coefficient: float, manganese_pct: float) -> float:
    """Logarithm of the time that manganese [mass %] adds to pearlite."""
    known = min(manganese_pct, MOST_MANGANESE_PCT)
    factor = manganese_factor(known) / manganese_factor(MANGANESE_PCT)
    beyond = coefficient * (manganese_pct - known)
    return coefficient * MANGANESE_PCT + 2.0 * math.log(factor) + beyond


def pearlite_share(
    undercooling: Array, composition: Composition, *, power: int, activation: float
) -> Array:
    """What is left of a pearlite rate [-], the shape of ``undercooling``.

    Parameters
    ----------
    undercooling
        Below Ae1 [K]; at and above Ae1 the share means nothing.
    composition
        The steel [mass %].
    power, activation
        Of the rate ``undercooling^power exp(-activation / T)``, ``activation`` in K.
    """
    known = np.array(DIAGRAM)
    temp = AE1_1080 - known[:, 0]
    rate = known[:, 0] ** power * np.exp(-activation / temp)
    excess = np.log(rate * np.sqrt(known[:, 1] * known[:, 2]))
    excess -= excess[-1]
    slope = (excess[1] - excess[0]) / (known[1, 0] - known[0, 0])
    near = excess[0] + slope * (np.minimum(undercooling, known[0, 0]) - known[0, 0])
    read = np.interp(undercooling, known[:, 0], excess)
    whole = np.where(undercooling < known[0, 0], near, read)
    alloy = composition.Cr + composition.Ni + composition.Mo
    return np.asarray(np.exp(-max(0.0, 1.0 - alloy / ALLOY_PCT) * whole))


def pearlite_pace() -> float:
    """Factor on a pearlite rate of Li that keeps its time of half on `PEARLITE_SHAPE`."""
    half = np.array([0.5])
    ours = clocks.integral(half, PEARLITE_SHAPE)[0]
    return float(ours / clocks.integral(half, clocks.LI)[0])


def soluble_manganese(composition: Composition) -> float:
    """Manganese [mass %] that sulphur above the ordinary content leaves in solution."""
    bound = MANGANESE_PER_SULPHUR * max(composition.S - ORDINARY_SULPHUR_PCT, 0.0)
    return max(composition.Mn - bound, 0.0)
