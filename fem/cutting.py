"""What a section can do, whether it is a form on a grid or a mesh.

The runner, the verdicts and the writers know sections by these two only.
"""

from collections.abc import Mapping
from typing import Protocol

from midradius.fem.drawing import Drawing
from midradius.fem.place import Line, Place
from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo.arrays import Array


class AnySection(Protocol):
    """A part with named surfaces, not cut into cells yet."""

    @property
    def form(self) -> str: ...
    @property
    def sense(self) -> Sense: ...
    @property
    def n_dim(self) -> int: ...
    @property
    def text(self) -> str: ...
    @property
    def zones(self) -> tuple[str, ...]: ...
    @property
    def whole(self) -> tuple[float, str]: ...

    def trade_place(self, term: str, depth: float | None = None) -> tuple[float, ...]:
        """Coordinates [m] of a place that the trade has a word for."""
        ...

    def depth_of(self, coordinates: tuple[float, ...]) -> float:
        """Distance [m] to the nearest surface."""
        ...


class AnyCut(Protocol):
    """A section cut into cells."""

    @property
    def section(self) -> AnySection: ...
    @property
    def body(self) -> ControlVolumes: ...

    def coarser(self) -> "AnyCut | None":
        """The same section with cells twice as long; None where there is none."""
        ...

    def finer(self, strongest_film: Mapping[str, float], most: int) -> "AnyCut | None":
        """The same section with cells half as long; None beyond ``most`` nodes."""
        ...

    def shared(self, field: Array) -> Array:
        """A field (n_time, n_node) on the nodes that the coarser one has too."""
        ...

    def place(self, coordinates: tuple[float, ...]) -> Place:
        """The weights that read a field at a point [m]."""
        ...

    def profile(self) -> Line:
        """The line from surface to core."""
        ...

    def drawing(self) -> Drawing:
        """The part as a mesh to look at."""
        ...
