"""The record of a run of ours, read back as temperatures that are given.

Positions of the record keep their names and stand at the nearest node, whose own depth
is stated. Everything the record says of units and places is taken from it.
"""

import json
import re
from collections.abc import Iterator, Mapping
from pathlib import Path

import numpy as np

from midradius.fem.drawing import Drawing
from midradius.fem.histories import Histories
from midradius.fem.meshraw import SHAPES
from midradius.fem.place import Line
from midradius.fem.record import Record, read_record
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

KELVIN = 273.15


def read_given_record(path: Path) -> Histories:
    """Read the stored fields of ``record.h5``.

    Raises
    ------
    InputFault
        No whole record of ours, or one that holds no fields over time.
    """
    try:
        record = read_record(path)
        points = 1e-3 * record.data["grid/points"].values
        times = record.data["fields/time"].values
        temps = np.ascontiguousarray(record.data["fields/temperature"].values + KELVIN)
        drawing = _drawing(record)
    except InputFault as fault:
        raise InputFault(
            "temperatures.file", f'"{path.name}"', fault.allowed, fault.remedy
        ) from fault
    except KeyError as fault:
        raise InputFault(
            "temperatures.file",
            f'"{path.name}"',
            "a record with fields over time",
            f"It lacks {fault}.",
        ) from fault
    if temps.shape != (len(times), len(points)):
        allowed = f"one temperature for each of {len(times)} times and {len(points)} nodes"
        raise InputFault("temperatures.file", f"shape {temps.shape}", allowed)

    def samples() -> Iterator[Array]:
        return iter(temps)

    line, depth = _line(record), None
    if line.share is None:
        depth = np.full(len(points), np.nan)
        depth[line.node] = line.depth
    return Histories(
        times=times,
        n_node=len(points),
        samples=samples,
        text=f"{path.name}, {record.text.get('section', '')}, {len(times)} samples",
        points=points,
        least_dim=points.shape[1],
        depth=depth,
        places=_places(record, points),
        drawing=drawing,
        line=line,
        sense=record.text.get("sense", "nodes"),
    )


def _drawing(record: Record) -> Drawing:
    found = record.data["view/connectivity"]
    numbers, cells = found.values, []
    for kind, count in re.findall(r"(\w+) x (\d+)", found.long_name):
        tail = re.search(r"\d+$", kind)
        size = int(tail[0]) if tail else SHAPES[kind].n_corner
        used = int(count) * size
        cells.append((kind, numbers[:used].reshape(-1, size)))
        numbers = numbers[used:]
    points = 1e-3 * record.data["view/points"].values
    return Drawing(points, tuple(cells), record.data["view/node"].values)


def _line(record: Record) -> Line:
    depth = record.data["profile/depth"]
    share = record.data.get("profile/share")
    return Line(
        depth=1e-3 * depth.values,
        node=record.data["profile/node"].values,
        label=depth.long_name.removeprefix("depth, "),
        share=None if share is None else share.values,
    )


def _places(record: Record, points: Array) -> Mapping[str, int]:
    found = {}
    for place in json.loads(record.text.get("positions_json", "[]")):
        at = 1e-3 * np.asarray(place["coordinates_mm"], dtype=np.float64)
        if at.shape == points.shape[1:]:
            found[str(place["name"])] = int(np.argmin(np.linalg.norm(points - at, axis=1)))
    return found
