"""An evaluated probe curve in words, as tables, pictures, document and film file."""

from collections.abc import Iterable, Sequence
from importlib import metadata
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from midradius.fem import inverse, probe
from midradius.fem.filmfile import MEASURED
from midradius.study.chart import SIZE, SMALL, WIDTH_INCH, label
from midradius.study.palette import BLACK, BLUE, GRID, GUIDE, VERMILION
from midradius.study.probejob import ZERO_DEGC, ProbeFound
from midradius.study.sheetfile import write_document, write_picture, write_table
from midradius.study.summary import SCHEMA_VERSION, jsonable
from midradius.thermo.errors import InputFault

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

FILM, CURVE, DOCUMENT = "film.csv", "probe.csv", "probe.json"
CURVE_PICTURE, FILM_PICTURE = "probe.png", "film.png"
CAUTIONS = (
    "A probe at 850 degC in oil can set it alight: small sample, lid and extinguisher at hand,"
    " no water in the oil; steam and splash from water and brine.",
    "A calculation decides nothing about safety: local codes and licensed practice rule.",
)


def head(found: ProbeFound) -> list[str]:
    """The probe, its quantities, the film and the residuals."""
    s, q = found.setting, found.quantities
    round_text = f"{s.metal.name}, round of {1e3 * s.diameter:.4g} mm"
    place = f"thermocouple {1e3 * s.depth:.4g} mm deep"
    kind = "the standard probe" if s.standard else round_text
    rate = "-" if q.rate_300 is None else f"{q.rate_300:.3g} K/s"
    times = ", ".join(
        f"{degc:.0f} degC {'-' if time is None else f'{time:.2f} s'}"
        for degc, time in q.times.items()
    )
    peak = int(np.argmax(found.film.htc))
    return [
        f"Cooling curve {found.curve.name}: {kind}, {place}, bath {s.bath - ZERO_DEGC:.4g} degC",
        f"{len(found.curve.time)} readings over {found.curve.time[-1]:.4g} s, "
        f"scatter {q.noise:.2g} K",
        "",
        f"highest cooling rate  {q.highest_rate:.1f} K/s at {q.highest_rate_temp - ZERO_DEGC:.0f} "
        "degC",
        f"rate at 300 degC      {rate}",
        f"times to              {times}",
        "",
        f"film: {len(found.film.temp)} knots, highest {found.film.htc[peak]:.0f} W/(m2 K) at "
        f"{found.film.temp[peak] - ZERO_DEGC:.0f} degC on the surface; flux at most "
        f"{1e-6 * found.inverted.flux.max():.2f} MW/m2",
        f"put back into the probe: within {found.residual_rms:.2g} K (root mean square), "
        f"{found.residual_max:.2g} K at most; by future steps alone {found.sequential_rms:.2g} K",
    ]


def remarks(found: ProbeFound) -> list[str]:
    """What to know beside the figures."""
    repeats = (
        "for scale: one operator repeats a fast oil within "
        f"{probe.REPEATS['rate']:g} K/s, 13 K and 0.4, 0.5, 1.3 s (two standard deviations, "
        "ASTM D6200)"
    )
    own = [repeats] if found.setting.standard else []
    return [f"- {note}" for note in (*found.notes, *own)]


