"""A result turned into what the file formats take: field series and record.

Nothing is computed here; names, units and long names are given to the numbers
of a `Result`.
"""

import json
from collections.abc import Mapping
from dataclasses import asdict
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from midradius.fem.drawing import Drawing
from midradius.fem.fields import write_series
from midradius.fem.givenfields import write_on_mesh
from midradius.fem.media import ZERO_DEGC
from midradius.fem.record import Quantity, provenance, write_record
from midradius.fem.volumes import EXTENT
from midradius.fem.vtkhdf import SERIES, HdfSeries
from midradius.study.result import Result
from midradius.study.summary import jsonable
from midradius.thermo import network
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault
from midradius.thermo.phases import PHASE_NAMES

RECORD = "record.h5"
TEMPERATURE = "temperature_degC"
CODES = "cementite network: " + ", ".join(f"{k} {name}" for k, name in enumerate(network.NAMES))
_EXTENT: Mapping[str, str] = EXTENT


def write_fields(result: Result, folder: Path) -> Path | None:
    """Write the PVD series into an existing folder; returns the index's path.

    Temperatures that came on a mesh leave one file on that mesh; those of thermocouples,
    which have no points, leave none.

    Raises
    ------
    InputFault
        The temperatures over time are not held: they went to a file during the run.
    """
    node = result.view.node
    if result.mesh:
        node = np.arange(result.n_node)
    elif not len(node):
        return None
    at_end = known_at_end(result, node)
    if result.mesh:
        return write_on_mesh(folder, result.mesh, at_end)
    if not len(result.temp_degC):
        raise InputFault(
            "temperatures over time",
            "not held",
            "in the result",
            f"They were written to {SERIES} as they came.",
        )
    return write_series(
        folder,
        points_mm=result.view.points_mm,
        cells=result.view.cells,
        given_point=result.view.point_data,
        given_cell=result.view.cell_data,
        times_s=result.times_s,
        each_time={TEMPERATURE: result.temp_degC[:, node]},
        at_end=at_end,
    )


def known_at_end(result: Result, node: IntArray) -> dict[str, Array]:
    """The arrays known at the end, by their names in field files, at solved nodes (n,)."""
    at_end = {
        f"{name}_fraction": values[node]
        for name, values in zip(PHASE_NAMES, result.phases, strict=True)
    }
    at_end |= {
        "hardness_HV": result.hardness_hv[node],
        "hardness_as_quenched_HV": result.hardness_as_quenched_hv[node],
        "yield_strength_MPa": result.yield_mpa[node],
        "time_800_500_s": result.time_800_500_s[node],
        "cooling_rate_700degC_K_per_s": result.rate_700_K_per_s[node],
        "austenite_carbon_pct": result.austenite_carbon_pct[node],
        "pearlite_formed_at_degC": result.pearlite_formed_at_degC[node],
        "ferrite_grain_um": result.ferrite_grain_um[node],
        "pearlite_spacing_um": result.pearlite_spacing_um[node],
        "impact_transition_degC": result.impact_transition_degC[node],
    }
    soaked = result.soaked
    at_end |= {
        "soak_reached_degC": soaked.hottest_degC[node],
        "carbon_in_solution_pct": soaked.carbon_in_solution_pct[node],
        "undissolved_ferrite_fraction": soaked.ferrite[node],
        "undissolved_cementite_fraction": soaked.cementite[node],
        "austenite_grain_astm": soaked.grain_astm[node],
        "austenite_grain_um": soaked.grain_um[node],
    }
    if np.isfinite(result.cementite_film_um).any():
        at_end["cementite_film_um"] = result.cementite_film_um[node]
        at_end["cementite_network_code"] = result.cementite_network[node].astype(np.float64)
    if result.resampling:
        at_end["hardness_resampling_error_HV"] = result.resampling.hardness_error_hv[node]
    return at_end


