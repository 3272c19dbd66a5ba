"""``midradius tank``: answers, refusals, files; and ``run`` with a tank."""

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.study import casefile, casekeys, job, tankjob, tanksetup
from midradius.study.case import Case
from midradius.study.setup import prepare
from midradius.study.tankanswer import TankAnswer
from midradius.study.tankinput import (
    CoolerInput,
    FixtureInput,
    LoadInput,
    ShiftInput,
    TankInput,
)
from midradius.study.tanksheet import document
from midradius.study.tanktext import lines
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import all_grades

MESHES = Path(__file__).resolve().parents[2] / "meshes"
SHIPPED = MESHES / "shaft-load.toml"

OIL = """
title = "Bars, one basket"
[steel]
grade = "C45"
[section]
form = "round"
diameter = "40 mm"
[[route]]
stage = "soak"
at = "850 degC"
time = "1 h"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
time = "5 min"
[load]
pieces = 40
length = "1 m"
[tank]
volume = "4 m3"
length = "2 m"
width = "1.5 m"
depth = "1.8 m"
flash_point = "190 degC"
bath_limit = "100 degC"
cooler = "80 kW"
period = "2 h"
"""
WATER = (
    OIL.replace("mineral oil, agitated", "water, still")
    .replace("60 degC", "20 degC")
    .replace('flash_point = "190 degC"\n', "")
    .replace("100 degC", "45 degC")
)


def solved(text: str) -> TankAnswer:
    return tankjob.solve(casefile.loads(text))


@pytest.fixture(scope="module")
def oil() -> TankAnswer:
    return solved(OIL)


def test_the_document_says_heat_balance_bath_and_verdict(oil: TankAnswer) -> None:
    said = document(oil)
    assert said["acceptable"] is True
    assert said["heat_balance_relative"] < 1e-6
    mass = 40.0 * np.pi / 4.0 * 0.04**2 * 7850.0
    assert_allclose(said["load_mass_kg"], mass, rtol=1e-9, atol=0.0)
    # 900 -> 20 degC is 570 to 650 kJ/kg; from 850 to near 100 degC it is less
    assert 450.0 < said["heat_to_bath_kJ_per_kg"] < 600.0
    assert 60.0 < said["bath_max_degC"] < 100.0
    low, high = said["bath_max_film_band_degC"]
    assert low <= said["bath_max_degC"] <= high
    assert said["sizing"]["least_volume_m3"] < 4.0
    least, most = said["heat_to_bath_film_band_MJ"]
    assert least <= said["heat_to_bath_MJ"] <= most
    assert json.dumps(said, allow_nan=False)


def test_the_rise_is_that_of_the_heat_less_what_was_lost_meanwhile(oil: TankAnswer) -> None:
    run = oil.day.first
    k = int(run.hottest[:, 0].argmax())
    lost = sum(run.heat[name][k, 0] for name in ("cooler", "surface", "drag-out"))
    mass = 4.0 * float(oil.fluid.density_at(293.15))
    temp = oil.fluid.temp_of(oil.fluid.enthalpy(333.15) + (run.heat["load"][k, 0] - lost) / mass)
    assert_allclose(run.hottest[k, 0], temp, rtol=0.0, atol=1e-6)


def test_every_answer_on_oil_carries_the_cautions(oil: TankAnswer) -> None:
    text = "\n".join(lines(oil))
    for word in (
        *("flash point at least 50 K", "No water in the oil", "level rises", "never water"),
        *("licensed practice", "never stop a load half in", "excess-temperature"),
    ):
        assert word in text, word


def test_water_has_cautions_of_steam_and_cracking_and_evaporates() -> None:
    found = solved(WATER)
    text = "\n".join(lines(found))
    assert "Steam and hot spray scald" in text and "crack" in text and "licensed practice" in text
    assert document(found)["evaporated_kg_per_day"] > 0.0
    assert found.acceptable


