"""The rule that makes a verdict out of a value, its limits and its two errors.

With the margin counted positive on the good side of the limit:

- *holds*: margin at least the sum of numerical and model uncertainty;
- *fails*: margin negative and at least that sum away;
- *too close to call*: everything between, and a value that no model gives.

Of the model's error counts the side towards the limit.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from midradius.study.case import Need
from midradius.study.result import Outcome, Verdict
from midradius.study.uncertainty import Spread
from midradius.thermo.arrays import Array

HOLDS: Outcome = "holds"
FAILS: Outcome = "fails"
CLOSE: Outcome = "too close to call"


@dataclass(frozen=True)
class Limits:
    low: float | None
    high: float | None

    def margin(self, value: Array) -> Array:
        """Distance to the nearer limit, positive inside."""
        low = value - self.low if self.low is not None else np.full_like(value, np.inf)
        high = self.high - value if self.high is not None else np.full_like(value, np.inf)
        return np.minimum(low, high)


def verdict_on(
    need: Need,
    unit: str,
    limits: Limits,
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
        note = joined(["no model gives a value here", note])
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


def joined(parts: Sequence[str]) -> str:
    return "; ".join(part for part in parts if part)
