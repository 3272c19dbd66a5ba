"""The bath against worked examples, closed forms and the ``ht`` library."""

from collections.abc import Callable
from dataclasses import replace

import ht
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.fem import fluids
from midradius.fem.fluids import ZERO_DEGC
from midradius.study import bath, bathcooler, bathloss
from midradius.study.bath import Immersion, Tank, march
from midradius.study.bathcooler import Cooler, cooler_of, effectiveness
from midradius.study.tankinput import CoolerInput
from midradius.thermo import en1993
from midradius.thermo.errors import InputFault

Rows = list[dict[str, str]]
OIL = fluids.oil(0.87)
CONSTANT = replace(
    OIL,
    temp=np.array([250.0, 500.0]),
    density=np.array([841.0, 841.0]),
    heat_capacity=np.array([2030.0, 2030.0]),
    conductivity=np.array([0.13, 0.13]),
)
PULSE, EVERY, CAPACITY = 375.6e6, 3600.0, 8532e3  # worked example B
COOLANT = 25.0 + ZERO_DEGC


def pulse(time: float, heat: float = PULSE) -> Immersion:
    """All the heat within half a second."""
    return Immersion(
        time,
        1.0,
        0.0,
        lambda s, temp: np.minimum(s / 0.5, 1.0)[:, None] * heat * np.ones((1, len(temp))),
    )


def gradual(time: float, heat: float = PULSE) -> Immersion:
    return Immersion(
        time,
        900.0,
        0.1,
        lambda s, temp: (heat * (1.0 - np.exp(-s / 200.0)))[:, None] * np.ones((1, len(temp))),
    )


def tank_b(per_kelvin: float) -> Tank:
    """Worked example B: always cooled, no other loss."""
    return Tank(
        CONSTANT,
        CAPACITY / 2030.0,
        4.0,
        293.15,
        Cooler(per_kelvin, COOLANT, 5.0, ""),
        cooler_start=200.0,
        lid=True,
    )


def test_worked_example_a_warms_to_101_75_degC() -> None:
    mass = 5.0 * float(OIL.density_at(60.0 + ZERO_DEGC))
    hot = en1993.enthalpy(860.0 + ZERO_DEGC)
    temp = bath.mixed_temp(
        OIL, mass, 60.0 + ZERO_DEGC, lambda t: 650.0 * (hot - en1993.enthalpy(t))
    )
    assert_allclose(temp - ZERO_DEGC, 101.75, rtol=0.0, atol=0.05)
    heat = 650.0 * float(hot - en1993.enthalpy(temp))
    assert_allclose(heat / 1e6, 368.8, rtol=0.0, atol=0.1)


def test_worked_example_b_has_its_effectiveness_and_heat_per_kelvin() -> None:
    share = effectiveness(4000.0, 5.0 * 2030.0, 4.0 * 4180.0, "counterflow")
    assert_allclose(share, 0.29886, rtol=0.0, atol=1e-5)
    assert_allclose(share * 5.0 * 2030.0, 3033.0, rtol=0.0, atol=1.0)
    assert_allclose(share * 5.0 * 2.030 * (80.0 - 25.0), 166.84, rtol=0.0, atol=0.1)


@pytest.mark.parametrize(
    ("per_kelvin", "low", "high"), [(3033.0, 41.96, 85.98), (3819.0, None, 80.0)]
)
def test_worked_example_b_settles_at_its_periodic_temperatures(
    per_kelvin: float, low: float | None, high: float
) -> None:
    run = march(
        tank_b(per_kelvin),
        [pulse(EVERY * k) for k in range(24)],
        start=np.array([333.15]),
        end=86_400.0,
    )
    last = run.hottest[run.time > 23 * EVERY - 1.0, 0] - ZERO_DEGC
    assert_allclose(last.max(), high, rtol=0.0, atol=0.1)
    if low is not None:
        assert_allclose(last.min(), low, rtol=0.0, atol=0.1)


