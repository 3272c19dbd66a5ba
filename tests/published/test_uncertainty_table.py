"""The shipped errors of the model are those that the published readings give today."""

import pytest
from measure_uncertainty import errors
from numpy.testing import assert_allclose

from midradius.study import uncertainty


@pytest.mark.slow
def test_the_tool_claims_no_less_error_than_the_readings_show() -> None:
    """Red: run ``python tests/published/measure_uncertainty.py``, and a changelog line."""
    measured = errors()
    shipped = {
        (row.steel_class, row.quantity, row.unit, row.data): row for row in uncertainty.rows()
    }
    assert set(shipped) == set(measured)
    for key, signed in measured.items():
        row, p90 = shipped[key], uncertainty.percentile_90(signed)
        assert row.n == len(signed)
        # two digits are printed; another machine moves the third
        assert_allclose(row.worst, max(map(abs, signed)), rtol=1e-3, atol=0.006)
        assert (row.p90 is None) == (p90 is None)
        if row.p90 is not None and p90 is not None:
            assert_allclose(row.p90, p90, rtol=1e-3, atol=0.006)
