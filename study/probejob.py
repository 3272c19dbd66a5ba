"""From a probe's cooling curve to its quantities and the film of its bath.

Model
-----
`fem.probe`, `fem.inverse`, `fem.filmfit`; the film is then put back into the forward march and
what is left between the two curves is the residual.

Source
------
As those.

Holds for
---------
A curve that starts hot throughout and was not heated again. Readings before the first fall
of the curve are taken as the start temperature.
"""

from dataclasses import dataclass

import numpy as np

from midradius.fem.filmfit import sharpened
from midradius.fem.inverse import (
    PEAK_BIAS_PCT,
    SHORTEST_SPAN,
    FilmKnots,
    Inverted,
    default_span,
    film_of,
    invert,
)
from midradius.fem.probe import DIAMETER, START_DEGC, WINDOW_PER_SPAN, ProbeQuantities, quantities
from midradius.fem.probemetal import ProbeMetal
from midradius.fem.rod import Cooled, cool_rod, rod
from midradius.study.probecurve import ProbeCurve
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

ZERO_DEGC = 273.15
DIFFUSIVITY_AT = 400.0 + ZERO_DEGC
LEAST_START_DEGC = 200.0
BELOW_BATH = 3.0  # K that a curve may end below its bath: what a thermocouple is off
POOR, FAR = 3.0, 10.0  # times the scatter: residual of the whole, gap of one reading
POOR_LEAST, FAR_LEAST = 1.0, 5.0  # K


@dataclass(frozen=True)
class ProbeSetting:
    """The round that was measured [m], its metal, the bath [K] and the span of the future [s],
    None for the default."""

    metal: ProbeMetal
    diameter: float
    depth: float
    bath: float
    span: float | None = None
    sharpen: bool = True

    @property
    def standard(self) -> bool:
        """Whether it is the probe of ISO 9950 and ASTM D6200."""
        return (
            self.metal.name == "alloy 600"
            and abs(self.diameter - DIAMETER) < 1e-5
            and abs(self.depth - 0.5 * DIAMETER) < 1e-5
        )


@dataclass(frozen=True)
class ProbeFound:
    """``film`` is what is saved; ``sequential`` what the future steps gave. ``forward`` is the
    march under the film at the readings' times; its residual [K] is computed less read, root mean
    square and the largest."""

    curve: ProbeCurve
    setting: ProbeSetting
    quantities: ProbeQuantities
    inverted: Inverted
    sequential: FilmKnots
    film: FilmKnots
    forward: Cooled
    residual_rms: float
    residual_max: float
    sequential_rms: float
    notes: tuple[str, ...]


def probed(curve: ProbeCurve, setting: ProbeSetting) -> ProbeFound:
    """Evaluate a curve.

    Raises
    ------
    InputFault
        A start too cold, readings too far apart, a bath that is not colder.
    """
    if setting.bath > curve.temp[0] - LEAST_START_DEGC:
        raise InputFault(
            "--bath",
            f"{setting.bath - ZERO_DEGC:.4g} degC",
            f"at least {LEAST_START_DEGC:g} K below the start of the curve, "
            f"{curve.temp[0] - ZERO_DEGC:.4g} degC",
        )
    body = rod(setting.metal, diameter=setting.diameter, sensor_depth=setting.depth)
    usual = default_span(setting.metal.diffusivity(DIFFUSIVITY_AT), setting.depth)
    span = usual if setting.span is None else setting.span
    found = quantities(curve.time, curve.temp, window=WINDOW_PER_SPAN * usual)
    coldest = float(found.temp.min())
    if setting.bath > coldest + BELOW_BATH:
        raise InputFault(
            "--bath",
            f"{setting.bath - ZERO_DEGC:.4g} degC",
            f"at most {coldest - ZERO_DEGC:.4g} degC, the coldest of the curve",
            "Nothing cools below its bath: give that of the measurement.",
        )
    inverted = invert(body, curve.time, curve.temp, span=span)
    sequential = film_of(inverted, bath=setting.bath)
    film = sequential
    if setting.sharpen:
        film = sharpened(
            body, sequential, curve.time, curve.temp, bath=setting.bath, noise=found.noise
        )
    marches = [
        cool_rod(
            body,
            start=float(curve.temp[0]),
            bath=setting.bath,
            film_temp=each.temp,
            film_htc=each.htc,
            time=curve.time,
        )
        for each in (film, sequential)
    ]
    gap, rough = (march.sensor - curve.temp for march in marches)
    return ProbeFound(
        curve=curve,
        setting=setting,
        quantities=found,
        inverted=inverted,
        sequential=sequential,
        film=film,
        forward=marches[0],
        residual_rms=float(np.sqrt(np.mean(gap**2))),
        residual_max=float(np.abs(gap).max()),
        sequential_rms=float(np.sqrt(np.mean(rough**2))),
        notes=(
            *_unexplained(curve, gap, found.noise),
            *_notes(curve, setting, span, usual, inverted),
        ),
    )


def _unexplained(curve: ProbeCurve, gap: Array, noise: float) -> list[str]:
    """What of the curve no film explains; ``gap`` (n,) [K] computed less read."""
    notes = []
    far = np.flatnonzero(np.abs(gap) > max(FAR * noise, FAR_LEAST))
    rms = float(np.sqrt(np.mean(gap**2)))
    if far.size:
        notes.append(
            f"{far.size} reading(s) lie more than {max(FAR * noise, FAR_LEAST):.2g} K off the"
            f" curve of the film, the first at {curve.time[far[0]]:.4g} s: look at them"
        )
    if rms > max(POOR * noise, POOR_LEAST):
        notes.append(
            f"THE FILM DOES NOT EXPLAIN THE CURVE: {rms:.2g} K are left (root mean square), the"
            f" scatter is {noise:.2g} K; check bath, metal, depth and the readings before its use"
        )
    return notes


def _notes(
    curve: ProbeCurve, setting: ProbeSetting, span: float, usual: float, inverted: Inverted
) -> tuple[str, ...]:
    low, high = PEAK_BIAS_PCT
    notes = [
        f"the future steps span {span:.2g} s: they flatten the peak of the flux by about "
        f"{-high:.0f} to {-low:.0f} % at 0.5 K noise"
        + ("; the sharpened film takes most of it back" if setting.sharpen else "")
    ]
    if span < SHORTEST_SPAN * usual:
        notes.append(f"a span below {SHORTEST_SPAN * usual:.2g} s follows the noise")
    if setting.standard and abs(curve.temp[0] - ZERO_DEGC - START_DEGC) > 5.0:
        start = curve.temp[0] - ZERO_DEGC
        notes.append(f"the curve starts at {start:.0f} degC, the standards at {START_DEGC:.0f}")
    coldest = float(inverted.surface.min()) - ZERO_DEGC
    notes.append(
        f"below {coldest:.0f} degC on the surface nothing was measured: the last value is held"
    )
    if setting.depth >= 0.25 * setting.diameter:
        notes.append(
            "a thermocouple near the axis gives an effective film, a mean over length and rewetting"
        )
    notes.append(
        "the film is that of this probe in this bath, temperature and flow: a heavy part, another "
        "surface or a packed load has another"
    )
    return tuple(notes)
