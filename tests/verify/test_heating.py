"""Heating by the solver that cools: series solutions, balances, rising furnaces, stops."""

import exact
import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem import section as forms
from midradius.fem.furnace import Rise, furnace_film, furnace_medium, furnace_names, rises
from midradius.fem.heatup import Heating, HeatingStage, heat_up
from midradius.fem.section import Section
from midradius.fem.surface import STEFAN_BOLTZMANN, Film
from midradius.thermo.arrays import Array
from midradius.thermo.assemble import inert_tables
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.heatup import heating_tables
from midradius.thermo.kinetics import Tables

RADIUS, K, DENSITY, CP, HTC = 0.1, 30.0, 7850.0, 600.0, 150.0
COLD, HOT = 293.15, 1133.15
CONSTANT = inert_tables(
    lambda temp: np.full(temp.shape, K), lambda temp: CP * temp, first=240.0, last=1400.0, step=1.0
)
SECTIONS: dict[exact.Form, Section] = {
    "slab": forms.slab(2.0 * RADIUS),
    "cylinder": forms.round_bar(2.0 * RADIUS, None),
    "ball": forms.ball(2.0 * RADIUS),
}


def even(htc: float) -> Film:
    return Film(np.array([240.0, 1400.0]), np.full(2, htc))


def heated(
    section: Section,
    pieces: tuple[Rise, ...],
    films: tuple[Film, ...],
    *,
    tables: Tables = CONSTANT,
    duration: float | None,
    core_above: float | None = None,
    tolerance: float = 1e-3,
) -> tuple[Heating, Array, list[tuple[float, Array]]]:
    """What heating leaves, the points' distance from the middle, and every step of the paths."""
    cut = forms.cut(section, (160,), strongest_film=dict.fromkeys(section.zones, HTC))
    middle = (RADIUS if section.form == "slab" else 0.0,)
    path: list[tuple[float, Array]] = []
    stage = HeatingStage(
        kind="heat",
        label="furnace",
        number=0,
        rises=pieces,
        films=tuple(dict.fromkeys(section.zones, film) for film in films),
        duration=duration,
        until_place=None if core_above is None else "core",
        until_temp=core_above,
    )
    heating = heat_up(
        cut,
        tables,
        (stage,),
        density=DENSITY,
        start_temp=COLD,
        places={"core": forms.place(cut, middle)},
        watched=("core",),
        tolerance=tolerance,
        follow=lambda time, temp: path.append((time, temp.copy())),
    )
    return heating, np.abs(cut.body.points[:, 0] - middle[0]), path


@pytest.mark.parametrize("form", SECTIONS)
@pytest.mark.parametrize("fourier", [0.1, 0.5, 2.0])
def test_a_section_with_a_constant_film_heats_up_as_the_series_says(
    form: exact.Form, fourier: float
) -> None:
    duration = fourier * RADIUS**2 * DENSITY * CP / K
    heating, away, _ = heated(
        SECTIONS[form], (Rise(HOT, HOT, None),), (even(HTC),), duration=duration
    )
    left = exact.theta(form, biot=HTC * RADIUS / K, fourier=fourier, place=away / RADIUS)
    assert_allclose(heating.temp, HOT + (COLD - HOT) * left, rtol=0.0, atol=0.05)


def test_a_section_follows_a_furnace_that_rises_at_the_lag_of_the_book() -> None:
    # far into a steady rise r the part lags by r rho cp (R/2h + (R^2 - x^2)/4k): Carslaw &
    # Jaeger, sec. 7.7 (remembered), for a cylinder; films alike make the pieces one
    rise = 50.0 / 3600.0
    pieces = rises(HOT, start=COLD, ramp=rise)
    assert len(pieces) > 30
    climb = (HOT - COLD) / rise
    heating, away, _ = heated(
        SECTIONS["cylinder"], pieces, (even(HTC),) * len(pieces), duration=climb
    )
    lag = rise * DENSITY * CP * (RADIUS / (2.0 * HTC) + (RADIUS**2 - away**2) / (4.0 * K))
    assert_allclose(heating.temp, HOT - lag, rtol=0.0, atol=0.05)
    assert_allclose(heating.stages[0].end, climb, rtol=1e-9, atol=0.0)


