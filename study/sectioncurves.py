"""The cooling curves of a section, from its record or from a case that is solved first."""

import json
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from midradius.study.sheetfile import record_path
from midradius.thermo.arrays import Array

if TYPE_CHECKING:
    from midradius.study.result import Result


@dataclass(frozen=True)
class SectionCurves:
    """Temperatures of a section's positions, and the soak it came from.

    ``time`` [s] (n_step,) from the start of cooling, ``temp`` [K] (n_step, n_position);
    ``grain_astm`` is None where the soak gave it.
    """

    title: str
    steel: str
    composition_pct: dict[str, float]
    soak_temp: float
    soak_time: float
    grain_astm: float | None
    names: tuple[str, ...]
    time: Array
    temp: Array


ZERO_DEGC = 273.15


def curves_of(path: Path) -> SectionCurves:
    """The curves of a result folder, a record, or a case file (TOML), which is solved.

    Raises
    ------
    InputFault, CaseFaults, SolverFault
        The record or the case cannot be read, the case cannot be solved.
    """
    if path.suffix.lower() == ".toml":
        from midradius.study.job import solve

        return _from_result(solve(path))
    from midradius.fem.record import read_record

    record = read_record(record_path(path))
    inputs = json.loads(record.text["inputs_json"])
    names = [item["name"] for item in json.loads(record.text["positions_json"])]
    return SectionCurves(
        title=record.text["title"],
        steel=record.text["steel"],
        composition_pct=json.loads(record.text["composition_pct_json"]),
        soak_temp=float(inputs["route"][0]["at"]),
        soak_time=float(inputs["route"][0]["time"]),
        grain_astm=inputs["steel"]["grain_astm"],
        names=tuple(names),
        time=np.asarray(record.data["histories/time"].values, dtype=np.float64),
        temp=np.asarray(record.data["histories/temperature"].values, dtype=np.float64) + ZERO_DEGC,
    )


def _from_result(result: "Result") -> SectionCurves:
    from midradius.study.summary import jsonable

    inputs = jsonable(result.inputs)
    return SectionCurves(
        title=result.title,
        steel=result.steel,
        composition_pct=dict(result.composition_pct),
        soak_temp=float(inputs["route"][0]["at"]),
        soak_time=float(inputs["route"][0]["time"]),
        grain_astm=inputs["steel"]["grain_astm"],
        names=tuple(p.name for p in result.positions),
        time=result.history_times_s,
        temp=result.history_temp_degC + ZERO_DEGC,
    )


def since(curves: SectionCurves, top: float) -> list[tuple[str, Array, Array]]:
    """Each position's name, time [s] since it fell through ``top`` [K], and temperature [K].

    A position that never falls through is left out; one that starts below counts from
    the start of cooling.
    """
    found = []
    for name, temp in zip(curves.names, curves.temp.T, strict=True):
        below = np.flatnonzero(temp < top)
        if not below.size:
            continue
        i = int(below[0])
        begun = float(curves.time[i])
        if i > 0:
            share = (temp[i - 1] - top) / (temp[i - 1] - temp[i])
            begun = float(curves.time[i - 1] + share * (curves.time[i] - curves.time[i - 1]))
        found.append((name, curves.time[i:] - begun, temp[i:]))
    return found
