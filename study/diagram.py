"""Transformation diagrams of a soaked steel, from the rates that every run uses.

Model
-----
One node of `thermo.kinetics`. Isothermal: dropped to a temperature in no time and held
there. Continuous cooling: at a constant rate, counted from the highest temperature at which
anything can form (Ae3, Acm, or the soak where that is lower). The start of a product is
1 % of the steel; its middle and end are 50 and 99 % of what it reaches there. A product that
stays below 2 %, or is still growing when the longest hold ends, has no end.

Source
------
Rates, limits and hardness are those of the main job and carry their sources.

Holds for
---------
The heat and the soak it is drawn for. Latent heat does not warm the node, so a section's
own curves may bend where those of constant rate do not. Isothermal lines end at Ms: below
it, the bainite that martensite speeds up is not known here.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from midradius.thermo import equilibrium, hardness, martensite, ratesets
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import fractions, initial_state, steel_tables
from midradius.thermo.austenite import Austenite, soak
from midradius.thermo.calibration import NONE, Shifts
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import Tables, advance_node
from midradius.thermo.phases import PHASE_NAMES
from midradius.thermo.ratechoice import DEFAULT, Kinetics
from midradius.thermo.source import RangeNote
from midradius.thermo.steel import Steel, range_notes
from midradius.thermo.walk import walk

ZERO_DEGC = 273.15
PRODUCTS = ("ferrite", "cementite", "pearlite", "bainite", "martensite")  # as the states hold them
DIFFUSIONAL = PRODUCTS[:4]
START, MIDDLE, END = 0.01, 0.50, 0.99
LEAST = 0.02  # of the steel that a product must reach to have a middle and an end
SHORTEST, LONGEST, PER_DECADE = 1e-3, 1e7, 40  # s; a time step of 6 %
HOLD_K, COOL_K = 2.5, 1.0  # between two holds; of one step of cooling
FASTEST_RATE, SLOWEST_RATE, RATES_PER_DECADE = 1e3, 1e-3, 16  # K/s
ROOM = 20.0 + ZERO_DEGC


@dataclass(frozen=True)
class Soaked:
    """A steel after its soak. ``critical`` [K] by name; ``top`` [K] is where clocks begin."""

    steel: Steel
    soak_temp: float
    soak_time: float
    austenite: Austenite
    tables: Tables
    critical: Mapping[str, float]
    top: float
    notes: tuple[RangeNote, ...]
    kinetics: Kinetics = DEFAULT


@dataclass(frozen=True)
class Isothermal:
    """Times [s] at each ``temp`` [K], rising, (n_temp,).

    ``times`` by product, (3, n_temp): start, middle, end. ``total`` (3, n_temp) is the
    same for everything that forms, against the austenite there was; ``reached`` (n_phase,
    n_temp) are the fractions after the longest hold. nan where there is none.
    """

    temp: Array
    times: Mapping[str, Array]
    total: Array
    reached: Array

    def nose(self, product: str) -> tuple[float, float]:
        """Temperature [K] and time [s] of the earliest start; nan without one."""
        begins = self.times[product][0]
        if not np.isfinite(begins).any():
            return float("nan"), float("nan")
        at = int(np.nanargmin(begins))
        return float(self.temp[at]), float(begins[at])


@dataclass(frozen=True)
class Cooling:
    """What each constant ``rate`` [K/s], falling, (n_rate,), leaves.

    ``temps`` [K] by product, (3, n_rate): start, middle, end. At 20 degC: ``phases``
    (n_phase, n_rate) and ``hardness_hv`` (n_rate,). ``critical`` [K/s] by name, nan where
    the rates drawn do not reach it.
    """

    rate: Array
    temps: Mapping[str, Array]
    phases: Array
    hardness_hv: Array
    critical: Mapping[str, float]


def soaked(
    steel: Steel,
    *,
    temp: float,
    time: float,
    grain_astm: float | None,
    shifts: Shifts = NONE,
    kinetics: Kinetics = DEFAULT,
) -> Soaked:
    """A steel ready for its diagrams; ``temp`` [K], ``time`` [s] and grain of its soak.

    ``shifts`` are those of a calibrated heat, ``kinetics`` the rates.

    Raises
    ------
    InputFault
        As :func:`midradius.thermo.austenite.soak`, or nothing can form.
    """
    left = soak(steel, temp, time, grain_astm)
    eq = equilibrium.equilibrium(steel.composition)
    rich = bool(np.isfinite(eq.acm) and eq.acm > eq.ae1)
    name, line = ("Acm", eq.acm) if rich else ("Ae3", eq.ae3)
    critical = {
        name: float(line),
        "Ae1": float(eq.ae1),
        "Bs": ratesets.bainite_start(kinetics, left.composition),
        "Ms": ratesets.martensite_start(kinetics, left) + shifts.martensite_start,
    }
    tables = steel_tables(steel, left, shifts, kinetics)
    top = min(temp, max(critical.values()))
    notes = [
        *range_notes(steel.composition),
        *equilibrium.range_notes(steel.composition),
        *left.notes,
        *ratesets.range_notes(kinetics, steel.composition, left.carbon_pct, left.grain_astm),
        *martensite.range_notes(left.composition),
    ]
    if not critical["Ms"] < top:
        raise InputFault("steel", steel.name, "a steel whose martensite starts below Ae3")
    return Soaked(
        steel, temp, time, left, tables, critical, top, tuple(dict.fromkeys(notes)), kinetics
    )


def isothermal(metal: Soaked) -> Isothermal:
    """The isothermal diagram."""
    count = int((metal.top - metal.critical["Ms"]) / HOLD_K)
    temp: Array = metal.top - HOLD_K * np.arange(count, 0, -1, dtype=np.float64)
    decades = np.log10(LONGEST / SHORTEST)
    time = np.geomspace(SHORTEST, LONGEST, int(PER_DECADE * decades) + 1)
    times = {name: np.full((3, count), np.nan) for name in DIFFUSIONAL}
    total = np.full((3, count), np.nan)
    reached = np.zeros((len(PHASE_NAMES), count))
    for i, hold in enumerate(temp):
        grown, state = held(metal, float(hold), time)
        for k, name in enumerate(DIFFUSIONAL):
            times[name][:, i] = _crossings(np.log(time), grown[:, k], settled=True)
        gone = grown.sum(axis=1) / austenite_before(metal)
        total[:, i] = np.exp(
            [crossing(np.log(time), gone, level) for level in (START, MIDDLE, END)]
        )
        reached[:, i] = fractions(state)[:, 0]
    return Isothermal(temp, {k: np.exp(v) for k, v in times.items()}, total, reached)


def cooling(metal: Soaked) -> Cooling:
    """The diagram of continuous cooling."""
    decades = np.log10(FASTEST_RATE / SLOWEST_RATE)
    rate = np.geomspace(FASTEST_RATE, SLOWEST_RATE, int(round(RATES_PER_DECADE * decades)) + 1)
    ends = [cooled(metal, float(one)) for one in rate]
    temps = {
        name: np.array([_cooling_crossings(temp, grown[:, k]) for temp, grown, _ in ends]).T
        for k, name in enumerate(PRODUCTS)
    }
    states = np.concatenate([state for *_, state in ends])
    phases = fractions(states)
    return Cooling(
        rate=rate,
        temps=temps,
        phases=phases,
        hardness_hv=hardness_of(metal, rate, states, phases),
        critical=_critical(rate, phases, metal),
    )


def _start(metal: Soaked) -> Array:
    return initial_state(metal.austenite, metal.steel.composition.C, metal.soak_temp, 1)


def austenite_before(metal: Soaked) -> float:
    return 1.0 - metal.austenite.ferrite - metal.austenite.cementite


def held(metal: Soaked, hold: float, time: Array) -> tuple[Array, Array]:
    """What each diffusional product has grown to at each time, (n_time, 4), and the state."""
    state = _start(metal)
    scale = np.ones(kin.N_SCALE)
    before = state[0, :4].copy()
    advance_node(state[0], metal.soak_temp, hold, 0.0, scale, metal.tables)
    grown = np.empty((len(time) + 1, 4))
    temps = np.full(len(grown), hold)
    walk(state[0], temps, np.diff(time, prepend=0.0), scale, metal.tables, grown)
    return grown[1:] - before, state


def cooled(metal: Soaked, rate: float) -> tuple[Array, Array, Array]:
    """Temperatures, what each product has grown to at them, (n_temp, 5), and the state."""
    temp = np.linspace(metal.top, ROOM, int((metal.top - ROOM) / COOL_K) + 1)
    state = _start(metal)
    scale = np.ones(kin.N_SCALE)
    before = state[0, :5].copy()
    advance_node(state[0], metal.soak_temp, metal.top, 0.0, scale, metal.tables)
    grown = np.empty((len(temp), 5))
    walk(state[0], temp, -np.diff(temp) / rate, scale, metal.tables, grown)
    return temp, grown - before, state


def _crossings(at: Array, grown: Array, *, settled: bool) -> list[float]:
    """Where a product starts, is half and is done; ``at`` rises."""
    last = float(grown[-1])
    found = [crossing(at, grown, START), np.nan, np.nan]
    still = settled and last - grown[-1 - PER_DECADE] > (1.0 - END) * last
    if last >= LEAST and not still:
        found[1:] = [crossing(at, grown, level * last) for level in (MIDDLE, END)]
    return found


def _cooling_crossings(temp: Array, grown: Array) -> list[float]:
    return [-value for value in _crossings(-temp, grown, settled=False)]


def crossing(at: Array, grown: Array, level: float) -> float:
    """Where ``grown`` first reaches ``level``, straight between two points; nan if never."""
    above = np.flatnonzero(grown >= level)
    if not above.size:
        return float("nan")
    i = int(above[0])
    if i == 0:
        return float(at[0])
    share = (level - grown[i - 1]) / (grown[i] - grown[i - 1])
    return float(at[i - 1] + share * (at[i] - at[i - 1]))


def hardness_of(metal: Soaked, rate: Array, states: Array, phases: Array) -> Array:
    carbon = metal.steel.composition.C
    hard, pearlite = states[:, kin.MARTENSITE], states[:, kin.PEARLITE]
    some, formed = hard > 1e-6, pearlite > 1e-6
    total, _ = hardness.vickers(
        phases,
        metal.steel.composition,
        carbon_austenite_pct=np.where(
            some,
            states[:, kin.CARBON_MARTENSITE] / np.where(some, hard, 1.0),
            metal.austenite.carbon_pct,
        ),
        carbon_initial_pct=carbon,
        rate_700=rate,
        pearlite_temp=np.where(
            formed, states[:, kin.PEARLITE_HEAT] / np.where(formed, pearlite, 1.0), np.nan
        ),
        ae1=metal.critical["Ae1"],
        grain_intercept=metal.austenite.grain_mean_intercept,
    )
    return total


def _critical(rate: Array, phases: Array, metal: Soaked) -> dict[str, float]:
    """Rates at which 1 % more or less decides, by name; ``rate`` falls."""
    named = dict(zip(PHASE_NAMES, phases, strict=True))
    log = np.log(rate)
    left = {"ferrite": metal.austenite.ferrite, "cementite": metal.austenite.cementite}
    own = {name: named[name] - left.get(name, 0.0) for name in DIFFUSIONAL}
    all_own = np.sum([*own.values()], axis=0)
    slow, from_slow = log[::-1], slice(None, None, -1)  # scanned from where there is none
    found = {"martensite only above": _appears(log, all_own)}
    found |= {f"{name} below": _appears(log, own[name]) for name in DIFFUSIONAL}
    found["no martensite below"] = _appears(slow, named["martensite"][from_slow])
    found["no bainite below"] = _appears(slow, own["bainite"][from_slow])
    return {name: float(np.exp(value)) for name, value in found.items()}


def _appears(log: Array, share: Array) -> float:
    """Where ``share`` first reaches 1 %; nan if it starts above, or never does."""
    return float("nan") if share[0] >= START else crossing(log, share, START)
