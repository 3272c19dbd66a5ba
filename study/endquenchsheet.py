"""An end-quench test as a table, a picture and a document; nothing is computed here."""

from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.chart import SIZE, SMALL, sheets
from midradius.study.endquench import A255, JUST, SIXTEENTH_MM, ZERO_DEGC, EndQuench
from midradius.study.palette import BLACK, GRID, GUIDE, PHASE, PHASE_LABEL, PURPLE, SKY
from midradius.study.sheetfile import write_document, write_picture, write_table
from midradius.study.summary import SCHEMA_VERSION, jsonable
from midradius.thermo.arrays import Array
from midradius.thermo.bands import UNSURE_HRC
from midradius.thermo.phases import PHASE_NAMES

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

TABLE, PICTURE, DOCUMENT = "end-quench.csv", "end-quench.png", "end-quench.json"
_LEAST_SHARE = 0.005  # of a constituent: less is thinner than a line
_LOWEST, _HIGHEST = 18.0, 68.0  # HRC on the chart; the scale begins at 20


def write_sheet(test: EndQuench, folder: Path, extra: Mapping[str, object]) -> None:
    """Write table, picture and document into an existing folder."""
    write_table(folder / TABLE, _rows(test))
    write_picture(folder / PICTURE, picture(test))
    write_document(folder / DOCUMENT, {**document(test), **extra})


