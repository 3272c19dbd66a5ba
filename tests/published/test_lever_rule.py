"""The lever rule through the whole job: slow cooling, holds above Ae1, what a soak leaves.

Invariants and equilibrium amounts: ``lever_rule.csv``. The films are made up so that a
round cools at 0.07 K/min through 700 degC (0.06 W/(m2 K)), ten and a hundred times faster.
"""

from pathlib import Path

import pytest
from endquench import ZERO, Row, rows
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
from midradius.thermo.equilibrium import equilibrium, lever_ferrite, slow_cooling
from midradius.thermo.grades import grade
from midradius.thermo.steel import Composition, Steel

TABLE = rows("lever_rule")
SLOWEST = 0.06  # W/(m2 K)
# suggested tolerances of the equilibrium amounts; the lag of growth is inside them
FERRITE_WITHIN, CEMENTITE_WITHIN = 0.01, 0.002
NO_PHASE = 1e-6
PLACES = (PositionInput("surface", "surface"), PositionInput("core", "core"))


def _value(quantity: str) -> float:
    (row,) = (row for row in TABLE if row["quantity"] == quantity)
    return float(row["value"])


def _most(product: str) -> list[object]:
    return [
        pytest.param(row, id=f"{row['carbon_pct']} % C at {row['temp_degC']} degC")
        for row in TABLE
        if row["quantity"] == f"most {product}"
    ]


def _plain(carbon_pct: float, *, mn: float = 0.0, si: float = 0.0) -> Steel:
    return Steel("plain carbon", Composition(C=carbon_pct, Mn=mn, Si=si), "", "given")


def _cooled(
    steel: Steel, soak_degC: float, *stages: Stage, diameter: float, grain_astm: float | None = 7.0
) -> Result:
    return run(
        Case(
            title="lever rule",
            steel=SteelInput(steel, grain_astm),
            section=SectionInput("round", diameter=diameter),
            route=(Stage("soak", at=soak_degC + ZERO, time=3600.0), *stages),
            outputs=Outputs(PLACES, n_field=4),
            grid=Grid((8,)),
        )
    )


def _film(folder: Path, htc: float, bath_degC: float) -> MediumUse:
    path = folder / f"film {htc:g}.csv"
    path.write_text(f"surface_degC, htc_W_per_m2K\n-20, {htc}\n1300, {htc}\n", encoding="utf-8")
    return MediumUse(film_file=path, bath=bath_degC + ZERO)


def _slowly_cooled(folder: Path, steel: Steel, htc: float = SLOWEST) -> Result:
    # 40 K above Ae3 or Acm all is austenite
    eq = equilibrium(steel.composition)
    top = max(eq.ae3, eq.acm if eq.acm == eq.acm else 0.0)
    slow = Stage("quench", medium=_film(folder, htc, 20.0), until=Until("core", 600.0 + ZERO))
    rest = Stage("quench", medium=MediumUse("still air"), until=Until("core", 60.0 + ZERO))
    return _cooled(steel, top - ZERO + 40.0, slow, rest, diameter=0.02)


def _held(folder: Path, row: Row) -> Result:
    """Austenite brought to the row's temperature and kept there; the rest turns martensite."""
    start = 850.0 if row["quantity"] == "most ferrite" else 900.0
    bath = _film(folder, 500.0, float(row["temp_degC"]))
    hold = Stage("hold", medium=bath, time=1e6)
    return _cooled(_plain(float(row["carbon_pct"])), start, hold, diameter=0.005)


@pytest.mark.parametrize("invariants", ["", "customary "])
@pytest.mark.parametrize("carbon_pct", [0.2, 0.45, 0.6])
def test_a_hypoeutectoid_steel_cooled_slowly_is_ferrite_by_the_lever_rule_and_pearlite(
    tmp_path: Path, carbon_pct: float, invariants: str
) -> None:
    eutectoid = _value(f"{invariants}eutectoid carbon")
    solvus = _value(f"{invariants}ferrite carbon at the eutectoid")
    ferrite = (eutectoid - carbon_pct) / (eutectoid - solvus)
    for place in _slowly_cooled(tmp_path, _plain(carbon_pct)).positions:
        phases = dict(place.phases)
        assert_allclose(phases.pop("ferrite"), ferrite, rtol=0.0, atol=FERRITE_WITHIN)
        assert_allclose(phases.pop("pearlite"), 1.0 - ferrite, rtol=0.0, atol=FERRITE_WITHIN)
        assert_allclose(list(phases.values()), 0.0, rtol=0.0, atol=NO_PHASE)