@settings(max_examples=25)
@given(
    per_kelvin=st.floats(500.0, 8000.0),
    capacity=st.floats(0.5, 4.0),
    heat=st.floats(50e6, 600e6),
)
def test_equal_pulses_end_at_the_closed_form(
    per_kelvin: float, capacity: float, heat: float
) -> None:
    x = np.exp(-per_kelvin * EVERY / (capacity * CAPACITY))
    lift = heat / (capacity * CAPACITY)
    low = COOLANT + lift * x / (1.0 - x)
    run = march(
        tank_b(per_kelvin),
        [pulse(0.0, heat)],
        start=np.array([low]),
        end=EVERY,
        volume=np.array([capacity]),
    )
    assert_allclose(run.temp[-1, 0, 0], low, rtol=0.0, atol=2e-3 * lift + 1e-6)
    assert_allclose(run.hottest.max(), low + lift, rtol=0.0, atol=3e-3 * lift)


@pytest.mark.parametrize("arrangement", ["counterflow", "parallel", "crossflow"])
@given(
    conductance=st.floats(100.0, 50e3),
    hot=st.floats(1e3, 50e3),
    cold=st.floats(1e3, 50e3),
)
def test_effectiveness_is_that_of_the_library_by_its_other_door(
    arrangement: str, conductance: float, hot: float, cold: float
) -> None:
    whole = ht.effectiveness_NTU_method(
        mh=hot, mc=cold, Cph=1.0, Cpc=1.0, subtype=arrangement, Thi=80.0, Tci=20.0, UA=conductance
    )
    share = effectiveness(conductance, hot, cold, arrangement)
    assert_allclose(share * min(hot, cold) * 60.0, whole["Q"], rtol=1e-9, atol=0.0)


def test_a_cooler_given_by_its_duty_has_it_with_the_bath_at_its_limit() -> None:
    cooler = cooler_of(CoolerInput(power=250e3), bath_cp=2000.0, bath_limit=353.15)
    assert cooler is not None
    assert_allclose(cooler.per_kelvin * (353.15 - cooler.coolant_in), 250e3, rtol=1e-12, atol=0.0)


def test_a_coolant_as_hot_as_the_limit_is_refused() -> None:
    asked = CoolerInput(power=250e3, coolant_in=360.0)
    with pytest.raises(InputFault, match="colder than the limit"):
        cooler_of(asked, bath_cp=2000.0, bath_limit=353.15)


def test_open_water_loses_what_the_published_table_says(published: Callable[[str], Rows]) -> None:
    rows = [r for r in published("quench_tank") if r["quantity"].startswith("open water")]
    assert len(rows) == 6
    for row in rows:
        temp = float(row["condition"].split()[1]) + ZERO_DEGC
        heat, _ = bathloss.surface_loss(fluids.fluid("water"), temp, air=15.6 + ZERO_DEGC)
        # the tolerance that the table of checks states
        assert_allclose(heat, float(row["value"]), rtol=0.25, atol=0.0)


def test_evaporation_at_60_degC_is_4_2_kg_per_square_metre_and_hour() -> None:
    found = bathloss.evaporation(60.0 + ZERO_DEGC, air=20.0 + ZERO_DEGC, speed=0.2)
    assert_allclose(3600.0 * found, 4.2, rtol=0.02, atol=0.0)
    heat = found * bathloss.heat_of_evaporation(60.0 + ZERO_DEGC)
    assert_allclose(heat, 2.8e3, rtol=0.03, atol=0.0)


def test_heat_of_evaporation_is_that_of_the_steam_formulation(
    published: Callable[[str], Rows],
) -> None:
    for row in published("quench_tank"):
        if row["quantity"].startswith("water rho/cp"):
            temp = float(row["condition"].split()[0]) + ZERO_DEGC
            wanted = 1e3 * float(row["value"].split("/")[-1])
            assert_allclose(bathloss.heat_of_evaporation(temp), wanted, rtol=1e-4, atol=0.0)


def test_oil_does_not_evaporate_and_water_loses_more() -> None:
    for celsius in (40.0, 70.0):
        oil, none = bathloss.surface_loss(OIL, celsius + ZERO_DEGC, air=293.15)
        water, some = bathloss.surface_loss(fluids.fluid("water"), celsius + ZERO_DEGC, air=293.15)
        assert none == 0.0 and some > 0.0 and water > oil > 0.0