class SeriesKeeper:
    """Takes the fields of a run as they come into one file; it has a life, hence a class.

    Parameters
    ----------
    path
        The file, begun anew by every call of ``begin``.
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        self._series: HdfSeries | None = None
        self._node: IntArray = np.empty(0, dtype=np.int64)

    def begin(self, view: Drawing) -> "SeriesKeeper":
        """Start the file for a part as it is drawn."""
        self.close()
        self._node = view.node
        self._series = HdfSeries(
            self._path,
            points_mm=view.points * 1e3,
            cells=view.cells,
            given_point=view.point_data,
            given_cell=view.cell_data,
        )
        return self

    def add(self, time: float, temp: Array) -> None:
        """One moment [s] and the temperatures [K] of the solved nodes."""
        assert self._series is not None, "begun"
        self._series.add(time, {TEMPERATURE: temp[self._node] - ZERO_DEGC})

    def finish(self, result: Result) -> None:
        """Add what is known at the end, and close."""
        assert self._series is not None, "begun"
        self._series.finish(known_at_end(result, self._node))
        self.close()

    def close(self) -> None:
        """Close the file, finished or not."""
        if self._series is not None:
            self._series.close()
            self._series = None


def write_result_record(result: Result, folder: Path) -> str:
    """Write ``record.h5`` into an existing folder; returns its root digest."""
    return write_record(
        folder / RECORD, data=_numbers(result), text=_texts(result), made_by=provenance()
    )


def _numbers(result: Result) -> dict[str, Quantity]:
    def many(values: NDArray[np.generic], units: str, long_name: str) -> Quantity:
        return Quantity(values, units, long_name)

    def one(value: float | None, units: str, long_name: str) -> Quantity:
        return Quantity(np.asarray(np.nan if value is None else value), units, long_name)

    r, view = result, result.view
    data = {
        "grid/points": many(r.points_mm, "mm", "coordinates of the solved nodes"),
        "grid/volume": many(
            r.volume, f"m3 {_EXTENT.get(r.sense, '')}".strip(), "control volume of each node"
        ),
        "view/points": many(view.points_mm, "mm", "points of the drawing of the whole part"),
        "view/quads": many(view.quads, "1", "corner points of quadrilateral cells"),
        "view/triangles": many(view.triangles, "1", "corner points of triangular cells"),
        "view/connectivity": many(
            np.concatenate([np.empty(0, np.int64), *(block.ravel() for _, block in view.cells)]),
            "1",
            f"corner points of all cells in turn, of the types {_types(view.cells)}",
        ),
        "view/node": many(view.node, "1", "solved node of each point of the drawing"),
        "fields/time": many(r.times_s, "s", "stored times"),
        "fields/temperature": many(r.temp_degC, "degC", "temperature (time, node)"),
        "fields/phases": many(
            r.phases, "1", f"phase fractions at the end (phase, node): {', '.join(PHASE_NAMES)}"
        ),
        "fields/hardness": many(r.hardness_hv, "HV", "Vickers hardness at the end"),
        "fields/hardness_as_quenched": many(
            r.hardness_as_quenched_hv, "HV", "Vickers hardness before the tempers"
        ),
        "fields/yield_strength": many(r.yield_mpa, "MPa", "yield strength, nan outside"),
        "fields/time_800_500": many(r.time_800_500_s, "s", "time from 800 to 500 degC"),
        "fields/rate_700": many(r.rate_700_K_per_s, "K/s", "cooling rate at 700 degC"),
        "fields/austenite_carbon": many(
            r.austenite_carbon_pct, "mass percent", "carbon in the austenite left at the end"
        ),
        "fields/pearlite_formed_at": many(
            r.pearlite_formed_at_degC, "degC", "mean temperature at which pearlite formed"
        ),
        "fields/ferrite_grain": many(r.ferrite_grain_um, "um", "ferrite grain diameter as cooled"),
        "fields/pearlite_spacing": many(
            r.pearlite_spacing_um, "um", "interlamellar spacing of pearlite as cooled"
        ),
        "fields/cementite_film": many(
            r.cementite_film_um, "um", "cementite on grain faces, nan unless hypereutectoid"
        ),
        "fields/cementite_network": many(r.cementite_network, "1", CODES),
        "fields/impact_transition": many(
            r.impact_transition_degC,
            "degC",
            "27 J transition of ferrite with pearlite, nan outside",
        ),
        "soak/reached": many(r.soaked.hottest_degC, "degC", "highest temperature of the soak"),
        "soak/carbon_in_solution": many(
            r.soaked.carbon_in_solution_pct, "mass percent", "carbon of the austenite"
        ),
        "soak/ferrite": many(r.soaked.ferrite, "1", "ferrite that the soak left"),
        "soak/cementite": many(r.soaked.cementite, "1", "cementite that the soak left"),
        "soak/grain_number": many(
            r.soaked.grain_astm, "ASTM E112", "prior austenite grain, nan where none formed"
        ),
        "soak/grain_intercept": many(r.soaked.grain_um, "um", "mean intercept of that grain"),
        "soak/austenitised": many(
            r.soaked.austenitised.astype(np.int64), "1", "whether a node became austenite"
        ),
        "histories/time": many(r.history_times_s, "s", "times of the histories"),
        "histories/temperature": many(r.history_temp_degC, "degC", "temperature (time, position)"),
        "profile/depth": many(r.profile.depth_mm, "mm", f"depth, {r.profile.label}"),
        "profile/node": many(r.profile.node, "1", "solved nodes along the profile"),
        "balance/heat_given": one(r.heat_given_J_per_kg, "J/kg", "heat given to the baths"),
        "balance/closure": one(r.heat_balance_relative, "1", "relative closure of heat balance"),
        "errors/time": one(r.time_error_K, "K", "estimated temperature error of the time steps"),
        "errors/grid": one(r.grid_error_K, "K", "estimated temperature error of the grid"),
        "counts/steps": one(r.n_step, "1", "number of time steps"),
        "counts/nodes": one(r.n_node, "1", "number of solved nodes"),
    }
    if r.heating is not None:
        data |= {
            "heating/time": many(r.heating.times_s, "s", "since the part came into the furnace"),
            "heating/temperature": many(
                r.heating.temp_degC, "degC", "temperature in the furnace (time, position)"
            ),
            "balance/heat_taken": one(
                r.heating.heat_taken_J_per_kg, "J/kg", "heat taken up in the furnace"
            ),
            "balance/heating_closure": one(
                r.heating.heat_balance_relative, "1", "relative closure of the heating's balance"
            ),
        }
    if r.profile.share is not None:
        data["profile/share"] = many(r.profile.share, "1", "shares of these nodes")
    for name, given in (*view.point_data.items(), *view.cell_data.items()):
        if given.dtype.kind in "fiu":
            data[f"given/{_plain(name)}"] = many(given, "1", "array of the mesh file, as it was")
    for name, temp in r.critical_degC.items():
        data[f"critical/{_plain(name)}"] = one(temp, "degC", f"critical temperature {name}")
    if r.resampling:
        data["errors/resampling_hardness"] = many(
            r.resampling.hardness_error_hv, "HV", "hardness error of the given samples"
        )
        data["errors/resampling_phase"] = many(
            r.resampling.phase_error, "1", "largest error of a phase fraction, given samples"
        )
    for key, units, long_name in _POSITION_COLUMNS:
        values = [getattr(p, key) for p in r.positions]
        column = np.array([np.nan if v is None else v for v in values], dtype=np.float64)
        data[f"positions/{key}"] = many(column, units, f"{long_name}, one value per position")
    return data


_POSITION_COLUMNS = (
    ("depth_mm", "mm", "depth below the nearest cooled surface"),
    ("hardness_hv", "HV", "Vickers hardness"),
    ("hardness_hrc", "HRC", "Rockwell C hardness by conversion, nan outside"),
    ("hardness_hb", "HB", "Brinell hardness by conversion, nan outside"),
    ("hardness_as_quenched_hv", "HV", "Vickers hardness before the tempers"),
    ("tensile_mpa", "MPa", "tensile strength by conversion, nan outside"),
    ("yield_mpa", "MPa", "yield strength by microstructure, nan outside"),
    ("time_800_500_s", "s", "time from 800 to 500 degC"),
    ("rate_700_K_per_s", "K/s", "cooling rate at 700 degC"),
    ("austenite_carbon_pct", "mass percent", "carbon in the austenite left"),
    ("ferrite_grain_um", "um", "ferrite grain diameter as cooled"),
    ("pearlite_spacing_um", "um", "interlamellar spacing of pearlite as cooled"),
    ("cementite_film_um", "um", "cementite on grain faces, nan unless hypereutectoid"),
    ("impact_transition_degC", "degC", "27 J transition of ferrite with pearlite"),
    ("soak_degC", "degC", "highest temperature of the soak"),
    ("carbon_in_solution_pct", "mass percent", "carbon of the austenite after the soak"),
    ("undissolved_ferrite", "1", "ferrite that the soak left"),
    ("undissolved_cementite", "1", "cementite that the soak left"),
    ("austenite_grain_astm", "ASTM E112", "prior austenite grain, nan where none formed"),
    ("austenite_grain_um", "um", "mean intercept of that grain"),
    ("hardness_time_error_hv", "HV", "estimated hardness error of the time steps"),
    ("hardness_grid_error_hv", "HV", "estimated hardness error of the grid"),
)


def _texts(result: Result) -> dict[str, str]:
    texts = {
        "case_toml": result.case_text,
        "inputs_json": _json(result.inputs),
        "title": result.title,
        "steel": result.steel,
        "composition_pct_json": _json(result.composition_pct),
        "section": result.section,
        "sense": result.sense,
        "soak": result.soak,
        "heat_extent": result.heat_extent,
        "positions_json": _json(
            [{"name": p.name, "coordinates_mm": p.coordinates_mm} for p in result.positions]
        ),
        "position_network_json": _json([p.cementite_network for p in result.positions]),
        "position_phases_json": _json([dict(p.phases) for p in result.positions]),
        "stages_json": _json([asdict(stage) for stage in result.stages]),
        "heating_stages_json": _json(
            [asdict(stage) for stage in result.heating.stages] if result.heating else []
        ),
        "tempers_json": _json([asdict(temper) for temper in result.tempers]),
        "needs_json": _json([asdict(verdict) for verdict in result.verdicts]),
        "notes_json": _json([asdict(note) for note in result.notes]),
        "sources_json": _json([asdict(source) for source in result.sources]),
        "assumptions_json": _json(result.assumptions),
        "cautions_json": _json(result.cautions),
    }
    # A file name need not be UTF-8; what the record holds must be.
    return {key: text.encode(errors="replace").decode() for key, text in texts.items()}


def _json(value: object) -> str:
    return json.dumps(jsonable(value), indent=1, ensure_ascii=False, allow_nan=False)


def _types(cells: tuple[tuple[str, NDArray[np.int64]], ...]) -> str:
    return ", ".join(f"{kind} x {len(block)}" for kind, block in cells)


def _plain(name: str) -> str:
    return name.replace("/", " per ")
