"""A field chosen freely, and the source and ambient that make it a solution."""

from dataclasses import dataclass

import numpy as np
from trial import Stuff, varying

from midradius.thermo.arrays import Array


@dataclass(frozen=True)
class Manufactured:
    """``T = level + swing e^(-t/tau) X(x) Y(y)`` in a material that varies with T.

    ``k = k0 (1 + b T)``, heat capacity per volume ``c0 (1 + d T)``; every length
    ``L`` of a plane direction carries ``cos(pi x / 2L)``; the radial direction of
    a cylinder or ball the same, with the divergence of its own coordinates.
    """

    lengths: tuple[float, ...]
    power: int  # 0 plane, 1 the first direction is a radius, 2 of a ball
    level: float = 300.0
    swing: float = 500.0
    tau: float = 10.0
    k0: float = 20.0
    b: float = 5e-4
    c0: float = 4.5e6
    d: float = 4e-4
    htc: float = 2000.0
    density: float = 7850.0

    def stuff(self, step: float) -> Stuff:
        """The material, with tables read every ``step`` [K]."""
        return varying(
            lambda t: self.k0 * (1.0 + self.b * t),
            lambda t: self.c0 * (t + 0.5 * self.d * t**2) / self.density,
            density=self.density,
            first=280.0,
            last=820.0,
            step=step,
        )

    def temp(self, points: Array, time: float) -> Array:
        """The field at ``points`` (n, dim), shape (n,)."""
        shape = np.prod([np.cos(self._angle(points, i)) for i in self._dims], axis=0)
        return np.asarray(self.level + self.swing * np.exp(-time / self.tau) * shape)

    @property
    def _dims(self) -> range:
        return range(len(self.lengths))

    def _angle(self, points: Array, i: int) -> Array:
        return np.asarray(0.5 * np.pi * points[:, i] / self.lengths[i])

    def slope(self, points: Array, time: float, i: int) -> Array:
        """dT/dx_i, shape (n,)."""
        others = [np.cos(self._angle(points, j)) for j in self._dims if j != i]
        wave = -0.5 * np.pi / self.lengths[i] * np.sin(self._angle(points, i))
        fading = self.swing * np.exp(-time / self.tau)
        return np.asarray(fading * wave * np.prod([np.ones(len(points)), *others], axis=0))

    def source(self, points: Array, time: float) -> Array:
        """c dT/dt - div(k grad T) [W/m3], shape (n,)."""
        temp = self.temp(points, time)
        above = temp - self.level
        k = self.k0 * (1.0 + self.b * temp)
        out = -self.c0 * (1.0 + self.d * temp) * above / self.tau
        for i in self._dims:
            along = self.slope(points, time, i)
            bend = -((0.5 * np.pi / self.lengths[i]) ** 2) * above
            if i == 0 and self.power > 0:
                r = points[:, 0]
                # at the axis dT/dr / r tends to the second derivative
                bend = bend + self.power * np.where(r > 0.0, along / np.maximum(r, 1e-30), bend)
            out = out - k * bend - self.k0 * self.b * along**2
        return np.asarray(out)

    def ambient(self, points: Array, time: float, i: int) -> Array:
        """What a film of ``htc`` must see where the outward normal is +x_i."""
        temp = self.temp(points, time)
        return np.asarray(
            temp + self.k0 * (1.0 + self.b * temp) * self.slope(points, time, i) / self.htc
        )
