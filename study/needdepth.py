"""Depths on a profile: where it first falls below a level, where limits are met."""

import numpy as np

from midradius.thermo.arrays import Array


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


def nearest_met(depth: Array, margin: Array, wanted: float) -> float | None:
    """The depth nearest to ``wanted`` where ``margin``, linear between points, is not negative."""
    met = [float(d) for d, m in zip(depth, margin, strict=True) if m >= 0.0]
    for k in range(len(depth) - 1):
        ends = margin[k], margin[k + 1]
        if min(ends) < 0.0 <= max(ends):
            part = ends[0] / (ends[0] - ends[1])
            met.append(float(depth[k] + part * (depth[k + 1] - depth[k])))
    return min(met, key=lambda d: abs(d - wanted), default=None)