def test_a_limit_within_50_K_of_the_flash_point_is_no_answer() -> None:
    found = solved(OIL.replace('flash_point = "190 degC"', 'flash_point = "150 degC"'))
    assert not found.acceptable
    said = document(found)
    assert said["acceptable"] is False and said["sizing"] is None
    text = "\n".join(lines(found))
    assert "NOT ACCEPTABLE" in text and "none: the limit of the bath itself" in text


def test_a_flash_point_51_K_above_the_limit_is_enough() -> None:
    found = solved(OIL.replace('flash_point = "190 degC"', 'flash_point = "151 degC"'))
    assert found.acceptable


def test_a_level_that_leaves_less_than_the_freeboard_is_not_acceptable() -> None:
    # 4 m3 stand 1.333 m high when cold and 1.40 m warm: 1.5 m less 150 mm is not enough
    found = solved(OIL.replace('depth = "1.8 m"', 'depth = "1.5 m"'))
    assert not found.acceptable
    (missed,) = [check for check in found.checks if check.met is False]
    assert missed.name == "level at the worst moment"


def test_without_dimensions_the_level_is_said_not_to_be_judged() -> None:
    text = OIL
    for key in ('length = "2 m"\n', 'width = "1.5 m"\n', 'depth = "1.8 m"\n'):
        text = text.replace(key, "")
    found = solved(text)
    (unknown,) = [check for check in found.checks if check.met is None]
    assert "level is not judged" in unknown.why
    text = "\n".join(lines(found))
    assert "level is not judged" in text and "NOT JUDGED IN FULL" in text
    said = document(found)
    assert said["acceptable"] is False and said["verdict"] == "not judged in full"
    assert said["not_judged"] == ["level at the worst moment"]


def test_a_usual_flash_point_refuses_but_does_not_accept() -> None:
    usual = OIL.replace('flash_point = "190 degC"\n', "")
    for limit, verdict, judged in (
        ("100 degC", "not judged in full", None),
        ("145 degC", "not acceptable", False),
    ):
        found = solved(usual.replace('"100 degC"', f'"{limit}"'))
        assert found.verdict == verdict
        (flash,) = [check for check in found.checks if "flash" in check.name]
        assert flash.met is judged


def test_a_bath_above_the_hottest_whose_film_is_known_is_no_answer() -> None:
    # agitated water has a film up to 60 degC; the limit itself, then the bath that runs there
    stirred = WATER.replace("water, still", "water, agitated")
    limit = solved(stirred.replace('"45 degC"', '"70 degC"'))
    assert document(limit)["acceptable"] is False and document(limit)["sizing"] is None
    runs = solved(stirred.replace('"45 degC"', '"55 degC"').replace('"4 m3"', '"1.1 m3"'))
    assert float(runs.hottest.max()) > 60.0 + 273.15
    for found in (limit, runs):
        (film,) = [check for check in found.checks if check.name == "film of the bath"]
        assert film.met is False and "no film is known" in film.why


def test_a_run_says_that_its_bath_left_the_films_that_are_known() -> None:
    small = WATER.replace("water, still", "water, agitated").replace('"4 m3"', '"1.1 m3"')
    case = casefile.loads(small)
    notes = [str(note) for note in tanksetup.in_bath(case, prepare(case)).notes]
    assert any("above, the film of that is kept" in note for note in notes)


def test_a_load_that_is_in_the_bath_as_the_period_ends_is_refused() -> None:
    with pytest.raises(InputFault, match="in the bath for up to 5 min"):
        solved(OIL + '[[shift]]\nat = "1 h 58 min"\n')


def test_loads_that_are_in_the_bath_together_are_named() -> None:
    found = solved(OIL + '[[shift]]\nat = "0 h"\nevery = "4 min"\ncount = 2\n')
    assert any("in the bath together from 0.06667 h" in line for line in found.assumptions)


def test_a_bath_that_passes_its_limit_is_not_acceptable() -> None:
    found = solved(OIL.replace('"100 degC"', '"70 degC"'))
    assert not found.acceptable
    assert document(found)["sizing"]["least_volume_m3"] > 4.0


