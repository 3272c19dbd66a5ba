"""A fitted heat in words, as a table, a picture, a document, a saved calibration."""

from collections.abc import Iterable, Sequence
from importlib import metadata
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.calibrate import HIGHEST_HRC, LOWEST_HRC, Fitted
from midradius.study.calibrationfile import KEYS, WORDS, HeatCalibration, dumps, shown
from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label
from midradius.study.measuredcurve import SIXTEENTH_MM
from midradius.study.palette import BLACK, GRID, GUIDE, PURPLE
from midradius.study.sheetfile import write_document, write_picture, write_table
from midradius.study.summary import jsonable
from midradius.thermo.calibration import SOURCE
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from matplotlib.figure import Figure

TABLE, PICTURE, DOCUMENT = "calibration.csv", "calibration.png", "calibration.json"
ZERO_DEGC = 273.15


def head(found: Fitted) -> list[str]:
    """The steel, the measurement, the shifts, how much nearer they bring the curve."""
    before, after = found.fit.root_mean_square
    lines = [
        f"Calibration of {found.steel.name} to {found.curve.name}",
        f"{int(found.used.sum())} points, scatter {found.fit.scatter:g} HRC; austenitised at "
        f"{found.austenitize - ZERO_DEGC:.0f} degC ({found.reason}), {found.time / 60.0:.4g} min",
        "",
        "Shifts, with standard errors",
    ]
    for k, (attribute, _, _) in enumerate(KEYS.values()):
        if np.isfinite(found.fit.error[k]):
            what, unit = WORDS[k]
            value = getattr(found.fit.shifts, attribute)
            lines.append(f"  {shown(what, unit, value, float(found.fit.error[k]))}")
            bound = _at_bound(k, value)
            if bound:
                lines.append(f"    {bound}")
    if found.fit.held:
        lines += ["Held at none", *(f"  {reason}" for reason in found.fit.held)]
    return [*lines, f"Root mean square deviation: {before:.2f} HRC before, {after:.2f} after"]


def remarks(found: Fitted) -> list[str]:
    """What to know beside the figures."""
    return [f"- {note}" for note in found.notes]


def _at_bound(k: int, value: float) -> str:
    """A warning where a shift stands at the end of its range."""
    _, low, high = tuple(KEYS.values())[k]
    near = 0.01 * (high - low)
    if low + (0.01 * low if low > 0.0 else near) < value < high - near:
        return ""
    return "at the end of its range: something else than this shift sets the curve apart"


