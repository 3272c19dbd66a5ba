"""Parts that come to their soak from cold: the whole job."""

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.case import Grid
from midradius.study.job import solve, write
from midradius.study.result import Result
from midradius.study.summary import document
from midradius.thermo import properties, soaked
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.grades import grade
from midradius.thermo.heatup import enthalpy

MESHES = Path(__file__).resolve().parents[2] / "meshes"
ZERO = 273.15

COLD = """
title = "Stud HF-0007"
[steel]
grade = "42CrMo4"
{steel}
[section]
form = "round"
diameter = "{diameter}"
{heat}
[[route]]
stage = "soak"
at = "860 degC"
time = "{soak}"
[[route]]
stage = "quench"
medium = "fast oil, agitated"
bath = "60 degC"
until = "core below 150 degC"
[[need]]
position = "surface"
quantity = "grain"
at_least = "ASTM 5"
[[need]]
position = "core"
quantity = "grain"
at_least = "ASTM 5"
[output]
positions = ["surface", "mid-radius", "core"]
[grid]
cells = 48
"""
HEAT = """[[route]]
stage = "heat"
medium = "{medium}"
furnace = "{furnace}"
{end}
"""


def case(*, heat: str = "", soak: str = "2 h", steel: str = "", diameter: str = "120 mm") -> Result:
    return solve(casefile.loads(COLD.format(heat=heat, soak=soak, steel=steel, diameter=diameter)))


def furnace(end: str, *, medium: str = "gas-fired furnace", furnace: str = "860 degC") -> str:
    return HEAT.format(medium=medium, furnace=furnace, end=end)


@pytest.fixture(scope="module")
def short() -> Result:
    """Taken out long before its core is hot."""
    heat = furnace('time = "75 min"')
    return case(heat=heat, soak="2 min", diameter="200 mm")


def test_a_part_soaked_long_enough_comes_out_as_one_that_was_hot_throughout() -> None:
    # the same grain by measurement: growth would go on through the longer soak
    given = 'austenite_grain = "ASTM 5.5"'
    heated = case(heat=furnace('until = "core above 850 degC"'), soak="12 h", steel=given)
    whole = case(steel=given)
    assert_allclose(heated.soaked.hottest_degC, 860.0, rtol=0.0, atol=0.05)
    assert_allclose(heated.soaked.carbon_in_solution_pct, 0.41, rtol=1e-12, atol=0.0)
    assert_allclose(heated.hardness_hv, whole.hardness_hv, rtol=2e-4, atol=0.0)
    assert_allclose(heated.phases, whole.phases, rtol=0.0, atol=2e-4)
    assert_allclose(heated.heat_given_J_per_kg, whole.heat_given_J_per_kg, rtol=2e-4, atol=0.0)
    assert not any(line.startswith(("Underheated", "Unevenly")) for line in heated.cautions)
    assert whole.heating is None and heated.heating is not None


def test_the_grain_of_a_heated_part_is_that_of_its_whole_path() -> None:
    # a longer stay at the same temperature coarsens by time^0.211; the time at heat before
    # the soak adds a little to the two hours
    heated = case(heat=furnace('until = "core above 858 degC"'), soak="2 h")
    whole = case(soak="2 h")
    number = whole.soaked.grain_astm[0]
    assert (heated.soaked.grain_astm < number).all()
    assert (heated.soaked.grain_astm > number - 0.5).all()
    core, surface = np.argsort(heated.points_mm[:, 0])[[0, -1]]
    assert heated.soaked.grain_astm[core] > heated.soaked.grain_astm[surface]


