"""Published heat conduction benchmarks and exact solutions with one number each.

Sources: The Standard NAFEMS Benchmarks, TNSB Rev 3, 1990 (targets read in public
example decks, the axisymmetric transient from memory); Arpaci, Conduction Heat
Transfer, 1966, example 3-8 (read in a public deck); Carslaw & Jaeger 1959 for the
half space (remembered). Rows in ``heat.csv``; every target is also recomputed by
an exact series of our own in ``exact.py``.
"""

from collections.abc import Callable
from dataclasses import replace

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose
from trial import HELD, Face, around, constant, cooled, orders, varying

from midradius.fem.grids import axis, line, rectangle
from midradius.fem.volumes import ControlVolumes
from midradius.thermo.arrays import Array

Rows = Callable[..., list[tuple[str, float]]]

STEEL = constant(k=52.0, density=7850.0, cp=460.0)
COLD = 300.0  # K, where a benchmark says zero


def extrapolated(values: list[float]) -> float:
    """Richardson's value of the two finest grids, for order 2."""
    return values[-1] + (values[-1] - values[-2]) / 3.0


def test_the_exact_solutions_give_the_published_targets(published_heat: Rows) -> None:
    target = {
        name: published_heat(f"NAFEMS {name}")[0][1]
        for name in (
            "T2 (1D conduction+radiation)",
            "T3 (1D transient)",
            "T4 (2D steady convection)",
            "axisymmetric steady 15(i)",
        )
    }
    t2, t3, t4, ring = target.values()
    assert_allclose(
        exact.radiating_bar(length=0.1, k=55.6, emissivity=0.98, hot=1000.0, cold=300.0),
        t2,
        rtol=0.0,
        atol=0.005,
    )
    assert_allclose(t3_exact(), t3, rtol=0.0, atol=5e-5)
    assert_allclose(t4_exact(), t4, rtol=0.0, atol=5e-6)
    assert_allclose(ring_exact(), ring, rtol=0.0, atol=0.005)


def test_a_half_space_cools_by_the_complementary_error_function(published_heat: Rows) -> None:
    htc, k, alpha, time = 2000.0, 30.0, 1.5e-5, 10.0
    body = line(axis(0.0, 0.16, 640, fine="even", first=1.0, low="face", high=None), "slab")
    stuff = constant(k=k, density=8000.0, cp=k / (alpha * 8000.0))
    run = cooled(body, stuff, 1100.0, around(Face(htc, 300.0)), time, tolerance=1e-4)
    theta = (run.progress.temp - 300.0) / 800.0
    depth = body.points[:, 0]
    ((_, surface),) = published_heat("semi-infinite Robin theta_surface")
    rows = [value for _, value in published_heat("semi-infinite Robin theta")]
    got = np.interp([0.0, 0.005, 0.02], depth, theta)
    # measured 2.4e-6
    assert_allclose(got, [surface, *rows], rtol=0.0, atol=3.2e-6)
    whole = exact.semi_infinite(depth, time=time, htc=htc, k=k, diffusivity=alpha)
    assert_allclose(theta, whole, rtol=0.0, atol=4.2e-6)


def test_a_bar_radiating_from_its_end_settles_at_927_kelvin(published_heat: Rows) -> None:
    # NAFEMS T2: 1000 K at one end, the other radiates to 300 K, sides insulated
    temp = np.arange(290.0, 1101.0, 1.0)
    film = 0.98 * 5.67e-8 * (temp**2 + 300.0**2) * (temp + 300.0)
    stuff = varying(
        lambda t: np.full_like(t, 55.6),
        lambda t: 460.0 * t,
        density=7850.0,
        first=290.0,
        last=1100.0,
        step=1.0,
    )
    body = line(axis(0.0, 0.1, 8, fine="even", first=1.0, low="hot", high="radiates"), "slab")
    surroundings = around(Face(HELD, 1000.0), Face((temp, film), 300.0))
    run = cooled(body, stuff, 1000.0, surroundings, 1e6, tolerance=0.1)
    ((_, target),) = published_heat("NAFEMS T2 (1D conduction+radiation)")
    assert_allclose(run.progress.temp[-1], target, rtol=0.0, atol=0.005)
    # a film linear between kelvins bends the root by 3e-5 K
    exactly = exact.radiating_bar(length=0.1, k=55.6, emissivity=0.98, hot=1000.0, cold=300.0)
    assert_allclose(run.progress.temp[-1], exactly, rtol=0.0, atol=4.2e-5)


def t3_exact() -> float:
    return exact.driven_bar(
        0.08, 32.0, length=0.1, diffusivity=35.0 / (440.5 * 7200.0), swing=100.0, omega=np.pi / 40.0
    )


