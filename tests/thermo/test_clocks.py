"""Shapes of clocks, and the kernel that reads them."""

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from midradius.thermo import clocks
from midradius.thermo import kinetics as kin
from midradius.thermo.assemble import inert_tables
from midradius.thermo.clocks import Shape
from midradius.thermo.kinetics import Tables, advance_node

KV, BENT = Shape(2.0 / 3.0), Shape(2.0 / 3.0, 3.9)


def test_the_1998_integral_has_its_published_values() -> None:
    # memory, with the quadrature of an independent prototype: metal.md 2.2
    found = clocks.integral(np.array([0.01, 0.5, 0.99]), clocks.LI)
    assert_allclose(found, [0.10434, 1.02588, 1.94742], rtol=0.0, atol=5e-6)


def test_the_1984_integral_has_its_published_values() -> None:
    # memory, metal.md 2.1
    assert_allclose(
        clocks.integral(np.array([0.01, 0.99]), KV), [0.6406, 3.7183], rtol=0, atol=5e-5
    )


@pytest.mark.parametrize("shape", [clocks.LI, KV, BENT])
def test_the_integral_is_that_of_adaptive_quadrature(shape: Shape) -> None:
    def slope(x: float) -> float:
        p = shape.power
        return float(np.exp(shape.bend * x * x) / (x ** (p * (1 - x)) * (1 - x) ** (p * x)))

    at = np.array([0.01, 0.3, 0.7, 0.99])
    exact = [quad(slope, 0.0, x, limit=500, epsabs=1e-11)[0] for x in at]
    assert_allclose(clocks.integral(at, shape), exact, rtol=1e-9, atol=0.0)


def _pearlite_only(shape: Shape | None, *, rate: float, exponent: float = 0.0) -> Tables:
    """A material that forms nothing but pearlite, as fast at every temperature."""
    plain = inert_tables(
        lambda t: 0.0 * t + 30.0, lambda t: 500.0 * t, first=230, last=1500, step=1
    )
    value = plain.value.copy()
    value[..., kin.RATE_PEARLITE] = rate
    value[..., kin.EXPONENT_PEARLITE] = exponent
    fields = {}
    which = np.array([0, 0, 0, 0], dtype=np.int64)
    if shape is None:
        which[1] = kin.AVRAMI
    else:
        fraction, cell, whole = clocks.tables(shape, kin.LAST)
        fields = {"clock": fraction, "back": cell, "per": np.array([kin.LAST / whole])}
    return plain._replace(value=value, shape=which, top=1400.0, transforms=True, **fields)


def _held(tables: Tables, spans: np.ndarray) -> np.ndarray:
    state = np.zeros(kin.N_STATE)
    state[kin.COLDEST] = 900.0
    scale = np.ones(4)
    grown = np.empty(len(spans))
    for i, span in enumerate(spans):
        advance_node(state, 900.0, 900.0, span, scale, tables)
        grown[i] = state[kin.PEARLITE]
    return grown


@pytest.mark.parametrize("shape", [clocks.LI, KV, BENT])
def test_a_product_that_is_held_follows_its_own_shape(shape: Shape) -> None:
    wanted = np.array([0.002, 0.01, 0.2, 0.5, 0.8, 0.99])
    times = clocks.integral(wanted, shape) / 0.01
    grown = _held(_pearlite_only(shape, rate=0.01), np.diff(times, prepend=0.0))
    assert_allclose(grown, wanted, rtol=1e-3, atol=1e-6)


@pytest.mark.parametrize("exponent", [1.0, 2.6, 4.0])
def test_an_exponent_of_its_own_gives_avrami_growth(exponent: float) -> None:
    times = np.array([5.0, 20.0, 60.0, 100.0, 180.0])
    tables = _pearlite_only(None, rate=0.01, exponent=exponent)
    grown = _held(tables, np.diff(times, prepend=0.0))
    assert_allclose(grown, -np.expm1(-((0.01 * times) ** exponent)), rtol=1e-9, atol=1e-12)


def test_many_small_steps_grow_as_one() -> None:
    for tables in (_pearlite_only(BENT, rate=0.05), _pearlite_only(None, rate=0.01, exponent=2.5)):
        one = _held(tables, np.array([70.0]))[-1]
        many = _held(tables, np.full(7000, 0.01))[-1]
        assert 0.05 < one < 0.95
        assert_allclose(many, one, rtol=1e-9, atol=0.0)
