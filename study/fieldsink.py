"""What is kept of the fields of a march as they come: those asked for, and differences.

A large run cannot hold two hundred fields to measure its errors at: each is compared
as it comes with that of the coarser run, on the nodes that both have.
"""

from collections.abc import Callable
from typing import Protocol

import numpy as np

from midradius.thermo.arrays import Array

HELD_MOST = 20_000_000  # temperatures that a run keeps in memory where a file takes them too
COMPARED_MOST = 60_000_000  # temperatures that one run holds for another to compare with
FEWEST_MOMENTS = 24


class Keeper(Protocol):
    """Where fields go as they come: see `archive.SeriesKeeper`."""

    def add(self, time: float, temp: Array) -> None:
        """One moment [s] and the temperatures [K] of the solved nodes."""
        ...


def compared_moments(most: int, n_node: int) -> int:
    """Moments at which errors are measured: fewer where the nodes are many."""
    return int(min(most, max(FEWEST_MOMENTS, COMPARED_MOST // n_node)))


class FieldSink:
    """Takes the fields of one march.

    Parameters
    ----------
    asked
        Moments [s] whose fields are wanted; none if left out.
    keeper
        Writes the asked ones; those of a large run are then not held.
    hold
        Hold all moments, for another run to compare with.
    against
        Fields of another run at all moments, (n_time, n).
    share
        Picks from fields (1, n_node) the nodes that the other run has too, which are
        its first.
    """

    def __init__(
        self,
        asked: Array | None = None,
        *,
        keeper: Keeper | None = None,
        hold: bool = False,
        against: Array | None = None,
        share: Callable[[Array], Array] | None = None,
    ) -> None:
        self._asked = set() if asked is None else set(asked.tolist())
        self._keeper = keeper
        self._hold = hold
        self._against = against
        self._share = share
        self._held: list[Array] = []
        self._wanted: list[Array] = []
        self._extremes: list[tuple[float, float]] = []
        self._row = 0
        self.worst = 0.0

    def __call__(self, time: float, field: Array) -> None:
        """Take one field [K], (n_node,)."""
        if self._against is not None:
            both = field if self._share is None else self._share(field[None])[0]
            gap = np.abs(both - self._against[self._row][: len(both)]).max()
            self.worst = max(self.worst, float(gap))
        self._row += 1
        if self._hold:
            self._held.append(field.copy())
        if time not in self._asked:
            return
        self._extremes.append((float(field.min()), float(field.max())))
        if self._keeper is not None:
            self._keeper.add(time, field)
        if self._keeper is None or len(self._asked) * len(field) <= HELD_MOST:
            self._wanted.append(field.copy())

    @property
    def held(self) -> Array:
        """All fields, (n_time, n_node) [K]."""
        return np.array(self._held)

    @property
    def wanted(self) -> Array | None:
        """Those asked for, (n_asked, n_node) [K]; None where only the file has them."""
        return np.array(self._wanted) if self._wanted else None

    @property
    def extremes(self) -> Array:
        """Lowest and highest temperature [K] at the asked moments, (n_asked, 2)."""
        return np.array(self._extremes)
