"""The one command that writes the baselines anew."""

import pytest


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption(
        "--regenerate",
        metavar="LINE",
        default=None,
        help="write tests/baseline/*.json anew; LINE stands in CHANGELOG.md and says why",
    )
