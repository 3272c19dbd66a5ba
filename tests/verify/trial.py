"""Made-up materials and bodies put through the heat solver."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from midradius.fem.coupled import Run, Sink, Surroundings, Watch
from midradius.fem.grids import Axis, halved
from midradius.fem.volumes import ControlVolumes
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.assemble import inert_tables
from midradius.thermo.kinetics import Tables

Curve = Callable[[Array], Array]
HELD = 1e9  # W/(m2 K): a film that holds the face at its ambient


@dataclass(frozen=True)
class Stuff:
    """A material that does not transform; ``density`` [kg/m3]."""

    tables: Tables
    density: float


def constant(*, k: float, density: float, cp: float) -> Stuff:
    """A material with constant properties, for 200 to 2200 K."""
    return varying(
        lambda t: np.full_like(t, k),
        lambda t: cp * (t - 200.0),
        density=density,
        first=200.0,
        last=2200.0,
        step=50.0,
    )


def varying(
    conductivity: Curve, enthalpy: Curve, *, density: float, first: float, last: float, step: float
) -> Stuff:
    """A material by its curves [W/(m K)], [J/kg] over temperature [K]."""
    return Stuff(inert_tables(conductivity, enthalpy, first=first, last=last, step=step), density)


@dataclass(frozen=True)
class Face:
    """What a zone sees: film [W/(m2 K)], ambient [K] (one, or over time), flux [W/m2].

    ``htc`` is a number, or (temperatures [K], coefficients).
    """

    htc: float | tuple[Array, Array]
    ambient: float | Array = 300.0
    flux: float = 0.0


def around(
    *faces: Face,
    moment: Array | None = None,
    source: Array | None = None,
    source_moment: Array | None = None,
) -> Surroundings:
    """Surroundings, one face for each zone in the body's order."""
    temps = [f.htc[0] for f in faces if isinstance(f.htc, tuple)]
    grid = np.unique(np.concatenate(temps)) if temps else np.array([0.0, 5000.0])
    htc = [
        np.interp(grid, *f.htc) if isinstance(f.htc, tuple) else np.full(len(grid), f.htc)
        for f in faces
    ]
    when = np.zeros(1) if moment is None else moment
    return Surroundings(
        film_temp=grid,
        film_htc=np.array(htc),
        ambient=np.array([np.broadcast_to(f.ambient, len(when)) for f in faces], dtype=np.float64),
        moment=when,
        flux=np.array([f.flux for f in faces]),
        source=source,
        source_moment=source_moment,
    )


def start(
    body: ControlVolumes,
    stuff: Stuff,
    temp: float | Array,
    *,
    fields: Sequence[float] = (),
    watch: Sequence[int] = (),
    sink: Sink | None = None,
) -> Run:
    """A body at its starting temperature [K], ready to run."""
    field = np.broadcast_to(np.asarray(temp, dtype=np.float64), body.n_node).copy()
    state = np.zeros((body.n_node, kin.N_STATE))
    state[:, kin.COLDEST] = field
    return Run(
        body,
        stuff.tables,
        density=stuff.density,
        temp=field,
        state=state,
        carbon_pct=0.0,
        watch=Watch(
            np.array(watch, dtype=np.int64).reshape(-1, 1),
            np.ones((len(watch), 1)),
        ),
        field_times=np.array(fields, dtype=np.float64),
        sink=sink,
    )


def cooled(
    body: ControlVolumes,
    stuff: Stuff,
    temp: float | Array,
    surroundings: Surroundings,
    duration: float,
    *,
    tolerance: float,
) -> Run:
    """The run after ``duration`` [s]."""
    run = start(body, stuff, temp)
    run.stage(surroundings, duration=duration, tolerance=tolerance)
    return run


def in_even_steps(
    body: ControlVolumes,
    stuff: Stuff,
    temp: float | Array,
    surroundings: Surroundings,
    duration: float,
    *,
    steps: int,
    tolerance: float = 1e6,
) -> Run:
    """The run after ``steps`` equal steps; the tolerance must allow them all."""
    run = start(body, stuff, temp)
    # a hair longer, so that rounding cannot split the last step in two
    step = duration / steps * (1.0 + 1e-12)
    run.stage(surroundings, duration=duration, tolerance=tolerance, first_step=step, longest=step)
    clock = run.progress.clock
    assert (clock[3], clock[4]) == (steps, 0), f"{clock[3]} steps, {clock[4]} refused"
    return run


def matrices(body: ControlVolumes) -> tuple[Array, Array]:
    """Graph Laplacian of ``conductance_length`` and face areas by zone, both dense."""
    n = body.n_node
    laplacian = np.zeros((n, n))
    for (i, j), g in zip(body.edge, body.conductance_length, strict=True):
        laplacian[i, i] += g
        laplacian[j, j] += g
        laplacian[i, j] -= g
        laplacian[j, i] -= g
    area = np.zeros((n, max(len(body.zones), 1)))
    np.add.at(area, (body.face_node, body.face_zone), body.face_area)
    return laplacian, area


def renumbered(body: ControlVolumes, order: IntArray) -> ControlVolumes:
    """The same body whose node ``i`` is the old node ``order[i]``."""
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    return replace(
        body,
        points=body.points[order],
        volume=body.volume[order],
        edge=place[body.edge],
        face_node=place[body.face_node],
    )


def one_zone_each(body: ControlVolumes) -> ControlVolumes:
    """Every face a zone of its own, so that each may see another ambient."""
    n = len(body.face_node)
    return replace(
        body, face_zone=np.arange(n, dtype=np.int64), zones=tuple(f"face {i}" for i in range(n))
    )


def orders(errors: Sequence[float]) -> Array:
    """Observed orders of errors whose cells or steps halve each time."""
    e = np.asarray(errors)
    return np.asarray(np.log2(e[:-1] / e[1:]))


def family(finest: Axis, count: int) -> list[Axis]:
    """``count`` axes, coarsest first, each with every second node of the next."""
    out = [finest]
    for _ in range(count - 1):
        out.append(halved(out[-1]))
    return out[::-1]


def lopsided(length: float, n_cell: int, zone: str) -> Axis:
    """Cells that alternate 6 : 4, which no smooth stretching makes; the high end cools."""
    nodes = np.linspace(0.0, length, n_cell + 1)
    nodes[1::2] += 0.2 * length / n_cell
    return Axis(nodes, None, zone)
