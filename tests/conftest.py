"""What tests of all floors share."""

import csv
from collections.abc import Callable
from pathlib import Path

import pytest

PUBLISHED = Path(__file__).parent / "published"

Rows = list[dict[str, str]]


@pytest.fixture(scope="session")
def published() -> Callable[[str], Rows]:
    """Rows of ``tests/published/NAME.csv`` by column: numbers from outside, with source."""

    def read(name: str) -> Rows:
        with (PUBLISHED / f"{name}.csv").open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))

    return read