def everything(n_layer: int, fluid: str = "water") -> Tank:
    return Tank(
        fluids.fluid(fluid),
        8000.0,
        4.0,
        291.15,
        Cooler(6000.0, 288.15, 4.0, ""),
        cooler_start=303.15,
        heater=30e3,
        heater_set=300.15,
        agitator=4e3,
        mixing=15.0,
        n_layer=n_layer,
        drag_out=5.0,
    )


@pytest.mark.parametrize("n_layer", [1, 2, 3])
@pytest.mark.parametrize("fluid", fluids.names())
def test_the_account_of_a_bath_closes(n_layer: int, fluid: str) -> None:
    run = march(
        everything(n_layer, fluid),
        [gradual(600.0), gradual(1000.0), gradual(9000.0)],
        start=np.array([295.15, 310.15]),
        end=20_000.0,
    )
    assert_allclose(run.balance, 0.0, rtol=0.0, atol=1e-12)
    whole = 3.0 * PULSE * -np.expm1(-4.5)
    assert_allclose(run.heat["load"][-1], whole, rtol=1e-9, atol=0.0)
    into = sum(run.heat[name][-1] for name in ("load", "heater", "agitator"))
    out = sum(run.heat[name][-1] for name in ("cooler", "surface", "drag-out"))
    assert_allclose(run.content[-1] - run.content[0], into - out, rtol=0.0, atol=1e-6 * whole)


@pytest.mark.parametrize("mixing", [50.0, 400.0])
def test_layers_lie_as_far_apart_as_the_flow_between_them_needs(mixing: float) -> None:
    # A steady load Q warms all layers alike; the bottom has its share s of Q by the flow m,
    # Q s = m cp (T_load - T_bottom), and the warm top turns over with the layer of the load.
    power, span, cp = 1.9e6, 3600.0, 4180.0
    fluid = replace(CONSTANT, heat_capacity=np.array([cp, cp]))
    tank = replace(bath.without_losses(everything(3)), fluid=fluid, mixing=mixing)
    load = Immersion(0.0, span, 0.0, lambda s, t: power * s[:, None] * np.ones((1, len(t))))
    run = march(tank, [load], start=np.array([300.15]), end=span)
    bottom, beside, top = run.temp[-1, 0]
    share = bath.SHARE_BELOW
    mean = 300.15 + power * span / (tank.fill_mass * cp)
    apart = share * power / (mixing * cp)
    assert_allclose(beside, mean + share * apart, rtol=0.0, atol=1e-6)
    assert_allclose(top, beside, rtol=0.0, atol=1e-9)
    assert_allclose(bottom, mean - (1.0 - share) * apart, rtol=0.0, atol=1e-6)


def test_without_agitation_the_top_gets_the_heat_and_the_bottom_stays_cold() -> None:
    still = replace(bath.without_losses(everything(3)), mixing=0.0)
    run = march(still, [gradual(0.0)], start=np.array([293.15]), end=1200.0)
    bottom, middle, top = run.temp[-1, 0]
    assert_allclose(bottom, 293.15, rtol=0.0, atol=1e-6)
    assert bottom < middle <= top + 1e-9
    mixed = march(replace(still, n_layer=1), [gradual(0.0)], start=np.array([293.15]), end=1200.0)
    assert top > mixed.temp[-1, 0, 0]


def test_a_cooler_that_fails_cools_no_more() -> None:
    tank = tank_b(3033.0)
    run = march(tank, [pulse(0.0)], start=np.array([333.15]), end=7200.0, cooler_fails_at=3600.0)
    late = run.time >= 3600.0
    assert np.ptp(run.heat["cooler"][late]) == 0.0
    assert run.heat["cooler"][-1, 0] > 0.0


@given(late=st.lists(st.floats(0.0, 3000.0), min_size=1, max_size=6))
def test_a_cooler_that_fails_as_the_load_goes_in_leaves_the_hottest_bath(
    late: list[float],
) -> None:
    fails = 3600.0 + np.array([0.0, *sorted(late)])
    run = march(
        replace(tank_b(3033.0), cooler_start=323.15),
        [gradual(3600.0)],
        start=np.full(len(fails), 333.15),
        end=7200.0,
        cooler_fails_at=fails,
    )
    hottest = run.hottest[run.time >= 3600.0].max(axis=0)
    assert np.all(np.diff(hottest) <= 1e-9)


