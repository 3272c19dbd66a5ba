"""The linear systems of one implicit step: a sweep on a line, multigrid elsewhere.

Every system is ``(diag(excess) + L(weight)) x = rhs`` with a graph Laplacian ``L``
and a positive excess per node; it must be positive definite, which positive
weights ensure.

Source
------
Thomas elimination; else :mod:`midradius.fem.multigrid`.
"""

from collections.abc import Callable
from typing import Any, NamedTuple

import numpy as np
from numba.extending import overload

from midradius.fem.aggregates import Aggregates, aggregates
from midradius.fem.multigrid import gradients
from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel


class Line(NamedTuple):
    """A chain of nodes: eliminated directly. ``work`` has shape (n_node,)."""

    work: Array


Scheme = Line | Aggregates


def scheme(body: ControlVolumes) -> Scheme:
    """The scheme that fits a section, built once from its geometry."""
    if body.is_chain:
        return Line(np.empty(body.n_node))
    return aggregates(body)


@kernel
def _sweep_line(
    line: Line, excess: Array, weight: Array, rhs: Array, out: Array, accuracy: float
) -> int:
    n = len(excess)
    work = line.work
    pivot = excess[0] + weight[0]
    out[0] = rhs[0] / pivot
    for i in range(1, n):
        work[i] = -weight[i - 1] / pivot
        pivot = excess[i] + weight[i - 1] * (1.0 + work[i])
        if i < n - 1:
            pivot += weight[i]
        out[i] = (rhs[i] + weight[i - 1] * out[i - 1]) / pivot
    for i in range(n - 2, -1, -1):
        out[i] -= work[i + 1] * out[i + 1]
    return 1


def solve(
    how: Scheme,
    excess: Array,
    weight: Array,
    rhs: Array,
    out: Array,
    accuracy: float,
    share: float = 0.0,
) -> int:
    """Solve ``(diag(excess) + L(weight)) out = rhs`` inside a kernel.

    The iterative scheme stops when a step moves no node by more than ``accuracy``
    [unit of ``out``], or when the error has fallen to ``share`` of ``out`` itself (in
    the energy of the matrix). Returns the iterations, or -1 when it did not converge.
    """
    if isinstance(how, Line):
        return _sweep_line(how, excess, weight, rhs, out, accuracy)
    return gradients(how, excess, weight, rhs, out, accuracy, share)


@overload(solve, strict=False)
def _choose(
    how: Any, excess: Any, weight: Any, rhs: Any, out: Any, accuracy: Any, share: Any = 0.0
) -> Callable[..., int] | None:
    kind = getattr(how, "instance_class", None)  # numba's type of a named tuple
    if kind is Line:
        return lambda how, excess, weight, rhs, out, accuracy, share=0.0: _sweep_line(
            how, excess, weight, rhs, out, accuracy
        )
    if kind is Aggregates:
        return lambda how, excess, weight, rhs, out, accuracy, share=0.0: gradients(
            how, excess, weight, rhs, out, accuracy, share
        )
    return None
