"""The reference round of the speed goals, for our solver and for peers.

A round of radius 150 mm, 200 even cells, 4 h of cooling from 860 degC in a bath
of 60 degC whose film has a boiling peak; properties of a plain steel. Two
materials: an inert one, and a transforming steel whose rates a method-of-lines
peer integrates as further unknowns of the same system.
"""

import time
from dataclasses import dataclass

import numpy as np

from midradius.fem.coupled import Run, Surroundings, Watch
from midradius.fem.grids import axis, line, rectangle
from midradius.fem.volumes import ControlVolumes
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.assemble import inert_tables, initial_state, steel_tables
from midradius.thermo.austenite import soak
from midradius.thermo.grades import grade
from midradius.thermo.kinetics import COLDEST, N_STATE, Tables

ZERO = 273.15
DENSITY = 7850.0
START, BATH = 860.0 + ZERO, 60.0 + ZERO
FILM_TEMP = np.array([150.0, 450.0, 700.0]) + ZERO
FILM = np.array([250.0, 1800.0, 400.0])
DURATION = 4.0 * 3600.0
STORED = np.linspace(0.0, DURATION, 201)


def conductivity(temp: Array) -> Array:
    """[W/(m K)]"""
    t = temp - ZERO
    return np.where(t < 800.0, 54.0 - 0.0333 * t, 27.3)


def capacity(temp: Array) -> Array:
    """[J/(kg K)]"""
    t = temp - ZERO
    low = 425.0 + 0.773 * t - 1.69e-3 * t**2 + 2.22e-6 * t**3
    middle = 760.0 - 110.0 / 300.0 * (t - 600.0)
    return np.where(t < 600.0, low, np.where(t < 900.0, middle, 650.0))


def enthalpy(temp: Array) -> Array:
    """[J/kg], the integral of the capacity from 230 K."""
    fine = np.arange(230.0, 1500.5, 0.25)
    cp = capacity(fine)
    total = np.concatenate([[0.0], np.cumsum(0.5 * (cp[1:] + cp[:-1]) * 0.25)])
    return np.interp(temp, fine, total)


@dataclass(frozen=True)
class Outcome:
    """Stored temperatures (n_time, n_node) [K] and the counts.

    ``times`` of the steps, ``at_steps`` (n_step + 1,) the temperature of the watched
    node then [K], ``seconds`` of processor time.
    """

    field: Array
    n_step: int
    balance: float
    times: Array
    at_steps: Array
    seconds: float


def round_section(n_cell: int = 200) -> ControlVolumes:
    """The round."""
    along = axis(0.0, 0.15, n_cell, fine="even", first=1.0, low=None, high="side")
    return line(along, "cylinder")


def square_quarter(n_cell: int) -> ControlVolumes:
    """A quarter of a 200 mm square bar."""
    side = axis(0.0, 0.1, n_cell, fine="even", first=1.0, low=None, high="side")
    return rectangle(side, side, "plane")


def block_corner(n_cell: int) -> ControlVolumes:
    """The corner of a block, 100 mm each way: three faces cooled, three of symmetry."""
    along = axis(0.0, 0.1, n_cell, fine="even", first=1.0, low=None, high="side")
    nodes, size = along.nodes, np.diff(along.faces)
    n = len(nodes)
    number = np.arange(n**3).reshape(n, n, n)
    area = size[:, None, None] * size[None, :, None]  # across the last direction
    through = area / np.diff(nodes)[None, None, :]
    edge, conductance, node, faces = [], [], [], []
    for way in range(3):
        turned = np.moveaxis(number, way, 2)
        edge.append(np.stack([turned[:, :, :-1].ravel(), turned[:, :, 1:].ravel()], axis=1))
        conductance.append(through.ravel())
        node.append(turned[:, :, -1].ravel())
        faces.append(np.broadcast_to(area, (n, n, 1)).ravel())
    return ControlVolumes(
        points=np.stack([x.ravel() for x in np.meshgrid(nodes, nodes, nodes, indexing="ij")], 1),
        volume=(size[:, None, None] * size[None, :, None] * size[None, None, :]).ravel(),
        edge=np.concatenate(edge),
        conductance_length=np.concatenate(conductance),
        face_node=np.concatenate(node),
        face_area=np.concatenate(faces),
        face_zone=np.zeros(3 * n * n, dtype=np.int64),
        zones=("side",),
        sense="plane",
    )