@pytest.mark.parametrize("invariants", ["", "customary "])
def test_a_hypereutectoid_steel_cooled_slowly_is_cementite_by_the_lever_rule_and_pearlite(
    tmp_path: Path, invariants: str
) -> None:
    eutectoid = _value(f"{invariants}eutectoid carbon")
    cementite = (1.1 - eutectoid) / (_value(f"{invariants}cementite carbon") - eutectoid)
    for place in _slowly_cooled(tmp_path, _plain(1.1)).positions:
        phases = dict(place.phases)
        assert_allclose(phases.pop("cementite"), cementite, rtol=0.0, atol=CEMENTITE_WITHIN)
        assert_allclose(phases.pop("pearlite"), 1.0 - cementite, rtol=0.0, atol=CEMENTITE_WITHIN)
        assert_allclose(list(phases.values()), 0.0, rtol=0.0, atol=NO_PHASE)


@pytest.mark.parametrize("carbon_pct", [0.2, 0.45, 0.6, 0.76, 1.1])
def test_manganese_moves_the_lever_rule_with_its_eutectoid(
    tmp_path: Path, carbon_pct: float
) -> None:
    steel = _plain(carbon_pct, mn=0.7, si=0.25)
    ferrite, cementite = slow_cooling(equilibrium(steel.composition), carbon_pct)
    for place in _slowly_cooled(tmp_path, steel).positions:
        phases = dict(place.phases)
        assert_allclose(phases.pop("ferrite"), ferrite, rtol=0.0, atol=FERRITE_WITHIN)
        assert_allclose(phases.pop("cementite"), cementite, rtol=0.0, atol=CEMENTITE_WITHIN)
        phases.pop("pearlite")
        assert_allclose(list(phases.values()), 0.0, rtol=0.0, atol=NO_PHASE)


def test_the_slower_a_steel_cools_the_nearer_it_comes_to_the_lever_rule(tmp_path: Path) -> None:
    steel = _plain(0.6, mn=0.7, si=0.25)
    ferrite, _ = slow_cooling(equilibrium(steel.composition), 0.6)
    short = [
        ferrite - _slowly_cooled(tmp_path, steel, htc).positions[1].phases["ferrite"]
        for htc in (1000.0 * SLOWEST, 100.0 * SLOWEST, 10.0 * SLOWEST)
    ]
    assert short[0] > 2.0 * short[1] > 4.0 * short[2] > 0.0


@pytest.mark.parametrize("row", [*_most("ferrite"), *_most("cementite")])
def test_a_long_hold_above_ae1_reaches_the_equilibrium_amount(tmp_path: Path, row: Row) -> None:
    product = row["quantity"].removeprefix("most ")
    for place in _held(tmp_path, row).positions:
        assert_allclose(
            place.phases[product], float(row["value"]), rtol=0.0, atol=float(row["tolerance"])
        )
        assert place.phases["pearlite"] == 0.0


def _brine() -> Stage:
    medium = MediumUse("brine, agitated", bath=20.0 + ZERO)
    return Stage("quench", medium=medium, until=Until("core", 40.0 + ZERO))


@pytest.mark.parametrize(
    "row",
    [
        pytest.param(row, id=f"{row['carbon_pct']} % C at {row['temp_degC']} degC")
        for row in TABLE
        if row["temp_degC"] in ("740", "760")
    ],
)
def test_what_a_soak_between_the_lines_leaves_undissolved_stays_through_the_quench(
    row: Row,
) -> None:
    product = row["quantity"].removeprefix("most ")
    steel = _plain(float(row["carbon_pct"]))
    result = _cooled(steel, float(row["temp_degC"]), _brine(), diameter=0.005)
    for place in result.positions:
        assert_allclose(
            place.phases[product], float(row["value"]), rtol=0.0, atol=float(row["tolerance"])
        )


def test_a_hardenable_steel_soaked_between_ae1_and_ae3_is_that_ferrite_and_martensite() -> None:
    steel = grade("4140")
    result = _cooled(steel, 750.0, _brine(), diameter=0.01, grain_astm=None)
    eq = equilibrium(steel.composition)
    ferrite = float(lever_ferrite(eq, 0.40, 750.0 + ZERO))
    assert 0.2 < ferrite < 0.3
    solved = float(eq.ferrite_solubility(750.0 + ZERO))
    for place in result.positions:
        assert_allclose(place.phases["ferrite"], ferrite, rtol=0.0, atol=1e-3)
        assert place.phases["martensite"] + place.phases["austenite"] > 0.76
        # carbon that the ferrite could not hold is in the austenite, and none is lost
        carbon = place.phases["ferrite"] * solved
        carbon += (1.0 - place.phases["ferrite"]) * place.austenite_carbon_pct
        assert_allclose(carbon, 0.40, rtol=0.0, atol=1e-3)
