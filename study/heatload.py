"""The heat that a load gives to its bath, from the section's own solution.

Model
-----
The part is solved as any case is; its heat through the surface in the tank is that of
its enthalpies, latent heat included, times the mass of the load. Baskets and fixtures
are slabs of their steel and thickness, cooled on both faces through the same stages
for the same times. The bath's temperature enters as ambient and through the films,
which are made anew for every interval of the immersion.

Source
------
Enthalpies: `thermo.properties`; films: `fem.media`. Waveform relaxation: Lelarasmee,
Ruehli & Sangiovanni-Vincentelli 1982 (remembered); it converges on every finite time.

Holds for
---------
Pieces that all see the same bath. Pieces in the wake of others see a hotter one.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem import section as forms
from midradius.fem.cutting import AnyCut, AnySection
from midradius.fem.media import ZERO_DEGC, medium
from midradius.fem.meshcut import cut_mesh
from midradius.fem.meshsection import MeshSection
from midradius.fem.place import Place
from midradius.fem.route import CoolingStage, History, Piece, Surface, cool
from midradius.fem.section import Section
from midradius.fem.surface import Film, film
from midradius.study.begin import Begun, begin
from midradius.study.case import Case, MediumUse, SectionInput, Stage, SteelInput, position
from midradius.study.casetank import tank_stage
from midradius.study.setup import Setup, coordinates_of, prepare, uses_of
from midradius.study.tankinput import LoadInput
from midradius.thermo import properties
from midradius.thermo.arrays import Array
from midradius.thermo.errors import SolverFault
from midradius.thermo.source import Source

SOURCES = (
    Source("bath and section as one problem", "Lelarasmee et al. 1982", "relaxation", "remembered"),
)

TOLERANCE = 0.05  # K per step, as the runner's scout
SETTLED = 0.01  # K between two bath paths
MOST_ROUNDS = 15
N_PIECE = 60
FIRST_PIECE = 0.5  # s
STAYS_AT_MOST = 3.0  # times what it would stay in a bath that is held
HOT_THROUGHOUT = 3600.0  # s, soak of a fixture where the case ends its own by temperature
GROWTH = 1.3  # of the pieces of the first round, whose length is not known yet


@dataclass(frozen=True)
class BathPath:
    """Temperatures of the bath ``temp`` (n,) [K] at ``time`` (n,) [s] since immersion."""

    time: Array
    temp: Array


@dataclass(frozen=True)
class Body:
    """A case made ready for the march, and how many kilograms of it a load holds."""

    name: str
    case: Case
    setup: Setup
    cut: AnyCut
    begun: Begun
    mass: float

    @property
    def mass_per_extent(self) -> float:
        """Mass of the solved section [kg per its extent]."""
        return properties.DENSITY * float(self.cut.body.volume.sum())


@dataclass(frozen=True)
class Given:
    """What a load gives: ``heat`` (n,) [J] until ``time`` (n,) [s] since immersion.

    ``left`` [J] is what it still holds when it leaves the bath, above ferrite with
    cementite of 20 degC; ``before`` [J] what went to the air on the way. ``balance`` is
    the largest gap of a body's own account. ``path`` is the bath that it saw.
    ``cut_short``: the bath kept it from the condition that ends its stage.
    """

    time: Array
    heat: Array
    left: float
    before: float
    balance: float
    path: BathPath
    part: History
    rounds: int
    cut_short: bool = False

    @property
    def stay(self) -> float:
        """How long the load is in the bath [s]."""
        return float(self.time[-1])

    @property
    def total(self) -> float:
        """Heat given to the bath [J]."""
        return float(self.heat[-1])

    @property
    def peak(self) -> float:
        """Largest mean rate of one interval of a second or more [W]."""
        even = np.arange(0.0, self.stay, 1.0)
        if len(even) < 2:
            return self.total / max(self.stay, 1e-9)
        return float(np.diff(np.interp(even, self.time, self.heat)).max())


def piece_mass(section: SectionInput, load: LoadInput, per_extent: float) -> float:
    """Mass of one piece [kg]; ``per_extent`` that of the section as it is named [kg]."""
    if load.piece_mass is not None:
        return load.piece_mass
    return per_extent * (load.length if load.length is not None else 1.0)


def bodies_of(case: Case) -> tuple[Body, ...]:
    """The pieces of a case's load as one body, then its fixtures.

    Raises
    ------
    InputFault
        As `setup.prepare`.
    """
    load = case.load or LoadInput()
    part = _body("pieces", case, 0.0)
    factor, _ = part.setup.section.whole
    one = piece_mass(case.section, load, factor * part.mass_per_extent)
    found = [replace(part, mass=load.pieces * one)]
    for fixture in load.fixtures:
        steel = SteelInput(fixture.steel) if fixture.steel else case.steel
        found.append(_body(fixture.name, as_slab(case, fixture.thickness, steel), fixture.mass))
    return tuple(found)


def as_slab(case: Case, thickness: float, steel: SteelInput) -> Case:
    """The same cooling for a slab of that thickness [m] that is hot throughout, both faces
    in each stage's medium."""
    hot = max(stage.at or 0.0 for stage in (*case.heating, case.soak))
    stages = [Stage("soak", at=hot, time=case.soak.time or HOT_THROUGHOUT)]
    for stage in case.cooling:
        use = stage.medium or next(iter(stage.faces.values()), None)
        until = replace(stage.until, position="core") if stage.until else None
        stages.append(replace(stage, medium=use, faces={}, until=until))
    return replace(
        case,
        steel=steel,
        section=SectionInput("slab", thickness=thickness, emissivity=case.section.emissivity),
        route=tuple(stages),
        outputs=replace(case.outputs, positions=(position("core"),)),
        needs=(),
        grid=replace(case.grid, cells=()),
    )


