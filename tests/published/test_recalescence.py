"""A eutectoid bar cooled slowly heats itself up while pearlite forms.

The heat of pearlite is measured as a calorimeter would: what the film took from the bar
between 727 degC (all austenite) and 600 degC (all pearlite), less what pearlite gives up
on that way by the tabulated heat contents. Against Hagel, Pound & Mehl, 82.0 kJ/kg +- 5 %
(abstract read); Umino 1935 found 69.5 +- 10 % at 720 degC, which does not agree with it.
"""

from pathlib import Path

import numpy as np
import pytest
from endquench import ZERO, rows
from numpy.testing import assert_allclose

from midradius.study.case import (
    Case,
    Grid,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
    Until,
)
from midradius.study.result import Result
from midradius.study.runner import run
from midradius.thermo.grades import grade
from midradius.thermo.properties import DENSITY
from midradius.thermo.steel import Composition, Steel

AIR_DEGC, DIAMETER = 20.0, 0.02
EUTECTOID_DEGC, AFTER_DEGC = 727.0, 600.0
PLAIN = Steel("eutectoid", Composition(C=0.77), "", "given")
WATCHED = (PositionInput("surface", "surface"), PositionInput("core", "core"))


def _cooled(folder: Path, steel: Steel, htc: float) -> Result:
    path = folder / "film.csv"
    path.write_text(f"surface_degC, htc_W_per_m2K\n0, {htc}\n1000, {htc}\n", encoding="utf-8")
    slow = MediumUse(film_file=path, bath=AIR_DEGC + ZERO)
    return run(
        Case(
            title="recalescence",
            steel=SteelInput(steel, 7.0),
            section=SectionInput("round", diameter=DIAMETER),
            route=(
                Stage("soak", at=815.0 + ZERO, time=3600.0),
                Stage("quench", medium=slow, until=Until("core", AFTER_DEGC - 20.0 + ZERO)),
            ),
            outputs=Outputs(WATCHED, n_field=4),
            grid=Grid((16,), 0.1),
        )
    )


@pytest.mark.parametrize("htc", [2.0, 5.0, 30.0])
@pytest.mark.parametrize("steel", [PLAIN, grade("1080")], ids=["plain", "1080"])
def test_a_eutectoid_bar_falls_below_ae1_rises_and_falls_again(
    tmp_path: Path, steel: Steel, htc: float
) -> None:
    result = _cooled(tmp_path, steel, htc)
    ae1 = result.critical_degC["Ae1"]
    core = result.history_temp_degC[:, 1]
    rising = np.flatnonzero(np.diff(core) > 0.0)
    first, last = int(rising[0]), int(rising[-1]) + 1
    # one rise without a break, below Ae1, falling before and after it; wire rod of eutectoid
    # steel rises 10 to 40 K on a cooling conveyor (common practice, no source)
    assert_allclose(np.diff(rising), 1.0, rtol=0.0, atol=0.0)
    assert core[first] < core[last] < ae1
    assert 1.0 < core[last] - core[first] < 40.0
    assert core[0] > ae1 and core[-1] < core[first] - 50.0
    # pearlite forms along the plateau
    formed = result.pearlite_formed_at_degC
    assert (formed > core[first] - 5.0).all() and (formed < core[last] + 1.0).all()
    assert result.positions[1].phases["pearlite"] > 0.98


@pytest.mark.parametrize("htc", [2.0, 5.0, 30.0])
def test_the_plateau_gives_off_the_heat_of_pearlite(tmp_path: Path, htc: float) -> None:
    result = _cooled(tmp_path, PLAIN, htc)
    time, surface = result.history_times_s, result.history_temp_degC[:, 0]
    # the mean of a parabola over a round is half way between surface and core
    mean = result.history_temp_degC.mean(axis=1)
    loss = htc * (surface - AIR_DEGC) * 4.0 / (DIAMETER * DENSITY)
    given = np.concatenate([[0.0], np.cumsum(0.5 * (loss[1:] + loss[:-1]) * np.diff(time))])
    # trapezoids over the steps of the run against its own account
    assert_allclose(given[-1], result.heat_given_J_per_kg, rtol=2e-3, atol=0.0)
    begin = np.interp(-EUTECTOID_DEGC, -mean[mean > 725.0], given[mean > 725.0])
    end = np.interp(-AFTER_DEGC, -mean[mean < 650.0], given[mean < 650.0])
    pearlite = {
        float(row["temp_degC"]): float(row["ferrite_cementite"])
        for row in rows("heat_content_by_phase")
        if float(row["carbon_pct"]) == 0.77
    }
    ours = 1e-3 * (end - begin) - (pearlite[EUTECTOID_DEGC] - pearlite[AFTER_DEGC])
    hagel = rows("recalescence")[0]
    assert_allclose(ours, float(hagel["value"]), rtol=float(hagel["tolerance_relative"]), atol=0.0)
