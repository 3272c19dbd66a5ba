"""Tables for a spreadsheet: histories, profile, positions.

RFC 4180: comma, CRLF, quotes where needed; UTF-8, decimal point, one heading
line with the unit at the end of every heading. What is not available (a
conversion outside its range, a temperature never crossed) is an empty cell.
"""

import csv
from collections.abc import Iterable, Sequence
from dataclasses import fields
from pathlib import Path

import numpy as np

from midradius.study.result import Profile, Result, Verdict
from midradius.thermo.arrays import Array
from midradius.thermo.conversion import hv_to_hb, hv_to_hrc, hv_to_uts
from midradius.thermo.phases import PHASE_NAMES

HISTORIES = "histories.csv"
PROFILE = "profile.csv"
POSITIONS = "positions.csv"
NEEDS = "needs.csv"
PATHS = "paths.csv"
HEATING = "heating.csv"

_HARDNESS = [
    *("hardness_HV", "hardness_HRC", "hardness_HB"),
    *("tensile_strength_MPa", "yield_strength_MPa", "hardness_as_quenched_HV"),
]
_AFTER_HARDNESS = ["time_800_500_s", "cooling_rate_700degC_K_per_s", "austenite_carbon_pct"]
_SCALES = ["ferrite_grain_um", "pearlite_spacing_um", "cementite_film_um", "cementite_network"]
_TRANSITION = "impact_transition_degC"
_SOAK = [
    *("soak_reached_degC", "carbon_in_solution_pct"),
    *("undissolved_ferrite_fraction", "undissolved_cementite_fraction"),
    *("austenite_grain_astm", "austenite_grain_um"),
]


def write_tables(result: Result, folder: Path) -> tuple[Path, ...]:
    """Write the tables into an existing folder and return their paths.

    ``needs.csv`` is written only where the case asks for something, ``heating.csv`` only
    where the part was heated from cold, ``profile.csv`` only where there is a line from
    surface to core, ``paths.csv`` only where the case asks for paths.
    """
    tables = {HISTORIES: _histories, PROFILE: _profile, POSITIONS: _positions}
    if not len(result.profile.node):  # a file of temperatures may have none
        del tables[PROFILE]
    if result.verdicts:
        tables[NEEDS] = _needs
    if result.paths:
        tables[PATHS] = _paths
    if result.heating is not None:
        tables[HEATING] = _heating
    return tuple(_write(folder / name, rows(result)) for name, rows in tables.items())


def _histories(result: Result) -> Iterable[Sequence[object]]:
    yield ["time_s", *(f"{p.name}_degC" for p in result.positions)]
    for time, row in zip(result.history_times_s, result.history_temp_degC, strict=True):
        yield [float(time), *(float(temp) for temp in row)]


def _heating(result: Result) -> Iterable[Sequence[object]]:
    assert result.heating is not None, "written only where there is one"
    yield ["time_s", *(f"{p.name}_degC" for p in result.positions)]
    for time, row in zip(result.heating.times_s, result.heating.temp_degC, strict=True):
        yield [float(time), *(float(temp) for temp in row)]


def _profile(result: Result) -> Iterable[Sequence[object]]:
    columns = _columns(result, result.profile)
    yield ["depth_mm", *columns]
    for row in np.column_stack([result.profile.depth_mm, *columns.values()]):
        yield [float(value) for value in row]


def _paths(result: Result) -> Iterable[Sequence[object]]:
    for k, path in enumerate(result.paths):
        columns = _columns(result, path)
        places = path.of(result.points_mm.T)
        if k == 0:
            axes = [f"{name}_mm" for name in _AXES[result.sense][: len(places)]]
            yield ["path", "distance_mm", *axes, *columns]
        for row in np.column_stack([path.depth_mm, *places, *columns.values()]):
            yield [path.label, *(float(value) for value in row)]


_AXES = {
    **dict.fromkeys(("cylinder", "ball"), ("r",)),
    **dict.fromkeys(("slab", "plane", "solid"), ("x", "y", "z")),
    "axisymmetric": ("r", "z"),
}


def _columns(result: Result, line: Profile) -> dict[str, Array]:
    """The end of the run along a line, by heading."""
    on = line.of
    hardness = on(result.hardness_hv)
    values = [
        *on(result.phases),
        hardness,
        hv_to_hrc(hardness),
        hv_to_hb(hardness),
        hv_to_uts(hardness),
        on(result.yield_mpa),
        on(result.hardness_as_quenched_hv),
        on(result.time_800_500_s),
        on(result.rate_700_K_per_s),
        on(result.austenite_carbon_pct),
        on(result.ferrite_grain_um),
        on(result.pearlite_spacing_um),
        on(result.cementite_film_um),
        on(result.impact_transition_degC),
        on(result.soaked.hottest_degC),
        on(result.soaked.carbon_in_solution_pct),
        on(result.soaked.ferrite),
        on(result.soaked.cementite),
        on(result.soaked.grain_astm),
        on(result.soaked.grain_um),
    ]
    heads = [
        *(f"{name}_fraction" for name in PHASE_NAMES),
        *_HARDNESS,
        *_AFTER_HARDNESS,
        *_SCALES[:3],
        _TRANSITION,
        *_SOAK,
    ]
    return dict(zip(heads, values, strict=True))


def _positions(result: Result) -> Iterable[Sequence[object]]:
    yield [
        *("position", "depth_mm"),
        *_HARDNESS,
        *(f"{name}_fraction" for name in PHASE_NAMES),
        *_AFTER_HARDNESS,
        *_SCALES,
        _TRANSITION,
        *_SOAK,
        *("hardness_time_error_HV", "hardness_grid_error_HV"),
    ]
    for p in result.positions:
        yield [
            *(p.name, p.depth_mm),
            *(p.hardness_hv, p.hardness_hrc, p.hardness_hb),
            *(p.tensile_mpa, p.yield_mpa, p.hardness_as_quenched_hv),
            *(p.phases.get(name, 0.0) for name in PHASE_NAMES),
            *(p.time_800_500_s, p.rate_700_K_per_s, p.austenite_carbon_pct),
            *(p.ferrite_grain_um, p.pearlite_spacing_um, p.cementite_film_um),
            *(p.cementite_network, p.impact_transition_degC),
            *(p.soak_degC, p.carbon_in_solution_pct),
            *(p.undissolved_ferrite, p.undissolved_cementite),
            *(p.austenite_grain_astm, p.austenite_grain_um),
            *(p.hardness_time_error_hv, p.hardness_grid_error_hv),
        ]


def _needs(result: Result) -> Iterable[Sequence[object]]:
    # Units differ by row: the one table whose unit stands in a column.
    names = [field.name for field in fields(Verdict)]
    yield names
    for verdict in result.verdicts:
        yield [getattr(verdict, name) for name in names]


def _write(path: Path, rows: Iterable[Sequence[object]]) -> Path:
    with path.open("w", encoding="utf-8", newline="") as file:
        csv.writer(file).writerows([_cell(value) for value in row] for row in rows)
    return path


def _cell(value: object) -> str:
    if isinstance(value, float):
        return f"{value:.9g}" if np.isfinite(value) else ""
    return "" if value is None else str(value)
