"""How cells are split into triangles and tetrahedra, evenly in all directions.

A cell with quadrilateral faces can be split in several ways. All of them are
taken at once, each with an equal share, so that both diagonals of every face
count alike: neighbours agree on their common face, linear temperatures are met
exactly, and a box gives the seven conductances of a finite difference grid.

Source
------
Hexahedra by the six tetrahedra around each of the four body diagonals: Kuhn
1960; the averaging is ours (derived; tested by linear fields and by grids).
"""

from collections.abc import Mapping
from functools import cache
from itertools import permutations

_AXES = ((0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0), (0, 0, 1), (1, 0, 1), (1, 1, 1), (0, 1, 1))
_QUADS_OF_WEDGE = ((0, 1, 4, 3), (1, 2, 5, 4), (2, 0, 3, 5))


@cache
def simplices_of(kind: str) -> tuple[tuple[int, ...], ...]:
    """Local corners of all simplices of a cell, in every splitting.

    Oriented as the cell: positive volume where the cell is right.
    """
    return _SIMPLICES[kind]()


def n_splitting(kind: str) -> int:
    """How many splittings :func:`simplices_of` holds: each counts that part."""
    return _COUNT[kind]


def _triangle() -> tuple[tuple[int, ...], ...]:
    return ((0, 1, 2),)


def _quad() -> tuple[tuple[int, ...], ...]:
    return ((0, 1, 2), (0, 2, 3), (0, 1, 3), (1, 2, 3))


def _tetra() -> tuple[tuple[int, ...], ...]:
    return ((0, 1, 2, 3),)


def _pyramid() -> tuple[tuple[int, ...], ...]:
    return tuple((*base, 4) for base in _quad())


def _hexahedron() -> tuple[tuple[int, ...], ...]:
    number = {place: k for k, place in enumerate(_AXES)}
    found = []
    for start in ((0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0)):
        for order in permutations(range(3)):
            place = list(start)
            path = [number[start]]
            for axis in order:
                place[axis] = 1 - place[axis]
                path.append(number[tuple(place)])  # type: ignore[index]
            corners = [_AXES[k] for k in path]
            right = _sign(corners) > 0
            found.append(tuple(path) if right else (path[0], path[2], path[1], path[3]))
    return tuple(found)


def _sign(corners: list[tuple[int, int, int]]) -> int:
    a, b, c = ([p[k] - corners[0][k] for k in range(3)] for p in corners[1:])
    return (
        a[0] * (b[1] * c[2] - b[2] * c[1])
        - a[1] * (b[0] * c[2] - b[2] * c[0])
        + a[2] * (b[0] * c[1] - b[1] * c[0])
    )


def _wedge() -> tuple[tuple[int, ...], ...]:
    """Six splittings: one for each order in which the three corners climb."""
    found = []
    for order in permutations(range(3)):
        i, j, k = order
        # the prism over (i, j, k): bottom corners are left one after the other
        for tetra in ((i, j, k, k + 3), (i, j, k + 3, j + 3), (i, i + 3, j + 3, k + 3)):
            found.append(_as_wedge(tetra))
    return tuple(found)


def _as_wedge(tetra: tuple[int, int, int, int]) -> tuple[int, ...]:
    places = ((0, 0, 0), (1, 0, 0), (0, 1, 0), (0, 0, 1), (1, 0, 1), (0, 1, 1))
    a, b, c, d = tetra
    return (a, b, c, d) if _sign([places[n] for n in tetra]) > 0 else (a, c, b, d)


_SIMPLICES = {
    "triangle": _triangle,
    "quad": _quad,
    "tetra": _tetra,
    "pyramid": _pyramid,
    "hexahedron": _hexahedron,
    "wedge": _wedge,
}
_COUNT: Mapping[str, int] = {
    "triangle": 1,
    "quad": 2,
    "tetra": 1,
    "pyramid": 2,
    "hexahedron": 4,
    "wedge": 6,
}
