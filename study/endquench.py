"""The end-quench test of a steel by the solver of the main job, and what it says of sections.

Model
-----
The test piece as a case like any other: a round of 25.4 mm, 100 mm long, under the water
jet at its near end, in still air elsewhere. Beside its hardness stand two estimates that
share nothing with it but the composition.

A place of a section has the equivalent distance at which the test piece of the same steel
takes the same time from 800 to 500 degC.

Source
------
Geometry and practice: ISO 642, ASTM A255 (remembered): 30 min at heat, hardness on flats
0.4 mm deep. Of the side that the jet leaves dry the standards say nothing but that it must
not scale: emissivity 0.4 (0.35 to 0.5, an estimate). Seconds between furnace and jet are
left out. Regressions: `thermo.regressions`, `thermo.hardenability`.

Holds for
---------
Distances 1.5 to 80 mm; equivalent distances outside them are nan. The rates of the test
piece beyond 10 mm are 20 to 35 % above the printed chart of rates (`tests/published`), so
an equivalent distance is one within this model, not one of that chart.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from midradius.study.case import (
    Case,
    Grid,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
)
from midradius.study.result import Position, Result
from midradius.study.runner import Tell, run
from midradius.thermo import hardenability, regressions
from midradius.thermo.arrays import Array
from midradius.thermo.austenitizing import SOAK_TIME, austenitizing
from midradius.thermo.bands import Band, band
from midradius.thermo.calibration import NONE, Shifts
from midradius.thermo.phases import PHASE_NAMES
from midradius.thermo.ratechoice import DEFAULT, Kinetics
from midradius.thermo.steel import Composition, Steel

ZERO_DEGC = 273.15
DIAMETER, LENGTH, FLAT = 25.4e-3, 0.1, 0.4e-3
JET, DRY, BRIGHT = "end-quench water jet", "still air", 0.4
QUENCH_TIME = 1200.0  # s; the standards say at least 10 min, when the far end is still hot
# Against (8, 192) cells and a quarter of a kelvin the hardness moves by 0.3 HRC at most
CELLS, ACCURACY = (4, 96), 1.0
GRAIN_ASTM = 7.0  # both band standards hold for fine-grain steel; ASTM A255 computes with 7
SIXTEENTH_MM = 25.4 / 16.0
ISO_MM = (1.5, 3.0, 5.0, 7.0, 9.0, 11.0, 13.0, 15.0, *np.arange(20.0, 51.0, 5.0).tolist())
SIXTEENTHS = (*range(1, 17), *range(18, 33, 2))
# for equivalent distances only: between the table's and beyond them
BETWEEN_MM = (2.2, 4.0, 55.0, 60.0, 65.0, 70.0, 75.0, 80.0)
JUST, A255 = "Just 1969", "ASTM A255"


@dataclass(frozen=True)
class EndQuench:
    """One end-quench test.

    ``distance_mm`` (n_distance,) rises and holds the distances of ISO 642 and ASTM A255;
    ``hardness_hrc`` (n_distance,) is nan below 20 HRC; ``estimates`` are curves (n_distance,)
    that do not come from the solver. ``cooling_mm`` and ``cooling_time`` [s], (n_place,)
    each, go farther: what equivalent distances are read from.
    """

    steel: Steel
    austenitize: float
    reason: str
    time: float
    grain_astm: float | None
    distance_mm: Array
    positions: tuple[Position, ...]
    hardness_hrc: Array
    estimates: Mapping[str, Array]
    ideal_diameter: float
    critical: regressions.CriticalRates
    band: Band | None
    cooling_mm: Array
    cooling_time: Array
    notes: tuple[str, ...]
    result: Result
    kinetics: Kinetics = DEFAULT

    def column(self, name: str) -> Array:
        """An attribute of every position, or a phase fraction, (n_distance,)."""
        values = [
            p.phases[name] if name in PHASE_NAMES else getattr(p, name) for p in self.positions
        ]
        return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def distances_mm() -> Array:
    """Every distance [mm] of the table, rising."""
    # 1/16 in is 1.5875 mm exactly: no last bits in a document
    return np.unique(np.array([*ISO_MM, *(round(SIXTEENTH_MM * j, 4) for j in SIXTEENTHS)]))


def piece(given: SteelInput, *, temp: float, time: float) -> Case:
    """The test piece as a case; ``temp`` [K] and ``time`` [s] of its soak."""
    jet, dry = MediumUse(JET), MediumUse(DRY)
    places = tuple(
        PositionInput(f"{z:g} mm", "coordinates", coordinates=(DIAMETER / 2.0 - FLAT, 1e-3 * z))
        for z in (*distances_mm(), *BETWEEN_MM)
    )
    return Case(
        title=f"End-quench test of {given.steel.name}",
        steel=given,
        section=SectionInput("round", diameter=DIAMETER, length=LENGTH, emissivity=BRIGHT),
        route=(
            Stage("soak", at=temp, time=time),
            Stage("quench", time=QUENCH_TIME, faces={"near end": jet, "side": dry, "far end": dry}),
        ),
        outputs=Outputs(places, n_field=4),
        grid=Grid(CELLS, ACCURACY),
    )


def endquench(
    given: SteelInput,
    *,
    temp: float | None = None,
    time: float = SOAK_TIME,
    tell: Tell | None = None,
) -> EndQuench:
    """Test a steel.

    Parameters
    ----------
    given
        The steel; a grain of None is the one that the soak leaves.
    temp, time
        Austenitising temperature [K], by default that of `thermo.austenitizing`, and
        time at it [s].
    tell
        As in :func:`midradius.study.runner.run`.

    Raises
    ------
    InputFault
        A soak that leaves nothing to quench.
    SolverFault
        The solver gave up.
    """
    rule = austenitizing(given.steel)
    at, reason = (rule.temp, rule.reason) if temp is None else (temp, "as asked")
    result = run(piece(given, temp=at, time=time), tell=tell)
    distance = distances_mm()
    table = result.positions[: len(distance)]
    composition = given.steel.composition
    grain = GRAIN_ASTM if given.grain_astm is None else given.grain_astm
    just = regressions.just_curve(composition, 1e-3 * distance, grain_astm=grain)
    a255 = hardenability.a255_curve(composition, 1e-3 * distance, grain_astm=grain)
    critical = regressions.critical_rates(composition, austenitising_temp=at)
    reach = np.array([*distance, *BETWEEN_MM])
    rising = np.argsort(reach)
    spent = np.array(
        [np.nan if p.time_800_500_s is None else p.time_800_500_s for p in result.positions]
    )
    hrc = [np.nan if p.hardness_hrc is None else p.hardness_hrc for p in table]
    # nan already says how far along the piece an estimate reaches
    beside = [n for n in (*just.notes, *a255.notes) if not n.quantity.startswith("distance")]
    own = [str(note) for note in (*result.notes, *critical.notes)]
    notes = [*own, *(f"estimate beside the solver: {note}" for note in beside)]
    return EndQuench(
        steel=given.steel,
        austenitize=at,
        reason=reason,
        time=time,
        grain_astm=given.grain_astm,
        distance_mm=distance,
        positions=table,
        hardness_hrc=np.array(hrc),
        estimates={JUST: just.hardness_hrc, A255: a255.hardness_hrc},
        ideal_diameter=hardenability.ideal_diameter(composition, grain_astm=grain).diameter,
        critical=critical,
        band=band(given.steel.name) if given.steel.status != "given" else None,
        cooling_mm=reach[rising],
        cooling_time=spent[rising],
        notes=tuple(dict.fromkeys(notes)),
        result=result,
        kinetics=given.kinetics,
    )


def equivalent_distance(result: Result, test: EndQuench | None = None) -> Array:
    """Distance from the quenched end that cools like each node of a section.

    Parameters
    ----------
    result
        A run of the main job.
    test
        The end-quench test to compare with; left out, that of the result's own
        composition, soaked at the default temperature.

    Returns
    -------
    Array
        [mm], (n_node,): where the test piece takes the node's time from 800 to 500 degC;
        nan for a node that did not cross both, or outside 1.5 to 80 mm.
    """
    if test is None:
        steel = Steel(result.steel, Composition(**result.composition_pct), "the result", "given")
        test = endquench(
            SteelInput(steel, GRAIN_ASTM, shifts=_shifts_of(result), kinetics=_set_of(result))
        )
    return distance_of(result.time_800_500_s, test)


def _shifts_of(result: Result) -> Shifts:
    """The shifts that a result was computed with."""
    steel = result.inputs.get("steel")
    return Shifts(**steel["shifts"]) if isinstance(steel, dict) and "shifts" in steel else NONE


def _set_of(result: Result) -> Kinetics:
    """The set of rates of a result; curves that were measured are not in it."""
    steel = result.inputs.get("steel")
    found = steel.get("kinetics") if isinstance(steel, dict) else None
    return Kinetics(found["name"]) if isinstance(found, dict) else DEFAULT


def distance_of(time_800_500: Array, test: EndQuench) -> Array:
    """Equivalent distance [mm] of cooling times from 800 to 500 degC [s], any shape."""
    known = np.isfinite(test.cooling_time)
    times, places = test.cooling_time[known], test.cooling_mm[known]
    # toward the far end the air takes over: only what still slows down can be told apart
    turn = np.flatnonzero(np.diff(times) <= 0.0)
    last = int(turn[0]) + 1 if turn.size else len(times)
    if last < 2:
        return np.full(np.shape(time_800_500), np.nan)
    spent = np.log(np.where(time_800_500 > 0.0, time_800_500, np.nan))
    # a power law between neighbours: time grows about as distance^1.7
    return np.asarray(
        np.exp(
            np.interp(spent, np.log(times[:last]), np.log(places[:last]), left=np.nan, right=np.nan)
        )
    )


def with_grain(given: SteelInput, grain_astm: float | None) -> SteelInput:
    """The same steel with another grain."""
    return replace(given, grain_astm=grain_astm)
