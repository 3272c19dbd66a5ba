"""Conservation, likeness, symmetry: what holds whatever the material.

The material is carbon steel by EN 1993-1-2, whose conductivity and heat capacity
vary with temperature, under a film that rises and falls like a boiling liquid's.
"""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from trial import Face, around, cooled, in_even_steps, renumbered, varying

from midradius.fem import section
from midradius.fem.grids import Axis, axis, line, rectangle
from midradius.fem.volumes import ControlVolumes, Sense
from midradius.thermo import en1993
from midradius.thermo.arrays import Array

HOT, BATH = 1173.15, 333.15
FILM = (
    np.array([293.15, 423.15, 723.15, 973.15, 1173.15]),
    np.array([250.0, 300.0, 1800.0, 400.0, 400.0]),
)


# What two runs of one body in the same steps may differ by [K]: the last move of
# Newton's method is below 1e-3 and the method squares it. Measured 2.4e-5 K; of heat 1.43e-9.
SAME = 3.2e-5
SAME_HEAT = 1.9e-9
STEPS = 240


def steel_heat(temp: Array) -> Array:
    """EN 1993-1-2 heat content, continued below 20 degC by its value there."""
    below = np.maximum(293.15 - temp, 0.0) * en1993.heat_capacity(293.15)
    return np.asarray(en1993.enthalpy(np.maximum(temp, 293.15)) - below)


STEEL = varying(
    en1993.conductivity,
    steel_heat,
    density=en1993.DENSITY,
    first=263.15,
    last=1273.15,
    step=1.0,
)


def film(share: float) -> tuple[Array, Array]:
    """The film curve times a factor."""
    return FILM[0], share * FILM[1]


def body_of(sense: Sense, size: float = 1.0) -> ControlVolumes:
    """A graded body of each sense, with two or three zones."""
    if sense in ("plane", "axisymmetric"):
        return rectangle(
            axis(0.02 * size, 0.1 * size, 24, fine="both", first=1e-3 * size, low="a", high="b"),
            axis(0.0, 0.05 * size, 16, fine="high", first=1e-3 * size, low=None, high="c"),
            sense,
        )
    along = axis(0.02 * size, 0.1 * size, 64, fine="both", first=5e-4 * size, low="a", high="b")
    return line(along, sense)


SENSES: tuple[Sense, ...] = ("slab", "cylinder", "ball", "plane", "axisymmetric")


@pytest.mark.parametrize("tolerance", [0.5, 0.05])
@pytest.mark.parametrize("sense", SENSES)
def test_the_heat_a_part_loses_went_through_its_surface(sense: Sense, tolerance: float) -> None:
    body = body_of(sense)
    faces = [
        Face(film(1.0 + 0.3 * i), BATH + 20.0 * i, flux=1e3 * i) for i in range(len(body.zones))
    ]
    run = cooled(body, STEEL, HOT, around(*faces), 300.0, tolerance=tolerance)
    lost = run.heat_at_start - run.heat()
    assert_allclose(-run.progress.zone_heat.sum(), lost, rtol=1e-9, atol=0.0)
    # and the books are not kept by the same sum: from the tables, node by node
    mass = body.volume * STEEL.density
    content = np.sum(mass * (steel_heat(np.full_like(mass, HOT)) - steel_heat(run.progress.temp)))
    # the tables are linear between kelvins, the cusp at 735 degC costs 4e-7 at most
    assert_allclose(lost, content, rtol=2e-6, atol=0.0)


