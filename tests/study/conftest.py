"""What the tests of this floor share: an invented run, a small case, the command.

The run has smooth made-up numbers and no physics; its part is a round of 300 mm from
the works of Hallgrund Forge, drawn as a disc.
"""

import os
import subprocess
import sys
import sysconfig
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from midradius.study.result import (
    Position,
    Profile,
    Result,
    SectionView,
    SoakFields,
    StageRecord,
    TemperRecord,
)
from midradius.thermo.phases import PHASE_NAMES
from midradius.thermo.source import RangeNote, Source

RADIUS_MM = 150.0


def disc(radii_mm: np.ndarray, n_around: int = 48) -> SectionView:
    """Rings of quads around a middle of triangles; ring k shows node k."""
    angle = 2.0 * np.pi * np.arange(n_around) / n_around
    rings = [
        np.column_stack([r * np.cos(angle), r * np.sin(angle), np.zeros(n_around)])
        for r in radii_mm[1:]
    ]
    points = np.vstack([[[0.0, 0.0, 0.0]], *rings])
    node = np.concatenate([[0], np.repeat(np.arange(1, len(radii_mm)), n_around)])
    here = np.arange(n_around)
    after = np.roll(here, -1)
    triangles = np.column_stack([np.zeros(n_around, dtype=np.int64), 1 + here, 1 + after])
    quads = np.vstack(
        [
            np.column_stack([a + here, a + n_around + here, a + n_around + after, a + after])
            for a in 1 + n_around * np.arange(len(radii_mm) - 2)
        ]
    )
    cells = (("quad", quads.astype(np.int64)), ("triangle", triangles.astype(np.int64)))
    return SectionView(points, cells, node)