def document(found: ProbeFound) -> dict[str, Any]:
    """Everything as plain Python for JSON; None where the curve does not get there."""
    s, q = found.setting, found.quantities
    content = {
        "schema_version": SCHEMA_VERSION,
        "curve": found.curve.name,
        "curve_sha256": found.curve.sha256,
        "material": s.metal.name,
        "diameter_mm": 1e3 * s.diameter,
        "depth_mm": 1e3 * s.depth,
        "bath_degC": round(s.bath - ZERO_DEGC, 6),
        "standard_probe": s.standard,
        "n_reading": len(found.curve.time),
        "scatter_K": q.noise,
        "highest_rate_K_per_s": q.highest_rate,
        "highest_rate_at_degC": q.highest_rate_temp - ZERO_DEGC,
        "rate_at_300degC_K_per_s": q.rate_300,
        "times_s": {f"{degc:.0f}degC": time for degc, time in q.times.items()},
        "future_span_s": found.inverted.span,
        "highest_flux_W_per_m2": found.inverted.flux.max(),
        "film": {
            "surface_degC": found.film.temp - ZERO_DEGC,
            "htc_W_per_m2K": found.film.htc,
            "sequential_htc_W_per_m2K": found.sequential.htc,
        },
        "residual_rms_K": found.residual_rms,
        "residual_max_K": found.residual_max,
        "sequential_residual_rms_K": found.sequential_rms,
        "notes": found.notes,
        "cautions": CAUTIONS,
        "sources": [vars(x) for x in (inverse.SOURCE, probe.SOURCE, s.metal.source)],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def film_text(found: ProbeFound) -> str:
    """The film as a file that a case takes, with where it comes from."""
    s = found.setting
    lines = [
        f"{MEASURED}{found.curve.name}, {s.metal.name} round {1e3 * s.diameter:.4g} mm, "
        f"thermocouple {1e3 * s.depth:.4g} mm deep, bath {s.bath - ZERO_DEGC:.4g} degC, "
        f"residual {found.residual_rms:.2g} K",
        f"# Curve sha256 {found.curve.sha256}",
        f"# midradius {metadata.version('midradius')}, future span {found.inverted.span:.3g} s, "
        f"{'sharpened on the whole curve' if s.sharpen else 'not sharpened'}",
        "# The film of this probe in this bath: a heavy part or a packed load has another.",
        "surface_degC, htc_W_per_m2K",
    ]
    rows = zip(found.film.temp - ZERO_DEGC, found.film.htc, strict=True)
    lines += [f"{temp:.2f}, {htc:.1f}" for temp, htc in rows]
    return "\n".join(lines) + "\n"


def save_film(found: ProbeFound, path: Path) -> None:
    """Write the film.

    Raises
    ------
    InputFault
        The place cannot be written.
    """
    try:
        path.write_text(film_text(found), encoding="utf-8")
    except OSError as error:
        allowed, reason = "a place that can be written", error.strerror or str(error)
        raise InputFault("--save", f'"{path}"', allowed, f"{reason}.") from error


def write_sheet(found: ProbeFound, folder: Path) -> None:
    """Write film, table, pictures and document into an existing folder."""
    (folder / FILM).write_text(film_text(found), encoding="utf-8")
    write_table(folder / CURVE, _rows(found))
    write_picture(folder / CURVE_PICTURE, curve_picture(found))
    write_picture(folder / FILM_PICTURE, film_picture(found))
    write_document(folder / DOCUMENT, document(found))


def _rows(found: ProbeFound) -> Iterable[Sequence[object]]:
    yield [
        *("time_s", "read_degC", "computed_degC", "residual_K", "surface_degC"),
        *("smoothed_degC", "cooling_rate_K_per_s", "flux_W_per_m2"),
    ]
    time, q, inv = found.curve.time, found.quantities, found.inverted
    columns = np.column_stack(
        [
            time,
            found.curve.temp - ZERO_DEGC,
            found.forward.sensor - ZERO_DEGC,
            found.forward.sensor - found.curve.temp,
            found.forward.surface - ZERO_DEGC,
            np.interp(time, q.time, q.temp) - ZERO_DEGC,
            np.interp(time, q.time, q.rate),
            np.interp(time, inv.time, inv.flux, left=np.nan, right=np.nan),
        ]
    )
    for row in columns:
        yield [float(value) for value in row]


def curve_picture(found: ProbeFound) -> "Figure":
    """Temperature over time, read and computed, with the residual; temperature over rate."""
    figure, (first, second) = _sheet(found, height=6.4)
    time = found.curve.time
    first.plot(time, found.curve.temp - ZERO_DEGC, color=BLACK, lw=1.8, label="read")
    first.plot(
        *(time, found.forward.sensor - ZERO_DEGC),
        color=VERMILION,
        ls=(0, (5, 2)),
        lw=1.4,
        label="computed with the film",
    )
    first.set_xlabel("time from immersion [s]", fontsize=SIZE)
    first.set_ylabel("thermocouple [degC]", fontsize=SIZE)
    first.legend(fontsize=SMALL, frameon=False)
    q = found.quantities
    second.plot(q.rate, q.temp - ZERO_DEGC, color=BLUE, lw=1.8)
    second.plot([q.highest_rate], [q.highest_rate_temp - ZERO_DEGC], "o", color=BLUE, ms=6)
    second.annotate(
        f"{q.highest_rate:.1f} K/s at {q.highest_rate_temp - ZERO_DEGC:.0f} degC",
        (q.highest_rate, q.highest_rate_temp - ZERO_DEGC),
        xytext=(-14, -4),
        textcoords="offset points",
        ha="right",
        fontsize=SMALL,
    )
    second.set_xlabel("cooling rate [K/s]", fontsize=SIZE)
    second.set_ylabel("thermocouple [degC]", fontsize=SIZE)
    return figure


def film_picture(found: ProbeFound) -> "Figure":
    """The film over surface temperature, and the residual over time."""
    figure, (first, second) = _sheet(found, height=6.4)
    temp = found.film.temp - ZERO_DEGC
    first.plot(temp, found.film.htc, color=BLACK, lw=1.8, marker="o", ms=3.5, label="film")
    if found.setting.sharpen:
        first.plot(
            *(temp, found.sequential.htc),
            color=GUIDE,
            ls=(0, (4, 2)),
            lw=1.2,
            label="by future steps alone",
        )
        first.legend(fontsize=SMALL, frameon=False)
    first.set_xlabel("surface [degC]", fontsize=SIZE)
    first.set_ylabel("film coefficient [W/(m² K)]", fontsize=SIZE)
    first.set_ylim(bottom=0.0)
    gap = found.forward.sensor - found.curve.temp
    second.plot(found.curve.time, gap, color=VERMILION, lw=0.9)
    second.axhline(0.0, color=GUIDE, lw=0.8)
    second.set_xlabel("time from immersion [s]", fontsize=SIZE)
    second.set_ylabel("computed less read [K]", fontsize=SIZE)
    return figure


def _sheet(found: ProbeFound, *, height: float) -> "tuple[Figure, Sequence[Axes]]":
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(WIDTH_INCH, height), layout="constrained", facecolor="white")
    FigureCanvasAgg(figure)
    title = f"{found.curve.name}, bath {found.setting.bath - ZERO_DEGC:.4g} degC"
    figure.suptitle(label(title if len(title) <= 90 else title[:88] + " …"), fontsize=SIZE + 1.5)
    panels = figure.subplots(2, 1)
    for axes in panels:
        axes.grid(color=GRID, lw=0.6)
        axes.set_axisbelow(True)
        axes.tick_params(labelsize=SMALL)
    return figure, panels
