"""Exact solutions of heat conduction, by series where no closed form exists.

Forms are ``"slab"`` (half thickness L), ``"cylinder"`` and ``"ball"`` (radius L),
with ``biot = h L / k``, ``fourier = a t / L^2`` and ``place = x / L`` from the
middle. ``theta`` is ``(T - T_ambient) / (T_start - T_ambient)``.

Source
------
Transient series: Carslaw & Jaeger, Conduction of Heat in Solids, 2nd ed. 1959,
ch. III, VII, IX and (semi-infinite) ch. II; Neumann's freezing problem ch. XI
(all remembered; the one-term coefficients are tested against a read table).
The steady and driven cases are separated here in the functions' own comments.
"""

from collections.abc import Callable
from typing import Literal

import numpy as np
from scipy.optimize import brentq
from scipy.special import erf, erfc, erfcx, i0, i1, j0, j1, jn_zeros, k0, k1

from midradius.thermo.arrays import Array

Form = Literal["slab", "cylinder", "ball"]
N_TERM = 200


def roots(form: Form, biot: float, n_term: int = N_TERM) -> Array:
    """Eigenvalues of the film-cooled body, ascending, shape (n_term,)."""
    n = np.arange(n_term)
    gap: Callable[[float], float]
    if form == "slab":
        low, high = n * np.pi, (n + 0.5) * np.pi
        gap = lambda z: z * np.sin(z) - biot * np.cos(z)  # noqa: E731
    elif form == "cylinder":
        low, high = np.concatenate([[0.0], jn_zeros(1, n_term - 1)]), jn_zeros(0, n_term)
        gap = lambda z: z * j1(z) - biot * j0(z)  # noqa: E731
    else:
        low, high = n * np.pi, (n + 1.0) * np.pi
        gap = lambda z: (1.0 - biot) * np.sin(z) - z * np.cos(z)  # noqa: E731
    tiny = 1e-9
    return np.array([brentq(gap, a + tiny, b, xtol=1e-14) for a, b in zip(low, high, strict=True)])


def weights(form: Form, zeta: Array) -> Array:
    """Coefficients of the series for a body that starts at one temperature."""
    if form == "slab":
        return 4.0 * np.sin(zeta) / (2.0 * zeta + np.sin(2.0 * zeta))
    if form == "cylinder":
        return 2.0 * j1(zeta) / (zeta * (j0(zeta) ** 2 + j1(zeta) ** 2))
    return 4.0 * (np.sin(zeta) - zeta * np.cos(zeta)) / (2.0 * zeta - np.sin(2.0 * zeta))


def _shape(form: Form, angle: Array) -> Array:
    if form == "slab":
        return np.cos(angle)
    if form == "cylinder":
        return np.asarray(j0(angle))
    return np.sinc(angle / np.pi)


def theta(form: Form, *, biot: float, fourier: float, place: Array | float) -> Array:
    """Temperature of the film-cooled body at ``place``, any shape."""
    zeta = roots(form, biot)
    at = np.atleast_1d(np.asarray(place, dtype=np.float64))
    terms = weights(form, zeta) * np.exp(-(zeta**2) * fourier)
    return _shape(form, at[..., None] * zeta) @ terms


def released(form: Form, *, biot: float, fourier: float) -> float:
    """Share of the heat above ambient that has left."""
    zeta = roots(form, biot)
    if form == "slab":
        mean = np.sin(zeta) / zeta
    elif form == "cylinder":
        mean = 2.0 * j1(zeta) / zeta
    else:
        mean = 3.0 * (np.sin(zeta) - zeta * np.cos(zeta)) / zeta**3
    return float(1.0 - np.sum(weights(form, zeta) * mean * np.exp(-(zeta**2) * fourier)))


def semi_infinite(depth: Array, *, time: float, htc: float, k: float, diffusivity: float) -> Array:
    """Theta of a half space cooled by a film from its face."""
    length = np.sqrt(diffusivity * time)
    eta = np.asarray(depth) / (2.0 * length)
    step = htc * length / k
    # exp(hx/k + h^2 a t/k^2) erfc(eta + step), free of overflow
    return np.asarray(erf(eta) + np.exp(-(eta**2)) * erfcx(eta + step))