def test_a_rise_limit_and_readiness_are_judged() -> None:
    asked = OIL + 'rise_limit = "5 K"\nready_at = "61 degC"\n'
    found = solved(asked)
    missed = {check.name for check in found.checks if check.met is False}
    assert "rise under one load" in missed


def test_coupling_can_be_switched_off(oil: TankAnswer) -> None:
    found = solved(OIL + "coupled = false\n")
    assert np.ptp(found.own.path.temp) == 0.0
    assert float(np.ptp(oil.own.path.temp)) > 5.0
    # the bath that stays cold takes more, in the same time
    assert found.own.total > oil.own.total


def test_a_lower_limit_asks_a_larger_tank(oil: TankAnswer) -> None:
    tight = solved(OIL.replace('"100 degC"', '"85 degC"'))
    assert np.all(tight.sizing.volume_least > oil.sizing.volume_least)


def test_the_least_cooler_falls_with_the_volume(oil: TankAnswer) -> None:
    repeated = solved(OIL + '[[shift]]\nat = "0 h"\nevery = "30 min"\ncount = 4\n')
    curve = repeated.sizing.cooler[0]
    known = curve[np.isfinite(curve)]
    assert len(known) > 5
    assert np.all(np.diff(known) <= 1e-9 * known[:-1])
    assert repeated.day.settled and repeated.failure is not None
    assert repeated.failure.hottest >= float(repeated.hottest[0]) - 1e-6


def test_a_shift_of_several_loads_names_them(tmp_path: Path) -> None:
    (tmp_path / "other.toml").write_text(
        OIL.replace("Bars, one basket", "Thin bars").replace("40 mm", "20 mm"), encoding="utf-8"
    )
    text = (
        OIL
        + '[[shift]]\nat = "0 h"\n'
        + '[[shift]]\nat = "40 min"\ncase = "other.toml"\n'
        + '[[shift]]\nat = "80 min"\nmass = "200 kg"\nfrom = "840 degC"\nthickness = "25 mm"\n'
        + 'time = "8 min"\n'
    )
    found = tankjob.solve(casefile.loads(text, tmp_path / "case.toml"))
    assert [row.name for row in found.loads] == [
        "load of the case",
        "Thin bars",
        "200 kg, 25 mm thick",
    ]
    # a quarter of the steel, a little more of its heat in the same five minutes
    heats = [kind.heats[0][0].total for kind in found.kinds]
    assert_allclose(heats[1] / heats[0], 0.25, rtol=0.1, atol=0.0)


def test_a_case_of_the_shift_without_a_load_is_refused(tmp_path: Path) -> None:
    other = OIL[: OIL.index("[load]")]
    (tmp_path / "other.toml").write_text(other, encoding="utf-8")
    text = OIL + '[[shift]]\nat = "0 h"\ncase = "other.toml"\n'
    with pytest.raises(casefile.CaseFaults, match="a case with a"):
        tankjob.solve(casefile.loads(text, tmp_path / "case.toml"))


def test_the_command_writes_its_folder_and_one_document(call, tmp_path: Path) -> None:
    (tmp_path / "bars.toml").write_text(OIL, encoding="utf-8")
    answer = call("tank", "bars.toml", "--out", "there", "--json")
    assert (answer.code, answer.err) == (0, "")
    said: dict[str, Any] = json.loads(answer.out)
    for key in (
        *("heat_to_bath_MJ", "heat_balance_relative", "bath_max_degC", "acceptable", "cautions"),
    ):
        assert key in said
    names = {path.name for path in (tmp_path / "there").iterdir()}
    assert {"bath.csv", "loads.csv", "load_heat.csv", "sizing.csv", "tank.json"} <= names
    assert {"bath.png", "load_heat.png", "sizing.png"} <= names
    written = json.loads((tmp_path / "there" / "tank.json").read_text(encoding="utf-8"))
    assert written == said


