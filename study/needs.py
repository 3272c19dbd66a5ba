"""Whether a run meets what the drawing asks for, and how sure that is.

A value is read from the three solutions of the run; they give its numerical error.
The error of the model comes from `uncertainty`; `needrule` makes the verdict.

The model figures hold at 90 %: of requirements that a run calls met, at most one in
ten is not, as far as the readings behind the figures speak for the part.

Where a value has no conversion into the unit asked, value and margin stand in HV.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np

from midradius.fem.cutting import AnyCut
from midradius.fem.place import Place
from midradius.study import casekeys as keys
from midradius.study import uncertainty
from midradius.study.case import EVERYWHERE, Asked, Case, Need
from midradius.study.needdepth import crossing, nearest_met
from midradius.study.needrule import FAILS, Limits, joined, verdict_on
from midradius.study.needscales import MPA_PER_KSI, SCALES
from midradius.study.result import Verdict
from midradius.study.uncertainty import AS_COOLED, TEMPERED, Spread
from midradius.study.worth import Worth
from midradius.thermo.arrays import Array
from midradius.thermo.phases import MARTENSITE, PHASE_NAMES


class Solution(Protocol):
    """One solution, with what its structure is worth; no cut where temperatures were given."""

    @property
    def cut(self) -> AnyCut | None: ...
    @property
    def worth(self) -> Worth: ...


Placed = tuple[Solution, Mapping[str, Place]]
Error = Callable[[float, float, float], float]  # of the answer, the rough and the sharp value


@dataclass(frozen=True)
class _Run:
    """The arguments of `judge`."""

    case: Asked
    answer: Placed
    rough: Placed
    sharp: Placed
    error: Error
    called: Callable[[int], str] = str

    @property
    def condition(self) -> str:
        """Whether the hardness is that of a tempered part."""
        tempered = any(stage.kind == "temper" for stage in self.case.route)
        return TEMPERED if tempered else AS_COOLED

    def numerical(self, read: Callable[[Solution, Mapping[str, Place]], float]) -> float:
        """Error by time steps and grid of what ``read`` finds in a solution."""
        answer, rough, sharp = (read(*each) for each in (self.answer, self.rough, self.sharp))
        return self.error(answer, rough, sharp)


def judge(
    case: Case,
    answer: Placed,
    rough: Placed,
    sharp: Placed,
    factors: tuple[float, float],
) -> tuple[Verdict, ...]:
    """One verdict for each need of a case, in its order.

    Parameters
    ----------
    case
        What was asked.
    answer, rough, sharp
        The run's own solution; one on the coarser grid; one on the coarser grid with
        the tighter tolerance; each with the places of the case on its grid.
    factors
        From ``sharp - rough`` to the error of the time steps and from ``answer -
        rough`` to that of the grid.
    """
    by_time, by_grid = factors

    def error(value: float, rough: float, sharp: float) -> float:
        return by_time * abs(sharp - rough) + by_grid * abs(value - rough)

    run = _Run(case, answer, rough, sharp, error)
    return tuple(_judged(run, need) for need in case.needs)


def judge_given(
    case: Asked,
    lines: Placed,
    halved: Placed,
    cubic: Placed,
    *,
    error: Error,
    called: Callable[[int], str],
) -> tuple[Verdict, ...]:
    """`judge` where the temperatures were given.

    ``error`` tells that of the samples from the values along straight lines, along every
    second sample and along the cubic; ``called`` is a node in words.
    """
    run = _Run(case, lines, halved, cubic, error, called)
    return tuple(_judged(run, need) for need in case.needs)


def any_fails(verdicts: Sequence[Verdict]) -> bool:
    """Whether one requirement is not met."""
    return any(verdict.outcome == FAILS for verdict in verdicts)


def _judged(run: _Run, need: Need) -> Verdict:
    if need.quantity == keys.DEPTH:
        return _depth(run, need)
    if need.quantity in ("hardness", "tensile"):
        return _of_hardness(run, need)
    return _of_field(run, need)


def _of_hardness(run: _Run, need: Need) -> Verdict:
    """Hardness and tensile strength: one field in HV, read in the unit asked."""
    to_unit, to_hv = SCALES[need.unit]
    in_hv = Limits(*(None if x is None else to_hv(x) for x in (need.at_least, need.at_most)))

    def read(solution: Solution, places: Mapping[str, Place]) -> float:
        return _value(need, solution, places, solution.worth.hardness_hv, in_hv)

    hv, error_hv = read(*run.answer), run.numerical(read)
    value, unit, limits, error, notes = hv, "HV", in_hv, error_hv, []
    if np.isfinite(to_unit(hv)):
        value, unit, limits = to_unit(hv), need.unit, Limits(need.at_least, need.at_most)
        shifts = [abs(to_unit(hv + step) - value) for step in (error_hv, -error_hv)]
        known = [shift for shift in shifts if np.isfinite(shift)]
        error = max(known, default=float("nan"))
    elif np.isfinite(hv):
        notes.append(f"{hv:.0f} HV has no {need.unit}: compared in HV")
    composition = run.case.steel.steel.composition
    if need.quantity == "tensile":
        spread = uncertainty.tensile(composition, value, condition=run.condition)
    else:
        spread = uncertainty.hardness(composition, unit, value, condition=run.condition)
    notes.append(_where(run, need, run.answer[0].worth.hardness_hv, in_hv))
    verdict = verdict_on(need, unit, limits, value, error, spread, joined(notes))
    return _with_remedy(run, need, verdict, run.answer[0].worth.hardness_hv, in_hv)


def _of_field(run: _Run, need: Need) -> Verdict:
    """Yield strength, a phase or a film: a field in the unit asked."""
    limits = Limits(need.at_least, need.at_most)

    def field(solution: Solution) -> Array:
        return _field(need, solution)

    def read(solution: Solution, places: Mapping[str, Place]) -> float:
        return _value(need, solution, places, field(solution), limits)

    value, error = read(*run.answer), run.numerical(read)
    composition = run.case.steel.steel.composition
    if need.quantity == keys.GRAIN:
        spread = uncertainty.grain(given=run.case.steel.grain_astm is not None)
    elif need.quantity == "yield":
        spread = uncertainty.yield_strength(composition, value, condition=run.condition)
    elif need.quantity == keys.FILM:
        spread = uncertainty.cementite_film(value)
    else:
        part = uncertainty.fraction(0.01 * value, hardened=need.quantity == "martensite")
        spread = Spread(100.0 * part.below, 100.0 * part.above, part.basis, part.measured)
    answer = field(run.answer[0])
    if np.ptp(answer) == 0.0:  # alike throughout: no place is better or worse
        return verdict_on(need, need.unit, limits, value, error, spread, "")
    note = _where(run, need, answer, limits)
    verdict = verdict_on(need, need.unit, limits, value, error, spread, note)
    return _with_remedy(run, need, verdict, answer, limits)


def _field(need: Need, solution: Solution) -> Array:
    worth = solution.worth
    if need.quantity == "yield":
        return worth.yield_mpa / (MPA_PER_KSI if need.unit == "ksi" else 1.0)
    if need.quantity == keys.GRAIN:
        return worth.soaked.grain_astm
    if need.quantity == keys.FILM:
        return 1e6 * worth.scales.cementite_film
    return np.asarray(100.0 * worth.phases[PHASE_NAMES.index(need.quantity)])


def _value(
    need: Need, solution: Solution, places: Mapping[str, Place], field: Array, limits: Limits
) -> float:
    """A field at the place of a need; everywhere: at the worst node."""
    if need.position != EVERYWHERE:
        at = places[need.position]
        used = at.share != 0.0  # a neighbour that does not count may have no value
        return float((field[at.node[used]] * at.share[used]).sum())
    if np.isnan(field).any():
        return float("nan")
    return float(field[np.argmin(limits.margin(field))])


def _where(run: _Run, need: Need, field: Array, limits: Limits) -> str:
    if need.position != EVERYWHERE or np.isnan(field).any():
        return ""
    cut = run.answer[0].cut
    worst = int(np.argmin(limits.margin(field)))
    if cut is None:
        return f"worst at {run.called(worst)}"
    depth = cut.section.depth_of(tuple(cut.body.points[worst]))
    return f"worst {1e3 * depth:.1f} mm below the surface"


def _depth(run: _Run, need: Need) -> Verdict:
    """Hardened depth: from the surface to where the profile first leaves the limit."""
    cut = run.answer[0].cut
    assert need.to is not None, "a hardened depth counts to something"
    assert cut is not None, "and is refused where temperatures were given"
    composition, metre = run.case.steel.steel.composition, keys.LENGTHS[need.unit]
    of_martensite = need.to_unit == keys.OF_MARTENSITE
    if of_martensite:
        level = 0.01 * need.to
        wide = uncertainty.fraction(level, hardened=True)
    else:
        level = SCALES[need.to_unit][1](need.to)
        wide = uncertainty.hardness(composition, "HV", level, condition=run.condition)

    def to(solution: Solution, level: float) -> float:
        worth = solution.worth
        field = worth.phases[MARTENSITE] if of_martensite else worth.hardness_hv
        line = (solution.cut or cut).profile()
        return crossing(line.depth, line.of(field), level) / metre

    answer = run.answer[0]
    value = to(answer, level)
    error = run.numerical(lambda solution, _: to(solution, level))
    spread = Spread(
        below=value - to(answer, level + wide.below),
        above=to(answer, level - wide.above) - value,
        basis=f"{wide.basis}; taken along the profile",
        measured=wide.measured,
    )
    line = cut.profile()
    note = "hardened through" if value >= line.depth[-1] / metre else ""
    limits = Limits(need.at_least, need.at_most)
    verdict = verdict_on(need, need.unit, limits, value, error, spread, note)
    return replace(verdict, position=line.label)


def _with_remedy(run: _Run, need: Need, verdict: Verdict, field: Array, limits: Limits) -> Verdict:
    """A failing verdict with where its limits are met."""
    if verdict.outcome != FAILS:
        return verdict
    cut = run.answer[0].cut
    if cut is None:
        count = int((limits.margin(field) >= 0.0).sum())
        text = f"met at {count} of {len(field)} nodes"
    elif need.position == EVERYWHERE:
        met = limits.margin(field) >= 0.0
        share = float(cut.body.volume[met].sum() / cut.body.volume.sum())
        text = f"met in {100.0 * share:.0f} % of the section"
    else:
        line = cut.profile()
        wanted = run.answer[1][need.position].depth
        near = nearest_met(line.depth, limits.margin(line.of(field)), wanted)
        text = f"met nowhere on the profile, {line.label}"
        if near is not None:
            text = f"nearest place that meets it: {1e3 * near:.1f} mm on the profile, {line.label}"
    return replace(verdict, note=joined([verdict.note, text]))