def test_heat_taken_up_is_the_heat_content_of_the_hot_part(short: Result) -> None:
    assert short.heating is not None
    assert short.heating.heat_balance_relative < 1e-12
    composition = grade("42CrMo4").composition
    # hottest is the temperature at the end: a part that only heats
    ends = short.soaked.hottest_degC + ZERO
    content = enthalpy(composition, ends) - enthalpy(composition, np.array([293.15]))
    mean = float((content * short.volume).sum() / short.volume.sum())
    # the tables are linear between whole kelvins
    assert_allclose(short.heating.heat_taken_J_per_kg, mean, rtol=1e-4, atol=0.0)
    mass = properties.DENSITY * short.volume.sum()
    given = sum(stage.heat_to_bath_J for stage in short.heating.stages)
    factor = given / -(short.heating.heat_taken_J_per_kg * mass)
    # per radian in the solver, per metre of length to a person
    assert_allclose(factor, 2.0 * np.pi, rtol=1e-9, atol=0.0)


def test_an_underheated_core_has_less_austenite_and_says_so(short: Result) -> None:
    order = np.argsort(short.points_mm[:, 0])  # from the core
    hottest = short.soaked.hottest_degC[order]
    assert (np.diff(hottest) > 0.0).all()
    ae3 = equilibrium(grade("42CrMo4").composition).ae3 - ZERO
    assert hottest[0] < ae3 < hottest[-1]
    ferrite = short.soaked.ferrite[order]
    assert (np.diff(ferrite) <= 1e-12).all() and ferrite[0] > 0.1 and ferrite[-1] == 0.0
    carbon = short.soaked.carbon_in_solution_pct[order]
    assert carbon[0] > 0.45 and carbon[-1] == 0.41
    # what stayed ferrite in the soak is there after the quench
    core = next(p for p in short.positions if p.name == "core")
    assert core.phases["ferrite"] >= core.undissolved_ferrite - 1e-9
    words = " ".join(short.cautions)
    assert "Ferrite left by the soak" in words and "Unevenly soaked" in words
    assert "intercritical austenite" in short.soak


def test_what_never_became_austenite_stays_soft_whatever_the_quench() -> None:
    result = case(
        heat=furnace('time = "40 min"', furnace="900 degC"), soak="2 min", diameter="200 mm"
    )
    old = ~result.soaked.austenitised
    assert old.any() and not old.all()
    assert np.isnan(result.soaked.grain_astm[old]).all()
    # ferrite, (cementite), pearlite, as before the quench, by the lever rule
    assert_allclose(result.phases[[1, 3]][:, old].sum(axis=0), 1.0, rtol=0.0, atol=1e-9)
    assert np.isfinite(result.hardness_hv).all()
    # as delivered: 42CrMo4 +A has at most 241 HB (EN ISO 683-2, from memory), about 254 HV
    assert result.hardness_hv[old].max() < 254.0 < result.hardness_hv.max() - 100.0
    core = next(p for p in result.positions if p.name == "core")
    assert core.austenite_grain_astm is None and core.austenite_grain_um is None
    assert any(line.startswith("Underheated: ") for line in result.cautions)
    assert " min" in result.soak and " of heating: reached " in result.soak
    assert any("not austenitised" in note.value for note in result.notes)
    surface, at_core = result.verdicts
    assert surface.value is not None and at_core.value is None
    assert at_core.outcome == "too close to call"


def test_what_stayed_cold_has_a_hardness_and_no_note_that_it_has_none() -> None:
    result = case(
        heat=furnace('time = "20 min"', furnace="700 degC"), soak="1 min", diameter="200 mm"
    )
    assert not result.soaked.austenitised.any() and np.isfinite(result.hardness_hv).all()
    assert result.soak.endswith("degC; not austenitised, ferrite and pearlite as before")
    assert not [note for note in result.notes if note.quantity == "cooling rate at 700 degC"]


def test_a_need_of_grain_is_judged_where_it_is_asked(short: Result) -> None:
    ends = (short.positions[0], short.positions[-1])
    for verdict, position in zip(short.verdicts, ends, strict=True):
        assert verdict.value == position.austenite_grain_astm
    assert short.verdicts[0].value != short.verdicts[1].value