def radiating_bar(*, length: float, k: float, emissivity: float, hot: float, cold: float) -> float:
    """Free-end temperature [K] of a bar held at ``hot`` that radiates to ``cold``."""
    sigma = 5.67e-8
    return float(
        brentq(
            lambda t: k * (hot - t) / length - emissivity * sigma * (t**4 - cold**4),
            cold,
            hot,
            xtol=1e-12,
        )
    )


def driven_bar(
    place: float, time: float, *, length: float, diffusivity: float, swing: float, omega: float
) -> float:
    """Bar from 0, one end at 0, the other (``place = length``) at ``swing sin(omega t)``.

    u = swing sin(wt) x/L + sum b_n(t) sin(n pi x/L), with
    b_n' + p_n b_n = -swing w cos(wt) c_n and x/L = sum c_n sin(n pi x/L).
    """
    n = np.arange(1, 4001)
    c = 2.0 * (-1.0) ** (n + 1) / (n * np.pi)
    p = diffusivity * (n * np.pi / length) ** 2
    swung = p * np.cos(omega * time) + omega * np.sin(omega * time) - p * np.exp(-p * time)
    b = -swing * omega * c * swung / (p**2 + omega**2)
    mode = np.sin(n * np.pi * place / length)
    return float(swing * np.sin(omega * time) * place / length + b @ mode)


def film_cooled_plate(
    x: float, y: float, *, width: float, height: float, k: float, htc: float, base: float
) -> float:
    """Steady plate: ``base`` at y = 0, x = 0 insulated, film to 0 at the other two sides.

    sum C_n cos(z x/a) Y(y), z tan z = h a/k, Y(0) = base, Robin at y = height.
    """
    zeta = roots("slab", htc * width / k, 120)
    m = zeta / width
    coefficient = base * weights("slab", zeta)
    # Y = [m cosh m(b-y) + (h/k) sinh m(b-y)] / [m cosh mb + (h/k) sinh mb]
    ratio = htc / k
    grow, fade = np.exp(-m * y), np.exp(-2.0 * m * (height - y))
    whole = np.exp(-2.0 * m * height)
    profile = grow * ((m + ratio) + (m - ratio) * fade) / ((m + ratio) + (m - ratio) * whole)
    return float(np.sum(coefficient * np.cos(m * x) * profile))


def heated_ring(
    r: float,
    z: float,
    *,
    bore: float,
    outside: float,
    height: float,
    k: float,
    flux: float,
    low: float,
    high: float,
) -> float:
    """Steady ring at 0 on three faces, ``flux`` through the bore for low < z < high.

    sum B_n sin(m z) [I0(m r) K0(m R) - K0(m r) I0(m R)], -k dT/dr = flux at the bore.
    """
    m = np.arange(1, 400) * np.pi / height
    load = 2.0 / height * (np.cos(m * low) - np.cos(m * high)) / m * flux
    m, load = m[m * outside < 600.0], load[m * outside < 600.0]

    def radial(at: float) -> Array:
        return np.asarray(i0(m * at) * k0(m * outside) - k0(m * at) * i0(m * outside))

    steep = m * (i1(m * bore) * k0(m * outside) + k1(m * bore) * i0(m * outside))
    return float(np.sum(load / (-k * steep) * np.sin(m * z) * radial(r)))


def one_phase_lambda(stefan: float) -> float:
    """Front constant of melting or freezing from the transformation temperature."""
    return float(
        brentq(lambda s: np.sqrt(np.pi) * s * np.exp(s**2) * erf(s) - stefan, 1e-9, 5.0, xtol=1e-14)
    )


def neumann_lambda(
    *,
    k_solid: float,
    c_solid: float,
    k_liquid: float,
    c_liquid: float,
    density: float,
    latent: float,
    above: float,
    below: float,
) -> float:
    """Front constant of freezing: front at ``2 lambda sqrt(a_solid t)``.

    ``above`` and ``below``: start above and face below the freezing point [K].
    """
    a_solid = k_solid / (density * c_solid)
    a_liquid = k_liquid / (density * c_liquid)
    nu = np.sqrt(a_solid / a_liquid)

    def gap(s: float) -> float:
        solid = np.exp(-(s**2)) / erf(s)
        liquid = k_liquid / k_solid * nu * above / below * np.exp(-((s * nu) ** 2)) / erfc(s * nu)
        return float(solid - liquid - s * np.sqrt(np.pi) * latent / (c_solid * below))

    return float(brentq(gap, 1e-6, 5.0, xtol=1e-14))
