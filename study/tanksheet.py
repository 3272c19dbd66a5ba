"""What ``midradius tank`` leaves in a folder: tables, pictures and a document."""

from collections.abc import Iterable, Sequence
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label
from midradius.study.palette import BLACK, BLUE, GREEN, GRID, GUIDE, ORANGE, SKY, VERMILION
from midradius.study.sheetfile import write_document, write_picture, write_table
from midradius.study.summary import jsonable
from midradius.study.tankanswer import ZERO_DEGC, TankAnswer

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SCHEMA_VERSION = 1
BATH, HEAT, SIZING, LOADS, DOCUMENT = (
    *("bath.csv", "load_heat.csv", "sizing.csv", "loads.csv"),
    "tank.json",
)


def write(found: TankAnswer, folder: Path) -> None:
    """Write everything into an existing folder."""
    write_table(folder / BATH, _bath_rows(found))
    write_table(folder / HEAT, _heat_rows(found))
    write_table(folder / LOADS, _load_rows(found))
    if found.limit_is_safe:
        write_table(folder / SIZING, _size_rows(found))
    write_picture(folder / "bath.png", bath_picture(found))
    write_picture(folder / "load_heat.png", heat_picture(found))
    if found.limit_is_safe:
        write_picture(folder / "sizing.png", size_picture(found))
    write_document(folder / DOCUMENT, document(found))
    if found.case.text:
        (folder / "case.toml").write_text(found.case.text, encoding="utf-8")


