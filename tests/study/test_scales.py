"""The lengths of a structure in a whole result: film, network, grain, spacing, transition."""

import csv
import json
from pathlib import Path

import h5py
import numpy as np
import pytest
import pyvista
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.job import run, solve
from midradius.study.result import Result
from midradius.study.summary import document

RING = """\
title = "Roll ring HF-0105, Hallgrund Forge (invented)"

[steel]
composition = { C = 1.10, Mn = 0.30, Si = 0.20 }
austenite_grain = "ASTM 5"

[section]
form = "round"
diameter = "60 mm"

[[route]]
stage = "soak"
at = "950 degC"
time = "1 h"

[[route]]
stage = "quench"
medium = "still air"
until = "core below 100 degC"
"""
MILD = RING.replace("C = 1.10, Mn = 0.30", "C = 0.08, Mn = 0.50").replace("950", "930")


@pytest.fixture(scope="module")
def hypereutectoid() -> Result:
    return solve(casefile.loads(RING))


def test_the_film_is_that_of_the_printed_table(hypereutectoid: Result) -> None:
    """Film at 650 degC of 1.1 % C and l = 60 um: 1.58 um at 0.1, 0.89 at 2 degC/s (PDE of
    sphere diffusion; the model is 1 to 24 % below it). A 60 mm round in air is between the
    two on its way to Ae1, and its grain is 56.6 um."""
    for place in hypereutectoid.positions:
        assert place.cementite_film_um is not None and place.rate_700_K_per_s is not None
        assert 0.1 < place.rate_700_K_per_s < 2.0
        assert 0.76 * 0.89 * 0.94 < place.cementite_film_um < 1.58 * 0.95
        assert place.cementite_network == "continuous"
        assert place.ferrite_grain_um is None
        assert place.impact_transition_degC is None


def test_a_faster_bath_leaves_no_network() -> None:
    text = RING.replace('"still air"', '"water, agitated"\nbath = "20 degC"').replace(
        "60 mm", "12 mm"
    )
    positions = solve(casefile.loads(text)).positions
    # the same table: 0.22 um at 50, 0.11 um at 200 degC/s
    assert all(p.cementite_film_um is not None and p.cementite_film_um < 0.3 for p in positions)
    assert {p.cementite_network for p in positions} <= {"none", "broken"}


def test_a_soft_steel_has_a_grain_and_a_transition_and_no_film() -> None:
    result = solve(casefile.loads(MILD))
    for place in result.positions:
        assert place.cementite_film_um is None and place.cementite_network is None
        assert place.ferrite_grain_um is not None and 5.0 < place.ferrite_grain_um < 60.0
        assert place.impact_transition_degC is not None
    assert np.isnan(result.cementite_film_um).all()
    assert any("impact transition" in source.model for source in result.sources)
    assert not any("network" in source.model for source in result.sources)


def test_all_outputs_carry_film_and_flag(tmp_path: Path) -> None:
    case = tmp_path / "ring.toml"
    case.write_text(RING, encoding="utf-8")
    folder = tmp_path / "out"
    result = run(case, folder)
    film = result.positions[-1].cementite_film_um
    assert film is not None
    said = json.loads(json.dumps(document(result), allow_nan=False))["positions"][-1]
    assert said["cementite_film_um"] == pytest.approx(film)
    assert said["cementite_network"] == "continuous"
    with (folder / "positions.csv").open(encoding="utf-8", newline="") as file:
        row = list(csv.DictReader(file))[-1]
    assert row["cementite_network"] == "continuous"
    assert_allclose(float(row["cementite_film_um"]), film, rtol=1e-8, atol=0.0)
    with (folder / "profile.csv").open(encoding="utf-8", newline="") as file:
        column = [float(line["cementite_film_um"]) for line in csv.DictReader(file)]
    node = result.profile.node
    assert_allclose(column, result.cementite_film_um[node], rtol=1e-8, atol=0.0)
    with h5py.File(folder / "record.h5") as record:
        names: list[str] = []
        record.visit(names.append)
        kept = next(name for name in names if name.endswith("fields/cementite_film"))
        assert_allclose(record[kept][()], result.cementite_film_um, rtol=0.0, atol=0.0)
    index = next(folder.rglob("*.pvd"))
    reader = pyvista.PVDReader(str(index))
    reader.set_active_time_value(reader.time_values[-1])
    data = reader.read()[0].point_data
    assert_allclose(
        data["cementite_film_um"], result.cementite_film_um[result.view.node], rtol=1e-6, atol=0.0
    )
    assert set(np.unique(data["cementite_network_code"])) <= {0.0, 1.0, 2.0}
