"""The film from a thermocouple curve: sequential function specification with future times.

Model
-----
At each step the outward flux is held over ``r`` future steps and corrected so that the
computed curve meets the measured one there in the sense of least squares:
``q <- q + sum(dT_j X_j) / sum(X_j^2)`` with the sensitivity ``X_j`` of the thermocouple to a
unit flux held for ``j`` steps; twice, since conductivity and heat capacity follow the
temperature. The span of the future is the only regularisation: longer is smoother and
flattens the peak. Coefficients are flux over surface less bath, summed over bins of surface
temperature.

Source
------
Beck, Blackwell & St Clair, Inverse Heat Conduction (1985), function specification, constant
flux over future times (remembered). Span of a tenth of depth squared over diffusivity (0.8 to
1.0 s in the standard probe): numerical experiment with 0.5 K noise (computed), peak flux 4 to
13 % low.

Holds for
---------
A round that does not transform, one film all round, readings without lag of the thermocouple.
A curve from the middle of the standard probe gives an effective film, an average over length
and rewetting (Kobasko, read).
"""

from dataclasses import dataclass

import numpy as np

from midradius.fem.rod import Rod, read, sensitivity, step
from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

SOURCE = Source(
    "film from a thermocouple curve",
    "Beck, Blackwell & St Clair, Inverse Heat Conduction (1985)",
    "function specification, future times",
    "remembered",
)
SPAN_FOURIER = 0.1  # of the future: diffusivity times span over depth squared
N_FUTURE = 17
SUBSTEPS = 4
PEAK_BIAS_PCT = (-13.0, -4.0)  # of the peak flux, at 0.5 K noise
SHORTEST_SPAN = 0.4 / 0.85  # of the default; below it the noise rules
BIN_K = 25.0
LEAST_ABOVE_BATH = 15.0  # K; nearer the bath flux over difference is noise over noise


@dataclass(frozen=True)
class Inverted:
    """Outward ``flux`` [W/m2], ``surface`` and thermocouple temperature [K] at ``time`` [s],
    (n_step,) each; ``span`` [s] of the future and its ``step`` [s]."""

    time: Array
    flux: Array
    surface: Array
    sensor: Array
    span: float
    step: float


@dataclass(frozen=True)
class FilmKnots:
    """The film: rising surface ``temp`` [K], ``htc`` [W/(m2 K)], and how many steps each mean
    holds, (n_knot,)."""

    temp: Array
    htc: Array
    count: Array


def default_span(diffusivity: float, depth: float) -> float:
    """The span of the future [s] for a thermocouple ``depth`` [m] below the surface."""
    return SPAN_FOURIER * depth**2 / diffusivity


def invert(body: Rod, time: Array, sensor: Array, *, span: float) -> Inverted:
    """Surface flux of a measured curve.

    Parameters
    ----------
    body
        The round with its thermocouple.
    time, sensor
        Readings [s, K], (n,); times rise from the start of cooling, where the whole round
        has the first temperature.
    span
        Of the future [s].

    Raises
    ------
    InputFault
        Readings too few or too far apart for the span.
    """
    gap = float(np.median(np.diff(time)))
    if gap > span / 3.0:
        raise InputFault(
            "readings",
            f"every {gap:.3g} s",
            f"every {span / 3.0:.2g} s or closer for a span of {span:.2g} s",
            "Read the thermocouple more often, or lengthen the span of the future.",
        )
    stride = span / N_FUTURE
    even = np.arange(time[0], time[-1] + 1e-9 * stride, stride)
    if len(even) < 3 * N_FUTURE:
        raise InputFault(
            "readings", f"{time[-1] - time[0]:.3g} s long", f"at least {3.0 * span:.3g} s", ""
        )
    wanted = _resampled(time, sensor, even, stride)
    flux, surface, computed = _sequential(body, wanted, stride, N_FUTURE, SUBSTEPS)
    n = len(flux)
    return Inverted(even[1 : n + 1], flux, surface, computed, span, stride)


def film_of(found: Inverted, *, bath: float) -> FilmKnots:
    """The film of a flux above a ``bath`` [K], by bins of surface temperature.

    Raises
    ------
    InputFault
        The surface never was far enough above the bath.
    """
    over = found.surface - bath
    bins = np.floor(found.surface / BIN_K)
    temps, values, counts = [], [], []
    for each in np.unique(bins):
        here = (bins == each) & (over >= LEAST_ABOVE_BATH)
        if here.any():
            temps.append(float(found.surface[here].mean()))
            values.append(max(float(found.flux[here].sum() / over[here].sum()), 1.0))
            counts.append(float(here.sum()))
    if len(temps) < 2:
        raise InputFault(
            "bath",
            f"{bath - 273.15:.4g} degC",
            "well below the curve",
            "Give the bath temperature of the measurement.",
        )
    return FilmKnots(np.array(temps), np.array(values), np.array(counts))


def _resampled(time: Array, sensor: Array, even: Array, stride: float) -> Array:
    """Readings at even times: means of those within half a stride, else between two."""
    between = np.interp(even, time, sensor)
    at = np.rint((time - even[0]) / stride).astype(np.int64)
    inside = (at > 0) & (at < len(even))
    count = np.bincount(at[inside], minlength=len(even))
    # each reading moved along the curve to its even moment, so that a mean has no lag
    slope = np.gradient(between, even)
    moved = sensor[inside] - slope[at[inside]] * (time[inside] - even[at[inside]])
    total = np.bincount(at[inside], weights=moved, minlength=len(even))
    return np.where(count > 1, total / np.maximum(count, 1), between)


@kernel
def _sequential(
    body: Rod, wanted: Array, stride: float, n_future: int, substeps: int
) -> tuple[Array, Array, Array]:
    n = len(body.radius)
    n_step = len(wanted) - n_future
    flux = np.zeros(n_step)
    surface = np.zeros(n_step)
    sensor = np.zeros(n_step)
    here = np.full(n, wanted[0])
    work = np.zeros((4, n))
    q = 0.0
    span = stride / substeps
    for m in range(n_step):
        for _ in range(2):
            before = here.copy()
            after = here.copy()
            slope = np.zeros(n)
            above = 0.0
            below = 0.0
            for j in range(n_future):
                for _sub in range(substeps):
                    step(body, before, after, work, span, q, 0.0, 0.0)
                    sensitivity(body, work, slope)
                    last = before
                    before = after
                    after = last
                    for i in range(n):
                        after[i] = before[i]
                x = read(body, slope)
                above += (wanted[m + 1 + j] - read(body, before)) * x
                below += x * x
            q += above / below
        before = here.copy()
        after = here.copy()
        for _sub in range(substeps):
            step(body, before, after, work, span, q, 0.0, 0.0)
            last = before
            before = after
            after = last
            for i in range(n):
                after[i] = before[i]
        here = before.copy()
        flux[m] = q
        surface[m] = here[n - 1]
        sensor[m] = read(body, here)
    return flux, surface, sensor