def document(test: EndQuench) -> dict[str, Any]:
    """The test as plain Python for JSON; lists along ``distance_mm``, None where unknown."""
    content = {
        "schema_version": SCHEMA_VERSION,
        "grade": test.steel.name,
        "standard": test.steel.standard,
        "composition_pct": {k: v for k, v in vars(test.steel.composition).items() if v},
        "austenitize_degC": round(test.austenitize - ZERO_DEGC, 6),
        "austenitize_reason": test.reason,
        "soak_time_s": test.time,
        "soak": test.result.soak,
        "grain_astm": test.grain_astm,
        "distance_mm": test.distance_mm,
        "distance_sixteenths": test.distance_mm / SIXTEENTH_MM,
        "hardness_hrc": test.hardness_hrc,
        "hardness_hv": test.column("hardness_hv"),
        "martensite_pct": 100.0 * test.column("martensite"),
        "phases": {name: test.column(name) for name in PHASE_NAMES},
        "cooling_rate_700degC_K_per_s": test.column("rate_700_K_per_s"),
        "time_800_500_s": test.column("time_800_500_s"),
        "ideal_diameter_mm": 1e3 * test.ideal_diameter,
        "regressions": {
            "what": "independent estimates from the composition, not from the solver",
            "just_1969_hrc": test.estimates[JUST],
            "astm_a255_hrc": test.estimates[A255],
            "critical_rate_all_martensite_K_per_s": test.critical.full,
            "critical_rate_half_martensite_K_per_s": test.critical.half,
        },
        "band": _band(test),
        "kinetics": test.kinetics.name,
        "critical_degC": test.result.critical_degC,
        "time_error_K": test.result.time_error_K,
        "grid_error_K": test.result.grid_error_K,
        "notes": test.notes,
        "assumptions": test.result.assumptions,
        "sources": [vars(source) for source in test.result.sources],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def _band(test: EndQuench) -> dict[str, object] | None:
    if test.band is None:
        return None
    points = test.band.points
    return {
        "name": test.band.name,
        "source": test.band.source,
        "status": test.band.status,
        "distance_mm": [round(1e3 * p.distance, 6) for p in points],
        "low_hrc": [p.low_hrc for p in points],
        "high_hrc": [p.high_hrc for p in points],
    }


def band_at(test: EndQuench) -> tuple[Array, Array]:
    """Lower and upper limit [HRC] where the band has a point, else nan, (n_distance,) each."""
    low, high = np.full((2, len(test.distance_mm)), np.nan)
    for point in test.band.points if test.band else ():
        here = np.isclose(test.distance_mm, 1e3 * point.distance, rtol=0.0, atol=1e-6)
        low[here], high[here] = point.low_hrc, point.high_hrc
    return low, high


def _rows(test: EndQuench) -> Iterable[Sequence[object]]:
    low, high = band_at(test)
    yield [
        *("distance_mm", "distance_sixteenths_in", "hardness_HV", "hardness_HRC"),
        *(f"{name}_fraction" for name in PHASE_NAMES),
        *("cooling_rate_700degC_K_per_s", "time_800_500_s"),
        *("estimate_Just_1969_HRC", "estimate_ASTM_A255_HRC", "band_low_HRC", "band_high_HRC"),
    ]
    columns = [
        test.distance_mm,
        test.distance_mm / SIXTEENTH_MM,
        test.column("hardness_hv"),
        test.hardness_hrc,
        *(test.column(name) for name in PHASE_NAMES),
        test.column("rate_700_K_per_s"),
        test.column("time_800_500_s"),
        test.estimates[JUST],
        test.estimates[A255],
        low,
        high,
    ]
    for row in np.column_stack(columns):
        yield [float(value) for value in row]


def picture(test: EndQuench) -> "Figure":
    """Hardness with band and estimates above, microstructure below."""
    figure, (upper, lower) = sheets(test.result, height=7.4, rows=2)
    z = test.distance_mm
    if test.band is not None:
        at = [1e3 * p.distance for p in test.band.points]
        unsure = UNSURE_HRC[test.band.status]
        name = f"band {test.band.name}" + (f", from memory (±{unsure:.0f})" if unsure else "")
        low = [p.low_hrc for p in test.band.points]
        high = [p.high_hrc for p in test.band.points]
        upper.fill_between(at, low, high, color=GRID, lw=0.0, label=name, zorder=1)
    upper.plot(
        z, test.estimates[JUST], color=PURPLE, ls=(0, (5, 2)), lw=1.5, label=f"estimate, {JUST}"
    )
    upper.plot(
        z, test.estimates[A255], color=SKY, ls=(0, (1.5, 1.2)), lw=2.2, label=f"estimate, {A255}"
    )
    upper.plot(
        z,
        test.hardness_hrc,
        color=BLACK,
        lw=1.8,
        marker="o",
        ms=3.5,
        label="computed by the solver",
    )
    upper.set_ylim(_LOWEST, _HIGHEST)
    upper.set_ylabel("hardness [HRC]", fontsize=SIZE)
    upper.legend(loc="upper right", fontsize=SMALL, frameon=True, edgecolor="white", framealpha=0.9)
    soft = z[~np.isfinite(test.hardness_hrc)]
    if soft.size:
        upper.text(
            0.99,
            0.03,
            f"below 20 HRC from {soft.min():.1f} mm on: Vickers in the table",
            transform=upper.transAxes,
            fontsize=SMALL,
            color=GUIDE,
            ha="right",
        )
    _sixteenths(upper)
    present = [name for name in PHASE_NAMES if test.column(name).max() > _LEAST_SHARE]
    lower.stackplot(
        z,
        100.0 * np.array([test.column(name) for name in present]),
        labels=[PHASE_LABEL[name] for name in present],
        colors=[PHASE[name] for name in present],
        edgecolor="white",
        lw=0.6,
    )
    lower.set_ylim(0.0, 100.0)
    lower.set_ylabel("mass fraction [%]", fontsize=SIZE)
    lower.set_xlabel(
        "distance from the quenched end [mm]; austenitised at "
        f"{test.austenitize - ZERO_DEGC:.0f} °C",
        fontsize=SIZE,
    )
    lower.set_xlim(0.0, float(z[-1]))
    lower.legend(
        loc="upper left", bbox_to_anchor=(1.01, 1.02), reverse=True, fontsize=SMALL, frameon=False
    )
    return figure


def _sixteenths(axes: "Axes") -> None:
    twin = axes.secondary_xaxis("top")
    marks = range(0, 33, 4)
    twin.set_xticks([j * SIXTEENTH_MM for j in marks], [str(j) for j in marks])
    twin.tick_params(labelsize=SMALL)
    twin.set_xlabel("sixteenths of an inch", fontsize=SMALL)