def test_a_design_that_is_not_acceptable_leaves_with_1(call, tmp_path: Path) -> None:
    (tmp_path / "bars.toml").write_text(OIL.replace('"100 degC"', '"145 degC"'), encoding="utf-8")
    answer = call("tank", "bars.toml", "--out", "there")
    assert answer.code == 1
    assert "NOT ACCEPTABLE" in answer.out
    assert not (tmp_path / "there" / "sizing.csv").exists()


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("[tank]", "[tnk]", "tank"),
        ('bath_limit = "100 degC"', 'bath_limit = "50 degC"', "above the bath of the route"),
        ('cooler = "80 kW"', 'fluid_file = "none.csv"', "an existing file"),
        ("4 m3", "400 m3", "what the tank holds to its lip"),
        ("mineral oil, agitated", "still air", "a quench in a liquid"),
    ],
)
def test_bad_input_leaves_with_2_and_writes_nothing(
    call, tmp_path: Path, old: str, new: str, said: str
) -> None:
    (tmp_path / "bars.toml").write_text(OIL.replace(old, new), encoding="utf-8")
    answer = call("tank", "bars.toml", "--out", "there")
    assert answer.code == 2
    assert said in answer.err and "Traceback" not in answer.err
    assert not (tmp_path / "there").exists()


def test_a_case_without_a_tank_is_told_so(call, tmp_path: Path) -> None:
    (tmp_path / "bars.toml").write_text(OIL[: OIL.index("[load]")], encoding="utf-8")
    answer = call("tank", "bars.toml")
    assert answer.code == 2 and "tank = missing" in answer.err


def test_run_with_a_tank_sees_the_bath_warm(tmp_path: Path) -> None:
    whole = job.solve(casefile.loads(OIL))
    text = " ".join(whole.assumptions)
    assert "The bath warms under the load of the case from 60 degC to" in text
    alone = job.solve(casefile.loads(OIL[: OIL.index("[load]")]))
    assert whole.stages[-1].heat_to_bath_J < alone.stages[-1].heat_to_bath_J
    assert whole.time_error_K < 1.0 and whole.heat_balance_relative < 1e-9
    off = job.solve(casefile.loads(OIL + "coupled = false\n"))
    assert_allclose(off.temp_degC[-1], alone.temp_degC[-1], rtol=0.0, atol=1e-9)


def test_a_fluid_of_ones_own_is_read_from_csv_and_toml(tmp_path: Path) -> None:
    table = "temp_degC,density_kg_per_m3,heat_capacity_J_per_kgK\n0,880,1800\n200,750,2500\n"
    (tmp_path / "own.csv").write_text(table, encoding="utf-8")
    (tmp_path / "own.toml").write_text(
        'name = "Hallgrund oil 3"\nkind = "oil"\nflash_degC = 205\ntemp_degC = [0, 200]\n'
        "density_kg_per_m3 = [880, 750]\nheat_capacity_J_per_kgK = [1800, 2500]\n",
        encoding="utf-8",
    )
    text = OIL.replace('flash_point = "190 degC"\n', "")
    first, second = (
        tankjob.solve(casefile.loads(text + f'fluid_file = "own.{end}"\n', tmp_path / "case.toml"))
        for end in ("csv", "toml")
    )
    assert (first.fluid.name, second.fluid.name) == ("own", "Hallgrund oil 3")
    assert_allclose(second.flash, 205.0 + 273.15, rtol=0.0, atol=1e-9)
    assert_allclose(first.hottest, second.hottest, rtol=0.0, atol=1e-9)


def test_the_tank_of_the_readme_is_sound() -> None:
    blocks = (MESHES.parent / "README.md").read_text(encoding="utf-8").split("```toml\n")[1:]
    texts = [block.split("```")[0] for block in blocks]
    (tank,) = [text for text in texts if text.startswith("[load]")]
    case = casefile.loads(f"{texts[0]}\n{tank}")
    assert case.load is not None and case.tank is not None
    assert (case.load.pieces, case.tank.volume, len(case.shift)) == (12, 40.0, 1)


# The reader and the writer


def base() -> Case:
    return casefile.loads(OIL)


def quantities(name: str) -> st.SearchStrategy[float | None]:
    low, high = casekeys.TANK_QUANTITIES[name][1]
    return st.none() | st.floats(low, high)


