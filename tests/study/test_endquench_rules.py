"""What the end-quench test takes for granted: temperatures, bands, which steel is meant."""

import csv
from pathlib import Path

import pytest
from numpy.testing import assert_allclose

from midradius.study import steelgiven
from midradius.study.casefaults import CaseFaults
from midradius.thermo.austenitizing import austenitizing
from midradius.thermo.bands import band
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import all_grades, grade
from midradius.thermo.steel import Composition, Steel

PUBLISHED = Path(__file__).parents[1] / "published" / "end_quench_bands.csv"


# ASTM A255, table of austenitising temperatures by series; EN ISO 683-2 (both from memory)
@pytest.mark.parametrize(
    ("name", "degc"),
    [
        *(("1045", 845.0), ("4130", 870.0), ("4140", 845.0), ("4340", 845.0), ("8620", 925.0)),
        *(("5120", 925.0), ("9310", 845.0), ("42CrMo4", 850.0)),
    ],
)
def test_a_steel_is_austenitised_as_its_standard_asks(name: str, degc: float) -> None:
    assert_allclose(austenitizing(grade(name)).temp - 273.15, degc, rtol=0.0, atol=1e-9)


def test_every_shipped_steel_is_austenitised_above_its_lines() -> None:
    for steel in all_grades():
        eq = equilibrium(steel.composition)
        carbon = steel.composition.C
        line = eq.ae3 if carbon <= eq.eutectoid_carbon_pct else eq.ae1
        assert austenitizing(steel).temp >= line + 30.0, steel.name


def test_a_steel_with_a_high_ae3_is_raised_and_says_so() -> None:
    silicon = Steel("HF-S1", Composition(C=0.40, Si=2.9), "invented", "given")
    found = austenitizing(silicon)
    assert found.reason == "50 K above Ae3, common practice"
    ae3 = equilibrium(silicon.composition).ae3
    assert_allclose(found.temp, ae3 + 50.0, rtol=0.0, atol=1e-9)


def test_the_shipped_bands_are_the_published_rows() -> None:
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if "one reading" not in row["band"]]
    for name in {row["grade"] for row in rows}:
        found = band(name)
        assert found is not None
        own = [row for row in rows if row["grade"] == name]
        assert found.name == own[0]["band"]
        status = {"read": "read", "memory": "remembered"}[own[0]["read_or_memory"]]
        assert found.status == status
        given = [(1e3 * p.distance, p.low_hrc, p.high_hrc) for p in found.points]
        asked = [tuple(float(row[k]) for k in ("distance_mm", "low", "high")) for row in own]
        assert_allclose(given, asked, rtol=1e-12, atol=0.0)


def test_a_band_is_found_by_any_name_of_its_grade_and_missing_for_others() -> None:
    assert band("1.7225") is band("42CrMo4") is not None
    assert band("4140H") is band("AISI 4140") is not None
    assert band("C45E") is None
    assert band("HF-0417") is None


def test_a_composition_in_toml_is_a_steel_and_its_other_tables_are_not_looked_at(
    tmp_path: Path,
) -> None:
    path = tmp_path / "heat.toml"
    path.write_text(
        'title = "x"\nnonsense = 1\n[steel]\naustenite_grain = "ASTM 8"\n'
        "composition = { C = 0.41, Mn = 0.75, Cr = 1.05 }\n",
        encoding="utf-8",
    )
    given = steelgiven.given(str(path))
    assert given.grain_astm == 8.0
    assert given.steel.composition == Composition(C=0.41, Mn=0.75, Cr=1.05)


def test_a_faulty_composition_is_answered_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "heat.toml"
    path.write_text("[steel]\ncomposition = { C = 0.41, Mn = 7.5 }\n", encoding="utf-8")
    with pytest.raises(CaseFaults, match=r"heat.toml, line 2: steel.composition.Mn = 7.5"):
        steelgiven.given(str(path))


def test_grains_are_astm_numbers_or_that_of_the_soak() -> None:
    assert steelgiven.grain_of("astm 7.5") == 7.5
    assert steelgiven.grain_of("soak") is None
    with pytest.raises(InputFault, match="ASTM -1"):
        steelgiven.grain_of("ASTM 15")
