"""Run a case whose temperatures come from elsewhere, and say what their samples cost.

Refused are samples so far apart that the hardness as quenched moves by more than
:data:`MOST_SHARE` of itself, or a constituent by more than :data:`MOST_FRACTION` of the
mass, at any node: a third of what the model itself is off at 90 % (`uncertainty.csv`).
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from midradius.fem import given as giving
from midradius.fem.given import HALVED, Followed, follow
from midradius.fem.histories import Histories
from midradius.fem.media import ZERO_DEGC
from midradius.fem.remains import Remains
from midradius.fem.section import Place
from midradius.study.basis import inputs_of, notes_of, sources_of
from midradius.study.begin import Begun
from midradius.study.findings import critical_degC, fields, position
from midradius.study.needs import judge_given
from midradius.study.result import (
    Profile,
    Resampling,
    Result,
    SectionView,
    StageRecord,
    TemperRecord,
)
from midradius.study.seriescase import SeriesCase
from midradius.study.seriesopen import histories, places
from midradius.study.soaktext import soak_text, soak_warnings
from midradius.study.worth import Worth, tempers_of, worth
from midradius.thermo import austenite as soaking
from midradius.thermo import equilibrium
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import initial_state, stacked, steel_tables
from midradius.thermo.austenite import Austenite
from midradius.thermo.errors import InputFault
from midradius.thermo.kinetics import N_SCALE
from midradius.thermo.soaked import alike
from midradius.thermo.source import RangeNote

MOST_SHARE = 0.05  # of the hardness
MOST_FRACTION = 0.10  # of the mass
BELOW_SOAK = 20.0  # K below the soak, or above, that a history may begin unsaid [estimate]
KEPT = 24  # samples of the whole field that a result keeps
WHOLE = 2_000_000  # numbers up to which all samples of all nodes are held

Tell = Callable[[float, float], None]


@dataclass(frozen=True)
class _Solution:
    """One of the three ways, as verdicts want it."""

    left: Remains
    worth: Worth
    cut: None = None


def run(case: SeriesCase, *, tell: Tell | None = None) -> Result:
    """Carry every node of the file along its own temperatures.

    Parameters
    ----------
    case
        From :func:`midradius.study.casefile.read_any`.
    tell
        Called with the time in the file [s] and its last one now and then.

    Raises
    ------
    InputFault
        The file cannot be read, holds something else than a cooling from the soak, or
        its samples are too far apart.
    """
    given = histories(case.temperatures)
    at = places(case, given)
    begun, left = _begin(case, given.n_node)
    eq = equilibrium.equilibrium(case.steel.steel.composition)
    small = given.n_node * len(given.times) <= WHOLE and given.mesh is None
    nodes = np.array([place.node[0] for place in at.values()], dtype=np.int64)
    found = follow(
        given,
        begun.tables,
        state=begun.state[0],
        starts=case.temperatures.starts_at,
        ae1=eq.ae1,
        watch=np.concatenate([nodes, np.arange(given.n_node if small else 0)]),
        tell=tell,
    )
    lines, halved, cubic = (
        _Solution(each, worth(case, begun.soaked, each))
        for each in (found.lines, found.halved, found.cubic)
    )
    cost = _resampling(given, found, lines.worth, halved.worth, cubic.worth)
    _refuse_coarse(case, given, found, cost, lines.worth.as_quenched_hv)
    begins = _begins(found, float(begun.temp[0]), case)
    return _result(case, given, at, begun, left, found, (lines, halved, cubic), cost, begins)


def _begin(case: SeriesCase, n_node: int) -> tuple[Begun, Austenite]:
    """Every node as the soak leaves it, and the one austenite of all."""
    steel, at, time = case.steel.steel, case.soak.at, case.soak.time
    assert at is not None and time is not None, "a soak has both"
    left = soaking.soak(steel, at, time, grain_astm=case.steel.grain_astm)
    soaked = alike(left, at, time, n_node)
    begun = Begun(
        temp=np.full(n_node, at),
        state=initial_state(left, steel.composition.C, at, 1),
        scale=np.ones((n_node, N_SCALE)),
        tables=stacked([steel_tables(steel, left, case.steel.shifts, case.steel.kinetics)]),
        soaked=soaked,
        heating=None,
    )
    return begun, left


def _error(value: float, halved: float, cubic: float) -> float:
    return max(abs(value - halved), abs(value - cubic))


def _resampling(
    given: Histories, found: Followed, lines: Worth, halved: Worth, cubic: Worth
) -> Resampling:
    def error(what: Callable[[Worth], Array], factor: float) -> Array:
        value = what(lines)
        return np.fmax(factor * np.abs(value - what(halved)), np.abs(value - what(cubic)))

    before = error(lambda value: value.as_quenched_hv, 1.0)
    phases = error(lambda value: value.phases, HALVED).max(axis=0)
    worst, worst_phase = int(np.argmax(before)), int(np.argmax(phases))
    return Resampling(
        hardness_error_hv=error(lambda value: value.hardness_hv, 1.0),
        as_quenched_error_hv=before,
        phase_error=phases,
        halved_hv=float(np.abs(lines.as_quenched_hv - halved.as_quenched_hv).max()),
        cubic_hv=float(np.abs(lines.as_quenched_hv - cubic.as_quenched_hv).max()),
        worst_hardness=given.called(worst),
        worst_phase=given.called(worst_phase),
        largest_fall_K=float(found.fall.max()),
        n_sample=len(found.times),
    )


def _refuse_coarse(
    case: SeriesCase, given: Histories, found: Followed, cost: Resampling, hardness_hv: Array
) -> None:
    share = np.maximum(
        cost.as_quenched_error_hv / (MOST_SHARE * hardness_hv), cost.phase_error / MOST_FRACTION
    )
    node = int(np.argmax(share))
    if share[node] <= 1.0:
        return
    k = max(int(found.widest[node]), 0)
    high, low = found.high[node], found.high[node] - found.fall[node]
    begin = case.temperatures.starts_at
    start = float(given.times[0]) if begin is None else begin
    apart = max(float(found.fall[node]) * np.sqrt(0.5 / share[node]), 1.0)
    raise InputFault(
        "temperatures.file",
        f"samples too far apart at {given.called(node)}: from {start + found.times[k]:.6g} to"
        f" {start + found.times[k + 1]:.6g} s it falls from {high - ZERO_DEGC:.0f} to"
        f" {low - ZERO_DEGC:.0f} degC, which leaves +-{cost.as_quenched_error_hv[node]:.0f} HV"
        f" and +-{100.0 * cost.phase_error[node]:.0f} % of a constituent open",
        f"so close that both are known, within {100.0 * MOST_SHARE:.0f} % of the hardness and"
        f" {100.0 * MOST_FRACTION:.0f} % of the mass",
        f"Write samples at most {apart:.0f} K apart there.",
    )


def _begins(found: Followed, soak: float, case: SeriesCase) -> tuple[RangeNote, ...]:
    """Where histories do not begin at the soak temperature."""
    eq = equilibrium.equilibrium(case.steel.steel.composition)
    low, high = float(found.first.min()), float(found.first.max())
    notes = []
    if low < soak - BELOW_SOAK or high > soak + BELOW_SOAK:
        value = f"{low - ZERO_DEGC:.0f} to {high - ZERO_DEGC:.0f} degC"
        allowed = f"about {soak - ZERO_DEGC:.0f} degC, the soak (its austenite is taken anyway)"
        notes.append(RangeNote("temperatures given", "first sample", value, allowed))
    top = max(eq.ae3, eq.acm) if np.isfinite(eq.acm) else eq.ae3
    if low < top:
        allowed = f"above {top - ZERO_DEGC:.0f} degC (what formed before is not counted)"
        value = f"{low - ZERO_DEGC:.0f} degC"
        notes.append(RangeNote("temperatures given", "coldest first sample", value, allowed))
    return tuple(notes)


def _result(
    case: SeriesCase,
    given: Histories,
    at: Mapping[str, Place],
    begun: Begun,
    left: Austenite,
    found: Followed,
    ways: tuple[_Solution, _Solution, _Solution],
    cost: Resampling,
    begins: tuple[RangeNote, ...],
) -> Result:
    lines, halved, cubic = ways
    n_place = len(at)
    whole = found.watched.shape[1] > n_place
    rows = np.unique(np.linspace(0, len(found.times) - 1, KEPT).round().astype(int))
    kept = found.watched[rows][:, n_place:] if whole else found.last[None, :]
    points = np.empty((given.n_node, 0)) if given.points is None else given.points
    return Result(
        title=case.title,
        steel=case.steel.steel.name,
        composition_pct={k: v for k, v in vars(case.steel.steel.composition).items() if v},
        section=given.text,
        sense=given.sense,
        points_mm=points * 1e3,
        volume=np.full(given.n_node, np.nan),
        view=_view(given),
        times_s=found.times[rows] if whole else found.times[-1:],
        temp_degC=kept - ZERO_DEGC,
        **fields(lines.left, lines.worth),
        history_times_s=found.times,
        history_temp_degC=found.watched[:, :n_place] - ZERO_DEGC,
        positions=tuple(
            position(
                name,
                lines.left,
                lines.worth,
                place,
                time_error_hv=float(cost.hardness_error_hv[place.node[0]]),
                grid_error_hv=float("nan"),
            )
            for name, place in at.items()
        ),
        profile=_profile(given),
        stages=(
            StageRecord(
                kind="given",
                medium=given.text,
                start_s=0.0,
                end_s=float(found.times[-1]),
                ended_by="end of the file",
                heat_to_bath_J=float("nan"),
            ),
        ),
        tempers=tuple(TemperRecord(t.temp - ZERO_DEGC, t.time) for t in tempers_of(case)),
        critical_degC=critical_degC(case, left),
        soak=soak_text(case, begun),
        heat_given_J_per_kg=float("nan"),
        heat_extent="",
        heat_balance_relative=float("nan"),
        time_error_K=float("nan"),
        grid_error_K=float("nan"),
        n_step=len(found.times) - 1,
        n_node=given.n_node,
        verdicts=judge_given(
            case,
            *((way, at) for way in ways),
            error=_error,
            called=given.called,
        ),
        notes=notes_of(
            case,
            begins,
            lines.left,
            lines.worth,
            seen=np.array([found.coldest.min(), found.first.max()]),
            last=found.last,
        ),
        sources=sources_of(case, giving.SOURCES),
        assumptions=_assumptions(case, given),
        cautions=soak_warnings(begun.soaked, case.soak.at or 0.0, np.ones(given.n_node))
        + lines.worth.cautions,
        inputs=inputs_of(case),
        case_text=case.text,
        resampling=cost,
        mesh=given.mesh,
    )


def _view(given: Histories) -> SectionView:
    if given.drawing is None:
        return SectionView(np.empty((0, 3)), (), np.empty(0, dtype=np.int64))
    return SectionView(given.drawing.points * 1e3, given.drawing.cells, given.drawing.node)


def _profile(given: Histories) -> Profile:
    if given.line is None:
        return Profile(np.empty(0), np.empty(0, dtype=np.int64), "")
    line = given.line
    return Profile(line.depth * 1e3, line.node, line.label, line.share)


def _assumptions(case: SeriesCase, given: Histories) -> tuple[str, ...]:
    lines = [
        "Temperatures are taken as given: neither heat nor the latent heat of what forms is"
        " balanced, and no grid is judged. Whoever computed or measured them answers for them.",
        "Every node has the austenite that the soak of the case leaves, when its history begins.",
        "Between samples the temperature is a straight line. Nothing is smoothed: scatter of a"
        " sensor enters the cooling rate at 700 degC, which is the slope between two samples.",
        "Phases and hardness are those at 20 degC: austenite left at the end of the file follows"
        " the martensite curve.",
    ]
    if case.tempers:
        lines.append(
            "Tempers act alike on every node, cooled to 20 degC before: their time counts from"
            " when the part is hot throughout. Retained austenite that they decompose counts as"
            " bainite."
        )
    if case.steel.calibration:
        lines.append(case.steel.calibration.text)
    lines.append(case.steel.kinetics.text)
    return (*lines, *given.remarks)