def test_what_the_soak_left_stands_in_tables_and_document(short: Result, tmp_path: Path) -> None:
    folder = write(short, tmp_path / "out")
    heating = list(csv.reader((folder / "heating.csv").read_text("utf-8").splitlines()))
    assert heating[0] == ["time_s", "surface_degC", "mid-radius_degC", "core_degC"]
    assert short.heating is not None
    assert float(heating[-1][0]) == pytest.approx(4620.0)
    rows = csv.DictReader((folder / "positions.csv").read_text("utf-8").splitlines())
    for row, position in zip(rows, short.positions, strict=True):
        assert_allclose(float(row["soak_reached_degC"]), position.soak_degC, rtol=1e-8, atol=0.0)
        assert_allclose(
            float(row["austenite_grain_astm"]), position.austenite_grain_astm, rtol=1e-8, atol=0.0
        )
    told = document(short)
    assert [stage["kind"] for stage in told["heating"]["stages"]] == ["heat", "soak"]
    assert told["positions"][0]["undissolved_ferrite"] == 0.0


def test_twelve_kinds_of_austenite_are_enough(
    short: Result, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(soaked, "MOST_KINDS", 40)
    heat = furnace('time = "75 min"')
    many = case(heat=heat, soak="2 min", diameter="200 mm")
    # without the factors of `nodeclocks` a position would be 15 HV off
    assert_allclose(short.hardness_hv, many.hardness_hv, rtol=0.0, atol=1.0)


def test_a_plugged_bore_takes_no_heat_in_the_furnace() -> None:
    text = COLD.format(heat=furnace('time = "10 min"'), soak="1 min", steel="", diameter="9 mm")
    tube = 'form = "tube"\noutside = "120 mm"\nbore = "60 mm"\nbore_medium = {}'
    text = text.replace('form = "round"\ndiameter = "9 mm"', tube)
    text = text.replace('"mid-radius"', '"quarter thickness"').replace("cells = 48", "cells = 24")
    plugged = solve(casefile.loads(text.format('"insulated"')))
    free = solve(casefile.loads(text.format('"still air"')))
    assert plugged.heating is not None and free.heating is not None
    inner = np.argmin(plugged.points_mm[:, 0])
    # without a flux at the bore the profile is flat there
    radius, hot = plugged.points_mm[:, 0], plugged.soaked.hottest_degC
    assert hot[inner] == hot.min()
    assert radius[np.argmin(free.soaked.hottest_degC)] > 60.0 / 2.0 + 2.0
    assert plugged.heating.heat_taken_J_per_kg < 0.8 * free.heating.heat_taken_J_per_kg


def test_a_preheat_goes_over_into_the_next_furnace() -> None:
    heat = furnace('until = "core above 600 degC"', medium="electric furnace, still air",
                   furnace="650 degC") + furnace('until = "core above 845 degC"',
                   medium="salt bath, austenitizing")  # fmt: skip
    result = case(heat=heat, soak="10 min", diameter="60 mm")
    assert result.heating is not None
    kinds = [(stage.kind, stage.medium) for stage in result.heating.stages]
    assert kinds == [
        ("heat", "electric furnace, still air, 650 degC"),
        ("heat", "salt bath, austenitizing, 860 degC"),
        ("soak", "salt bath, austenitizing, 860 degC"),
    ]
    ends = [stage.end_s for stage in result.heating.stages]
    starts = [stage.start_s for stage in result.heating.stages]
    assert starts == [0.0, *ends[:-1]]
    core = result.heating.temp_degC[:, 2]
    at = np.searchsorted(result.heating.times_s, ends[:2])
    assert_allclose(core[at], [600.0, 845.0], rtol=0.0, atol=0.02)


def test_the_shipped_rotor_shaft_is_sound_from_surface_to_core() -> None:
    asked = casefile.read(MESHES / "rotor-shaft.toml")
    result = solve(replace(asked, grid=Grid((48,), 1.0)))
    assert result.soaked.austenitised.all()
    assert [verdict.outcome for verdict in result.verdicts] == ["holds"]
    assert result.heating is not None
    # 120 K/h from 20 to 870 degC takes 7.08 h: the core is behind the furnace
    assert result.heating.stages[0].end_s > 7.08 * 3600.0