def test_what_goes_in_through_one_face_and_a_source_comes_to_stay() -> None:
    body = body_of("plane")
    source = np.tile(np.linspace(0.0, 1e6, body.n_node), (2, 1)) * np.array([[1.0], [3.0]])
    faces = [Face(0.0, BATH, flux=2e4), Face(0.0, BATH), Face(0.0, BATH, flux=-5e3)]
    surroundings = around(*faces, source=source, source_moment=np.array([0.0, 100.0]))
    run = cooled(body, STEEL, 500.0, surroundings, 100.0, tolerance=0.1)
    areas = np.bincount(body.face_zone, weights=body.face_area)
    through = np.array([2e4, 0.0, -5e3]) * areas * 100.0
    made = float(body.volume @ source.mean(axis=0)) * 100.0
    assert_allclose(run.progress.zone_heat, through, rtol=1e-10, atol=1e-9)
    kept = run.progress.book.sum() - run.heat_at_start
    assert_allclose(kept, through.sum() + made, rtol=1e-10, atol=0.0)
    # what Newton's method left over is in the books already, not yet in the field
    assert_allclose(run.heat() - run.heat_at_start, kept, rtol=1e-7, atol=0.0)


@pytest.mark.parametrize("sense", SENSES)
def test_twice_the_size_takes_four_times_as_long_under_half_the_film(sense: Sense) -> None:
    # every quantity scales by a power of two, so that even the steps are the same
    runs = []
    for size in (1.0, 2.0):
        body = body_of(sense, size)
        faces = [Face(film(1.0 / size), BATH)] * len(body.zones)
        runs.append(cooled(body, STEEL, HOT, around(*faces), 100.0 * size**2, tolerance=0.05))
    assert_allclose(runs[1].progress.temp, runs[0].progress.temp, rtol=0.0, atol=1e-6)
    seen = runs[0].progress.marks[:, :3] >= 0.0
    assert seen.any()
    assert_allclose(
        runs[1].progress.marks[:, :3][seen],
        4.0 * runs[0].progress.marks[:, :3][seen],
        rtol=1e-7,
        atol=0.0,
    )


@pytest.mark.parametrize(("flat", "solid"), [("slab", "plane"), ("cylinder", "axisymmetric")])
def test_a_line_is_a_plane_with_insulated_sides(flat: Sense, solid: Sense) -> None:
    along = axis(0.0, 0.05, 40, fine="high", first=5e-4, low=None, high="side")
    across = axis(0.0, 0.02, 4, fine="even", first=1.0, low=None, high=None)
    faces = around(Face(film(1.0), BATH))
    thin = in_even_steps(line(along, flat), STEEL, HOT, faces, 120.0, steps=STEPS)
    wide = in_even_steps(rectangle(along, across, solid), STEEL, HOT, faces, 120.0, steps=STEPS)
    field = wide.progress.temp.reshape(41, 5)
    assert_allclose(field, np.tile(thin.progress.temp[:, None], 5), rtol=0.0, atol=SAME)
    assert_allclose(
        wide.progress.zone_heat[0], 0.02 * thin.progress.zone_heat[0], rtol=SAME_HEAT, atol=0.0
    )


def test_a_wall_of_large_radius_is_a_slab() -> None:
    # curvature falls with the radius: 1 % of thickness over radius in each doubling
    flat = axis(0.0, 0.05, 40, fine="both", first=5e-4, low="bore", high="outside")
    faces = around(Face(film(1.0), BATH), Face(film(1.0), BATH))
    slab = in_even_steps(line(flat, "slab"), STEEL, HOT, faces, 60.0, steps=STEPS)
    gaps = []
    for radius in (5.0, 50.0):
        wall = Axis(flat.nodes + radius, "bore", "outside")
        tube = in_even_steps(line(wall, "cylinder"), STEEL, HOT, faces, 60.0, steps=STEPS)
        gaps.append(float(np.abs(tube.progress.temp - slab.progress.temp).max()))
    assert_allclose(gaps[0] / gaps[1], 10.0, rtol=0.01, atol=0.0)


def halves(form: section.Section, cells: tuple[int, ...]) -> tuple[section.Cut, section.Cut]:
    """A form cut whole and cut folded, on grids whose nodes coincide."""
    folded = form.folded({(s.low_zone, s.high_zone): True for s in form.spans if s.low_zone})
    films = dict.fromkeys(form.zones, 20.0)  # a weak film leaves the cells even
    whole = tuple(2 * n if f.folded else n for n, f in zip(cells, folded.spans, strict=True))
    return section.cut(form, whole, strongest_film=films), section.cut(
        folded, cells, strongest_film=films
    )


