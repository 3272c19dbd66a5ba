"""The catalogue of media and its tables."""

from collections import defaultdict
from collections.abc import Callable

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.fem.media import Curve, check_bath, curves, medium, names
from midradius.thermo.errors import InputFault

Rows = list[dict[str, str]]


def by_table(rows: Rows) -> dict[tuple[str, float], list[tuple[float, float]]]:
    tables: dict[tuple[str, float], list[tuple[float, float]]] = defaultdict(list)
    for row in rows:
        key = row["medium"], float(row["bath_degC"]) + 273.15
        tables[key].append((float(row["surface_degC"]) + 273.15, float(row["htc_W_per_m2K"])))
    return tables


def only(name: str) -> Curve:
    (curve,) = curves(medium(name))
    return curve


def test_every_shipped_knot_is_that_of_the_source_list(
    published: Callable[[str], Rows],
) -> None:
    tables = by_table(published("media_tables"))
    offered = {key: knots for key, knots in tables.items() if key[0] in names()}
    assert len(offered) == 12
    for (name, bath), knots in offered.items():
        (curve,) = [curve for curve in curves(medium(name)) if abs(curve.bath - bath) < 1e-6]
        temp, htc = np.array(knots).T
        assert_allclose(curve.temp, temp, rtol=0.0, atol=1e-9)
        assert_allclose(curve.htc, htc, rtol=1e-12, atol=0.0)


def test_every_medium_has_limits_that_enclose_where_it_holds() -> None:
    for name in names():
        one = medium(name)
        assert one.name == name
        assert one.bath_min <= one.holds_min < one.holds_max <= one.bath_max
        assert one.bath_default is None or one.holds_min <= one.bath_default <= one.holds_max
        assert one.source.status in ("read", "derived", "remembered", "estimate")
        assert one.kind in ("liquid", "gas", "ideal")
        for curve in curves(one):
            assert one.bath_min <= curve.bath <= one.bath_max
            assert np.all(np.diff(curve.temp) > 0.0)
            assert np.all(curve.htc > 0.0)


def test_a_liquid_bath_has_no_default_temperature() -> None:
    assert {name for name in names() if medium(name).bath_default is not None} == {
        "still air",
        "fan air",
        "insulated",
        "end-quench water jet",
    }


def test_agitation_of_slow_oil_doubles_convection_and_weakens_to_the_blanket() -> None:
    # factors 2 below the peak, 1.15 at it, 1.6 above, on 230 ... 400, 2400, 540, 490, 520
    curve = only("slow oil, agitated")
    expected = [460.0, 540.0, 640.0, 680.0, 800.0, 2760.0, 864.0, 784.0, 832.0]
    assert_allclose(curve.htc, expected, rtol=1e-12, atol=0.0)
    assert_allclose(curve.temp, only("slow oil, still").temp, rtol=0.0, atol=0.0)


def test_agitation_of_mineral_oil_uses_the_same_factors() -> None:
    # on 260, 320, 370, 430 | 3500 | 590, 530, 560
    expected = [520.0, 640.0, 740.0, 860.0, 4025.0, 944.0, 848.0, 896.0]
    assert_allclose(only("mineral oil, agitated").htc, expected, rtol=1e-12, atol=0.0)


def test_the_factors_agree_with_the_separate_table_of_agitated_fast_oil() -> None:
    ratio = only("fast oil, agitated").htc / only("fast oil, still").htc
    assert_allclose(ratio[4], 1.15, rtol=0.01, atol=0.0)
    assert_allclose(ratio[5:], 1.6, rtol=0.03, atol=0.0)
    assert_allclose(ratio[:4].mean(), 2.0, rtol=0.15, atol=0.0)


def test_a_name_is_found_whatever_the_case_and_the_blanks() -> None:
    assert medium("Still  Air") is medium("still air")
    assert medium("polymer 10%, agitated").name == "polymer 10 %, agitated"


def test_an_unknown_medium_names_the_nearest() -> None:
    with pytest.raises(InputFault) as caught:
        medium("mineral oil")
    assert caught.value.quantity == "medium"
    assert caught.value.value == '"mineral oil"'
    assert caught.value.allowed == "one of: " + "; ".join(names())
    assert caught.value.remedy == 'Did you mean "mineral oil, still" or "mineral oil, agitated"?'
    with pytest.raises(InputFault) as caught:
        medium("watr, still")
    assert caught.value.remedy == 'Did you mean "water, still"?'


def test_a_medium_like_none_of_ours_points_to_a_curve_of_the_users_own() -> None:
    for name in ("hot lava", "", "  "):
        with pytest.raises(InputFault) as caught:
            medium(name)
        assert (
            caught.value.remedy == "Give a film curve of your own, or choose a medium of the list."
        )


@pytest.mark.parametrize("bath", [273.15 + 640.0, 273.15 + 9.0, float("nan")])
def test_a_bath_the_medium_cannot_have_is_refused(bath: float) -> None:
    with pytest.raises(InputFault) as caught:
        check_bath(medium("mineral oil, still"), bath)
    assert caught.value.allowed == '10 to 200 degC for "mineral oil, still"'


def test_the_refusal_of_a_bath_says_what_to_do() -> None:
    with pytest.raises(InputFault) as caught:
        check_bath(medium("mineral oil, still"), 273.15 + 640.0)
    assert str(caught.value) == (
        'bath = "640 degC", but must be 10 to 200 degC for "mineral oil, still". '
        "Change the bath temperature, or choose another medium."
    )


def test_a_bath_outside_the_range_of_the_table_is_noted() -> None:
    (note,) = check_bath(medium("mineral oil, still"), 273.15 + 95.0)
    assert str(note) == (
        'film coefficient of "mineral oil, still": bath = 95 degC, source holds for 40 to 80 degC'
    )
    assert check_bath(medium("mineral oil, still"), 273.15 + 40.0) == ()
    assert check_bath(medium("mineral oil, still"), 273.15 + 80.0) == ()
