"""A fitted heat in words, as a table, a picture, a document, a saved calibration."""

from collections.abc import Iterable, Sequence
from importlib import metadata
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.study.calibrate import Fitted
from midradius.study.calibratepoints import (
    POINTS_PICTURE,
    POINTS_TABLE,
    deviation_texts,
    diagram_document,
    point_rows,
    points_picture,
    points_text,
)
from midradius.study.calibrationfile import (
    KEYS,
    WORDS,
    CalibratedSoak,
    HeatCalibration,
    dumps,
    shown,
)
from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label
from midradius.study.curvefit import HIGHEST_HRC, LOWEST_HRC, CurveFit
from midradius.study.measuredcurve import SIXTEENTH_MM
from midradius.study.palette import BLACK, GRID, GUIDE, PURPLE
from midradius.study.sheetfile import write_document, write_picture, write_table
from midradius.study.summary import SCHEMA_VERSION, jsonable
from midradius.thermo.calibration import SOURCE
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from matplotlib.figure import Figure

TABLE, PICTURE, DOCUMENT = "calibration.csv", "calibration.png", "calibration.json"
ZERO_DEGC = 273.15


def head(found: Fitted) -> list[str]:
    """The steel, the measurements, the shifts, how much nearer they bring the heat."""
    names = " and ".join(name for name, _ in found.files)
    said = []
    if found.curve is not None:
        said.append(f"{int(found.curve.used.sum())} points, scatter {found.curve.scatter:g} HRC")
    said += [points_text(drawn) for drawn in found.diagrams]
    lines = [
        f"Calibration of {found.steel.name} to {names}",
        f"{'; '.join(said)}; austenitised at "
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
    return [*lines, *(f"Root mean square deviation: {text}" for text in deviations(found))]


def deviations(found: Fitted) -> list[str]:
    """Before and after, of every measurement in its own unit."""
    lines = []
    if found.curve is not None:
        before, after = found.curve.root_mean_square
        lines.append(f"{before:.2f} HRC before, {after:.2f} after")
    for drawn in found.diagrams:
        lines += deviation_texts(drawn)
    return lines


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
    content = {
        "schema_version": SCHEMA_VERSION,
        "grade": found.steel.name,
        "composition_pct": {k: v for k, v in vars(found.steel.composition).items() if v},
        "austenitize_degC": round(found.austenitize - ZERO_DEGC, 6),
        "soak_time_s": found.time,
        "grain_astm": found.grain_astm,
        "measured": ", ".join(name for name, _ in found.files),
        "measured_sha256": ", ".join(digest for _, digest in found.files),
        "kinetics": found.kinetics,
        "shifts": {key: getattr(found.fit.shifts, item[0]) for key, item in KEYS.items()},
        "standard_errors": dict(zip(KEYS, found.fit.error, strict=True)),
        "held": found.fit.held,
        "rivals": [vars(other) for other in found.fit.rivals],
        **_curve_document(found.curve),
        "diagrams": [diagram_document(drawn) for drawn in found.diagrams],
        "notes": found.notes,
        "sources": [vars(SOURCE)],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def _curve_document(curve: CurveFit | None) -> dict[str, object]:
    if curve is None:
        return {}
    before, after = curve.root_mean_square
    return {
        "scatter_hrc": curve.scatter,
        "rms_before_hrc": before,
        "rms_after_hrc": after,
        "distance_mm": curve.measured.distance_mm,
        "measured_hrc": curve.measured.hardness_hrc,
        "used": [bool(used) for used in curve.used],
        "before_hrc": curve.before_hrc,
        "after_hrc": curve.after_hrc,
    }


def write_sheet(found: Fitted, folder: Path) -> None:
    """Write tables, pictures and the document into an existing folder."""
    if found.curve is not None:
        write_table(folder / TABLE, _rows(found.curve))
        write_picture(folder / PICTURE, picture(found, found.curve))
    if found.diagrams:
        write_table(folder / POINTS_TABLE, point_rows(found.diagrams))
        write_picture(folder / POINTS_PICTURE, points_picture(found.steel.name, found.diagrams))
    write_document(folder / DOCUMENT, document(found))


def _rows(curve: CurveFit) -> Iterable[Sequence[object]]:
    yield [
        *("distance_mm", "distance_sixteenths_in", "measured_HRC", "used_in_fit"),
        *("before_HRC", "after_HRC"),
    ]
    for k, z in enumerate(curve.measured.distance_mm):
        measured, used = float(curve.measured.hardness_hrc[k]), int(curve.used[k])
        computed = float(curve.before_hrc[k]), float(curve.after_hrc[k])
        yield [float(z), float(z / SIXTEENTH_MM), measured, used, *computed]


def picture(found: Fitted, curve: CurveFit) -> "Figure":
    """The measured points between the computed curves before and after."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH_INCH, 4.6), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots()
    title = f"{found.steel.name}, calibrated to {curve.measured.name}"
    figure.suptitle(label(title if len(title) <= 90 else title[:88] + " …"), fontsize=SIZE + 1.5)
    axes.grid(color=GRID, lw=0.6)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=SMALL)
    before, after = curve.root_mean_square
    axes.plot(
        *(curve.chart_mm, curve.chart_before_hrc),
        color=PURPLE,
        ls=(0, (5, 2)),
        lw=1.6,
        label=f"computed before (rms {before:.1f} HRC)",
    )
    axes.plot(
        *(curve.chart_mm, curve.chart_after_hrc),
        color=BLACK,
        lw=1.8,
        label=f"computed after (rms {after:.1f} HRC)",
    )
    used = curve.used
    axes.errorbar(
        *(curve.measured.distance_mm[used], curve.measured.hardness_hrc[used]),
        yerr=curve.scatter,
        fmt="o",
        ms=5,
        color=BLACK,
        mfc="white",
        elinewidth=0.9,
        label=f"measured, ±{curve.scatter:g} HRC",
        zorder=3,
    )
    if not used.all():
        axes.plot(
            *(curve.measured.distance_mm[~used], curve.measured.hardness_hrc[~used]),
            "x",
            ms=5,
            color=GUIDE,
            label=f"below {LOWEST_HRC:g} HRC, left out",
        )
    lowest = min(LOWEST_HRC, float(curve.measured.hardness_hrc.min()))
    axes.set_ylim(lowest - 2.0, HIGHEST_HRC)
    axes.set_xlim(0.0, float(curve.chart_mm[-1]) * 1.02)
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
        measured=", ".join(name for name, _ in found.files),
        measured_sha256=", ".join(digest for _, digest in found.files),
        program=f"midradius {metadata.version('midradius')}",
        soak=CalibratedSoak(
            found.austenitize - ZERO_DEGC, found.time, found.grain_left_astm, found.carbon_pct
        ),
        kinetics=found.kinetics,
    )


def save_file(found: Fitted, path: Path) -> None:
    """Write the calibration.

    Raises
    ------
    InputFault
        The place cannot be written.
    """
    grain = "as the soak leaves it" if found.grain_astm is None else f"ASTM {found.grain_astm:g}"
    said = (
        f"{len(found.fit.measured)} points, austenitised at "
        f"{found.austenitize - ZERO_DEGC:.4g} degC for {found.time / 60.0:.4g} min, grain {grain}",
        *(f"root mean square deviation {text}" for text in deviations(found)),
        *(f"held: {reason}" for reason in found.fit.held),
    )
    try:
        path.write_text(dumps(saved(found, path), said), encoding="utf-8")
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputFault(
            "--save", f'"{path}"', "a place that can be written", f"{reason}."
        ) from error
