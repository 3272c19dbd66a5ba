"""Joins the parts of an .inp deck into one mesh: numbers, sets, surfaces.

A deck may number the nodes of every instance anew; here all of them follow one
after the other, and each set and surface finds its members again.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from midradius.fem.meshraw import SHAPES, Group, RawMesh, facet_table, family, refuse
from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.errors import InputFault


@dataclass
class Space:
    """The nodes and elements of a part, an instance, or of a deck without parts."""

    nodes: list[tuple[IntArray, Array]] = field(default_factory=list)
    elements: list[tuple[str, IntArray, IntArray]] = field(default_factory=list)
    node_sets: dict[str, list[IntArray]] = field(default_factory=dict)
    element_sets: dict[str, list[IntArray]] = field(default_factory=dict)
    surfaces: dict[str, list[tuple[str, str]]] = field(default_factory=dict)


@dataclass(frozen=True)
class Placed:
    """A space with its name, turned by ``turn`` (3, 3) and then moved by ``shift`` (3,)."""

    title: str
    space: Space
    turn: Array
    shift: Array


@dataclass(frozen=True)
class OfInstance:
    """A set of the assembly that names members of one instance."""

    word: str
    key: str
    instance: str
    members: list[IntArray]


def joined(
    spaces: list[Placed],
    *,
    assembly: Space,
    of_instances: list[OfInstance],
    notes: list[str],
    name: str,
) -> RawMesh:
    """Number the nodes and elements of all spaces one after the other."""
    points, ids, cells, cell_ids = [], [], [], []
    order: list[tuple[str, IntArray, int]] = []
    groups: dict[str, Group] = {}
    n_point = n_cell = 0
    where_node: dict[str, tuple[IntArray, IntArray]] = {}
    where_cell: dict[str, tuple[IntArray, IntArray]] = {}
    for placed in spaces:
        title, space = placed.title, placed.space
        own = np.concatenate([node_ids for node_ids, _ in space.nodes])
        xyz = np.concatenate([p for _, p in space.nodes]) @ placed.turn.T + placed.shift
        # a node that is given twice has the place that was given last
        own, last = np.unique(own[::-1], return_index=True)
        keep = np.sort(len(xyz) - 1 - last)
        given = np.concatenate([node_ids for node_ids, _ in space.nodes])[keep]
        sorter = np.argsort(given)
        where_node[title] = (given[sorter], sorter + n_point)
        points.append(xyz[keep])
        ids.append(given)
        numbers, index = [], []
        for kind, element_ids, nodes in space.elements:
            block = _look_up(where_node[title], nodes, name, "node")
            order.append((kind, block, n_cell))
            cells.append((kind, block))
            cell_ids.append(element_ids)
            numbers.append(element_ids)
            index.append(np.arange(n_cell, n_cell + len(block)))
            n_cell += len(block)
        all_ids = np.concatenate([*numbers, np.empty(0, np.int64)]).astype(np.int64)
        all_index = np.concatenate([*index, np.empty(0, np.int64)]).astype(np.int64)
        sorter = np.argsort(all_ids, kind="stable")
        where_cell[title] = (all_ids[sorter], all_index[sorter])
        n_point += len(keep)
    maps = _Maps(where_node, where_cell, order, name)
    for placed in spaces:
        maps.add_sets(groups, placed.title, placed.space)
    for of in of_instances:
        maps.add(groups, of.key, of.instance, of.word, of.members)
    for placed in [*spaces, Placed("", assembly, np.eye(3), np.zeros(3))]:
        maps.add_surfaces(groups, placed.title, placed.space)
    if not cells:
        raise refuse(
            name,
            "a deck with *NODE and *ELEMENT",
            "; ".join(notes) or "It holds no elements.",
        )
    return RawMesh(
        points=np.concatenate(points),
        cells=tuple(cells),
        point_ids=np.concatenate(ids),
        cell_ids=np.concatenate(cell_ids),
        point_data={},
        cell_data={},
        groups=groups,
        notes=tuple(notes),
        format="inp",
    )


def _look_up(known: tuple[IntArray, IntArray], wanted: IntArray, name: str, what: str) -> IntArray:
    ids, index = known
    at = np.minimum(np.searchsorted(ids, wanted), max(len(ids) - 1, 0))
    missing = wanted[ids[at] != wanted] if len(ids) else wanted
    if missing.size:
        raise refuse(
            name,
            f"a deck that holds every {what} it names ({what} {int(missing.flat[0])} is missing)",
            "Export the whole mesh again.",
        )
    return np.asarray(index[at], dtype=np.int64)


@dataclass(frozen=True)
class _Maps:
    """From the deck's numbers to ours, by instance."""

    node: Mapping[str, tuple[IntArray, IntArray]]
    cell: Mapping[str, tuple[IntArray, IntArray]]
    order: list[tuple[str, IntArray, int]]
    name: str

    def add_sets(self, groups: dict[str, Group], title: str, space: Space) -> None:
        for word, sets in (("NSET", space.node_sets), ("ELSET", space.element_sets)):
            for key, members in sets.items():
                self.add(groups, key, title, word, members)

    def add(
        self, groups: dict[str, Group], key: str, title: str, word: str, members: list[IntArray]
    ) -> None:
        known = (self.node if word == "NSET" else self.cell).get(title)
        if known is None or not members:
            return
        numbers = np.unique(np.concatenate(members))
        # a set may name what the reader left out
        numbers = numbers[np.isin(numbers, known[0])]
        index = _look_up(known, numbers, self.name, "node" if word == "NSET" else "element")
        before = groups.get(key, Group())
        if word == "NSET":
            joined = np.union1d(before.points, index)
            groups[key] = Group(joined, before.cells, before.facets)
        else:
            joined = np.union1d(before.cells, index)
            groups[key] = Group(before.points, joined, before.facets)

    def add_surfaces(self, groups: dict[str, Group], title: str, space: Space) -> None:
        for key, rows in space.surfaces.items():
            facets: list[tuple[int, ...]] = []
            points: list[IntArray] = []
            for where, side in rows:
                instance, dot, rest = where.partition(".")
                owner, item = (instance.upper(), rest) if dot else (title, where)
                if side == "NODE":
                    points.append(self._members(groups, item, owner, "NSET"))
                elif re.fullmatch(r"S[1-6]", side):
                    members = self._members(groups, item, owner, "ELSET")
                    facets += self._sides(members, int(side[1]) - 1)
                else:
                    raise InputFault(
                        f"surface {key}",
                        f'"{where}, {side}"',
                        "a set or an element, and a side S1 to S6",
                        "Write the surface by element sides.",
                    )
            before = groups.get(key, Group())
            groups[key] = Group(
                np.unique(np.concatenate([before.points, *points])),
                before.cells,
                np.concatenate([before.facets, facet_table(facets)]),
            )

    def _members(self, groups: Mapping[str, Group], item: str, owner: str, word: str) -> IntArray:
        if item.isdigit():
            known = (self.node if word == "NSET" else self.cell).get(owner)
            if known is None:
                return np.empty(0, dtype=np.int64)
            return _look_up(known, np.array([int(item)]), self.name, "element")
        for key, group in groups.items():
            if key.upper() == item.upper():
                return group.points if word == "NSET" else group.cells
        return np.empty(0, dtype=np.int64)

    def _sides(self, members: IntArray, side: int) -> list[tuple[int, ...]]:
        found: list[tuple[int, ...]] = []
        for kind, block, first in self.order:
            inside = members[(members >= first) & (members < first + len(block))] - first
            sides = SHAPES[family(kind)].facets
            if len(inside) and side < len(sides):
                found += [tuple(int(n) for n in row) for row in block[inside][:, list(sides[side])]]
        return found
