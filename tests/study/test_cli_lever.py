"""The lever rule at the command line, forward and inverse.

Phases: ``tests/published/calphad.csv`` and the customary eutectoid 727 degC, 0.76 % C,
ferrite 0.022 %, cementite 6.70 % C (from memory). Intervals: exact binomial arithmetic
and Student's t of a printed table (2.776 for four degrees of freedom).
"""

import json
import math
import shutil
from pathlib import Path
from typing import Any

import pytest
from numpy.testing import assert_allclose

MESHES = Path(__file__).resolve().parents[2] / "meshes"
FIELDS = "41 38.5 45 40 44 of 100"


def told(call, *words: str) -> dict[str, Any]:
    answer = call("lever", *words, "--json")
    assert (answer.code, answer.err) == (0, "")
    document: dict[str, Any] = json.loads(answer.out)
    return document


def shares(items: list[dict[str, Any]]) -> dict[str, float]:
    return {item["name"]: item["mass_fraction"] for item in items}


# Forward


def test_plain_steel_of_045_carbon_has_the_lines_and_the_structure_of_the_books(call) -> None:
    document = told(call, "--composition", "C 0.45")
    found = document["equilibrium"]
    assert_allclose(found["Ae1_degC"], 727.0, rtol=0.0, atol=1.0)
    # between 787.1 and 767.5 degC of the independent minimisation at 0.4 and 0.5 % C
    assert_allclose(found["Ae3_degC"], 777.0, rtol=0.0, atol=1.0)
    assert found["Acm_degC"] is None
    assert_allclose(found["eutectoid_carbon_pct"], 0.76, rtol=0.0, atol=0.01)
    # (0.76 - 0.45) / (0.76 - 0.022)
    ferrite = shares(document["slow_cooling"])["ferrite"]
    assert_allclose(ferrite, 0.420, rtol=0.0, atol=0.005)
    assert_allclose(sum(shares(document["slow_cooling"]).values()), 1.0, rtol=0.0, atol=1e-12)
    volumes = [item["volume_fraction"] for item in document["slow_cooling"]]
    assert_allclose(sum(volumes), 1.0, rtol=0.0, atol=1e-12)
    assert volumes[0] < ferrite  # ferrite is the denser


def test_hypereutectoid_steel_has_an_acm_and_cementite(call) -> None:
    document = told(call, "--composition", "C 1.1", "--at", "760 degC")
    # calphad.csv: 855.7 degC and 0.0437 at 760 degC
    assert_allclose(document["equilibrium"]["Acm_degC"], 855.7, rtol=0.0, atol=0.2)
    assert document["equilibrium"]["Ae3_degC"] is None
    assert_allclose(shares(document["at"]["phases"])["cementite"], 0.0437, rtol=0.0, atol=2e-4)
    # (1.1 - 0.76) / (6.70 - 0.76)
    assert_allclose(shares(document["slow_cooling"])["cementite"], 0.0572, rtol=0.0, atol=5e-4)


@pytest.mark.parametrize(
    ("at", "phases"),
    [
        ("740 degC", {"ferrite": 0.335238, "austenite": 0.664762}),
        ("1364 degF", {"ferrite": 0.335238, "austenite": 0.664762}),
        ("900 degC", {"austenite": 1.0}),
        # (0.45 - x) / (6.69 - x) with ferrite of 0.0146 % C
        ("700 degC", {"cementite": 0.06523, "ferrite": 0.93477}),
    ],
)
def test_phases_at_a_temperature_are_those_of_an_independent_minimisation(
    call, at: str, phases: dict[str, float]
) -> None:
    found = told(call, "--composition", "C 0.45", "--at", at)["at"]["phases"]
    assert list(shares(found)) == list(phases)
    assert_allclose(list(shares(found).values()), list(phases.values()), rtol=0.0, atol=5e-4)
    carbon = sum(item["mass_fraction"] * item["carbon_pct"] for item in found)
    assert_allclose(carbon, 0.45, rtol=0.0, atol=1e-9)


