"""Pictures of the part itself: hardness, each phase, the cooling; a solid is cut open.

They are drawn by a process of its own (`scenedraw`), since a machine without any
way to render can end the process that tries. Then one sentence says so, and the
results of the run stay as they are.
"""

import json
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from midradius.fem.meshraw import SHAPES
from midradius.study.chart import heading
from midradius.study.result import Result
from midradius.thermo.arrays import Array
from midradius.thermo.phases import PHASE_NAMES

LONGEST = 600.0  # s
INNER = 0.4  # of its size from the middle, within which the core is a place to cut at
LEAST_SHARE = 0.02  # of a phase where there is most of it: less is not drawn
NOT_DRAWN = "Pictures of the part were not drawn: {}. All other results are complete."


def write_scenes(result: Result, folder: Path) -> str:
    """Draw into an existing folder; the sentence to tell where that failed, else nothing.

    The pictures are ``hardness.png``, ``phases.png`` and, where the result holds the
    temperatures over time, ``temperature.png`` and ``cooling.gif``.
    """
    with tempfile.TemporaryDirectory(prefix="midradius-") as work:
        request = Path(work) / "scene.npz"
        _hand_over(result, request)
        command = [sys.executable, "-m", "midradius.study.scenedraw", str(request), str(folder)]
        try:
            done = subprocess.run(
                command, capture_output=True, text=True, timeout=LONGEST, check=False
            )
        except subprocess.TimeoutExpired:
            return NOT_DRAWN.format(f"they took more than {LONGEST / 60.0:.0f} minutes")
    if done.returncode == 0:
        return ""
    lines = [line.strip() for line in done.stderr.splitlines() if line.strip()]
    reason = f": {lines[-1]}" if lines else ""
    return NOT_DRAWN.format(f"this machine does not render (code {done.returncode}{reason})")


def _inside(core: Array, points: Array) -> list[float]:
    """Where to cut a solid open: at its core, or midway where that is on its boundary.

    A core on a plane of symmetry would leave nothing of the part, or all of it.
    """
    low, high = points.min(axis=0), points.max(axis=0)
    share = (core - low) / np.maximum(high - low, 1e-300)
    at = np.where(np.abs(share - 0.5) > INNER, 0.5 * (low + high), core)
    return [float(x) for x in at]


def _hand_over(result: Result, path: Path) -> None:
    view = result.view
    shown = [k for k in range(len(PHASE_NAMES)) if result.phases[k].max() > LEAST_SHARE]
    blocks = [(kind, block) for kind, block in view.cells if kind in SHAPES and len(block)]
    dim = max(SHAPES[kind].dim for kind, _ in blocks)
    blocks = [(kind, block) for kind, block in blocks if SHAPES[kind].dim == dim]
    core = [p.coordinates_mm for p in result.positions if p.name == "core"]
    about = {
        "heading": heading(result),
        "sense": result.sense,
        "kinds": [kind for kind, _ in blocks],
        "phases": [PHASE_NAMES[k] for k in shown],
        "core": _inside(np.array(core[0]), view.points_mm) if core and len(core[0]) == 3 else None,
    }
    arrays: dict[str, Any] = {
        "about": np.array(json.dumps(about)),
        "points": view.points_mm,
        "times": result.times_s,
        "temps": result.temp_degC[:, view.node].astype(np.float32),
        "hardness": result.hardness_hv[view.node],
        "phases": result.phases[shown][:, view.node],
    }
    arrays |= {f"cells_{k}": block for k, (_, block) in enumerate(blocks)}
    np.savez(path, **arrays)
