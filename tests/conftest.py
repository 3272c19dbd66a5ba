"""What tests of all floors share."""

import csv
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import settings

# The ordinary run must give the same answer twice; search for new examples with
# pytest --hypothesis-profile=default.
settings.register_profile("same", derandomize=True, deadline=None)
settings.load_profile("same")

PUBLISHED = Path(__file__).parent / "published"

Rows = list[dict[str, str]]


@pytest.fixture(scope="session")
def published() -> Callable[[str], Rows]:
    """Rows of ``tests/published/NAME.csv`` by column: numbers from outside, with source."""

    def read(name: str) -> Rows:
        with (PUBLISHED / f"{name}.csv").open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))

    return read
