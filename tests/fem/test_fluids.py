"""What fills a tank, against tables from outside (tests/published/quench_tank.csv)."""

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.fem import fluids
from midradius.fem.fluids import ZERO_DEGC
from midradius.fem.media import medium, names
from midradius.thermo.errors import InputFault

Rows = list[dict[str, str]]


def rows_of(published: Callable[[str], Rows], start: str) -> list[tuple[float, list[float]]]:
    found = [row for row in published("quench_tank") if row["quantity"].startswith(start)]
    assert found
    return [
        (
            float(row["condition"].split(" C")[0]) + ZERO_DEGC,
            [float(value) for value in row["value"].split("/")],
        )
        for row in found
    ]


def test_oil_has_the_density_heat_and_conductivity_of_cragoe(
    published: Callable[[str], Rows],
) -> None:
    oil = fluids.oil(0.87)
    for temp, (density, cp, conductivity) in rows_of(published, "mineral quench oil"):
        assert_allclose(oil.density_at(temp), density, rtol=0.0, atol=0.51)
        assert_allclose(oil.heat_capacity_at(temp), 1e3 * cp, rtol=0.0, atol=0.51)
        k = np.interp(temp, oil.temp, oil.conductivity)
        assert_allclose(k, conductivity, rtol=0.0, atol=1e-4)


def test_water_has_the_density_heat_and_conductivity_of_the_steam_formulation(
    published: Callable[[str], Rows],
) -> None:
    water = fluids.fluid("water")
    for temp, (density, cp, conductivity, _) in rows_of(published, "water rho/cp"):
        assert_allclose(water.density_at(temp), density, rtol=1e-3, atol=0.0)
        assert_allclose(water.heat_capacity_at(temp), cp, rtol=1e-3, atol=0.0)
        k = np.interp(temp, water.temp, water.conductivity)
        assert_allclose(k, conductivity, rtol=1e-3, atol=0.0)


def test_oil_expands_by_the_usual_140_litres_on_5_cubic_metres_from_20_to_60_degC() -> None:
    # 7e-4 per kelvin from memory; the range for quench oils is 6.3 to 7.6e-4
    oil = fluids.oil(0.87)
    grown = 5.0 * (oil.density_at(20.0 + ZERO_DEGC) / oil.density_at(60.0 + ZERO_DEGC) - 1.0)
    assert_allclose(grown, 0.14, rtol=0.12, atol=0.0)


@pytest.mark.parametrize("name", fluids.names())
@given(share=st.floats(0.0, 1.0), other=st.floats(0.0, 1.0))
def test_heat_content_and_temperature_are_inverse_and_rise_together(
    name: str, share: float, other: float
) -> None:
    fluid = fluids.fluid(name)
    low, high = fluid.temp[0], fluid.temp[-1]
    temp = np.array([low + share * (high - low), low + other * (high - low)])
    content = fluid.enthalpy(temp)
    assert_allclose(fluid.temp_of(content), temp, rtol=0.0, atol=1e-6)
    if temp[0] < temp[1] - 1e-6:
        assert content[0] < content[1]


@pytest.mark.parametrize("name", fluids.names())
def test_heat_capacity_is_the_slope_of_the_heat_content(name: str) -> None:
    fluid = fluids.fluid(name)
    middle = 0.5 * (fluid.temp[:-1] + fluid.temp[1:])
    slope = (fluid.enthalpy(middle + 1.0) - fluid.enthalpy(middle - 1.0)) / 2.0
    assert_allclose(slope, fluid.heat_capacity_at(middle), rtol=2e-4, atol=0.0)


def test_every_liquid_medium_has_a_fluid_and_no_gas_has() -> None:
    for name in names():
        found = fluids.of_medium(name)
        assert (found is not None) == (medium(name).kind == "liquid"), name


def test_a_fluid_that_is_not_shipped_is_answered_with_those_that_are() -> None:
    with pytest.raises(InputFault, match="one of: slow quench oil; medium quench oil"):
        fluids.fluid("butter")


def test_a_bath_beyond_the_table_is_noted() -> None:
    (note,) = fluids.range_notes(fluids.fluid("brine"), coldest=293.0, hottest=350.0)
    assert "properties of brine" in str(note)
    assert fluids.range_notes(fluids.fluid("brine"), coldest=293.0, hottest=312.0) == ()
