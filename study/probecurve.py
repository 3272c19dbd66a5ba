"""A measured cooling curve of a probe from a CSV file, each fault with its line."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from midradius.study.casefaults import CaseFaults, Fault
from midradius.study.measuredfile import MeasuredFile, one_fault, read_file
from midradius.thermo.arrays import Array

ZERO_DEGC = 273.15
MOST_READINGS, LEAST_READINGS = 200_000, 20
MOST_FAULTS = 20
TIME = ("time_s", "time", "t_s", "s")
# The unit, how a head may name it, and what makes degC of it: less, then times.
UNITS = (
    ("degC", ("temperature_degc", "temp_degc", "degc", "temperature_c"), 0.0, 1.0),
    ("K", ("temperature_k", "temp_k", "k"), ZERO_DEGC, 1.0),
    ("degF", ("temperature_degf", "temp_degf", "degf", "temperature_f"), 32.0, 1.0 / 1.8),
)
TEMPERATURE_DEGC = (-20.0, 1300.0)
REMEDY = "Begin with time_s,temperature_degC (or temperature_K, temperature_degF)."


@dataclass(frozen=True)
class ProbeCurve:
    """Readings ``time`` [s] from immersion and ``temp`` [K], (n,); the file's name and sha256."""

    time: Array
    temp: Array
    name: str
    sha256: str


def read_probe(path: Path, *, immersed: float | None = None) -> ProbeCurve:
    """The readings of a CSV file.

    ``immersed`` is the file's time [s] of immersion; left out, the first reading's.

    Raises
    ------
    CaseFaults
        All that is wrong with the file.
    """
    file = read_file(path, remedy=REMEDY)
    at_time = file.column(TIME)
    columns = [(name, file.column(heads), low, by) for name, heads, low, by in UNITS]
    unit, at_temp, less, factor = next((c for c in columns if c[1] is not None), columns[0])
    if at_time is None or at_temp is None:
        missing = "time_s" if at_time is None else "temperature_degC"
        raise CaseFaults(
            (Fault(file.head_line, f"{missing} column", "", missing, REMEDY, file.shown),)
        )
    low, high = ((end / factor) + less for end in TEMPERATURE_DEGC)
    times, temps = _readings(file, at_time, at_temp, unit, (low, high))
    time, temp = np.array(times), factor * (np.array(temps) - less) + ZERO_DEGC
    start = float(time[0]) if immersed is None else immersed
    kept = time >= start - 1e-9
    if kept.sum() < LEAST_READINGS:
        said = f"{int(kept.sum())} readings from immersion on, at least {LEAST_READINGS} are needed"
        raise one_fault(file.shown, said, "Check the time of immersion and the file.")
    return ProbeCurve(time[kept] - start, temp[kept], file.name, file.sha256)


def _readings(
    file: MeasuredFile, at_time: int, at_temp: int, unit: str, within: tuple[float, float]
) -> tuple[list[float], list[float]]:
    faults: list[Fault] = []
    times: list[float] = []
    temps: list[float] = []
    low, high = within
    for line, row in file.rows:
        cells = [row[k] if k < len(row) else "" for k in (at_time, at_temp)]
        time, temp = file.number(cells[0]), file.number(cells[1])
        if time is None or (times and time <= times[-1]):
            allowed = "a number, later than in the line before"
            faults.append(file.fault(line, "time_s", cells[0], allowed, ""))
        if temp is None or not low <= temp <= high:
            allowed = f"{low:.4g} to {high:.4g} {unit}"
            faults.append(file.fault(line, f"temperature_{unit}", cells[1], allowed, ""))
        if len(faults) >= MOST_FAULTS:
            break
        if time is not None and temp is not None:
            times.append(time)
            temps.append(temp)
    if len(file.rows) > MOST_READINGS:
        value = f"{len(file.rows)} rows, but at most {MOST_READINGS} are read"
        faults.append(
            Fault(None, "", value, "", "Thin it out to 20 readings a second.", file.shown)
        )
    if not faults and len(times) < LEAST_READINGS:
        said = f"{len(times)} readings, at least {LEAST_READINGS} are needed"
        raise one_fault(file.shown, said, REMEDY)
    if faults:
        raise CaseFaults(tuple(faults))
    return times, temps
