"""The shipped errors of the model, and how they are used."""

import pytest
from numpy.testing import assert_allclose

from midradius.study.uncertainty import (
    ALLOY,
    AS_COOLED,
    CLASSES,
    HIGH_CARBON,
    OTHER,
    PLAIN,
    TEMPERED,
    cementite_film,
    fraction,
    hardness,
    percentile_90,
    rows,
    steel_class,
    tensile,
    widest,
    yield_strength,
)
from midradius.thermo.grades import all_grades, grade


def test_the_percentile_is_an_order_statistic_and_needs_nine_readings() -> None:
    # ceil(0.9 (n + 1)): the 9th of 9, the 10th of 10, the 18th of 19, the 90th of 99
    assert percentile_90([1.0] * 8) is None
    assert percentile_90([-float(k) for k in range(1, 10)]) == 9.0
    assert percentile_90([float(k) for k in range(1, 11)]) == 10.0
    assert percentile_90([float(k) for k in range(1, 20)]) == 18.0
    assert percentile_90([float(k) for k in range(1, 100)]) == 90.0


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("C45E", PLAIN),
        ("1045", PLAIN),
        ("1080", HIGH_CARBON),
        ("42CrMo4", ALLOY),
        ("4340", ALLOY),
        ("41Cr4", ALLOY),
        ("100Cr6", OTHER),
        ("20MnB5", OTHER),
        ("9260", OTHER),
    ],
)
def test_a_steel_belongs_to_the_class_of_its_alloy(name: str, expected: str) -> None:
    assert steel_class(grade(name).composition) == expected


def test_every_row_says_how_many_readings_how_and_when() -> None:
    for row in rows():
        assert row.steel_class in CLASSES and row.condition in (AS_COOLED, TEMPERED)
        assert row.how and len(row.measured_on) == 10 and row.status
        assert (row.p90 is None) == (row.n < 9)
        assert row.median <= row.worst and (row.p90 is None or row.p90 <= row.worst)


def test_of_two_sets_of_readings_the_wider_one_rules() -> None:
    figures = [
        row.p90
        for row in rows()
        if (row.steel_class, row.quantity, row.unit, row.condition)
        == (ALLOY, "hardness", "%", AS_COOLED)
        and row.p90 is not None
    ]
    assert len(figures) == 2
    used = widest(ALLOY, "hardness", "%")
    assert used is not None and used.p90 == max(figures)


@pytest.mark.parametrize("condition", [AS_COOLED, TEMPERED])
def test_no_steel_has_a_narrower_error_than_the_measured_alloy_steels(condition: str) -> None:
    alloy = widest(ALLOY, "hardness", "HRC", condition)
    assert alloy is not None and alloy.p90 is not None
    for steel in all_grades():
        spread = hardness(steel.composition, "HRC", 30.0, condition=condition)
        assert spread.above >= alloy.p90
        if not spread.measured:
            assert spread.basis.startswith("not measured")
            assert spread.above >= 2.0 * alloy.p90


def test_no_estimate_is_narrower_than_an_error_that_was_seen() -> None:
    for row in rows():
        if row.p90 is None:
            name = {PLAIN: "1045", HIGH_CARBON: "1080", ALLOY: "42CrMo4"}[row.steel_class]
            composition = grade(name).composition
            strength = {"tensile": tensile, "yield": yield_strength}
            if row.quantity in strength:
                spread = strength[row.quantity](composition, 100.0, condition=row.condition)
            else:
                unit = "HRC" if row.unit == "HRC" else "HV"
                spread = hardness(composition, unit, 100.0, condition=row.condition)
            assert spread.above >= row.worst and not spread.measured


def test_strength_is_less_sure_than_hardness_and_yield_less_than_tensile() -> None:
    composition = grade("42CrMo4").composition
    hv = hardness(composition, "HV", 1000.0, condition=AS_COOLED).above
    strong = tensile(composition, 1000.0, condition=AS_COOLED).above
    assert hv < strong < yield_strength(composition, 1000.0, condition=AS_COOLED).above


def test_a_fraction_errs_by_a_factor_of_two_in_time() -> None:
    # 1 - f to the powers 4 and 1/4
    half = fraction(0.5, hardened=False)
    assert_allclose(half.above, 1.0 - 0.5**4 - 0.5, rtol=1e-12, atol=0.0)
    assert_allclose(half.below, 0.5 - (1.0 - 0.5**0.25), rtol=1e-12, atol=0.0)
    martensite = fraction(0.98, hardened=True)
    assert_allclose(martensite.below, 1.0 - 0.98**4 - 0.02, rtol=1e-12, atol=0.0)
    # never surer than one percent
    assert (fraction(0.0, hardened=False).above, fraction(1.0, hardened=True).below) == (0.01, 0.01)


def test_a_film_errs_by_a_factor_of_three() -> None:
    spread = cementite_film(0.6)
    assert_allclose([0.6 + spread.above, 0.6 - spread.below], [1.8, 0.2], rtol=1e-12, atol=0.0)
    assert not spread.measured
