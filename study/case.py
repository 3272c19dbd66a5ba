"""One case: what is cooled, how, and what is asked for. Frozen, in SI.

Every quantity that carries no suffix is in SI (m, s, K). The reader of the TOML
file (``casefile``) has checked all of it; a case made in Python is as good as
its maker.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from midradius.thermo.errors import InputFault
from midradius.thermo.ratechoice import DEFAULT, Kinetics
from midradius.thermo.source import RangeNote
from midradius.thermo.steel import Steel
from midradius.thermo.units import parse

from .calibrationfile import HeatCalibration
from .steelfile import FileSteel
from .tankinput import LoadInput, ShiftInput, TankInput

if TYPE_CHECKING:
    from midradius.fem.outline import Slice
    from midradius.thermo.calibration import Shifts

Form = Literal["slab", "round", "tube", "ball", "bar", "ring", "mesh", "outline"]
MeshSense = Literal["plane", "axisymmetric", "solid"]
StageKind = Literal["heat", "soak", "transfer", "quench", "hold", "temper"]
PositionKind = Literal[
    "surface",
    "core",
    "mid-radius",
    "quarter thickness",
    "depth",
    "coordinates",
    "node",
    "place of the file",
]


@dataclass(frozen=True)
class MediumUse:
    """A medium as one stage or one surface zone uses it.

    ``name`` is the catalogue's; with ``film_file`` it is a mere label or None.
    ``bath`` [K] is None where the catalogue's usual bath is meant.
    """

    name: str | None = None
    film_file: Path | None = None
    bath: float | None = None


@dataclass(frozen=True)
class Until:
    """Ends a stage: when ``position`` is on the ``sense`` side of ``temp`` [K]."""

    position: str
    temp: float
    sense: Literal["below", "above"] = "below"


@dataclass(frozen=True)
class Stage:
    """One stage of the route.

    ``at`` [K] belongs to the soak, to tempers and, as that of the furnace, to heating;
    ``start`` [K] of the part and ``ramp`` [K/s] of the furnace belong to heating alone.
    ``time`` [s] belongs to any stage; that of a temper counts from when the part
    is hot throughout. A stage with both ``time`` and ``until`` ends at whichever
    comes first. ``faces`` names the zones that see something else than ``medium``;
    it wins over the bore medium of the section.
    """

    kind: StageKind
    at: float | None = None
    time: float | None = None
    medium: MediumUse | None = None
    until: Until | None = None
    faces: Mapping[str, MediumUse] = field(default_factory=dict)
    start: float | None = None
    ramp: float | None = None


def _no_shifts() -> "Shifts":
    # here, since the fit needs numpy and a case does not
    from midradius.thermo.calibration import NONE

    return NONE


@dataclass(frozen=True)
class SteelInput:
    """The steel, and its prior austenite grain [ASTM number] unless the soak gives it.

    ``file`` is where a certificate was read; ``notes`` say where it leaves the limits
    of the grade that was ordered. ``shifts`` are those of ``calibration`` where it is
    given: what distinguishes this heat from its grade. ``kinetics`` are the rates it
    transforms with, measured ones from the file ``transformation`` first.
    """

    steel: Steel
    grain_astm: float | None = None
    file: FileSteel | None = None
    notes: tuple[RangeNote, ...] = ()
    shifts: "Shifts" = field(default_factory=_no_shifts)
    calibration: HeatCalibration | None = None
    kinetics: Kinetics = DEFAULT
    transformation: Path | None = None


@dataclass(frozen=True)
class OutlineFile:
    """An outline of CAD and how it was asked to be meshed.

    ``length_unit`` belongs to a drawing that states none; ``finest`` is the size of the
    surface cells [m], None where the films of the route choose it. The reader adds in
    ``statements`` what was made of it.
    """

    file: Path
    length_unit: str | None = None
    layers: tuple[str, ...] = ()
    cut: "Slice | None" = None
    finest: float | None = None
    statements: tuple[str, ...] = field(default=(), compare=False)


@dataclass(frozen=True)
class MeshFile:
    """A mesh file as the section, and how to take it.

    ``symmetry`` names groups or planes (``"x = 0"``) that no heat passes; ``named``
    are the groups that the route speaks of. The reader adds what it found in the
    file: its surface ``zones`` and how far it reaches, ``low`` to ``high`` [m]. A mesh that
    was made of an ``outline`` has its file among those kept for later reads.
    """

    file: Path
    length_unit: str
    sense: MeshSense
    symmetry: tuple[str, ...] = ()
    named: tuple[str, ...] = ()
    outline: OutlineFile | None = None
    zones: tuple[str, ...] = field(default=(), compare=False)
    low: tuple[float, ...] = field(default=(), compare=False)
    high: tuple[float, ...] = field(default=(), compare=False)


@dataclass(frozen=True)
class SectionInput:
    """The section's form and its dimensions [m]; those of other forms are None.

    The forms ``"mesh"`` and ``"outline"`` have ``mesh`` in their place.

    ``emissivity`` of the surface [-] acts in gases: 0.8 is scaled steel.
    """

    form: Form
    thickness: float | None = None
    diameter: float | None = None
    length: float | None = None
    outside: float | None = None
    bore: float | None = None
    width: float | None = None
    height: float | None = None
    bore_medium: MediumUse | None = None
    emissivity: float = 0.8
    mesh: MeshFile | None = None

    @property
    def zones(self) -> tuple[str, ...]:
        """Names of the surfaces that can see a medium of their own."""
        if self.mesh is not None:
            return self.mesh.zones
        if self.form == "round" and self.length is not None:
            return ("side", "near end", "far end")
        return ZONES[self.form]

    @property
    def n_dim(self) -> int:
        """1 for a line through the section, 2 for a plane, 3 for a solid."""
        if self.mesh is not None:
            return 3 if self.mesh.sense == "solid" else 2
        plane = self.form in ("bar", "ring") or (self.form == "round" and self.length is not None)
        return 2 if plane else 1


@dataclass(frozen=True)
class PositionInput:
    """A place where the answer is wanted.

    ``depth`` [m] counts from the cooled surface; ``coordinates`` [m] are (x,)
    from the near face of a slab, (r,) of a round, tube or ball, (x, y) from the
    left bottom corner of a bar, (r, z) from the bottom or near end otherwise.
    ``node`` counts from 0; it and a place of the file belong to temperatures from elsewhere.
    """

    name: str
    kind: PositionKind
    depth: float | None = None
    coordinates: tuple[float, ...] | None = None
    node: int | None = None


@dataclass(frozen=True)
class PathInput:
    """A straight path across the section, from ``start`` to ``end`` [m], ``n_point`` even steps."""

    name: str
    start: tuple[float, ...]
    end: tuple[float, ...]
    n_point: int = 41


@dataclass(frozen=True)
class Outputs:
    """What is written: positions, paths, and field times or else their number.

    ``field_times`` [s] count from the end of the soak. ``field_format`` is ``"vtu"`` or
    ``"vtkhdf"``, which takes the fields as the run goes on; ``pictures`` are the ``"charts"``
    or the ``"scenes"`` of the part as well.
    """

    positions: tuple[PositionInput, ...]
    field_times: tuple[float, ...] = ()
    n_field: int = 24
    paths: tuple[PathInput, ...] = ()
    field_format: str = "vtu"
    pictures: str = "charts"


@dataclass(frozen=True)
class Grid:
    """Cells along each axis, empty where the tool chooses; asked accuracy [K]."""

    cells: tuple[int, ...] = ()
    accuracy: float = 0.5


@dataclass(frozen=True)
class Need:
    """What the drawing asks for: a quantity at a place, within limits.

    ``position`` names a place (an output position, a trade term, a depth) or is
    ``EVERYWHERE``: every solved node. ``at_least`` and ``at_most`` are in ``unit``
    (HRC, HV, HB; MPa, ksi; % by mass; mm, in; um; ASTM), one of them at least is
    given. ``to`` belongs to a hardened depth: a hardness, or percent of martensite.
    """

    position: str
    quantity: str
    unit: str
    at_least: float | None = None
    at_most: float | None = None
    to: float | None = None
    to_unit: str = ""

    @property
    def text(self) -> str:
        """The requirement in words: ``"hardness at mid-radius: at least 28 HRC"``."""
        low, high = (
            None if limit is None else with_unit(limit, self.unit)
            for limit in (self.at_least, self.at_most)
        )
        limits = f"between {low} and {high}"
        if low is None or high is None:
            limits = f"at least {low}" if low is not None else f"at most {high}"
        if self.to is not None:
            where = f" to {with_unit(self.to, self.to_unit)}"
        else:
            where = f" {EVERYWHERE}" if self.position == EVERYWHERE else f" at {self.position}"
        return f"{self.quantity}{where}: {limits}"


def with_unit(value: float, unit: str) -> str:
    """``28 HRC``, ``ASTM 5``: every digit of the value, the unit on its side."""
    number = repr(float(value)).removesuffix(".0")
    return f"{unit} {number}" if unit == "ASTM" else f"{number} {unit}"


@dataclass(frozen=True, kw_only=True)
class Asked:
    """What every case asks for, wherever its temperatures come from."""

    title: str
    steel: SteelInput
    route: tuple[Stage, ...]
    outputs: Outputs
    needs: tuple[Need, ...] = ()
    text: str = field(default="", compare=False, repr=False)
    path: Path | None = field(default=None, compare=False)

    @property
    def soak(self) -> Stage:
        """The soak."""
        return next(stage for stage in self.route if stage.kind == "soak")

    @property
    def heating(self) -> tuple[Stage, ...]:
        """The stages that heat the part, before the soak; none where it is hot throughout."""
        return tuple(stage for stage in self.route if stage.kind == "heat")

    @property
    def cooling(self) -> tuple[Stage, ...]:
        """The stages between the soak and the tempers."""
        return tuple(stage for stage in self.route if stage.kind not in ("heat", "soak", "temper"))

    @property
    def tempers(self) -> tuple[Stage, ...]:
        """The stages that temper the cooled part, the last of the route."""
        return tuple(stage for stage in self.route if stage.kind == "temper")

    @property
    def watched(self) -> Mapping[str, PositionInput]:
        """By name, the output positions and then the other places that a need names."""
        found = {place.name: place for place in self.outputs.positions}
        for need in self.needs:
            if need.position != EVERYWHERE and need.position not in found:
                found[need.position] = self.position(need.position)
        return found

    def position(self, name: str) -> PositionInput:
        """The place that ``name`` means: an output position, else a trade term or a depth.

        Raises
        ------
        InputFault
            If the name is neither.
        """
        for place in self.outputs.positions:
            if place.name == name:
                return place
        return position(name)


@dataclass(frozen=True, kw_only=True)
class Case(Asked):
    """A whole case. Two cases are equal when they ask for the same computation."""

    section: SectionInput
    grid: Grid = Grid()
    load: LoadInput | None = None
    tank: TankInput | None = None
    shift: tuple[ShiftInput, ...] = ()


ZONES: Mapping[str, tuple[str, ...]] = {
    "slab": ("near face", "far face"),
    "round": ("side",),
    "tube": ("outside", "bore"),
    "ball": ("surface",),
    "bar": ("left", "right", "bottom", "top"),
    "ring": ("outside", "bore", "bottom", "top"),
}
TRADE_TERMS: tuple[PositionKind, ...] = ("surface", "mid-radius", "quarter thickness", "core")
BELOW_SURFACE = " below surface"
EVERYWHERE = "everywhere"


def position(text: str) -> PositionInput:
    """A place by its trade term (``"core"``) or as ``"12 mm below surface"``."""
    for term in TRADE_TERMS:
        if text == term:
            return PositionInput(name=term, kind=term)
    if text.endswith(BELOW_SURFACE):
        depth = parse(text.removesuffix(BELOW_SURFACE), "length")
        return PositionInput(name=text, kind="depth", depth=depth)
    near = get_close_matches(text[:80], TRADE_TERMS, n=1)
    remedy = f'Write "{near[0]}" if that is meant.' if near else ""
    terms = ", ".join(f'"{term}"' for term in TRADE_TERMS)
    allowed = f'{terms} or a depth such as "12 mm below surface"'
    raise InputFault("position", f'"{text}"', allowed, remedy)