@settings(max_examples=25)
@given(
    volume=st.floats(0.5, 4.0),
    more=st.floats(1.05, 3.0),
    cooling=st.floats(0.2, 5.0),
)
def test_a_larger_tank_or_cooler_never_makes_a_load_hotter(
    volume: float, more: float, cooling: float
) -> None:
    tank = replace(tank_b(3033.0), cooler_start=323.15)
    run = march(
        tank,
        [gradual(0.0)],
        start=np.full(3, 333.15),
        end=3600.0,
        volume=np.array([volume, volume * more, volume]),
        cooling=np.array([cooling, cooling, cooling * more]),
    )
    plain, larger, cooler = run.hottest.max(axis=0)
    assert larger <= plain + 1e-6 and cooler <= plain + 1e-6


def test_the_level_rises_by_expansion_and_by_what_the_load_displaces() -> None:
    # by hand: 5 m3 at 20 degC to 60 degC is 5.1546 m3 (Cragoe, 866.75 and 840.75 kg/m3)
    mass = 5.0 * 866.75
    tank = bath.without_losses(Tank(OIL, mass, 4.0, 293.15))
    load = Immersion(100.0, 200.0, 700.0 / 7850.0, lambda s, t: np.zeros((len(s), len(t))))
    run = march(tank, [load], start=np.array([333.15]), end=1000.0)
    volume = bath.level_volume(tank, run, [load], np.ones(1))[:, 0]
    assert_allclose(volume.min(), 5.1546, rtol=1e-4, atol=0.0)
    assert_allclose(volume.max() - volume.min(), 0.08917, rtol=1e-3, atol=0.0)


def test_the_water_plant_of_the_published_example_warms_by_11_K() -> None:
    # 10 000 lb of carbon steel from 850 to 20 degC (EN enthalpy) into 58.86 m3
    water = fluids.fluid("water")
    heat = 4535.9 * float(en1993.enthalpy(850.0 + ZERO_DEGC) - en1993.enthalpy(20.0 + ZERO_DEGC))
    assert_allclose(heat / 3600.0, 752e3, rtol=0.01, atol=0.0)
    temp = bath.mixed_temp(water, 58.86 * 998.2, 293.15, lambda _: heat)
    assert_allclose(temp - 293.15, 11.1, rtol=0.0, atol=0.3)
    assert_allclose(58.86e3 / 4535.9, 12.97, rtol=1e-3, atol=0.0)


def test_a_us_gallon_per_pound_gives_the_rise_of_the_rule() -> None:
    # 8.345 l/kg, about 38 K (read), computed 38 to 41 K with EN enthalpies
    start = 60.0 + ZERO_DEGC
    hot = en1993.enthalpy(850.0 + ZERO_DEGC)
    mass = 8.345e-3 * float(OIL.density_at(start))
    temp = bath.mixed_temp(OIL, mass, start, lambda t: hot - en1993.enthalpy(t))
    assert_allclose(temp - start, 38.0, rtol=0.0, atol=4.0)


def test_10_litres_per_kg_give_the_rise_of_the_rule() -> None:
    # 580 kJ/kg into oil of 870 kg/m3 and 2.0 kJ/(kg K): 33.3 K
    oil = replace(CONSTANT, heat_capacity=np.array([2000.0, 2000.0]))
    temp = bath.mixed_temp(oil, 10e-3 * 870.0, 333.15, lambda _: 580e3)
    assert_allclose(temp - 333.15, 33.3, rtol=0.0, atol=0.1)


def test_the_constants_of_the_coolants_are_those_of_water_and_air() -> None:
    # 20 degC: 4184 (IAPWS by CoolProp) and 1006 J/(kg K)
    assert_allclose(bathcooler.COOLANT_CP["water"], 4184.0, rtol=2e-3, atol=0.0)
    assert_allclose(bathcooler.COOLANT_CP["air"], 1006.0, rtol=2e-3, atol=0.0)