def _body(name: str, case: Case, mass: float) -> Body:
    setup = prepare(case)
    cut = _cut(setup)
    places = _places(case, cut)
    begun = begin(case, setup.furnace, cut, places=places, watched=("core",), tolerance=TOLERANCE)
    return Body(name, case, setup, cut, begun, mass)


def _cut(setup: Setup) -> AnyCut:
    """A grid fine enough for the heat: in two and three dimensions the coarser one."""
    section: AnySection = setup.section
    if isinstance(section, MeshSection):
        return cut_mesh(section, 0)
    assert isinstance(section, Section), "a section is a form or a mesh"
    cells = tuple(4 * int(np.ceil(n / 4)) for n in forms.cells_for(section, 1.0))
    cut = forms.cut(section, cells, strongest_film=setup.strongest_film)
    return (cut.coarser() or cut) if len(cells) > 1 else cut


def _places(case: Case, cut: AnyCut) -> dict[str, Place]:
    named = {place.name: place for place in case.outputs.positions}
    for stage in (*case.heating, *case.cooling):
        if stage.until and stage.until.position not in named:
            named[stage.until.position] = case.position(stage.until.position)
    named.setdefault("core", position("core"))
    return {name: cut.place(coordinates_of(cut.section, at)) for name, at in named.items()}


def tank_index(case: Case) -> int:
    """Which of the cooling stages happens in the tank."""
    number = tank_stage(case.route)
    assert number is not None, "the reader checked that a quench is in a liquid"
    return case.cooling.index(case.route[number])


def stages_in(
    setup: Setup,
    case: Case,
    path: BathPath,
    film_factor: float = 1.0,
    longest: float | None = None,
) -> tuple[CoolingStage, ...]:
    """The stages of a case, that in the tank with the bath on a path, at most ``longest`` [s]."""
    index = tank_index(case)
    stage, given = setup.stages[index], case.cooling[index]
    use = given.medium
    assert use is not None
    uses = uses_of(setup.section, case.section, given)
    same = [zone for zone, seen in uses.items() if _same(seen, use)]

    def surfaces(start: float, end: float | None) -> Mapping[str, Surface]:
        middle = start if end is None else 0.5 * (start + end)
        curve = _film_at(use, middle, stage.surfaces[same[0]].film, film_factor)
        changed = {zone: Surface(stage.surfaces[zone].label, curve, start, end) for zone in same}
        return {**stage.surfaces, **changed}

    pieces = tuple(
        Piece(float(after - now), surfaces(float(start), float(end)))
        for now, after, start, end in zip(
            path.time[:-1], path.time[1:], path.temp[:-1], path.temp[1:], strict=True
        )
    )
    rest = surfaces(float(path.temp[-1]), None)
    duration = stage.duration if stage.duration is not None else longest
    changed = replace(stage, surfaces=rest, pieces=pieces, duration=duration)
    return tuple(changed if k == index else s for k, s in enumerate(setup.stages))


def _same(seen: MediumUse, tank: MediumUse) -> bool:
    return (seen.name, seen.film_file) == (tank.name, tank.film_file)


def _film_at(use: MediumUse, bath: float, own: Film, factor: float) -> Film:
    curve = own
    if use.film_file is None:
        known = medium(use.name or "")
        # A bath that runs away keeps the film of its hottest table; the notes say so.
        held = min(max(bath, known.bath_min), known.bath_max)
        curve, _ = film(known, bath=held, length=1.0, geometry="sphere")
    return Film(curve.temp, factor * curve.htc, curve.name)