def test_pieces_of_a_rise_follow_each_other_and_end_in_the_furnace() -> None:
    pieces = rises(1143.15, start=293.15, ramp=0.05)
    climbing = pieces[:-1]
    assert_allclose(climbing[0].begin, 293.15, rtol=0.0, atol=1e-9)
    ends = [piece.end for piece in climbing]
    assert_allclose([piece.begin for piece in climbing[1:]], ends[:-1], rtol=0.0, atol=1e-9)
    assert_allclose(
        sum(piece.span or 0.0 for piece in climbing), 850.0 / 0.05, rtol=1e-12, atol=0.0
    )
    assert pieces[-1] == Rise(1143.15, 1143.15, None)


def test_the_heat_taken_up_is_the_enthalpy_gained_through_the_transformation() -> None:
    steel = heating_tables(grade("42CrMo4").composition)
    film, _ = furnace_film(
        furnace_medium("gas-fired furnace"),
        furnace=HOT,
        length=0.2,
        geometry="horizontal cylinder",
        emissivity=0.8,
    )
    heating, _, path = heated(
        SECTIONS["cylinder"],
        (Rise(HOT, HOT, None),),
        (film,),
        tables=steel,
        duration=None,
        core_above=1123.15,
        tolerance=0.05,
    )
    assert_allclose(heating.balance, 0.0, rtol=0.0, atol=1e-12)
    assert heating.stages[0].ended_by == "limit"
    assert_allclose(heating.watch_temp[-1, 0], 1123.15, rtol=0.0, atol=0.02)
    times = [time for time, _ in path]
    assert_allclose(times, heating.step_times[1:], rtol=0.0, atol=0.0)
    assert_allclose(path[-1][1], heating.temp, rtol=0.0, atol=0.0)
    # no node is ever colder than before, none hotter than the furnace
    assert (np.diff([temp for _, temp in path], axis=0) > -1e-3).all()
    assert heating.temp.max() < HOT


def test_a_stage_that_never_gets_there_says_so() -> None:
    with pytest.raises(InputFault) as caught:
        heated(
            SECTIONS["slab"],
            (Rise(HOT, HOT, None),),
            (even(0.0),),
            duration=None,
            core_above=1000.0,
            tolerance=1.0,
        )
    assert caught.value.quantity == "route[0].until"
    assert caught.value.allowed == "reached within 30 days"


@pytest.mark.parametrize("name", furnace_names())
def test_every_heating_medium_has_a_positive_film_up_to_the_furnace(name: str) -> None:
    medium = furnace_medium(name.upper())
    furnace = 0.5 * (medium.coldest + medium.hottest)
    film, _ = furnace_film(
        medium, furnace=furnace, length=0.1, geometry="horizontal cylinder", emissivity=0.8
    )
    below = film.temp < furnace - 1.0
    assert (film.htc[below] > 0.0).all()
    assert film.temp[0] <= 250.0 and film.temp[-1] >= 1500.0


def test_the_vacuum_furnace_radiates_and_does_nothing_else() -> None:
    # sigma eps (Tf^4 - Ts^4) with CODATA sigma; 900 K and 1200 K
    film, _ = furnace_film(
        furnace_medium("vacuum furnace"),
        furnace=1200.0,
        length=0.1,
        geometry="sphere",
        emissivity=0.4,
    )
    at = film.temp[10]
    flux = 0.4 * STEFAN_BOLTZMANN * (1200.0**4 - at**4)
    assert_allclose(film.htc[10] * (1200.0 - at), flux, rtol=1e-12, atol=0.0)


def test_an_unknown_heating_medium_is_answered_with_the_nearest() -> None:
    with pytest.raises(InputFault, match='Did you mean "vacuum furnace"?'):
        furnace_medium("vacum furnace")
    with pytest.raises(InputFault, match="Choose one of: electric furnace, still air; "):
        furnace_medium("lava")