@pytest.mark.parametrize(
    ("form", "cells"),
    [
        (section.slab(0.08), (24,)),
        (section.bar(0.08, 0.05), (12, 10)),
        (section.round_bar(0.08, 0.06), (16, 10)),
        (section.ring(0.12, 0.04, 0.06), (16, 10)),
    ],
    ids=["slab", "bar", "round", "ring"],
)
def test_half_a_symmetric_part_cools_like_the_whole(
    form: section.Section, cells: tuple[int, ...]
) -> None:
    runs = {}
    for name, cut in zip(("whole", "half"), halves(form, cells), strict=True):
        faces = around(*[Face(film(1.0), BATH)] * len(cut.body.zones))
        runs[name] = cut, in_even_steps(cut.body, STEEL, HOT, faces, 60.0, steps=STEPS)
    sizes = [np.array([0.0, 0.13, 0.5, 0.78, 1.0])] * len(form.spans)
    for share in np.stack(np.meshgrid(*sizes), axis=-1).reshape(-1, len(form.spans)):
        at = tuple(s.low + x * s.length for s, x in zip(form.spans, share, strict=True))
        read = {}
        for name, (cut, run) in runs.items():
            place = section.place(cut, at)
            read[name] = float(run.progress.temp[place.node] @ place.share)
        assert_allclose(read["half"], read["whole"], rtol=0.0, atol=SAME)
    fold = 2 ** sum(s.folded for s in runs["half"][0].section.spans)
    assert_allclose(
        fold * runs["half"][1].progress.zone_heat.sum(),
        runs["whole"][1].progress.zone_heat.sum(),
        rtol=1e-6,
        atol=0.0,
    )


@pytest.mark.parametrize("sense", SENSES)
def test_renumbered_nodes_give_the_same_field(sense: Sense) -> None:
    # on a line this also sets the multigrid against the direct sweep
    body = body_of(sense)
    order = np.random.default_rng(7).permutation(body.n_node)
    mixed = renumbered(body, order)
    assert not mixed.is_chain
    faces = around(*[Face(film(1.0), BATH)] * len(body.zones))
    plain = in_even_steps(body, STEEL, HOT, faces, 60.0, steps=STEPS)
    other = in_even_steps(mixed, STEEL, HOT, faces, 60.0, steps=STEPS)
    assert_allclose(other.progress.temp, plain.progress.temp[order], rtol=0.0, atol=SAME)
    assert_allclose(other.progress.zone_heat, plain.progress.zone_heat, rtol=SAME_HEAT, atol=0.0)


def test_edges_in_another_order_and_direction_give_the_same_field() -> None:
    body = body_of("axisymmetric")
    order = np.random.default_rng(8).permutation(len(body.edge))
    flipped = replace(
        body,
        edge=np.ascontiguousarray(body.edge[order, ::-1]),
        conductance_length=body.conductance_length[order],
    )
    faces = around(*[Face(film(1.0), BATH)] * len(body.zones))
    plain = in_even_steps(body, STEEL, HOT, faces, 60.0, steps=STEPS)
    other = in_even_steps(flipped, STEEL, HOT, faces, 60.0, steps=STEPS)
    assert_allclose(other.progress.temp, plain.progress.temp, rtol=0.0, atol=SAME)


def test_a_part_at_the_temperature_of_its_bath_stays_there() -> None:
    for sense in SENSES:
        body = body_of(sense)
        faces = around(*[Face(film(1.0), BATH)] * len(body.zones))
        run = cooled(body, STEEL, BATH, faces, 1e5, tolerance=0.1)
        assert_allclose(run.progress.temp, BATH, rtol=0.0, atol=1e-9)
        assert_allclose(run.progress.zone_heat, 0.0, rtol=0.0, atol=1e-9 * abs(run.heat_at_start))