def test_a_bar_with_a_swinging_end_is_at_its_temperature_after_32_seconds(
    published_heat: Rows,
) -> None:
    # NAFEMS T3: one end at 0, the other at 100 sin(pi t/40) degC
    stuff = constant(k=35.0, density=7200.0, cp=440.5)
    moment = np.linspace(0.0, 32.0, 1601)
    surroundings = around(
        Face(HELD, COLD),
        Face(HELD, COLD + 100.0 * np.sin(np.pi * moment / 40.0)),
        moment=moment,
    )
    values = []
    for cells in (20, 40, 80, 160):
        body = line(axis(0.0, 0.1, cells, fine="even", first=1.0, low="a", high="b"), "slab")
        run = cooled(body, stuff, COLD, surroundings, 32.0, tolerance=1e-4)
        values.append(float(run.progress.temp[cells * 8 // 10] - COLD))
    ((_, target),) = published_heat("NAFEMS T3 (1D transient)")
    # measured 0.0031 K on 160 cells, 0.0002 K extrapolated
    assert_allclose(values[-1], target, rtol=0.0, atol=0.0041)
    assert_allclose(extrapolated(values), target, rtol=0.0, atol=3e-4)
    errors = [abs(value - t3_exact()) for value in values]
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)


def t4_exact() -> float:
    return exact.film_cooled_plate(0.6, 0.2, width=0.6, height=1.0, k=52.0, htc=750.0, base=100.0)


def test_a_plate_with_a_hot_base_and_two_film_cooled_sides_settles(published_heat: Rows) -> None:
    # NAFEMS T4: 100 degC at y = 0, insulated at x = 0, 750 W/(m2 K) to 0 degC elsewhere
    values = []
    for n in (2, 4, 8, 16):
        body = rectangle(
            axis(0.0, 0.6, 3 * n, fine="even", first=1.0, low=None, high="film"),
            axis(0.0, 1.0, 5 * n, fine="even", first=1.0, low="base", high="film"),
            "plane",
        )
        sees = {"film": Face(750.0, COLD), "base": Face(HELD, COLD + 100.0)}
        surroundings = around(*[sees[zone] for zone in body.zones])
        run = cooled(body, STEEL, COLD + 100.0, surroundings, 1e8, tolerance=1e-3)
        values.append(float(run.progress.temp[3 * n * (5 * n + 1) + n] - COLD))
    ((_, target),) = published_heat("NAFEMS T4 (2D steady convection)")
    # the same finite-volume grids outside this code gave 18.349, 18.276, 18.259
    assert_allclose(values[1:], [18.349, 18.276, 18.259], rtol=0.0, atol=6e-4)
    assert_allclose(values[-1], target, rtol=0.0, atol=0.007)
    assert_allclose(extrapolated(values), target, rtol=0.0, atol=5e-4)
    errors = [value - t4_exact() for value in values]
    assert_allclose(orders(errors)[-1], 2.0, rtol=0.0, atol=0.1)


def ring_exact() -> float:
    return exact.heated_ring(
        0.04,
        0.04,
        bore=0.02,
        outside=0.1,
        height=0.14,
        k=52.0,
        flux=5e5,
        low=0.04,
        high=0.1,
    )


def heated_between(body: ControlVolumes, low: float, high: float) -> ControlVolumes:
    """The body whose bore takes heat only between two heights, on nodes."""
    z = body.points[body.face_node, 1]
    share = np.where((z > low) & (z < high), 1.0, 0.0)
    share[np.isclose(z, low) | np.isclose(z, high)] = 0.5
    bore = body.face_zone == body.zones.index("bore")
    return replace(body, face_area=np.where(bore, body.face_area * share, body.face_area))


def test_a_ring_heated_in_the_middle_of_its_bore_settles(published_heat: Rows) -> None:
    # NAFEMS, Benchmark Tests for Thermal Analysis 15(i): 332.97 K = 59.82 degC at (0.04, 0.04)
    values = []
    for n in (2, 4, 8, 16):
        body = heated_between(
            rectangle(
                axis(0.02, 0.1, 4 * n, fine="even", first=1.0, low="bore", high="cold"),
                axis(0.0, 0.14, 7 * n, fine="even", first=1.0, low="cold", high="cold"),
                "axisymmetric",
            ),
            0.04,
            0.1,
        )
        sees = {"cold": Face(HELD, COLD), "bore": Face(0.0, COLD, flux=5e5)}
        surroundings = around(*[sees[zone] for zone in body.zones])
        run = cooled(body, STEEL, COLD, surroundings, 1e7, tolerance=1e-3)
        values.append(float(run.progress.temp[n * (7 * n + 1) + 2 * n] - COLD))
    ((_, target),) = published_heat("NAFEMS axisymmetric steady 15(i)")
    assert_allclose(values[-1], target, rtol=0.0, atol=0.014)
    assert_allclose(extrapolated(values), ring_exact(), rtol=0.0, atol=3e-4)
    errors = [abs(value - ring_exact()) for value in values]
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)


def heated_cylinder(n: int) -> float:
    """Temperature rise at (0.1, 0.3) after 190 s on a grid of 3n by 4n cells."""
    body = rectangle(
        axis(0.0, 0.3, 3 * n, fine="even", first=1.0, low=None, high="skin"),
        axis(0.0, 0.4, 4 * n, fine="even", first=1.0, low="skin", high="skin"),
        "axisymmetric",
    )
    run = cooled(body, STEEL, COLD, around(Face(HELD, COLD + 1000.0)), 190.0, tolerance=1e-2)
    return float(run.progress.temp[n * (4 * n + 1) + 3 * n] - COLD)


def test_a_cold_cylinder_in_a_held_skin_warms_by_the_product(published_heat: Rows) -> None:
    # NAFEMS axisymmetric transient (target 186.5 degC from memory; the row is the product)
    ((_, target),) = published_heat("NAFEMS axisymmetric transient")
    fourier = 52.0 / (7850.0 * 460.0) * 190.0
    still = exact.theta("cylinder", biot=1e9, fourier=fourier / 0.3**2, place=0.1 / 0.3) * (
        exact.theta("slab", biot=1e9, fourier=fourier / 0.2**2, place=0.1 / 0.2)
    )
    assert_allclose(1000.0 * (1.0 - still), target, rtol=0.0, atol=6e-4)
    values = [heated_cylinder(n) for n in (3, 6, 12)]
    assert_allclose(extrapolated(values), target, rtol=0.0, atol=0.007)
    assert_allclose(orders([v - target for v in values])[-1], 2.0, rtol=0.0, atol=0.1)


@pytest.mark.slow
def test_the_cylinder_in_a_held_skin_meets_its_target_on_a_fine_grid(published_heat: Rows) -> None:
    ((_, target),) = published_heat("NAFEMS axisymmetric transient")
    assert_allclose(heated_cylinder(24), target, rtol=0.0, atol=0.16)


def test_a_slab_with_a_source_and_a_conductivity_that_rises_has_arpacis_peak(
    published_heat: Rows,
) -> None:
    # Arpaci ex. 3-8: L = 10, source 5, k = 2 (1 + 0.01 T), T(L) = 0, insulated at 0.
    # The mean of two conductivities linear in T is exact, so are the nodes.
    stuff = varying(
        lambda t: 2.0 * (1.0 + 0.01 * (t - COLD)),
        lambda t: t,
        density=1.0,
        first=290.0,
        last=450.0,
        step=0.5,
    )
    body = line(axis(0.0, 10.0, 20, fine="even", first=1.0, low=None, high="cold"), "slab")
    surroundings = around(Face(HELD, COLD), source=np.full((1, 21), 5.0), source_moment=np.zeros(1))
    run = cooled(body, stuff, COLD, surroundings, 1e7, tolerance=1e-3)
    ((_, target),) = published_heat("Arpaci ex. 3-8 nonlinear k")
    # what Newton's method leaves; a tenth of its last move
    assert_allclose(run.progress.temp[0] - COLD, target, rtol=0.0, atol=2e-6)


@pytest.mark.parametrize(
    ("form", "straight", "measured"),
    [
        ("slab", lambda r: r, 7.8e-6),
        ("cylinder", np.log, 8.7e-5),
        ("ball", lambda r: -1.0 / r, 3.4e-4),
    ],
)
def test_the_integral_of_the_conductivity_runs_straight_through_a_wall(
    form: exact.Form, straight: Callable[[Array], Array], measured: float
) -> None:
    # Kirchhoff's transform: with held faces and no source, integral k dT is
    # linear in x, ln r or 1/r, whatever k(T)
    def conductivity(t: Array) -> Array:
        return np.asarray(15.0 + 40.0 * np.exp(-((t - 300.0) / 300.0)))

    def integral(t: Array | float) -> Array:
        return np.asarray(15.0 * t - 12000.0 * np.exp(-((np.asarray(t) - 300.0) / 300.0)))

    stuff = varying(
        conductivity, lambda t: 500.0 * t, density=7850.0, first=290.0, last=1210.0, step=0.5
    )
    errors = []
    for cells in (8, 16, 32, 64):
        body = line(axis(0.02, 0.1, cells, fine="even", first=1.0, low="a", high="b"), form)
        surroundings = around(Face(HELD, 1200.0), Face(HELD, 300.0))
        run = cooled(body, stuff, 700.0, surroundings, 1e6, tolerance=0.1)
        r = body.points[:, 0]
        share = (straight(r) - straight(r[0])) / (straight(r[-1]) - straight(r[0]))
        kirchhoff = integral(run.progress.temp)
        through = (kirchhoff - kirchhoff[0]) / (kirchhoff[-1] - kirchhoff[0])
        errors.append(float(np.abs(through - share).max()))
    assert_allclose(orders(errors)[-2:], 2.0, rtol=0.0, atol=0.1)
    assert errors[-1] < 1.3 * measured
