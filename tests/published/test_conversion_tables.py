"""Hardness conversion against printed tables; sources row by row in conversion.csv."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo.conversion import (
    hb_to_hv,
    hrc_to_hv,
    hv_to_hb,
    hv_to_hrc,
    hv_to_uts,
    uts_to_hv,
)

TABLE = Path(__file__).parent / "conversion.csv"
ROWS = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))
CONVERSIONS = {
    "HV at HRC": hrc_to_hv,
    "HB->HV": hb_to_hv,
    "HB->UTS": lambda hb: hv_to_uts(hb_to_hv(hb)),
    "HV->UTS": hv_to_uts,
}


@pytest.mark.parametrize("row", ROWS, ids=[f"{r['quantity']} {r['at']}" for r in ROWS])
def test_a_printed_row_converts_within_its_tolerance(row: dict[str, str]) -> None:
    ours = CONVERSIONS[row["quantity"]](float(row["at"]))
    assert_allclose(ours, float(row["value"]), rtol=float(row["tolerance_relative"]), atol=0.0)


def test_the_fitted_curve_of_the_same_table_agrees_within_its_stated_error() -> None:
    # HRC = 127.92 - 1992.3 / sqrt(HV) + 5076.2 / HV, +-0.4 from 238 to 940 HV (fit, derived)
    hv = np.linspace(238.0, 940.0, 500)
    fit = 127.92 - 1992.3 / np.sqrt(hv) + 5076.2 / hv
    assert_allclose(hv_to_hrc(hv), fit, rtol=0.0, atol=0.4)


@given(st.floats(238.0, 940.0))
def test_rockwell_converts_there_and_back(hv: float) -> None:
    assert_allclose(hrc_to_hv(hv_to_hrc(hv)), hv, rtol=1e-12, atol=0.0)


@given(st.floats(80.0, 650.0))
def test_brinell_and_tensile_strength_convert_there_and_back(hv: float) -> None:
    assert_allclose(hb_to_hv(hv_to_hb(hv)), hv, rtol=1e-9, atol=0.0)
    assert_allclose(uts_to_hv(hv_to_uts(hv)), hv, rtol=1e-9, atol=0.0)


def test_outside_its_scale_a_hardness_is_not_a_number() -> None:
    assert np.isnan(hv_to_hrc(np.array([237.9, 940.1, np.nan]))).all()
    assert np.isnan(hrc_to_hv(np.array([19.9, 68.1]))).all()
    assert np.isnan(hv_to_hb(np.array([79.0, 651.0]))).all()
    assert np.isnan(hv_to_uts(np.array([79.0, 651.0]))).all()
    assert np.isfinite(hv_to_hrc(np.array([238.0, 940.0]))).all()
