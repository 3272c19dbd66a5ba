"""Nothing moves unseen: whole cases as they came out last time.

The one place where expected numbers are our own. They say nothing about being right,
only that a change was meant. Where a change moves a result:

1. add a line below "Numbers changed" in CHANGELOG.md: case, quantity, old, new, cause;
2. ``python -m pytest tests/baseline --regenerate="that line"``.

Each file keeps the line that moved it last, and the line must stay in the changelog.
"""

import json
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.case import Grid
from midradius.study.job import solve
from midradius.study.result import Result

HERE = Path(__file__).parent
ROOT = HERE.parents[1]
# As shipped, or on a grid that keeps the plane case short.
CASES = {
    "cylinder-liner": None,
    "die-plate": None,
    "drive-shaft": None,
    "guide-rail": Grid((16, 16), 1.0),
    "mill-roll": None,
    "pump-shaft": None,
}
SURE = 1e-4  # of a temperature, a time or a hardness: far above rounding, far below a change


def kept(result: Result) -> dict[str, Any]:
    """What a person would notice, with the digits that a machine keeps from run to run."""

    def short(value: float | None) -> float | None:
        return None if value is None or not math.isfinite(value) else float(f"{value:.7g}")

    return {
        "critical_degC": {name: short(temp) for name, temp in result.critical_degC.items()},
        "stages_end_s": [short(stage.end_s) for stage in result.stages],
        "heat_given_J_per_kg": short(result.heat_given_J_per_kg),
        "last_temperature_degC": [short(temp) for temp in result.history_temp_degC[-1]],
        "positions": {
            p.name: {
                "depth_mm": short(p.depth_mm),
                "hardness_hv": short(p.hardness_hv),
                "tensile_mpa": short(p.tensile_mpa),
                "time_800_500_s": short(p.time_800_500_s),
                "rate_700_K_per_s": short(p.rate_700_K_per_s),
                "phases": {name: round(share, 7) for name, share in p.phases.items()},
            }
            for p in result.positions
        },
        "time_error_K": float(f"{result.time_error_K:.2g}"),
        "grid_error_K": float(f"{result.grid_error_K:.2g}"),
    }


def numbers_changed() -> str:
    """The first heading's part of every version in the changelog, on one line."""
    text = (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")
    parts = [part.partition("\n### ")[0] for part in text.split("### Numbers changed")[1:]]
    return " ".join(" ".join(parts).split())


@pytest.mark.parametrize("name", CASES)
def test_a_result_moves_only_with_a_line_in_the_changelog(
    name: str, request: pytest.FixtureRequest
) -> None:
    place = HERE / f"{name}.json"
    case = casefile.read(ROOT / "meshes" / f"{name}.toml")
    grid = CASES[name]
    now = kept(solve(case if grid is None else replace(case, grid=grid)))
    line = request.config.getoption("--regenerate", default=None)
    if line is not None:
        assert line and line in numbers_changed(), "first write that line into CHANGELOG.md"
        content = {"moved_by": line, **now}
        place.write_text(json.dumps(content, indent=1) + "\n", encoding="utf-8")
    before = json.loads(place.read_text(encoding="utf-8"))
    assert before.pop("moved_by") in numbers_changed()
    same(before, now, name)


def same(before: object, now: object, where: str) -> None:
    if isinstance(before, dict):
        assert isinstance(now, dict) and before.keys() == now.keys(), where
        for key, value in before.items():
            same(value, now[key], f"{where}: {key}")
    elif isinstance(before, list):
        assert isinstance(now, list) and len(before) == len(now), where
        for k, value in enumerate(before):
            same(value, now[k], f"{where}[{k}]")
    elif isinstance(before, float) and isinstance(now, float):
        # an estimate of an error is a difference of two runs: it keeps fewer digits
        loose = 0.2 if where.endswith("_error_K") else SURE
        assert_allclose(now, before, rtol=loose, atol=1e-5, err_msg=where)
    else:
        assert now == before, where


def test_no_baseline_is_left_over() -> None:
    assert sorted(path.stem for path in HERE.glob("*.json")) == sorted(CASES)
