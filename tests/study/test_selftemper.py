"""A surface that its core heats up again comes out tempered; a bar cooled through does not."""

import re
from pathlib import Path

import numpy as np
from numpy.testing import assert_allclose

from midradius.study.casefile import loads
from midradius.study.result import Result
from midradius.study.runner import run

CASE = """
[steel]
grade = "4130"

[section]
form = "round"
diameter = "{size} mm"

[[route]]
stage = "soak"
at = "870 degC"
time = "30 min"

[[route]]
stage = "quench"
medium = "water, agitated"
bath = "20 degC"
{until}
{more}
[output]
positions = ["surface"]

[grid]
cells = 32
"""
AIR = """
[[route]]
stage = "hold"
medium = "still air"
time = "15 min"
"""
TEMPER = '\n[[route]]\nstage = "temper"\nat = "600 degC"\ntime = "2 h"\n'


def cooled(size: float, until: str, more: str = "") -> Result:
    return run(loads(CASE.format(size=size, until=until, more=more), Path("case.toml")))


def told(result: Result) -> list[str]:
    return [str(note) for note in result.notes if note.model == "self-tempering of martensite"]


def test_a_bar_that_cools_through_keeps_the_hardness_as_quenched() -> None:
    assert not told(cooled(12, 'until = "core below 60 degC"'))


def test_a_surface_that_its_core_heats_again_is_softer_and_says_so() -> None:
    through = cooled(90, 'until = "core below 60 degC"')
    taken_out = cooled(90, 'time = "25 s"', AIR)
    surface, temp = taken_out.positions[0], taken_out.history_temp_degC[:, 0]
    assert surface.phases["martensite"] > 0.9
    assert surface.hardness_hv < through.positions[0].hardness_hv - 10.0
    (note,) = told(taken_out)
    said = re.search(r"as a temper of 1 h = (\d+) degC", note)
    assert said is not None
    # From the temperatures of the run alone: all from when it left the water, by the
    # weight exp(-H / R T) of Maynier 1978 (memory), as the temperature that does it in 1 h.
    out = int(np.argmax(taken_out.history_times_s > 25.0))
    kelvin, times = temp[out:] + 273.15, taken_out.history_times_s[out:]
    weight = np.exp(-50327.0 / kelvin)
    spent = float((0.5 * (weight[1:] + weight[:-1]) * np.diff(times)).sum())
    asked = -50327.0 / np.log(spent / 3600.0) - 273.15
    assert_allclose(float(said[1]), asked, rtol=0.0, atol=5.0)


def test_a_later_temper_is_no_softer_for_it() -> None:
    through = cooled(90, 'until = "core below 60 degC"', TEMPER)
    taken_out = cooled(90, 'time = "25 s"', AIR + TEMPER)
    assert_allclose(
        taken_out.positions[0].hardness_hv, through.positions[0].hardness_hv, rtol=0.0, atol=3.0
    )
