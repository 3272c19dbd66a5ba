"""The command that reads a probe's curve: quantities, film, files, and a case that takes the film.

The shipped curve was made from the film `hallgrund-oil-3.csv`, which is the expected answer.
"""

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.filmfile import read_curve
from midradius.study.casefile import loads
from midradius.study.job import solve
from midradius.study.probecurve import read_probe

MESHES = Path(__file__).parents[2] / "meshes"
SAMPLE = str(MESHES / "hallgrund-probe.csv")
BATH = ("--bath", "65 degC")


def against_truth(temp: list[float], htc: list[float]) -> float:
    """Root mean square error of the flux, of its peak, over what the probe shows well."""
    known_temp, known = read_curve(MESHES / "hallgrund-oil-3.csv")
    at = np.array(temp)
    seen = (at > 200.0) & (at < 800.0)
    over = at[seen] - 65.0
    gap = (np.array(htc)[seen] - np.interp(at[seen], known_temp, known)) * over
    return float(np.sqrt(np.mean(gap**2)) / (np.interp(at[seen], known_temp, known) * over).max())


def test_the_shipped_curve_gives_its_film_back(call, tmp_path: Path) -> None:
    answer = call("probe", SAMPLE, *BATH, "--no-sharpen", "--out", "oil", "--json")
    assert (answer.code, answer.err) == (0, "")
    found = json.loads(answer.out)
    assert found["standard_probe"] is True
    assert against_truth(found["film"]["surface_degC"], found["film"]["htc_W_per_m2K"]) < 0.05
    assert_allclose(found["scatter_K"], 0.4, rtol=0.1, atol=0.0)
    assert found["highest_rate_K_per_s"] > 50.0
    assert list(found["times_s"]) == ["600degC", "400degC", "200degC"]
    assert any("local codes" in line for line in found["cautions"])
    names = sorted(item.name for item in (tmp_path / "oil").glob("[!.]*"))
    assert names == ["film.csv", "film.png", "probe.csv", "probe.json", "probe.png"]
    temp, htc = read_curve(tmp_path / "oil" / "film.csv")
    assert_allclose(htc, found["film"]["htc_W_per_m2K"], rtol=0.0, atol=0.06)
    with (tmp_path / "oil" / "probe.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    gaps = [float(row["residual_K"]) for row in rows]
    assert_allclose(np.sqrt(np.mean(np.square(gaps))), found["residual_rms_K"], rtol=1e-4, atol=0.0)
    assert len(rows) == found["n_reading"] == 601
    assert temp[0] < temp[-1]


@pytest.mark.slow
def test_sharpened_the_film_meets_the_readings_within_their_scatter(call) -> None:
    found = json.loads(call("probe", SAMPLE, *BATH, "--json").out)
    assert found["residual_rms_K"] < 0.5 < found["sequential_residual_rms_K"]
    assert against_truth(found["film"]["surface_degC"], found["film"]["htc_W_per_m2K"]) < 0.03


def test_a_case_takes_the_saved_film_and_its_result_says_where_it_is_from(
    call, tmp_path: Path, small: str
) -> None:
    answer = call("probe", SAMPLE, *BATH, "--no-sharpen", "--save", "oil-7.csv")
    assert (answer.code, answer.err) == (0, "")
    assert 'film = "oil-7.csv"' in answer.out and 'bath = "65 degC"' in answer.out
    assert "Caution" in answer.out
    quench = next(line for line in small.splitlines() if line.startswith("medium"))
    text = small.replace(quench, 'film = "oil-7.csv"', 1)
    result = solve(loads(text, tmp_path / "stud.toml"))
    (source,) = [each for each in result.sources if each.work == "oil-7.csv"]
    assert source.locator.startswith("hallgrund-probe.csv, alloy 600 round 12.5 mm")
    # an earlier film is replaced, another file is not touched
    assert call("probe", SAMPLE, *BATH, "--no-sharpen", "--save", "oil-7.csv").code == 0
    (tmp_path / "other.csv").write_text("mine\n", encoding="utf-8")
    refused = call("probe", SAMPLE, *BATH, "--save", "other.csv")
    assert refused.code == 2 and "was not touched" in refused.err
    assert (tmp_path / "other.csv").read_text(encoding="utf-8") == "mine\n"


def test_readings_before_immersion_do_not_count(call, tmp_path: Path) -> None:
    rows = Path(SAMPLE).read_text(encoding="utf-8").splitlines()
    later = [
        f"{float(time) + 5.0:.1f};{temp.strip()}"
        for time, temp in (row.split(",") for row in rows[3:])
    ]
    before = [f"{0.1 * k:.1f};849.9" for k in range(50)]
    text = "\n".join(["time_s;temperature_degC", *before, *later]).replace(".", ",")
    (tmp_path / "late.csv").write_text(text, encoding="utf-8")
    words = (*BATH, "--no-sharpen", "--json")
    late = json.loads(call("probe", "late.csv", *words, "--immersed", "5 s").out)
    plain = json.loads(call("probe", SAMPLE, *words).out)
    assert_allclose(late["times_s"]["400degC"], plain["times_s"]["400degC"], rtol=0.0, atol=0.01)


@pytest.mark.parametrize(
    ("head", "of"),
    [
        ("temperature_K", lambda degc: degc + 273.15),
        ("temperature_degF", lambda degc: 1.8 * degc + 32.0),
    ],
)
def test_kelvin_and_fahrenheit_are_read_by_their_head(tmp_path: Path, head: str, of) -> None:
    rows = [row.split(",") for row in Path(SAMPLE).read_text(encoding="utf-8").splitlines()[3:]]
    text = "".join(f"{time},{of(float(temp)):.6f}\n" for time, temp in rows)
    (tmp_path / "other.csv").write_text(f"time_s,{head}\n{text}", encoding="utf-8")
    found, plain = read_probe(tmp_path / "other.csv"), read_probe(Path(SAMPLE))
    assert_allclose(found.temp, plain.temp, rtol=0.0, atol=1e-5)


def test_readings_that_no_film_explains_are_named_first(call, tmp_path: Path) -> None:
    rows = Path(SAMPLE).read_text(encoding="utf-8").splitlines()
    time, temp = rows[203].split(",")
    rows[203] = f"{time},{float(temp) + 60.0}"
    (tmp_path / "spike.csv").write_text("\n".join(rows), encoding="utf-8")
    words = (*BATH, "--no-sharpen", "--json")
    notes = json.loads(call("probe", "spike.csv", *words).out)["notes"]
    assert "reading(s) lie more than 5 K off" in notes[0]
    assert "DOES NOT EXPLAIN" in notes[1]
    sound = json.loads(call("probe", SAMPLE, *words).out)["notes"]
    assert not any("EXPLAIN" in note for note in sound)


BAD = {
    "no head": ("0,850\n1,840\n", "time_s column is missing"),
    "turned back": ("time_s,temperature_degC\n0,850\n1,849\n1,848\n", "line 4: time_s"),
    "no unit": ("time_s,temperature\n0,850\n", "temperature_degC column is missing"),
    "far too cold": ("time_s,temperature_degF\n0,-80\n", "must be -4 to 2372 degF"),
    "kelvin": ("time_s,temperature_degC\n0,1423\n", "line 2: temperature_degC"),
    "short": ("time_s,temperature_degC\n0,850\n1,849\n", "2 readings, at least 20 are needed"),
}


@pytest.mark.parametrize("name", BAD)
def test_a_file_that_is_no_probe_curve_is_refused(call, tmp_path: Path, name: str) -> None:
    text, said = BAD[name]
    (tmp_path / "bad.csv").write_text(text, encoding="utf-8")
    answer = call("probe", "bad.csv", *BATH, "--out", "oil")
    assert answer.code == 2
    assert said in answer.err
    assert not (tmp_path / "oil").exists()


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--bath", "700 degC"), "--bath"),
        (("--bath", "300 degC"), "the coldest of the curve"),
        (("--bath", "65 degC", "--material", "42CrMo4"), "its latent heat would be read"),
        (("--bath", "65 degC", "--depth", "9 mm"), "--depth"),
        (("--bath", "65 degC", "--future", "0 s"), "more than 0 s"),
        (("--bath", "65 degC", "--save", "film.txt"), "a file name that ends in .csv"),
        (("--bath", "65"), "--bath"),
    ],
)
def test_an_option_that_cannot_be_is_refused(call, words: tuple[str, ...], said: str) -> None:
    answer = call("probe", SAMPLE, *words)
    assert answer.code == 2
    assert said in answer.err