def invented_result(n_node: int = 31, n_around: int = 48) -> Result:
    """A whole result, the same at every call."""
    share = np.linspace(0.0, 1.0, n_node) ** 0.8
    radii = RADIUS_MM * share
    depth = RADIUS_MM - radii
    slow = 60.0 + 9.0 * depth

    def temp(times: np.ndarray, slowness: np.ndarray) -> np.ndarray:
        since = np.maximum(times - 45.0, 0.0)[:, None]
        air = 860.0 - 0.3 * np.minimum(times, 45.0)[:, None]
        return 60.0 + (air - 60.0) * np.exp(-since / slowness[None, :])

    martensite = 0.9 / (1.0 + np.exp((depth - 25.0) / 9.0))
    ferrite = 0.12 / (1.0 + np.exp((80.0 - depth) / 12.0))
    pearlite = 0.20 / (1.0 + np.exp((95.0 - depth) / 10.0))
    retained = 0.02 + 0.01 * martensite
    bainite = 1.0 - martensite - ferrite - pearlite - retained
    phases = np.array(
        [retained, ferrite, np.zeros(n_node), pearlite, bainite, martensite], dtype=np.float64
    )
    hardness = 620.0 * martensite + 340.0 * bainite + 210.0 * (ferrite + pearlite) + 300 * retained
    cooling_time = np.where(depth < 2.0, np.nan, 4.0 + 2.4 * depth)
    rate = np.where(depth < 2.0, np.nan, 60.0 / (1.0 + depth))
    places = (
        ("surface", 0.0),
        ("8 mm below the surface", 8.0),
        ("quarter thickness", 75.0),
        ("core", 150.0),
    )
    nodes = [int(np.argmin(np.abs(depth - d))) for _, d in places]
    history_times = np.concatenate([np.linspace(0.0, 45.0, 10), 45.0 + np.geomspace(0.2, 9e3, 120)])
    positions = tuple(
        Position(
            name=name,
            depth_mm=d,
            coordinates_mm=(RADIUS_MM - d,),
            hardness_hv=float(hardness[n]),
            hardness_hrc=None if hardness[n] < 238.0 else float(hardness[n] / 11.0),
            hardness_hb=float(hardness[n] * 0.95),
            hardness_as_quenched_hv=float(hardness[n]),
            tensile_mpa=None if n == nodes[0] else float(hardness[n] * 3.2),
            yield_mpa=None if n == nodes[0] else float(hardness[n] * 2.4),
            phases=dict(zip(PHASE_NAMES, map(float, phases[:, n]), strict=True)),
            time_800_500_s=None if np.isnan(cooling_time[n]) else float(cooling_time[n]),
            rate_700_K_per_s=None if np.isnan(rate[n]) else float(rate[n]),
            austenite_carbon_pct=0.41,
            ferrite_grain_um=None if ferrite[n] < 0.01 else 14.5,
            pearlite_spacing_um=None if pearlite[n] < 0.01 else 0.21,
            cementite_film_um=None,
            cementite_network=None,
            impact_transition_degC=None,
            soak_degC=860.0,
            carbon_in_solution_pct=0.41,
            undissolved_ferrite=0.0,
            undissolved_cementite=0.0,
            austenite_grain_astm=7.5,
            austenite_grain_um=23.8,
            hardness_time_error_hv=1.2,
            hardness_grid_error_hv=0.4 + k,
        )
        for k, ((name, d), n) in enumerate(zip(places, nodes, strict=True))
    )
    times = np.array([0.0, 45.0, 100.0, 400.0, 1500.0, 9045.0])
    return Result(
        title="Pump shaft HF-4711, Hallgrund Forge (invented)",
        steel="42CrMo4",
        composition_pct={"C": 0.41, "Mn": 0.75, "Cr": 1.05, "Mo": 0.22},
        section="round, diameter 300 mm",
        sense="cylinder",
        points_mm=radii[:, None],
        volume=np.gradient(0.5 * (radii * 1e-3) ** 2),
        view=disc(radii, n_around),
        times_s=times,
        temp_degC=temp(times, slow),
        phases=phases,
        hardness_hv=hardness,
        hardness_as_quenched_hv=hardness,
        yield_mpa=np.where(depth < 2.0, np.nan, hardness * 2.4),
        time_800_500_s=cooling_time,
        rate_700_K_per_s=rate,
        austenite_carbon_pct=np.full(n_node, 0.41),
        pearlite_formed_at_degC=np.where(pearlite > 0.01, 640.0, np.nan),
        ferrite_grain_um=np.where(ferrite >= 0.01, 14.5, np.nan),
        pearlite_spacing_um=np.where(pearlite >= 0.01, 0.21, np.nan),
        cementite_film_um=np.full(n_node, np.nan),
        cementite_network=np.zeros(n_node, dtype=np.int64),
        impact_transition_degC=np.full(n_node, np.nan),
        soaked=SoakFields(
            hottest_degC=np.full(n_node, 860.0),
            carbon_in_solution_pct=np.full(n_node, 0.41),
            ferrite=np.zeros(n_node),
            cementite=np.zeros(n_node),
            grain_astm=np.full(n_node, 7.5),
            grain_um=np.full(n_node, 23.8),
            austenitised=np.full(n_node, True),
        ),
        history_times_s=history_times,
        history_temp_degC=temp(history_times, slow[nodes]),
        positions=positions,
        profile=Profile(depth[::-1].copy(), np.arange(n_node)[::-1].copy(), "along a radius"),
        stages=(
            StageRecord("transfer", "still air", 0.0, 45.0, "time", 1.0e6),
            StageRecord(
                "quench", "mineral oil, agitated", 45.0, 9045.0, "core below 150 degC", 3.0e8
            ),
        ),
        tempers=(),
        critical_degC={"Ae3": 762.0, "Ae1": 738.0, "Ms": 331.0, "Acm": float("nan")},
        soak="860 degC, 4 h: fully austenitic, ASTM 7",
        heat_given_J_per_kg=5.5e5,
        heat_extent="per metre of length",
        heat_balance_relative=3.1e-9,
        time_error_K=0.7,
        grid_error_K=float("nan"),
        n_step=412,
        n_node=n_node,
        notes=(RangeNote("bainite start", "Si", "2.1 %", "up to 1.5 %"),),
        sources=(
            Source("martensite start", "an invented work", "eq. 1", "read"),
            Source("film curve", "an invented handbook", "table 2", "remembered"),
        ),
        assumptions=("ends insulated: the bar is long",),
        cautions=(),
        inputs={"steel": {"grade": "42CrMo4"}, "section": {"diameter": 0.3}},
        case_text='title = "Pump shaft HF-4711"\n',
    )


