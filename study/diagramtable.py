"""Transformation diagrams as tables; nothing is computed here."""

from collections.abc import Mapping

import numpy as np

from midradius.study.diagram import (
    DIFFUSIONAL,
    PRODUCTS,
    ROOM,
    ZERO_DEGC,
    Cooling,
    Isothermal,
    Soaked,
)
from midradius.thermo.arrays import Array
from midradius.thermo.conversion import hv_to_hrc
from midradius.thermo.phases import PHASE_NAMES

_PARTS = ("start", "half", "end")


def table(metal: Soaked, diagram: Isothermal | Cooling) -> list[list[object]]:
    """Rows of the CSV file, heads first."""
    if isinstance(diagram, Isothermal):
        return _isothermal_rows(diagram)
    return _cooling_rows(metal, diagram)


def _isothermal_rows(diagram: Isothermal) -> list[list[object]]:
    columns = {
        f"{n}_{part}_s": diagram.times[n][k] for n in DIFFUSIONAL for k, part in enumerate(_PARTS)
    }
    columns |= {
        f"austenite_{p}_gone_s": diagram.total[k] for k, p in enumerate(("1pct", "50pct", "99pct"))
    }
    return _rows({"hold_degC": diagram.temp - ZERO_DEGC, **columns})


def _cooling_rows(metal: Soaked, diagram: Cooling) -> list[list[object]]:
    columns: dict[str, Array] = {"rate_K_per_s": diagram.rate}
    for name in PRODUCTS:
        for k, part in enumerate(_PARTS):
            columns[f"{name}_{part}_degC"] = diagram.temps[name][k] - ZERO_DEGC
    columns |= {f"{n}_fraction": v for n, v in zip(PHASE_NAMES, diagram.phases, strict=True)}
    columns |= {"hardness_HV": diagram.hardness_hv, "hardness_HRC": hv_to_hrc(diagram.hardness_hv)}
    columns["time_to_20degC_s"] = (metal.top - ROOM) / diagram.rate
    return _rows(columns)


def _rows(columns: Mapping[str, Array]) -> list[list[object]]:
    body = np.column_stack([*columns.values()])
    heads: list[object] = [*columns]
    rows: list[list[object]] = [[float(value) for value in row] for row in body]
    return [heads, *rows]