@st.composite
def tanks(draw: st.DrawFn) -> TankInput:
    free = ("filled_at", "flash_point", "bath_limit", "rise_limit", "ready_at", "freeboard")
    more = ("morning", "agitator", "flow", "air", "drag_out")
    found = {name: draw(quantities(name)) for name in (*free, *more)}
    cooler = draw(
        st.none()
        | st.builds(CoolerInput, power=st.floats(1.0, 1e8))
        | st.builds(
            CoolerInput,
            conductance=st.floats(1.0, 1e7),
            bath_flow=st.floats(1e-3, 1e4),
            coolant_flow=st.floats(1e-3, 1e4),
            coolant=st.sampled_from(casekeys.COOLANTS),
            arrangement=st.sampled_from(casekeys.ARRANGEMENTS),
            coolant_in=st.none() | st.floats(260.0, 350.0),
        )
    )
    return TankInput(
        volume=draw(st.floats(0.01, 1e4)),
        **found,
        cooler=cooler,
        layers=draw(st.none() | st.integers(1, 3)),
        lid=draw(st.booleans()),
        coupled=draw(st.booleans()),
    )


@settings(max_examples=60)
@given(
    tank=tanks(),
    fixtures=st.lists(
        st.builds(
            FixtureInput,
            name=st.sampled_from(["basket", 'a "rack"']),
            mass=st.floats(1e-3, 1e6),
            thickness=st.floats(0.5e-3, 0.5),
            steel=st.none() | st.sampled_from(all_grades()),
        ),
        max_size=2,
    ),
    length=st.floats(1e-3, 50.0),
    at=st.floats(0.0, 3600.0),
)
def test_load_tank_and_shift_read_back_as_they_were_written(
    tank: TankInput, fixtures: list[FixtureInput], length: float, at: float
) -> None:
    case = replace(
        base(),
        load=LoadInput(3, length, None, tuple(fixtures)),
        tank=tank,
        shift=(
            ShiftInput(at, 600.0, 3),
            ShiftInput(at, mass=50.0, start_temp=1100.0, thickness=0.02, time=60.0),
        ),
    )
    assert casefile.loads(casefile.dumps(case)) == case


def test_a_film_of_one_bath_is_said_to_be_kept_while_the_bath_warms(tmp_path: Path) -> None:
    (tmp_path / "oil.csv").write_text(
        "surface_degC, htc_W_per_m2K\n40, 250\n300, 400\n500, 2500\n900, 600\n", encoding="utf-8"
    )
    (tmp_path / "oil.toml").write_text(
        'kind = "oil"\ntemp_degC = [0, 200]\n'
        "density_kg_per_m3 = [880, 750]\nheat_capacity_J_per_kgK = [1800, 2500]\n",
        encoding="utf-8",
    )
    text = OIL.replace('medium = "mineral oil, agitated"', 'film = "oil.csv"')
    found = tankjob.solve(casefile.loads(text + 'fluid_file = "oil.toml"\n', tmp_path / "c.toml"))
    assert any("its only bath; the film is kept" in str(note) for note in found.notes)


def test_a_bath_colder_than_its_films_is_said_to_keep_the_coldest() -> None:
    found = solved(OIL + 'morning = "2 degC"\n')
    assert any("below, the film of that is kept" in str(note) for note in found.notes)


def test_a_medium_that_is_not_known_is_one_fault() -> None:
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.loads(OIL.replace("mineral oil, agitated", "minerol oil, agitated"))
    assert len(caught.value.faults) == 1


@pytest.mark.slow
def test_the_shipped_shaft_load_is_acceptable_and_hot_enough_to_matter() -> None:
    found = tankjob.solve(SHIPPED)
    assert found.acceptable and found.balance < 1e-6
    # 12 shafts of 180 mm and 1.6 m and 600 kg of racks
    mass = 12.0 * np.pi / 4.0 * 0.18**2 * 1.6 * 7850.0 + 600.0
    assert_allclose(sum(b.mass for b in found.own_bodies), mass, rtol=1e-9, atol=0.0)
    assert found.core.worst_hv <= found.core.uncoupled_hv
