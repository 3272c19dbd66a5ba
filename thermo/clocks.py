"""The shape of a clock: how the fraction follows the time that a product has run.

Model
-----
The time to a fraction ``X`` of what can form is ``tau0(T) S(X)`` with
``S(X) = int_0^X exp(b x^2) dx / (x^(p(1-x)) (1-x)^(p x))``: ``p`` is 0.4 with
Li et al. 1998 and 2/3 with Kirkaldy & Venugopalan 1984, whose bainite alone has a
``b``. The clock ``S`` runs with ``1/tau0(T)`` along any path.

Source
------
Those of the rates that use a shape (`diffusional`, `kirkaldy`); the tables here are
mathematics.

Holds for
---------
0 < p < 1 and b from 0 to about 10.
"""

from dataclasses import dataclass
from functools import cache

import numpy as np

from midradius.thermo.arrays import Array, IntArray


@dataclass(frozen=True)
class Shape:
    """``power`` p and ``bend`` b of the integral."""

    power: float
    bend: float = 0.0


LI = Shape(0.4)


def integral(fraction: Array, shape: Shape = LI) -> Array:
    """``S(X)`` [-] for fractions between 0 and 1, by Gauss-Legendre quadrature.

    With ``x = X s^(1/(1-p))`` the end singularity ``x^-p`` drops out; the upper half
    is counted from the other end, whose singularity is the same.
    """
    half = np.array([0.5])
    low = _from_end(np.minimum(fraction, 0.5), shape, above=False)
    high = _from_end(np.minimum(1.0 - fraction, 0.5), shape, above=True)
    whole = _from_end(half, shape, above=False)[0] + _from_end(half, shape, above=True)[0]
    return np.where(fraction <= 0.5, low, whole - high)


def _from_end(upper: Array, shape: Shape, *, above: bool) -> Array:
    """The integral over the first ``upper`` from 0, or over the last ``upper`` up to 1."""
    node, weight = np.polynomial.legendre.leggauss(64)
    stretch = 1.0 / (1.0 - shape.power)
    unit, unit_weight = (0.5 * (node + 1.0)) ** stretch, weight * 0.5 * stretch
    x = upper[..., None] * unit
    far = 1.0 - x if above else x
    smooth = np.exp(
        shape.power * x * (np.log(np.maximum(x, 1e-300)) - np.log1p(-x)) + shape.bend * far**2
    )
    value: Array = upper ** (1.0 - shape.power) * (smooth * unit_weight).sum(axis=-1)
    return value


@cache
def tables(shape: Shape, n_cell: int) -> tuple[Array, IntArray, float]:
    """What the kernel reads of a shape.

    The fraction at even S, (n_cell + 1,); the cell of it that holds a fraction, at even
    square roots of the fraction and then of what is left of 1, falling, (2 n_cell + 2,);
    and S(1).
    """
    fine = (1.0 - np.cos(np.linspace(0.0, np.pi, 6001))) / 2.0
    clock = integral(fine, shape)
    whole = float(clock[-1])
    even = np.linspace(0.0, whole, n_cell + 1)
    # Near the ends S goes as X^(1-p): interpolate X^(1-p) against S, which is smooth.
    end = 1.0 - shape.power
    low = np.interp(even, clock, fine**end) ** (1.0 / end)
    from_top = whole - clock[::-1]
    high = 1.0 - np.interp(whole - even, from_top, fine**end) ** (1.0 / end)
    middle = float(integral(np.array([0.5]), shape)[0])
    fraction = np.where(even <= middle, low, high)
    span = np.linspace(0.0, 1.0, n_cell + 1) ** 2
    held = np.concatenate([integral(span, shape), integral(1.0 - span, shape)[::-1]])
    cell = np.clip(held * (n_cell / whole), 0.0, n_cell - 1.0).astype(np.int64)
    return fraction, cell, whole