def test_a_soak_between_the_lines_leaves_ferrite(call) -> None:
    soak = told(call, "--composition", "C 0.45", "--soak", "740 degC, 1 h")["soak"]
    assert soak["regime"] == "intercritical"
    assert_allclose(soak["undissolved_ferrite_mass_fraction"], 0.3352, rtol=0.0, atol=5e-4)
    assert_allclose(soak["austenite_carbon_pct"], 0.668, rtol=0.0, atol=1e-3)
    assert soak["time_s"] == 3600.0
    assert "After a soak at 740 degC" in call("lever", "C45E", "--soak", "740 degC, 1 h").out


def test_a_grade_a_case_and_a_heat_of_a_file_can_be_named(call, tmp_path: Path, small: str) -> None:
    (tmp_path / "case.toml").write_text(small, encoding="utf-8")
    assert told(call, "case.toml")["equilibrium"] == told(call, "1.1191")["equilibrium"]
    shutil.copy(MESHES / "steels-hallgrund.csv", tmp_path)
    found = told(call, "steels-hallgrund.csv", "--heat", "H 5119")
    assert found["composition_pct"]["C"] == 0.47
    assert found["status"] == "given"


def test_a_composition_may_be_written_with_decimal_commas_and_ppm(call) -> None:
    written = told(call, "--composition", "c 0,45; Mn=0,7 %; B 30 ppm")["composition_pct"]
    assert written == {"C": 0.45, "Mn": 0.7, "B": 0.003}


def test_a_model_outside_its_range_is_noted(call) -> None:
    notes = told(call, "--composition", "C 0.3, Ni 4.0")["notes"]
    assert any(note.startswith("alloy shifts of the phase boundaries: Ni = 4 %") for note in notes)
    said = call("lever", "--composition", "C 0.3, Ni 4.0").out
    assert "Outside the range of a source" in said


# Inverse


def test_counted_ferrite_gives_the_carbon_it_was_made_of(call) -> None:
    words = ("--ferrite", "42.0 %", "--basis", "mass", "--counted", "25 fields of 100 points")
    carbon = told(call, *words)["carbon"]
    assert_allclose(carbon["carbon_pct"], 0.45, rtol=0.0, atol=0.003)
    words = ("--cementite", "5.72 %", "--basis", "mass", "--counted", "40 fields of 100 points")
    assert_allclose(told(call, *words)["carbon"]["carbon_pct"], 1.10, rtol=0.0, atol=0.005)


def test_the_interval_of_fields_is_that_of_students_t(call) -> None:
    document = told(call, "--ferrite", FIELDS)
    measured, carbon = document["measured"], document["carbon"]
    hits = [0.41, 0.385, 0.45, 0.40, 0.44]
    mean = sum(hits) / 5
    deviation = math.sqrt(sum((hit - mean) ** 2 for hit in hits) / 4)
    half = 2.776 * deviation / math.sqrt(5)
    assert_allclose(measured["fraction"], mean, rtol=0.0, atol=1e-12)
    assert_allclose([measured["low"], measured["high"]], [mean - half, mean + half],
                    rtol=0.0, atol=1e-5)  # fmt: skip
    assert_allclose(measured["relative_accuracy"], half / mean, rtol=1e-3, atol=0.0)
    assert (measured["n_field"], measured["n_point"], measured["basis"]) == (5, 500.0, "volume")
    # the lever: 0.743 % C a unit of mass fraction, volume and mass nearly alike
    span = carbon["high_pct"] - carbon["low_pct"]
    assert_allclose(span, 2.0 * half * 0.743, rtol=0.01, atol=0.0)


def test_totals_give_the_score_interval_and_say_that_it_is_the_least(call) -> None:
    for words in (
        ("--ferrite", "42 %", "--counted", "25 fields of 100 points"),
        ("--ferrite", "42 %", "--counted", "2500 points"),
        ("--ferrite", "1050 of 2500"),
    ):
        document = told(call, *words)
        measured = document["measured"]
        # Wilson with z = 1.95996: centre (p + z2/2n) / (1 + z2/n)
        assert_allclose(measured["low"], 0.40079, rtol=0.0, atol=2e-5)
        assert_allclose(measured["high"], 0.43944, rtol=0.0, atol=2e-5)
        assert "so the interval is the least there can be" in document["notes"][0]


