"""The end-quench test through the whole job, against hardenability bands and a chart of rates.

Every row is asserted with its suggested tolerance; a row that the job misses is a
strict expected failure with the figures, so that a better model is noticed.
Every band is met. The rates of the chart are not: beyond 10 mm the piece in air cools
20 to 35 % faster, of which the radiating side makes the larger part; a steel that
transforms at 704 degC (1045) stays within the chart. The constant 30 kW/(m2 K) of the
jet, an estimate, is too strong for the first two distances.
"""

import numpy as np
import pytest
from endquench import CELLS, Row, at, distances, piece, quenched, rate_at, rows
from numpy.testing import assert_allclose

from midradius.study.runner import run
from midradius.thermo.conversion import hv_to_hrc

BANDS, CHART = rows("end_quench_bands"), rows("end_quench_rates")
CHART_DEGC = 704.0  # 1300 degF; the result's own rate is at 700 degC, 1 % lower

OUT_OF_BAND: dict[str, str] = {}
# By how many percent the computed rate is above the printed one
OFF_CHART_IN_AIR = {
    "J1": 135, "J2": 31, "J7": 22, "J8": 26, "J9": 28, "J10": 30, "J11": 31, "J12": 24, "J13": 27,
    "J14": 27, "J16": 25, "J18": 26, "J20": 26, "J24": 32, "J28": 35, "J32": 30,
}  # fmt: skip
OFF_CHART_INSULATED = {"J1": 134, "J2": 29, "J9": 20.3, "J10": 20.1}
# within 0.2 % of the limit: the grid decides on which side, so these may pass
ON_THE_LIMIT = 20.2


def _name(row: Row) -> str:
    return f"{row['grade']} {row['distance']}" + " (one reading)" * ("reading" in row["band"])


def _hrc(hv: float) -> float:
    """Rockwell C; below its end at 20 by the bracketed row of SAE J417, 18 for 230 HV (memory)."""
    return float(hv_to_hrc(hv)) if hv >= 238.0 else 20.0 - 2.0 * (238.0 - hv) / 8.0


def _failing(reason: str, *, strict: bool = True) -> pytest.MarkDecorator:
    return pytest.mark.xfail(strict=strict, raises=AssertionError, reason=reason)


def _rate_rows(off: dict[str, float]) -> list[object]:
    cases = []
    for row in CHART:
        name = row["distance"]
        marks = []
        if name in off:
            reason = f"{off[name]:g} % faster than the chart"
            marks = [_failing(reason, strict=off[name] > ON_THE_LIMIT)]
        cases.append(pytest.param(row, marks=marks, id=name))
    return cases


@pytest.mark.parametrize(
    "row",
    [
        pytest.param(
            row,
            marks=[_failing(OUT_OF_BAND[_name(row)])] if _name(row) in OUT_OF_BAND else [],
            id=_name(row),
        )
        for row in BANDS
    ],
)
def test_the_hardness_of_the_test_piece_lies_in_the_band_of_its_steel(row: Row) -> None:
    hv = at(quenched(row["grade"]), float(row["distance_mm"])).hardness_hv
    ours, margin = _hrc(hv), float(row["tolerance_hrc"])
    assert float(row["low"]) - margin <= ours <= float(row["high"]) + margin, f"{ours:.1f} HRC"


@pytest.mark.parametrize("row", _rate_rows(OFF_CHART_IN_AIR))
def test_the_test_piece_in_air_cools_at_the_rate_of_the_chart(row: Row) -> None:
    ours = rate_at(quenched("4140"), float(row["distance_mm"]), CHART_DEGC)
    assert_allclose(
        ours, float(row["rate_at_704_degC"]), rtol=float(row["tolerance_relative"]), atol=0.0
    )


@pytest.mark.parametrize("row", _rate_rows(OFF_CHART_INSULATED))
def test_conduction_alone_cools_at_the_rate_of_the_chart(row: Row) -> None:
    ours = rate_at(quenched("4140", cells=(192,)), float(row["distance_mm"]), CHART_DEGC)
    assert_allclose(
        ours, float(row["rate_at_704_degC"]), rtol=float(row["tolerance_relative"]), atol=0.0
    )


def test_with_its_side_insulated_the_test_piece_is_a_slab() -> None:
    piece_2d, slab = quenched("4140", "insulated"), quenched("4140", cells=CELLS[1:])
    for z in distances():
        # same cells along the axis; both runs choose their own time steps
        assert_allclose(rate_at(piece_2d, z, 700.0), rate_at(slab, z, 700.0), rtol=2e-3, atol=0.0)
        assert_allclose(at(piece_2d, z).hardness_hv, at(slab, z).hardness_hv, rtol=0.0, atol=1.0)


def test_the_air_on_the_side_counts_for_little_in_the_first_six_millimetres() -> None:
    in_air, slab = quenched("4140"), quenched("4140", cells=(192,))
    for z in distances():
        if z < 6.4:
            with_air, without = (rate_at(result, z, CHART_DEGC) for result in (in_air, slab))
            assert_allclose(with_air, without, rtol=0.04, atol=0.0)


@pytest.mark.slow
def test_finer_cells_and_steps_leave_the_hardness_of_the_test_piece() -> None:
    fine = run(piece("42CrMo4", side="still air", cells=(8, 192), accuracy=0.25))
    coarse = quenched("42CrMo4")
    hrc = [[float(hv_to_hrc(p.hardness_hv)) for p in r.positions] for r in (fine, coarse)]
    assert np.isfinite(hrc).all()
    assert_allclose(hrc[1], hrc[0], rtol=0.0, atol=0.3)
