"""A film sharpened on the whole curve that it came from.

Model
-----
The coefficients at the knots of a film are moved, by their logarithms, until the forward
march meets all readings in the sense of least squares; second differences along the knots
are held small beside the noise of the readings. It takes back most of what the future
steps of `fem.inverse` have flattened.

Source
------
Whole-curve fit of a film by least squares (common practice); weight of the second
differences: an estimate, checked on made curves.

Holds for
---------
As `fem.inverse`.
"""

import numpy as np

from midradius.fem.inverse import FilmKnots
from midradius.fem.rod import Cooled, Rod, cool_rod
from midradius.thermo.arrays import Array

SMOOTHNESS = 3.0  # of a second difference of ln h of one half, in standard deviations of noise
LEAST_NOISE = 0.3  # K
MOST_TIMES = 1200
COARSE = 4.0  # times the step of the shown march


def sharpened(
    body: Rod, film: FilmKnots, time: Array, sensor: Array, *, bath: float, noise: float
) -> FilmKnots:
    """The film that meets the readings best.

    Parameters
    ----------
    body, film
        The round and the film to start from.
    time, sensor
        Readings [s, K], (n,).
    bath
        Temperature of the bath [K].
    noise
        Standard deviation of one reading [K].
    """
    from scipy.optimize import least_squares

    every = max(1, len(time) // MOST_TIMES)
    at, wanted = time[::every], sensor[::every]
    sigma = max(noise, LEAST_NOISE)
    weight = SMOOTHNESS * np.sqrt(len(at) / len(film.temp))

    def residual(logs: Array) -> Array:
        done = _march(body, film, np.exp(logs), at, float(sensor[0]), bath)
        return np.concatenate([(done.sensor - wanted) / sigma, weight * np.diff(logs, 2)])

    start = np.log(film.htc)
    found = least_squares(residual, start, diff_step=1e-3, xtol=1e-4, ftol=1e-4, max_nfev=12)
    better = found.cost < 0.5 * float(np.sum(residual(start) ** 2))
    return FilmKnots(film.temp, np.exp(found.x) if better else film.htc, film.count)


def _march(
    body: Rod, film: FilmKnots, htc: Array, time: Array, start: float, bath: float
) -> Cooled:
    return cool_rod(
        body,
        start=start,
        bath=bath,
        film_temp=film.temp,
        film_htc=htc,
        time=time,
        coarse=COARSE,
    )