def test_a_stated_interval_is_carried_to_carbon(call) -> None:
    document = told(call, "C45E", "--ferrite", "42 % +- 3 %", "--level", "90 %")
    assert document["measured"]["interval_by"] == "stated"
    assert document["measured"]["n_point"] is None
    assert document["carbon"]["level"] == 0.9
    assert "C" not in document["composition_pct"]


def test_alloying_moves_what_a_fraction_means(call) -> None:
    words = ("--ferrite", "42 % +- 3 %")
    plain, alloyed = told(call, *words), told(call, "--composition", "Mn 1.5", *words)
    assert alloyed["carbon"]["carbon_pct"] < plain["carbon"]["carbon_pct"] - 0.02
    assert alloyed["composition_pct"] == {"Mn": 1.5}


def test_the_text_says_volume_or_mass_how_it_was_counted_and_what_is_from_memory(call) -> None:
    said = call("lever", "--ferrite", FIELDS).out
    assert "% ferrite by volume" in said
    assert "at 95 %, from 5 fields, 500 points" in said
    assert "From memory: density of ferrite" in said
    assert said.count("Carbon ") == 1


# Bad input: exit code 2, one message

BAD = [
    ((), "a grade, a file or --composition"),
    (("C45F",), "Nearest: C45, C45E."),
    (("C45E", "--composition", "C 0.4"), "left out where a grade or file is given"),
    (("--composition", "C 0,45"), "With a decimal comma separate the elements by semicolons."),
    (("--composition", "Mn 0.7"), "composition, C = missing"),
    (("--composition", "C 45"), "It looks like hundredths of a percent: write 0.45."),
    (("--composition", "C 0.4, Sn 0.1"), "No model here knows this element"),
    (("--composition", "C 0.4, C 0.5"), "given once for C"),
    (("C45E", "--at", "740"), '--at = "740"'),
    (("C45E", "--at", "1300 degC"), "0 degC to 1147 degC"),
    (("C45E", "--soak", "860 degC"), "a temperature and a time"),
    (("C45E", "--soak", "650 degC, 1 h"), "soak"),
    (("C45E", "--counted", "2500 points"), "given beside --ferrite or --cementite"),
    (("--ferrite", "42 %"), 'Write for example "25 fields of 100 points"'),
    (("--ferrite", "42 %", "--counted", "many"), '--counted = "many"'),
    (("--ferrite", "42 %", "--counted", "0 points"), '--counted = "0 points"'),
    (("--ferrite", FIELDS, "--counted", "9 points"), "That text says it all."),
    (("--ferrite", "142 %", "--counted", "9 points"), "0 to 100 %"),
    (("--ferrite", "nan %", "--counted", "9 points"), "a share, as"),
    (("--ferrite", "41 120 of 100"), "0 to 100, the points of a field"),
    (("--ferrite", "120 of 100"), "points hit = 120"),
    (("--ferrite", FIELDS, "--cementite", FIELDS), "left out where --ferrite is given"),
    (("--ferrite", FIELDS, "--at", "740 degC"), "left out where carbon is asked for"),
    (("--ferrite", FIELDS, "--basis", "mass"), "volume for a point count"),
    (("--ferrite", FIELDS, "--level", "2"), "95 % is usual."),
    (("--cementite", "60 % +- 1 %"), "More is cast iron"),
]


@pytest.mark.parametrize(("words", "hint"), BAD, ids=[" ".join(words) for words, _ in BAD])
def test_what_cannot_be_answered_is_one_message(call, words: tuple[str, ...], hint: str) -> None:
    answer = call("lever", *words)
    assert (answer.code, answer.out) == (2, ""), answer
    assert hint in answer.err
    assert len(answer.err.splitlines()) == 1
    assert "Traceback" not in answer.err