def of_triangles(points: Array, cells: IntArray) -> ControlVolumes:
    """Linear triangles (n_cell, 3) of the quarter square: stiffness weights, lumped capacity."""
    n = len(points)
    corner = points[cells]
    weight, pairs = [], []
    for k in range(3):
        a, b = corner[:, (k + 1) % 3] - corner[:, k], corner[:, (k + 2) % 3] - corner[:, k]
        cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
        weight.append(0.5 * (a * b).sum(axis=1) / np.abs(cross))  # half the cotangent
        pairs.append(np.sort(cells[:, [(k + 1) % 3, (k + 2) % 3]], axis=1))
    key = np.concatenate(pairs) @ np.array([n, 1])
    unique, inverse, count = np.unique(key, return_inverse=True, return_counts=True)
    edge = np.stack([unique // n, unique % n], axis=1)
    outer = edge[count == 1]
    cooled = outer[np.isclose(points[outer], points.max()).all(axis=1).any(axis=1)]
    length = np.linalg.norm(np.diff(points[cooled], axis=1)[:, 0], axis=1)
    area = np.bincount(cooled.ravel(), np.repeat(0.5 * length, 2), n)
    node = np.flatnonzero(area)
    return ControlVolumes(
        points=points,
        volume=np.bincount(cells.ravel(), np.repeat(np.abs(cross) / 6.0, 3), n),
        edge=edge,
        conductance_length=np.bincount(inverse, np.concatenate(weight)),
        face_node=node,
        face_area=area[node],
        face_zone=np.zeros(len(node), dtype=np.int64),
        zones=("side",),
        sense="plane",
    )


def inert() -> Tables:
    """The material without transformation."""
    return inert_tables(conductivity, enthalpy, first=230.0, last=1500.0, step=1.0)


def steel() -> tuple[Tables, Array, float]:
    """42CrMo4 after an hour at the starting temperature: tables, one node's state, carbon."""
    heat = grade("42CrMo4")
    left = soak(heat, START, 3600.0, grain_astm=7.0)
    return (
        steel_tables(heat, left),
        initial_state(left, heat.composition.C, START, 1),
        (heat.composition.C),
    )


def ours(
    body: ControlVolumes,
    tables: Tables,
    *,
    tolerance: float,
    duration: float = DURATION,
    start: Array | None = None,
    carbon_pct: float = 0.0,
    watched: int = 0,
) -> Outcome:
    """Our solver on a section; ``start`` is one node's state."""
    n = body.n_node
    state = np.zeros((n, N_STATE))
    state[:, COLDEST] = START
    if start is not None:
        state[:] = start
    run = Run(
        body,
        tables,
        density=DENSITY,
        temp=np.full(n, START),
        state=state,
        carbon_pct=carbon_pct,
        watch=Watch(np.array([[watched]]), np.ones((1, 1))),
        field_times=STORED * duration / DURATION,
    )
    around = Surroundings(
        film_temp=FILM_TEMP,
        film_htc=FILM[None, :],
        ambient=np.array([[BATH]]),
        moment=np.zeros(1),
        flux=np.zeros(1),
    )
    begin = time.process_time()
    run.stage(around, duration=duration, tolerance=tolerance)
    seconds = time.process_time() - begin
    lost = run.heat_at_start - run.heat()
    balance = abs(lost + float(run.progress.zone_heat.sum())) / lost
    history = run.history
    return Outcome(
        run.progress.field,
        int(run.progress.clock[3]),
        balance,
        history[:, 0, 0],
        history[:, 1, 0],
        seconds,
    )


def right_hand_side(body: ControlVolumes):  # type: ignore[no-untyped-def]
    """dT/dt of the same equations, for a method-of-lines peer."""
    mass = body.volume * DENSITY
    tail, head = body.edge[:, 0], body.edge[:, 1]

    def slope(_time: float, temp: Array) -> Array:
        k = conductivity(temp)
        flow = body.conductance_length * 0.5 * (k[tail] + k[head]) * (temp[head] - temp[tail])
        rate = np.bincount(tail, flow, len(mass)) - np.bincount(head, flow, len(mass))
        surface = temp[body.face_node]
        film = np.interp(surface, FILM_TEMP, FILM)
        rate += np.bincount(body.face_node, -body.face_area * film * (surface - BATH), len(mass))
        out: Array = rate / (mass * capacity(temp))
        return out

    return slope


def right_hand_side_with_steel(  # type: ignore[no-untyped-def]
    body: ControlVolumes, tables: Tables, carbon_pct: float
):
    """d/dt of temperature, ferrite, pearlite, bainite, martensite at every node.

    The rate form ``dx/dt = x^(0.4(1-x)) (1-x)^(0.4x) / tau0`` with the share x of
    the limit, a seed of 1e-5, and martensite in the apparent capacity: the same
    physics as ours for a steel without grain-boundary cementite.
    """
    mass = body.volume * DENSITY
    n = len(mass)
    tail, head = body.edge[:, 0], body.edge[:, 1]
    value, first, step = tables.value[0], tables.first, tables.step
    seed = 1e-5

    def slope(_time: float, y: Array) -> Array:
        temp, f, p, b, m = y.reshape(5, n)
        grid = np.clip((temp - first) / step, 0.0, len(value) - 1.001)
        row = grid.astype(int)
        part = (grid - row)[:, None]
        at = value[row] * (1.0 - part) + value[row + 1] * part
        by = (value[row + 1] - value[row]) / step
        austenite = np.clip(1.0 - f - p - b - m, 1e-12, 1.0)
        in_ferrite = at[:, kin.CARBON_FERRITE] * f
        carbon = np.clip((carbon_pct - in_ferrite) / np.maximum(1.0 - f, 1e-9), 0.0, 2.0)

        def grow(x: Array, limit: Array, rate: Array) -> Array:
            share = np.clip(x / np.maximum(limit, 1e-9), seed, 1.0)
            speed = share ** (0.4 * (1.0 - share)) * np.maximum(1.0 - share, 0.0) ** (0.4 * share)
            return np.where((limit > x) & (austenite > 1e-9), limit * speed * rate, 0.0)

        df = grow(f, np.minimum(at[:, kin.LIMIT_FERRITE], f + austenite), at[:, kin.RATE_FERRITE])
        dp = grow(p, p + austenite, at[:, kin.RATE_PEARLITE])
        db = grow(b, b + austenite, at[:, kin.RATE_BAINITE])
        rest = f + p + b
        carbon_a, carbon_m = austenite * carbon, m * carbon
        carbon_rest = carbon_pct - carbon_a - carbon_m
        cp = (
            austenite * by[:, kin.H_AUSTENITE] + carbon_a * by[:, kin.H_AUSTENITE_C]
            + rest * by[:, kin.H_FERRITE] + carbon_rest * by[:, kin.H_FERRITE_C]
            + m * by[:, kin.H_MARTENSITE] + carbon_m * by[:, kin.H_MARTENSITE_C]
        )  # fmt: skip
        h_a = at[:, kin.H_AUSTENITE] + carbon * at[:, kin.H_AUSTENITE_C]
        h_f = at[:, kin.H_FERRITE] + carbon * at[:, kin.H_FERRITE_C]
        h_m = at[:, kin.H_MARTENSITE] + carbon * at[:, kin.H_MARTENSITE_C]
        a, bb, c = tables.start[0]
        start = a - bb * (1.0 - np.exp(-c * carbon))
        a, bb, c = tables.rate[0]
        speed = np.where(temp < start, (a - bb * (1.0 - np.exp(-c * carbon))) * austenite, 0.0)
        k = (
            austenite * at[:, kin.K_AUSTENITE] + rest * at[:, kin.K_FERRITE]
            + m * at[:, kin.K_MARTENSITE]
        )  # fmt: skip
        flow = body.conductance_length * 0.5 * (k[tail] + k[head]) * (temp[head] - temp[tail])
        rate = np.bincount(tail, flow, n) - np.bincount(head, flow, n)
        surface = temp[body.face_node]
        film = np.interp(surface, FILM_TEMP, FILM)
        rate += np.bincount(body.face_node, -body.face_area * film * (surface - BATH), n)
        heating = rate / mass + (df + dp + db) * (h_a - h_f)
        cooled = heating / (cp + speed * (h_a - h_m))
        dtemp = np.where(heating < 0.0, cooled, heating / cp)
        dm = np.where(dtemp < 0.0, -speed * dtemp, 0.0)
        return np.concatenate([dtemp, df, dp, db, dm])

    return slope
