"""What a cooling curve of a probe says by itself: rates and times.

Model
-----
Readings are put on even moments and smoothed by local parabolas over a window of 0.6 s in the
standard probe (in proportion to the span of the future in others); the rate is the slope
of the parabola. Times count from immersion to the first reading below.

Source
------
Quantities reported: ISO 9950, ASTM D6200 (remembered): highest cooling rate and its
temperature, rate at 300 degC, times to 600, 400 and 200 degC. How to differentiate the
standards leave open; the window is an estimate: the highest rate comes out 1 % low, and
0.5 K of noise at 20 readings a second moves it by 0.7 K/s.

Holds for
---------
At least 8 readings a second in the standard probe; cooling from above 600 degC.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault
from midradius.thermo.source import Source

SOURCE = Source("quantities of a probe curve", "ISO 9950, ASTM D6200", "reported", "remembered")
ZERO_DEGC = 273.15
DIAMETER, LENGTH, START_DEGC = 12.5e-3, 60e-3, 850.0  # the standard probe
WINDOW = 0.6  # s in the standard probe
WINDOW_PER_SPAN = 0.7  # of the future of `fem.inverse`: the same there
LEAST_POINTS = 5
RATE_AT_DEGC = 300.0
TIMES_TO_DEGC = (600.0, 400.0, 200.0)
# One laboratory, one operator, a fast oil (ASTM D6200 precision, read): twice the standard
# deviation of highest rate [K/s], its temperature [K], times to 600, 400 and 200 degC [s].
REPEATS = {"rate": 2.1, "temperature": 12.7, "times": (0.4, 0.5, 1.3)}
REPEATS_RATE_300_PCT = 8.7


@dataclass(frozen=True)
class ProbeQuantities:
    """``highest_rate`` [K/s] at ``highest_rate_temp`` [K]; ``rate_300`` [K/s]; ``times`` [s] by
    temperature [degC]; None where the curve does not get there. ``noise`` [K] is the scatter of
    the readings about the parabolas; ``time``, ``temp`` and ``rate`` (n,) are smoothed."""

    highest_rate: float
    highest_rate_temp: float
    rate_300: float | None
    times: Mapping[float, float | None]
    noise: float
    time: Array
    temp: Array
    rate: Array


def quantities(time: Array, temp: Array, *, window: float = WINDOW) -> ProbeQuantities:
    """Rates and times of a curve.

    Parameters
    ----------
    time, temp
        Readings [s, K], (n,), times rising from immersion.
    window
        Of the local parabolas [s].

    Raises
    ------
    InputFault
        Too few readings for the window.
    """
    from scipy.signal import savgol_filter

    gap = float(np.median(np.diff(time)))
    count = max(int(round(window / gap)) | 1, LEAST_POINTS)
    if gap * (LEAST_POINTS - 1) > 1.5 * window or len(time) < 3 * count:
        raise InputFault(
            "readings",
            f"{len(time)}, every {gap:.3g} s",
            f"every {1.5 * window / (LEAST_POINTS - 1):.2g} s or closer, over several seconds",
            "Read the thermocouple more often.",
        )
    even = np.arange(time[0], time[-1] + 1e-9 * gap, gap)
    plain = np.interp(even, time, temp)
    smooth = savgol_filter(plain, count, 2)
    rate = -savgol_filter(plain, count, 2, deriv=1, delta=gap)
    fastest = int(np.argmax(rate))
    # a parabola through n readings leaves n - 3 of them to scatter
    left = plain - smooth
    share = 1.0 - savgol_filter(np.eye(1, count, count // 2)[0], count, 2)[count // 2]
    noise = float(np.median(np.abs(left)) / 0.6745 / np.sqrt(share))
    return ProbeQuantities(
        highest_rate=float(rate[fastest]),
        highest_rate_temp=float(smooth[fastest]),
        rate_300=_at(smooth, rate, RATE_AT_DEGC + ZERO_DEGC),
        times={degc: _at(smooth, even - time[0], degc + ZERO_DEGC) for degc in TIMES_TO_DEGC},
        noise=noise,
        time=even,
        temp=smooth,
        rate=rate,
    )


def _at(temp: Array, values: Array, level: float) -> float | None:
    """``values`` where the curve first falls through ``level``; None if it never does."""
    below = np.flatnonzero(temp <= level)
    if not below.size or below[0] == 0:
        return None
    i = int(below[0])
    share = (temp[i - 1] - level) / (temp[i - 1] - temp[i])
    return float(values[i - 1] + share * (values[i] - values[i - 1]))