def document(found: Fitted) -> dict[str, Any]:
    """The fit as plain Python for JSON; None where unknown or held."""
    before, after = found.fit.root_mean_square
    content = {
        "grade": found.steel.name,
        "composition_pct": {k: v for k, v in vars(found.steel.composition).items() if v},
        "austenitize_degC": round(found.austenitize - ZERO_DEGC, 6),
        "soak_time_s": found.time,
        "grain_astm": found.grain_astm,
        "measured": found.curve.name,
        "measured_sha256": found.curve.sha256,
        "scatter_hrc": found.fit.scatter,
        "shifts": {key: getattr(found.fit.shifts, item[0]) for key, item in KEYS.items()},
        "standard_errors": dict(zip(KEYS, found.fit.error, strict=True)),
        "held": found.fit.held,
        "rms_before_hrc": before,
        "rms_after_hrc": after,
        "distance_mm": found.curve.distance_mm,
        "measured_hrc": found.curve.hardness_hrc,
        "used": [bool(used) for used in found.used],
        "before_hrc": found.before_hrc,
        "after_hrc": found.after_hrc,
        "notes": found.notes,
        "sources": [vars(SOURCE)],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def write_sheet(found: Fitted, folder: Path) -> None:
    """Write table, picture and document into an existing folder."""
    write_table(folder / TABLE, _rows(found))
    write_picture(folder / PICTURE, picture(found))
    write_document(folder / DOCUMENT, document(found))


def _rows(found: Fitted) -> Iterable[Sequence[object]]:
    yield [
        *("distance_mm", "distance_sixteenths_in", "measured_HRC", "used_in_fit"),
        *("before_HRC", "after_HRC"),
    ]
    for k, z in enumerate(found.curve.distance_mm):
        measured, used = float(found.curve.hardness_hrc[k]), int(found.used[k])
        computed = float(found.before_hrc[k]), float(found.after_hrc[k])
        yield [float(z), float(z / SIXTEENTH_MM), measured, used, *computed]


def picture(found: Fitted) -> "Figure":
    """The measured points between the computed curves before and after."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH_INCH, 4.6), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots()
    title = f"{found.steel.name}, calibrated to {found.curve.name}"
    figure.suptitle(label(title if len(title) <= 90 else title[:88] + " …"), fontsize=SIZE + 1.5)
    axes.grid(color=GRID, lw=0.6)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=SMALL)
    before, after = found.fit.root_mean_square
    axes.plot(
        *(found.chart_mm, found.chart_before_hrc),
        color=PURPLE,
        ls=(0, (5, 2)),
        lw=1.6,
        label=f"computed before (rms {before:.1f} HRC)",
    )
    axes.plot(
        *(found.chart_mm, found.chart_after_hrc),
        color=BLACK,
        lw=1.8,
        label=f"computed after (rms {after:.1f} HRC)",
    )
    used = found.used
    axes.errorbar(
        *(found.curve.distance_mm[used], found.curve.hardness_hrc[used]),
        yerr=found.fit.scatter,
        fmt="o",
        ms=5,
        color=BLACK,
        mfc="white",
        elinewidth=0.9,
        label=f"measured, ±{found.fit.scatter:g} HRC",
        zorder=3,
    )
    if not used.all():
        axes.plot(
            *(found.curve.distance_mm[~used], found.curve.hardness_hrc[~used]),
            "x",
            ms=5,
            color=GUIDE,
            label=f"below {LOWEST_HRC:g} HRC, left out",
        )
    lowest = min(LOWEST_HRC, float(found.curve.hardness_hrc.min()))
    axes.set_ylim(lowest - 2.0, HIGHEST_HRC)
    axes.set_xlim(0.0, float(found.chart_mm[-1]) * 1.02)
    axes.set_xlabel("distance from the quenched end [mm]", fontsize=SIZE)
    axes.set_ylabel("hardness [HRC]", fontsize=SIZE)
    axes.legend(loc="upper right", fontsize=SMALL, frameon=True, edgecolor="white", framealpha=0.9)
    return figure


def saved(found: Fitted, path: Path) -> HeatCalibration:
    """The fit as a case will carry it."""
    return HeatCalibration(
        path=path,
        steel=found.steel.name,
        composition=found.steel.composition,
        shifts=found.fit.shifts,
        error=tuple(float(e) if np.isfinite(e) else None for e in found.fit.error),
        measured=found.curve.name,
        measured_sha256=found.curve.sha256,
        program=f"midradius {metadata.version('midradius')}",
    )


def save_file(found: Fitted, path: Path) -> None:
    """Write the calibration.

    Raises
    ------
    InputFault
        The place cannot be written.
    """
    before, after = found.fit.root_mean_square
    grain = "as the soak leaves it" if found.grain_astm is None else f"ASTM {found.grain_astm:g}"
    said = (
        f"{int(found.used.sum())} points, scatter {found.fit.scatter:g} HRC, austenitised at "
        f"{found.austenitize - ZERO_DEGC:.4g} degC for {found.time / 60.0:.4g} min, grain {grain}",
        f"root mean square deviation {before:.2f} HRC before, {after:.2f} after",
        *(f"held: {reason}" for reason in found.fit.held),
    )
    try:
        path.write_text(dumps(saved(found, path), said), encoding="utf-8")
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputFault(
            "--save", f'"{path}"', "a place that can be written", f"{reason}."
        ) from error
