"""The standard probe in a medium, by scipy alone: what our own solvers stand beside."""

from functools import cache

import numpy as np
from scipy.integrate import solve_ivp

from midradius.fem.media import medium
from midradius.fem.surface import film

# Alloy 600, Special Metals bulletin values, read; degC, W/(m K), J/(kg K), kg/m3
K_AT = np.array([20.0, 100, 200, 300, 400, 500, 600, 700, 800])
K = np.array([14.9, 15.9, 17.3, 19.0, 20.5, 22.1, 23.9, 25.7, 27.5])
CP_AT = np.array([20.0, 100, 200, 300, 400, 500, 600, 700, 800, 900])
CP = np.array([444.0, 465, 486, 502, 519, 536, 578, 595, 611, 628])
DENSITY = 8470.0
RADIUS = 6.25e-3
N_CELL = 60


@cache
def cooled(name: str, bath_degC: float) -> tuple[np.ndarray, np.ndarray]:
    """Time [s] and temperature at the centre [degC] of a probe in a medium."""
    curve, _ = film(
        medium(name), bath=bath_degC + 273.15, length=0.0125, geometry="horizontal cylinder"
    )
    edge = np.linspace(0.0, RADIUS, N_CELL + 1)
    middle = 0.5 * (edge[1:] + edge[:-1])
    volume = 0.5 * np.diff(edge**2)
    half = RADIUS - middle[-1]

    def rate(_: float, temp: np.ndarray) -> np.ndarray:
        k = np.interp(temp, K_AT, K)
        flow = np.zeros(N_CELL + 1)
        flow[1:-1] = -edge[1:-1] * 0.5 * (k[1:] + k[:-1]) * np.diff(temp) / np.diff(middle)
        surface = temp[-1]
        for _step in range(3):  # flux through the outer half cell equals that of the film
            htc = float(curve.at(np.array(surface + 273.15)))
            across = k[-1] / half
            surface = (across * temp[-1] + htc * bath_degC) / (across + htc)
        flow[-1] = RADIUS * htc * (surface - bath_degC)
        return -np.diff(flow) / (volume * DENSITY * np.interp(temp, CP_AT, CP))

    end = 90.0
    done = solve_ivp(
        rate,
        (0.0, end),
        np.full(N_CELL, 850.0),
        method="LSODA",
        lband=1,
        uband=1,
        rtol=1e-5,
        atol=1e-3,
        max_step=0.1,
        dense_output=True,
    )
    time = np.linspace(0.0, end, 18_001)
    return time, np.asarray(done.sol(time)[0])


@cache
def probe(name: str, bath_degC: float) -> dict[str, float]:
    time, centre = cooled(name, bath_degC)
    cooling = -np.gradient(centre, time)
    fastest = int(np.argmax(cooling))

    def at(temp: float) -> float:
        return float(np.interp(-temp, -centre, time))

    return {
        "highest cooling rate": float(cooling[fastest]),
        "temperature of highest cooling rate": float(centre[fastest]),
        "cooling rate at 300 degC": float(np.interp(-300.0, -centre, cooling)),
        "time to 600 degC": at(600.0),
        "time to 400 degC": at(400.0),
        "time to 200 degC": at(200.0),
    }
