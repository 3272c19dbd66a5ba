"""The lengths of the structure at every position, as cells of a table; nothing is computed."""

from midradius.study.result import Result
from midradius.thermo.network import CRITERION

_COLUMNS: tuple[tuple[str, str, int], ...] = (
    ("ferrite\ngrain, um", "ferrite_grain_um", 1),
    ("pearlite\nspacing, um", "pearlite_spacing_um", 2),
    ("cementite\nfilm, um", "cementite_film_um", 2),
    ("\nnetwork", "cementite_network", 0),
    ("27 J at\ndegC", "impact_transition_degC", 0),
)


def lengths(result: Result) -> tuple[list[str], list[list[str]]]:
    """Heads and rows; no columns where no position has a value."""
    there = [
        column
        for column in _COLUMNS
        if any(getattr(p, column[1]) is not None for p in result.positions)
    ]
    rows = [
        [p.name, *(_cell(getattr(p, name), digits) for _, name, digits in there)]
        for p in result.positions
    ]
    return [head for head, *_ in there], rows


def remark(result: Result) -> str:
    """How the network flag is meant; empty where there is none."""
    flagged = any(p.cementite_network is not None for p in result.positions)
    return f"cementite network: {CRITERION}" if flagged else ""


def _cell(value: object, digits: int) -> str:
    return f"{value:.{digits}f}" if isinstance(value, float) else str(value or "-")
