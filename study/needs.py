"""Whether a run meets what the drawing asks for, and how sure that is.

A value is read from the three solutions of the run; they give its numerical error.
The error of the model comes from `uncertainty`, on the side of the limit. The rule,
with the margin counted positive on the good side of the limit:

- *holds*: margin at least the sum of numerical and model uncertainty;
- *fails*: margin negative and at least that sum away;
- *too close to call*: everything between, and a value that no model gives.

The model figures hold at 90 %: of requirements that a run calls met, at most one in
ten is not, as far as the readings behind the figures speak for the part.

Limits in HRC, HB, MPa and ksi are turned into HV by `thermo.conversion`, values into
the unit asked. Where a value has no such conversion, value and margin stand in HV.
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
from midradius.study.result import Outcome, Verdict
from midradius.study.uncertainty import AS_COOLED, TEMPERED, Spread
from midradius.study.worth import Worth
from midradius.thermo import conversion
from midradius.thermo.arrays import Array
from midradius.thermo.phases import MARTENSITE, PHASE_NAMES

MPA_PER_KSI = 6.894757293168361
HOLDS: Outcome = "holds"
FAILS: Outcome = "fails"
CLOSE: Outcome = "too close to call"

_Scale = tuple[Callable[[float], float], Callable[[float], float]]
# Unit: what a Vickers hardness is in it, and back; nan where neither exists.
_SCALES: Mapping[str, _Scale] = {
    "HV": (lambda hv: hv, lambda hv: hv),
    "HRC": (
        lambda hv: float(conversion.hv_to_hrc(hv)),
        lambda hrc: float(conversion.hrc_to_hv(hrc)),
    ),
    "HB": (lambda hv: float(conversion.hv_to_hb(hv)), lambda hb: float(conversion.hb_to_hv(hb))),
    "MPa": (
        lambda hv: float(conversion.hv_to_uts(hv)),
        lambda mpa: float(conversion.uts_to_hv(mpa)),
    ),
    "ksi": (
        lambda hv: float(conversion.hv_to_uts(hv)) / MPA_PER_KSI,
        lambda ksi: float(conversion.uts_to_hv(ksi * MPA_PER_KSI)),
    ),
}


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


@dataclass(frozen=True)
class _Limits:
    low: float | None
    high: float | None

    def margin(self, value: Array) -> Array:
        """Distance to the nearer limit, positive inside."""
        low = value - self.low if self.low is not None else np.full_like(value, np.inf)
        high = self.high - value if self.high is not None else np.full_like(value, np.inf)
        return np.minimum(low, high)


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
    to_unit, to_hv = _SCALES[need.unit]
    in_hv = _Limits(*(None if x is None else to_hv(x) for x in (need.at_least, need.at_most)))

    def read(solution: Solution, places: Mapping[str, Place]) -> float:
        return _value(need, solution, places, solution.worth.hardness_hv, in_hv)

    hv, error_hv = read(*run.answer), run.numerical(read)
    value, unit, limits, error, notes = hv, "HV", in_hv, error_hv, []
    if np.isfinite(to_unit(hv)):
        value, unit, limits = to_unit(hv), need.unit, _Limits(need.at_least, need.at_most)
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
    verdict = _verdict(need, unit, limits, value, error, spread, _joined(notes))
    return _with_remedy(run, need, verdict, run.answer[0].worth.hardness_hv, in_hv)


def _of_field(run: _Run, need: Need) -> Verdict:
    """Yield strength, a phase or a film: a field in the unit asked."""
    limits = _Limits(need.at_least, need.at_most)

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
        return _verdict(need, need.unit, limits, value, error, spread, "")
    note = _where(run, need, answer, limits)
    verdict = _verdict(need, need.unit, limits, value, error, spread, note)
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
    need: Need, solution: Solution, places: Mapping[str, Place], field: Array, limits: _Limits
) -> float:
    """A field at the place of a need; everywhere: at the worst node."""
    if need.position != EVERYWHERE:
        at = places[need.position]
        used = at.share != 0.0  # a neighbour that does not count may have no value
        return float((field[at.node[used]] * at.share[used]).sum())
    if np.isnan(field).any():
        return float("nan")
    return float(field[np.argmin(limits.margin(field))])


def _where(run: _Run, need: Need, field: Array, limits: _Limits) -> str:
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
        level = _SCALES[need.to_unit][1](need.to)
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
    limits = _Limits(need.at_least, need.at_most)
    verdict = _verdict(need, need.unit, limits, value, error, spread, note)
    return replace(verdict, position=line.label)


def crossing(depth: Array, values: Array, level: float) -> float:
    """The depth at which ``values`` first fall below ``level``, the last depth if never.

    Parameters
    ----------
    depth
        Rising from the surface [m], shape (n_point,).
    values
        Along it, same shape; linear between the points.
    """
    below = np.flatnonzero(~(values >= level))
    if not below.size:
        return float(depth[-1])
    k = int(below[0])
    if k == 0:
        return float(depth[0])
    part = (values[k - 1] - level) / (values[k - 1] - values[k])
    return float(depth[k - 1] + part * (depth[k] - depth[k - 1]))


def _verdict(
    need: Need,
    unit: str,
    limits: _Limits,
    value: float,
    error: float,
    spread: Spread,
    note: str,
) -> Verdict:
    sides = []
    if limits.low is not None:
        toward = spread.below if value >= limits.low else spread.above
        sides.append((value - limits.low, toward, limits.low))
    if limits.high is not None:
        toward = spread.above if value <= limits.high else spread.below
        sides.append((limits.high - value, toward, limits.high))
    margin, model, limit = min(sides, key=lambda side: side[0] - side[1])
    outcome: Outcome = CLOSE
    if all(gap >= error + wide for gap, wide, _ in sides):
        outcome = HOLDS
    elif any(gap < 0.0 and gap <= -(error + wide) for gap, wide, _ in sides):
        outcome = FAILS
        margin, model, limit = min(sides)
    if not np.isfinite(value):
        note = _joined(["no model gives a value here", note])
    return Verdict(
        need=need.text,
        position=need.position,
        quantity=need.quantity,
        unit=unit,
        value=_known(value),
        limit=limit,
        margin=_known(margin),
        numerical_uncertainty=_known(error),
        model_uncertainty=_known(model),
        model_measured=spread.measured,
        model_basis=spread.basis,
        outcome=outcome,
        note=note,
    )


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _joined(parts: Sequence[str]) -> str:
    return "; ".join(part for part in parts if part)


def _with_remedy(run: _Run, need: Need, verdict: Verdict, field: Array, limits: _Limits) -> Verdict:
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
    return replace(verdict, note=_joined([verdict.note, text]))


def nearest_met(depth: Array, margin: Array, wanted: float) -> float | None:
    """The depth nearest to ``wanted`` where ``margin``, linear between points, is not negative."""
    met = [float(d) for d, m in zip(depth, margin, strict=True) if m >= 0.0]
    for k in range(len(depth) - 1):
        ends = margin[k], margin[k + 1]
        if min(ends) < 0.0 <= max(ends):
            part = ends[0] / (ends[0] - ends[1])
            met.append(float(depth[k] + part * (depth[k + 1] - depth[k])))
    return min(met, key=lambda d: abs(d - wanted), default=None)


def shown(value: float | None, unit: str, *, bare: bool = False) -> str:
    """A value for a person, with the digits that its unit deserves; ``bare``: no unit."""
    if value is None:
        return "-"
    digits = {"HRC": 1, "%": 1, "mm": 1, "in": 2, "um": 2, "ASTM": 1, "ksi": 1}.get(unit, 0)
    number = f"{value:.{digits}f}"
    if bare:
        return number
    return f"{unit} {number}" if unit == "ASTM" else f"{number} {unit}"