def document(found: TankAnswer) -> dict[str, Any]:
    """The answer as plain Python for JSON; units in the names, None where unknown."""
    own, core, band = found.own, found.core, found.own_band
    low_high = [float(np.min(found.hottest)), float(np.max(found.hottest))]
    mass = sum(body.mass for body in found.own_bodies)
    content = {
        "schema_version": SCHEMA_VERSION,
        "program": "midradius",
        "title": found.case.title,
        "acceptable": found.acceptable,
        "verdict": found.verdict,
        "not_judged": [check.name for check in found.checks if check.met is None],
        "checks": [asdict(check) for check in found.checks],
        "coupled": found.case.tank.coupled if found.case.tank else True,
        "fluid": found.fluid.name,
        "flash_point_degC": _degC(found.flash),
        "bath_limit_degC": _degC(found.limits.bath),
        "load_mass_kg": mass,
        "load_bodies_kg": {body.name: body.mass for body in found.own_bodies},
        "heat_to_bath_MJ": own.total / 1e6,
        "heat_to_bath_kJ_per_kg": own.total / mass / 1e3,
        "heat_left_in_load_MJ": own.left / 1e6,
        "heat_to_air_before_MJ": own.before / 1e6,
        "peak_heat_rate_kW": own.peak / 1e3,
        "heat_to_bath_film_band_MJ": [q / 1e6 for q in band[0]],
        "peak_heat_rate_film_band_kW": [q / 1e3 for q in band[1]],
        "time_in_bath_s": own.stay,
        "heat_balance_relative": found.balance,
        "coupling_rounds": own.rounds,
        "bath_max_degC": _degC(float(found.hottest[0])),
        "bath_max_film_band_degC": [_degC(t) for t in low_high],
        "film_uncertainty_pct": found.uncertainty_pct,
        "core_hardness_hv": {
            "bath_held": core.uncoupled_hv,
            "first_load": core.first_hv,
            "hottest_bath": core.worst_hv,
            "hottest_bath_at_immersion_degC": _degC(core.worst_start),
        },
        "days_to_periodic": found.day.days,
        "periodic": found.day.settled,
        "loads": _loads(found),
        "cooler_fails": _failure(found),
        "level": {
            "worst_mm": None if found.level is None else 1e3 * float(found.level.max()),
            "lip_mm": None if found.lip is None else 1e3 * found.lip,
            "worst_volume_m3": float(found.level_volume.max()),
        },
        "evaporated_kg_per_day": float(found.day.steady.evaporated[-1, 0]),
        "sizing": _sizing(found) if found.limit_is_safe else None,
        "agitation": None if found.agitation is None else asdict(found.agitation),
        "rules_of_thumb": [
            {"rule": name, "value": value, "unit": unit} for name, value, unit in found.rules
        ],
        "cautions": found.cautions,
        "assumptions": found.assumptions,
        "notes": [str(note) for note in found.notes],
        "sources": [asdict(source) for source in found.sources],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def _sizing(found: TankAnswer) -> dict[str, object]:
    sized = found.sizing
    duty = sized.per_kelvin_to_duty / 1e3
    return {
        "volume_m3": sized.volume,
        "least_cooler_kW": duty * sized.cooler[0],
        "least_cooler_film_band_kW": duty * _band(sized.cooler),
        "least_volume_m3": sized.volume_least[0],
        "least_volume_film_band_m3": _band(sized.volume_least),
        "least_cooler_at_volume_kW": duty * sized.cooler_least[0],
        "least_cooler_at_volume_film_band_kW": duty * _band(sized.cooler_least),
        "cooler_given_kW": duty * sized.cooler_given,
        "coolant_in_degC": _degC(sized.coolant_in),
    }


def _degC(temp: float | None) -> float | None:
    return None if temp is None else round(temp - ZERO_DEGC, 6)


def _band(values: np.ndarray) -> np.ndarray:
    """Lowest and highest over the film variants; nan where one of them has no answer."""
    return np.array([np.min(values, axis=0), np.max(values, axis=0)])


def _loads(found: TankAnswer) -> list[dict[str, object]]:
    return [
        {
            "name": row.name,
            "at_h": row.time / 3600.0,
            "bath_before_degC": _degC(float(row.before[0])),
            "bath_hottest_degC": _degC(float(row.hottest[0])),
            "rise_K": float(row.rise[0]),
            "rise_film_band_K": [float(row.rise.min()), float(row.rise.max())],
            "bath_at_next_degC": _degC(float(row.at_next[0])),
            "recovered_after_s": float(row.recovered[0]),
        }
        for row in found.loads
    ]


def _failure(found: TankAnswer) -> dict[str, object] | None:
    failed = found.failure
    if failed is None:
        return None
    return {
        "at_h": failed.at / 3600.0,
        "bath_max_under_that_load_degC": _degC(failed.hottest),
        "bath_max_under_that_load_film_band_degC": [_degC(t) for t in failed.band],
        "bath_max_if_loads_go_on_degC": _degC(failed.hottest_if_loads_go_on),
        "passes_bath_limit_after_s": failed.passes_limit_after,
    }


Rows = Iterable[Sequence[object]]


def _bath_rows(found: TankAnswer) -> Rows:
    yield [
        *("day", "time_h", "bath_degC", "bath_film_stronger_degC", "bath_film_weaker_degC"),
        *("load_MJ", "heater_MJ", "agitator_MJ", "cooler_MJ", "surface_MJ", "drag_out_MJ"),
        "level_volume_m3",
    ]
    from midradius.study.bath import level_volume

    runs = [("first", found.day.first)]
    if found.day.steady is not found.day.first:
        runs.append(("periodic", found.day.steady))
    for name, run in runs:
        volume = level_volume(found.tank, run, found.day.loads, np.ones(run.temp.shape[1]))
        for k, time in enumerate(run.time):
            yield [
                name,
                float(time) / 3600.0,
                *(float(t) - ZERO_DEGC for t in run.hottest[k]),
                *(float(heat[k, 0]) / 1e6 for heat in run.heat.values()),
                float(volume[k, 0]),
            ]


def _heat_rows(found: TankAnswer) -> Rows:
    yield ["time_s", "heat_MJ", "mean_rate_kW", "bath_degC"]
    own = found.own
    rate = np.diff(own.heat) / np.maximum(np.diff(own.time), 1e-9)
    bath = np.interp(own.time, own.path.time, own.path.temp)
    for k in range(len(own.time)):
        before = float(rate[k - 1]) / 1e3 if k else None
        yield [
            float(own.time[k]),
            float(own.heat[k]) / 1e6,
            before,
            float(bath[k]) - ZERO_DEGC,
        ]


def _load_rows(found: TankAnswer) -> Rows:
    rows = _loads(found)
    yield [name for name in rows[0] if name != "rise_film_band_K"]
    for row in rows:
        yield [value for name, value in row.items() if name != "rise_film_band_K"]


def _size_rows(found: TankAnswer) -> Rows:
    sized = found.sizing
    yield ["volume_m3", "least_cooler_kW", "film_band_low_kW", "film_band_high_kW"]
    duty = sized.per_kelvin_to_duty / 1e3
    low, high = duty * _band(sized.cooler)
    for k, volume in enumerate(sized.volume):
        yield [
            float(volume),
            float(duty * sized.cooler[0, k]),
            float(low[k]),
            float(high[k]),
        ]


def _sheet(found: TankAnswer, what: str, rows: int = 1) -> "tuple[Figure, Sequence[Axes]]":
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    height = 4.6 if rows == 1 else 6.4
    figure = Figure(figsize=(WIDTH_INCH, height), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots(rows, 1, sharex=True, squeeze=False)[:, 0]
    volume = found.case.tank.volume if found.case.tank else 0.0
    said = f"{volume:g} m³ of {found.fluid.name}, {what}"
    figure.suptitle(f"{label(found.case.title)[:90]}\n{label(said)}", fontsize=SIZE + 1.5)
    for one in axes:
        one.grid(color=GRID, lw=0.6)
        one.set_axisbelow(True)
        one.tick_params(labelsize=SMALL)
    return figure, tuple(axes)


def bath_picture(found: TankAnswer) -> "Figure":
    """Bath temperature through the first and the periodic day, with the film's band."""
    figure, (axes,) = _sheet(found, "bath through the day")
    steady, first = found.day.steady, found.day.first
    hours = steady.time / 3600.0
    band = steady.hottest - ZERO_DEGC
    axes.fill_between(
        hours, band.min(axis=1), band.max(axis=1), color=SKY, alpha=0.35, lw=0, label="film band"
    )
    if steady is not first:
        axes.plot(hours, band[:, 0], color=BLUE, lw=1.6, label="periodic day")
        axes.plot(
            first.time / 3600.0,
            first.hottest[:, 0] - ZERO_DEGC,
            color=GREEN,
            lw=1.3,
            ls="dashed",
            label="first day",
        )
    else:
        axes.plot(hours, band[:, 0], color=BLUE, lw=1.6, label="bath")
    axes.axhline(found.limits.bath - ZERO_DEGC, color=VERMILION, lw=1.2, label="limit")
    if found.flash is not None and found.fluid.kind == "oil":
        safe = found.flash - 50.0 - ZERO_DEGC
        axes.axhline(safe, color=BLACK, lw=1.0, ls="dotted", label="flash point less 50 K")
    last = max(load.time + load.stay for load in found.day.loads) / 3600.0
    axes.set_xlim(0.0, min(float(hours[-1]), 1.25 * last + 1.0))
    axes.set_xlabel("time [h]", fontsize=SIZE)
    axes.set_ylabel("bath [°C]", fontsize=SIZE)
    axes.legend(fontsize=SMALL, framealpha=0.9, edgecolor="none", loc="best")
    return figure


def heat_picture(found: TankAnswer) -> "Figure":
    """Heat rate of one load and the bath meanwhile."""
    figure, (top, low) = _sheet(found, "one load", rows=2)
    own = found.own
    time = np.maximum(own.time, 1e-3)
    rate = np.diff(own.heat) / np.maximum(np.diff(own.time), 1e-9) / 1e3
    middle = 0.5 * (time[1:] + time[:-1])
    top.plot(middle, rate, color=VERMILION, lw=1.6, label="heat rate")
    top.set_ylabel("heat rate [kW]", fontsize=SIZE)
    total = top.twinx()
    total.plot(time, own.heat / 1e6, color=GUIDE, lw=1.3, ls="dashed")
    total.set_ylabel("heat given [MJ], dashed", fontsize=SIZE)
    total.tick_params(labelsize=SMALL)
    low.plot(time, np.interp(time, own.path.time, own.path.temp) - ZERO_DEGC, color=BLUE, lw=1.6)
    low.set_ylabel("bath [°C]", fontsize=SIZE)
    low.set_xlabel("time in the bath [s]", fontsize=SIZE)
    low.set_xlim(0.0, own.stay)
    return figure


def size_picture(found: TankAnswer) -> "Figure":
    """Least cooler on volume, with the film's band and the tank of the case."""
    figure, (axes,) = _sheet(found, "least cooler on volume")
    sized = found.sizing
    duty = sized.per_kelvin_to_duty / 1e3
    low, high = duty * _band(sized.cooler)
    axes.fill_between(sized.volume, low, high, color=SKY, alpha=0.35, lw=0, label="film band")
    axes.plot(sized.volume, duty * sized.cooler[0], color=BLUE, lw=1.6, label="least cooler")
    mark = "o" if found.acceptable else "X"
    said = "this tank" if found.acceptable else f"this tank, {found.verdict}"
    axes.plot([sized.volume_given], [duty * sized.cooler_given], mark, color=ORANGE, ms=9)
    axes.annotate(
        said,
        (sized.volume_given, duty * sized.cooler_given),
        xytext=(8, 8),
        textcoords="offset points",
        fontsize=SMALL,
    )
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel("volume of fluid [m³]", fontsize=SIZE)
    limit = found.limits.bath - ZERO_DEGC
    axes.set_ylabel(f"cooler [kW with the bath at {limit:.4g} °C]", fontsize=SIZE)
    axes.legend(fontsize=SMALL, frameon=False, loc="best")
    return figure
