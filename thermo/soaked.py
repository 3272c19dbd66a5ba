"""The austenite of every node after a soak that was not the same everywhere.

Model
-----
Each node has a temperature path of its own. The growth law ``l = A exp(-Q/RT)
t^n`` is additive in ``l^(1/n)``, so a path is worth the time ``t_e`` at its end
temperature that gives the same grain: ``t_e = int exp(-(Q/nR)(1/T - 1/T_end)) dt``
over the time above Ae1. Carbon in solution, undissolved ferrite and cementite are
those of :mod:`austenite` at the node's end temperature. A node that never passed
Ae1 is **not austenitised**: it keeps ferrite and pearlite of slow cooling, has no
austenite grain and cannot harden.

Source
------
Growth and dissolution: :mod:`austenite`. Additivity of a law that is one function
of an integral over the path: Scheil 1935, Cahn 1956 (remembered).

Holds for
---------
As :mod:`austenite`; a part heated once, and slowly: undissolved ferrite and carbide
follow the end temperature without delay, though minutes at it would be needed. The
structure of a node that is not austenitised is assumed, not computed
(``OLD_GRAIN_ASTM``, ``OLD_RATE``, ``OLD_PEARLITE_BELOW``: that of a normalised
forging, an estimate); what the soak softens in it is left out.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array, BoolArray, IntArray
from midradius.thermo.austenite import (
    GAS_CONSTANT,
    GROWTH_POWER,
    REGIMES,
    Austenite,
    astm_of,
    dissolution,
    dissolution_notes,
    grown_intercept,
    growth_activation,
    growth_notes,
    intercept_of,
    soak,
)
from midradius.thermo.equilibrium import Equilibrium, equilibrium, slow_cooling
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Steel

SOURCES = (
    Source("soak of each node", "Scheil 1935, Cahn 1956", "additivity", "remembered"),
    Source("structure where nothing was austenitised", "thermo.soaked", "assumed", "estimate"),
)

ZERO_DEGC = 273.15
BETWEEN = 4  # steps from one kind to the next
MOST_KINDS = 12  # austenites that one section is given; nodes take the nearest in carbon
KIND_SPACING = 5.0  # K: kinds lie on this lattice, so that grids of one part share them
ALIKE_PCT = 1e-3  # carbon in solution that differs by less makes one kind
KIND_GRAIN_ASTM = 7.0  # of the kinds; each node's own grain is a factor on its clocks
KIND_TIME = 3600.0  # s, of the kinds' soak, which decides nothing beside a given grain
SHORTEST = 1e-3  # s, of a node that has only just passed Ae1

OLD_GRAIN_ASTM = 7.0
OLD_RATE = 0.1  # K/s at 700 degC, still air about a forging of some 200 mm
OLD_PEARLITE_BELOW = 60.0  # K below Ae1 at which its pearlite formed


@dataclass(frozen=True)
class Soaked:
    """What the soak left at every node, (n_node,) each; see `Austenite` for the words.

    ``hottest`` [K] is the highest temperature reached, ``time`` [s] what the path was
    worth at its end temperature. ``regime`` is a place in `REGIMES`, -1 where the node
    was not austenitised: there ``grain_mean_intercept`` and ``grain_astm`` are nan and
    ``pearlite`` is what it keeps. ``kind`` counts in ``kinds``; ``fine`` are the
    ``kinds`` and more between them, in the same order.
    """

    hottest: Array
    time: Array
    carbon_pct: Array
    ferrite: Array
    cementite: Array
    pearlite: Array
    regime: IntArray
    grain_mean_intercept: Array
    grain_astm: Array
    kind: IntArray
    kinds: tuple[Austenite, ...]
    fine: tuple[Austenite, ...]
    notes: tuple[RangeNote, ...] = ()

    @property
    def austenitised(self) -> BoolArray:
        """Whether each node became austenite at all."""
        return self.regime >= 0

    @property
    def old_intercept(self) -> Array:
        """``grain_mean_intercept`` [m], the assumed one where there was no austenite."""
        return np.where(self.austenitised, self.grain_mean_intercept, intercept_of(OLD_GRAIN_ASTM))


def alike(austenite: Austenite, temp: float, time: float, n_node: int) -> Soaked:
    """A section that was at ``temp`` [K] throughout for ``time`` [s]."""

    def all_of(value: float) -> Array:
        return np.full(n_node, value)

    return Soaked(
        hottest=all_of(temp),
        time=all_of(time),
        carbon_pct=all_of(austenite.carbon_pct),
        ferrite=all_of(austenite.ferrite),
        cementite=all_of(austenite.cementite),
        pearlite=all_of(0.0),
        regime=np.full(n_node, REGIMES.index(austenite.regime)),
        grain_mean_intercept=all_of(austenite.grain_mean_intercept),
        grain_astm=all_of(austenite.grain_astm),
        kind=np.zeros(n_node, dtype=np.int64),
        kinds=(austenite,),
        fine=(austenite,),
        notes=austenite.notes,
    )


class Paths:
    """The temperature paths of all nodes, followed step by step; it has a life, hence a class.

    Parameters
    ----------
    steel
        The steel.
    temp
        Temperatures when heating starts [K], (n_node,).
    """

    def __init__(self, steel: Steel, temp: Array) -> None:
        self._steel = steel
        self._eq = equilibrium(steel.composition)
        self._slope = growth_activation(steel.composition) / (GROWTH_POWER * GAS_CONSTANT)
        self._time = 0.0
        self._last = np.array(temp, dtype=np.float64)
        self._grown = np.zeros(len(self._last))
        self.hottest = self._last.copy()

    def follow(self, time: float, temp: Array) -> None:
        """The next point of the paths: ``time`` [s] and ``temp`` (n_node,) [K]."""
        middle = 0.5 * (self._last + temp)
        rates = [self._rate(at) for at in (self._last, middle, temp)]
        span = time - self._time
        self._grown += span * (rates[0] + 4.0 * rates[1] + rates[2]) / 6.0
        self._time = time
        self._last = np.array(temp, dtype=np.float64)
        self.hottest = np.maximum(self.hottest, temp)

    def _rate(self, temp: Array) -> Array:
        # against the rate at Ae1, so that the numbers stay near one
        above = np.exp(self._slope * (1.0 / self._eq.ae1 - 1.0 / temp))
        return np.where(temp > self._eq.ae1, above, 0.0)

    def end(self, grain_astm: float | None = None) -> Soaked:
        """What the paths have left; ``grain_astm`` is a measured grain of the whole section."""
        eq, composition = self._eq, self._steel.composition
        reached = self.hottest > eq.ae1
        temp = np.maximum(self._last, eq.ae1 + 1e-6)
        back = np.exp(self._slope * (1.0 / temp - 1.0 / eq.ae1))
        time = np.maximum(self._grown * back, SHORTEST)
        left = dissolution(eq, temp)
        if grain_astm is None:
            unit = np.array([grown_intercept(composition, at, 1.0) for at in temp])
            intercept = unit * time**GROWTH_POWER
            number = np.array([astm_of(length) for length in intercept])
        else:
            intercept = np.full(temp.shape, intercept_of(grain_astm))
            number = np.full(temp.shape, grain_astm)
        old_ferrite, old_cementite = slow_cooling(eq, composition.C)
        carbon = np.where(reached, left.carbon_pct, composition.C)
        fine = _kinds(self._steel, eq, temp[reached], left.carbon_pct[reached])
        kinds = fine[::BETWEEN]
        of_kind = np.array([kind.carbon_pct for kind in kinds])
        return Soaked(
            hottest=self.hottest.copy(),
            time=np.where(reached, time, 0.0),
            carbon_pct=carbon,
            ferrite=np.where(reached, left.ferrite, old_ferrite),
            cementite=np.where(reached, left.cementite, old_cementite),
            pearlite=np.where(reached, 0.0, 1.0 - old_ferrite - old_cementite),
            regime=np.where(reached, left.regime, -1),
            grain_mean_intercept=np.where(reached, intercept, np.nan),
            grain_astm=np.where(reached, number, np.nan),
            kind=np.abs(carbon[:, None] - of_kind).argmin(axis=1),
            kinds=kinds,
            fine=fine,
            notes=_notes(eq, temp, time, reached, measured=grain_astm is not None),
        )


def _kinds(steel: Steel, eq: Equilibrium, temp: Array, carbon: Array) -> tuple[Austenite, ...]:
    """The austenites that nodes at ``temp`` [K] with ``carbon`` [mass %] are sorted into."""

    def kind(at: float) -> Austenite:
        return soak(steel, at, KIND_TIME, KIND_GRAIN_ASTM)

    if not temp.size:
        return (kind(eq.ae1 + KIND_SPACING),)
    if np.ptp(carbon) < ALIKE_PCT:
        return (kind(float(temp.mean())),)
    low = np.floor(temp.min() / KIND_SPACING) * KIND_SPACING
    high = np.ceil(temp.max() / KIND_SPACING) * KIND_SPACING
    # Above the last change of the carbon in solution one kind does for all.
    fine = np.linspace(max(low, eq.ae1 + 1e-3), high, 400)
    of_fine = dissolution(eq, fine).carbon_pct
    changing = np.flatnonzero(np.abs(of_fine - of_fine[-1]) > 1e-9)
    last = min(int(changing[-1]) + 1, len(fine) - 1) if changing.size else 0
    wanted = np.linspace(of_fine[0], of_fine[last], BETWEEN * (MOST_KINDS - 1) + 1)
    rising = of_fine[-1] > of_fine[0]
    part = slice(None, last + 1) if rising else slice(last, None, -1)
    at = np.interp(wanted, of_fine[part], fine[part])
    return tuple(kind(float(each)) for each in at)


def _notes(
    eq: Equilibrium, temp: Array, time: Array, reached: BoolArray, *, measured: bool
) -> tuple[RangeNote, ...]:
    notes: list[RangeNote] = []
    if reached.any():
        for pick in (np.argmin, np.argmax):
            node = np.flatnonzero(reached)[int(pick(temp[reached]))]
            notes += dissolution_notes(eq, float(temp[node]), float(time[node]))
            notes += [] if measured else growth_notes(float(temp[node]))
        notes = _as_spans(notes)
    cold = int(np.count_nonzero(~reached))
    if cold:
        value = f"not passed at {cold} of {reached.size} nodes: not austenitised"
        allowed = f"above Ae1, {eq.ae1 - ZERO_DEGC:.0f} degC, everywhere"
        notes.append(RangeNote("austenite after the soak", "temperature", value, allowed))
    return tuple(dict.fromkeys(notes))


def _as_spans(notes: list[RangeNote]) -> list[RangeNote]:
    """One note in place of two that differ in the value alone: from the coldest to the hottest."""
    by_rest: dict[tuple[str, str, str], list[str]] = {}
    for note in dict.fromkeys(notes):
        by_rest.setdefault((note.model, note.quantity, note.allowed), []).append(note.value)
    spans = []
    for (model, quantity, allowed), values in by_rest.items():
        low, high = values[0], values[-1]
        unit = f" {high.partition(' ')[2]}"
        text = high if low == high else f"{low.removesuffix(unit)} to {high}"
        spans.append(RangeNote(model, quantity, text, allowed))
    return spans


def initial_states(soaked: Soaked, temp: Array, ae1: float) -> Array:
    """States (n_node, N_STATE) when cooling starts at ``temp`` (n_node,) [K]."""
    state = np.zeros((len(temp), kin.N_STATE))
    state[:, kin.FERRITE] = soaked.ferrite
    state[:, kin.CEMENTITE] = soaked.cementite
    state[:, kin.PEARLITE] = soaked.pearlite
    left = 1.0 - soaked.ferrite - soaked.cementite - soaked.pearlite
    state[:, kin.CARBON_AUSTENITE] = np.where(soaked.austenitised, left * soaked.carbon_pct, 0.0)
    state[:, kin.PEARLITE_HEAT] = soaked.pearlite * (ae1 - OLD_PEARLITE_BELOW)
    state[:, kin.COLDEST] = temp
    state[:, kin.KIND] = soaked.kind
    return state
