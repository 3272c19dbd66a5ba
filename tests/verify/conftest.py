"""What the proofs of the heat solver share: outside numbers and two modules beside it."""

import csv
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

HERE = Path(__file__).parent
# tests are imported by path, so the modules beside them need their folder named
sys.path.insert(0, str(HERE))


@pytest.fixture(scope="session")
def published_heat() -> Callable[..., list[tuple[str, float]]]:
    """``(condition, value)`` of the rows of ``heat.csv`` whose quantity is the one asked."""
    with (HERE / "heat.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))

    def read(quantity: str, condition: str = "") -> list[tuple[str, float]]:
        found = [
            (row["condition"], float(row["value"]))
            for row in rows
            if row["quantity"] == quantity and condition in row["condition"]
        ]
        assert found, f"no row {quantity}, {condition}"
        return found

    return read