def march_body(
    body: Body,
    path: BathPath,
    *,
    film_factor: float = 1.0,
    durations: Mapping[int, float] | None = None,
    longest: float | None = None,
) -> History:
    """One body through its route.

    ``durations`` [s] by stage replace its own ends; ``longest`` [s] is how long it may
    stay in the tank for a condition that its bath may never allow.
    """
    stages = list(stages_in(body.setup, body.case, path, film_factor, longest))
    for k, seconds in (durations or {}).items():
        stages[k] = replace(stages[k], duration=seconds, until_place=None, until_temp=None)
    if durations is not None:
        stages = stages[: len(durations)]
    places = _places(body.case, body.cut)
    return cool(
        body.cut,
        body.begun.tables,
        tuple(stages),
        density=properties.DENSITY,
        start_temp=body.begun.temp,
        state=body.begun.state,
        carbon_pct=body.case.steel.steel.composition.C,
        places=places,
        watched=("core",),
        field_times=np.zeros(1),
        tolerance=TOLERANCE,
        scale=body.begun.scale,
        first_number=len(body.case.heating) + 1,
    )


Response = Callable[[Array, Array], BathPath]
"""From the heat of a load [J] on the seconds since immersion to the bath that it makes."""


def solve(
    bodies: tuple[Body, ...],
    *,
    bath: float,
    response: Response | None,
    film_factor: float = 1.0,
    longest: float | None = None,
) -> Given:
    """A load in its bath, both at once.

    Parameters
    ----------
    bodies
        From `bodies_of`.
    bath
        The bath at immersion [K].
    response
        What the bath does; None keeps it at ``bath``.
    film_factor
        On the film coefficients in the tank.
    longest
        The load is taken out after it [s] where the bath keeps it from its condition.

    Raises
    ------
    SolverFault
        Bath and load do not settle.
    """
    index = tank_index(bodies[0].case)
    begin_at = np.concatenate([[0.0], np.cumsum(FIRST_PIECE * GROWTH ** np.arange(40))])
    path = BathPath(begin_at, np.full(len(begin_at), bath))
    for round_number in range(1, MOST_ROUNDS + 1):
        given = _give(bodies, path, index, film_factor, longest, round_number)
        if round_number > 1 and response is None:
            return given
        # One piece ends with the stay itself; beyond it the bath is not known yet.
        first = min(FIRST_PIECE, 0.25 * given.stay)
        grid = np.geomspace(first, given.stay, N_PIECE)
        grid = np.concatenate([[0.0], grid, [1.2 * given.stay]])
        if response is None:
            path = BathPath(grid, np.full(len(grid), bath))
            continue
        made = response(given.time, given.heat)
        after = np.interp(grid, made.time, made.temp)
        moved = np.abs(after - np.interp(grid, path.time, path.temp))
        inside = grid <= given.stay
        if round_number > 1 and float(moved[inside].max()) < SETTLED:
            return given
        path = BathPath(grid, after)
    raise SolverFault(
        f"Bath and load did not settle in {MOST_ROUNDS} rounds: the bath is very small for"
        " its load. Enlarge the volume."
    )


def _give(
    bodies: tuple[Body, ...],
    path: BathPath,
    stage: int,
    film_factor: float,
    longest: float | None,
    rounds: int,
) -> Given:
    part = march_body(bodies[0], path, film_factor=film_factor, longest=longest)
    ends = part.stages[: stage + 1]
    durations = {k: end.end - end.start for k, end in enumerate(ends)}
    histories = [part] + [
        march_body(body, path, film_factor=film_factor, durations=durations) for body in bodies[1:]
    ]
    begun = ends[stage].start
    time = np.concatenate([[0.0], np.array(ends[stage].moments) - begun])
    heat, left, before = np.zeros(len(time)), 0.0, 0.0
    for body, history in zip(bodies, histories, strict=True):
        factor = body.mass / body.mass_per_extent
        end = history.stages[stage]
        own = np.concatenate([[0.0], np.array(end.moments) - end.start])
        heat += factor * np.interp(time, own, np.concatenate([[0.0], end.heat_until]))
        air = sum(s.heat_given for s in history.stages[:stage])
        before += factor * air
        left += factor * (history.heat_before - air - end.heat_given)
    balance = max(history.balance for history in histories)
    own_stage = bodies[0].setup.stages[stage]
    short = own_stage.duration is None and ends[stage].ended_by == "time"
    return Given(time, heat, left, before, balance, path, part, rounds, short)


def degC(temp: float) -> str:
    """A temperature for a text."""
    return f"{temp - ZERO_DEGC:.4g} degC"
