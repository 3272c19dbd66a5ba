"""From ``[temperatures]`` of a case to histories, and from its positions to their nodes."""

from collections.abc import Mapping

import numpy as np

from midradius.fem.histories import Histories
from midradius.fem.section import Place
from midradius.study.case import PositionInput
from midradius.study.casetable import nearest, one_of
from midradius.study.seriescase import (
    LENGTH_UNITS,
    RECORD,
    TABLE,
    TEMPERATURE_UNITS,
    TIME_UNITS,
    GivenInput,
    SeriesCase,
)
from midradius.thermo.errors import InputFault

OFF = 0.02  # of the body's size that a point may lie off its nearest node


def histories(given: GivenInput) -> Histories:
    """Open the file of a case.

    Raises
    ------
    InputFault
        With the key of the case that must change.
    """
    if given.kind == TABLE:
        from midradius.fem.thermocouples import read_thermocouples

        return read_thermocouples(
            given.file,
            time=given.time_column or "",
            places=given.columns,
            time_factor=TIME_UNITS[given.time_unit or "s"],
            to_kelvin=TEMPERATURE_UNITS[given.temperature_unit or "K"],
            decimal_comma=given.decimal == "comma",
        )
    if given.kind == RECORD:
        from midradius.fem.givenrecord import read_given_record

        return read_given_record(given.file)
    from midradius.fem.givenmesh import read_given_mesh

    return read_given_mesh(
        given.file,
        array=given.array or "",
        time_factor=TIME_UNITS[given.time_unit or "s"],
        to_kelvin=TEMPERATURE_UNITS[given.temperature_unit or "K"],
        length_factor=LENGTH_UNITS[given.length_unit or "m"],
    )


def places(case: SeriesCase, given: Histories) -> dict[str, Place]:
    """The node of every place of the case; without any, every named one of the file.

    Raises
    ------
    InputFault
        A name, a node or a point that the file does not have.
    """
    found = {}
    numbers: Mapping[str, int] = {}
    for k, wanted in enumerate(case.outputs.positions):
        found[wanted.name] = _place(wanted, given, f"output.positions[{k}]")
    if not case.outputs.positions:
        numbers = {name: node for node, name in enumerate(given.names)} or given.places
        found = {name: _at(given, node) for name, node in numbers.items()}
    for k, need in enumerate(case.needs):
        if need.position not in found and need.position in case.watched:
            wanted = case.watched[need.position]
            found[need.position] = _place(wanted, given, f"need[{k}].position")
    return found


def _place(wanted: PositionInput, given: Histories, key: str) -> Place:
    if wanted.node is not None:
        if wanted.node < given.n_node:
            return _at(given, wanted.node)
        raise InputFault(
            key, f"node {wanted.node}", f"0 to {given.n_node - 1}", "Nodes count from 0."
        )
    if wanted.coordinates is not None:
        return _nearest(wanted.coordinates, given, key)
    known = {name: node for node, name in enumerate(given.names)} or dict(given.places)
    if wanted.name in known:
        return _at(given, known[wanted.name])
    allowed = f"a place of the file: {one_of(tuple(known))}" if known else "a point with node or at"
    raise InputFault(key, f'"{wanted.name}"', allowed, nearest(wanted.name, tuple(known)))


def _at(given: Histories, node: int) -> Place:
    points = given.points
    where = () if points is None else tuple(float(x) for x in points[node])
    depth = float("nan") if given.depth is None else float(given.depth[node])
    return Place(np.array([node], dtype=np.int64), np.array([1.0]), where, depth)


def _nearest(wanted: tuple[float, ...], given: Histories, key: str) -> Place:
    shown = "(" + ", ".join(f"{1e3 * x:.6g}" for x in wanted) + ") mm"
    if given.points is None:
        raise InputFault(key, shown, "the name of a place", "The file has no coordinates.")
    n_dim = given.points.shape[1]
    point = np.zeros(n_dim)
    if len(wanted) > n_dim or len(wanted) < given.least_dim:
        raise InputFault(key, shown, f"{given.least_dim} to {n_dim} coordinates", "")
    point[: len(wanted)] = wanted
    away = np.linalg.norm(given.points - point, axis=1)
    node = int(np.argmin(away))
    size = float(np.linalg.norm(np.ptp(given.points, axis=0)))
    if away[node] > OFF * size:
        there = ", ".join(f"{1e3 * x:.6g}" for x in given.points[node])
        raise InputFault(
            key,
            shown,
            f"a point of the mesh; its nearest node is {node} at ({there}) mm,"
            f" {1e3 * away[node]:.3g} mm away",
            f"Check the point, its order of axes, and length_unit; or write node = {node}.",
        )
    return _at(given, node)