def slow_cooled(result: Result) -> Result:
    """The same run without any place that crossed 800 or 700 degC, and one phase only."""
    nothing = np.full(result.n_node, np.nan)
    phases = np.zeros_like(result.phases)
    phases[3] = 1.0
    return replace(
        result,
        phases=phases,
        hardness_hv=np.full(result.n_node, 205.0),
        hardness_as_quenched_hv=np.full(result.n_node, 205.0),
        time_800_500_s=nothing,
        rate_700_K_per_s=nothing,
        pearlite_formed_at_degC=np.full(result.n_node, 690.0),
    )


@pytest.fixture(scope="session")
def result() -> Result:
    """An invented run of a round, quenched."""
    return invented_result()


@pytest.fixture(scope="session")
def tempered_result(result: Result) -> Result:
    """The invented run of a round, its hardness four fifths after two tempers."""
    return replace(
        result,
        hardness_hv=0.8 * result.hardness_hv,
        positions=tuple(replace(p, hardness_hv=0.8 * p.hardness_hv) for p in result.positions),
        tempers=(TemperRecord(600.0, 21_600.0), TemperRecord(580.0, 7_200.0)),
    )


@pytest.fixture(scope="session")
def slow_result(result: Result) -> Result:
    """An invented run that is pearlite throughout, with nothing measured on the way."""
    return slow_cooled(result)


SMALL = """\
title = "Stud HF-0001"

[steel]
grade = "C45E"

[section]
form = "round"
diameter = "30 mm"

[[route]]
stage = "soak"
at = "850 degC"
time = "1 h"

[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 degC"
time = "100 s"

[output]
fields = 3

[grid]
cells = 16
accuracy = "4 K"
"""


@pytest.fixture(scope="session")
def small() -> str:
    """The text of a case that is solved in no time, coarsely."""
    return SMALL


@dataclass(frozen=True)
class Answer:
    """What a command left: its exit code and what stood on stdout and stderr."""

    code: int
    out: str
    err: str


Call = Callable[..., Answer]


@pytest.fixture
def call(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Call:
    """Run the command line in this process, in ``tmp_path``."""

    def run(*words: str) -> Answer:
        from midradius.study.cli import main

        monkeypatch.chdir(tmp_path)
        monkeypatch.setattr(sys, "argv", ["midradius", *words])
        capsys.readouterr()
        code = 0
        try:
            main()
        except SystemExit as leaving:
            code = int(leaving.code or 0)
        said = capsys.readouterr()
        return Answer(code, said.out, said.err)

    return run


Start = Callable[..., "subprocess.Popen[str]"]


@pytest.fixture
def start(tmp_path: Path) -> Iterator[Start]:
    """Start the installed command in a process of its own, in ``tmp_path``."""
    started: list[subprocess.Popen[str]] = []

    def run(
        *words: str, env: Mapping[str, str] | None = None, **how: Any
    ) -> "subprocess.Popen[str]":
        command = str(Path(sysconfig.get_path("scripts")) / "midradius")
        pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "text": True}
        process = subprocess.Popen(
            [command, *words], cwd=tmp_path, env={**os.environ, **(env or {})}, **{**pipes, **how}
        )
        started.append(process)
        return process

    yield run
    for process in started:
        process.kill()
        process.communicate()
