"""What the readers of meshio lack for files that are sound.

They fail on pixels and drop voxels (VTK), fail on mixed cells of second order
(XDMF), and on families without a group and cells with middle nodes on their faces
(MED). ``mended`` lends them what they need and takes it back.

Source
------
XDMF topology numbers and MED geometry names: meshio's own tables; families: the MED
file format 3.0, ``FAS`` (remembered; checked against files of gmsh in the tests).
"""

import contextlib
from collections.abc import Iterator
from typing import Any

import numpy as np

_MED = {"QU9": "quad9", "TR7": "triangle7", "H27": "hexahedron27", "P18": "wedge18"}
_CELLS = (("pixel", 4, 2), ("voxel", 8, 3))
_LINE = 2  # its number of nodes stands before its nodes


@contextlib.contextmanager
def mended() -> Iterator[None]:
    """meshio with its gaps filled, as long as the context lasts."""
    import meshio
    from meshio import _common, _mesh, _vtk_common
    from meshio.med import _med
    from meshio.xdmf import main, time_series

    sizes = {kind: n for kind, n, _ in _CELLS}
    dims = {kind: dim for kind, _, dim in _CELLS} | {"triangle7": 2, "wedge18": 3}

    def mixed(data: Any) -> list[Any]:
        return [meshio.CellBlock(kind, table) for kind, table in mixed_cells(np.asarray(data))]

    with contextlib.ExitStack() as lent:
        for table, more in (
            (_vtk_common.vtk_to_meshio_type, {11: "voxel"}),
            (_common.num_nodes_per_cell, sizes),
            (_mesh.topological_dimension, dims),
            (_med.med_to_meshio_type, _MED),
        ):
            for key in more.keys() - table.keys():
                table[key] = more[key]
                lent.callback(table.pop, key)
        for module, name, ours in (
            (_med, "_read_families", families),
            (main, "translate_mixed_cells", mixed),
            (time_series, "translate_mixed_cells", mixed),
        ):
            lent.callback(setattr, module, name, getattr(module, name))
            setattr(module, name, ours)
        yield


def families(group: Any) -> dict[int, list[str]]:
    """Names of the groups of each family of a MED file; a family may have none."""
    found: dict[int, list[str]] = {}
    for family in group.values():
        names = family["GRO/NOM"][()] if "GRO" in family else ()
        texts = ("".join(chr(x) for x in name) for name in names)
        found[int(family.attrs["NUM"])] = [text.strip().rstrip("\0") for text in texts]
    return found


def mixed_cells(data: np.ndarray[Any, np.dtype[Any]]) -> list[tuple[str, Any]]:
    """Runs of one type from a mixed topology of XDMF: number of the type, then its nodes.

    Raises
    ------
    ValueError
        A type that is not known, or a cell that is cut short.
    """
    from meshio._common import num_nodes_per_cell
    from meshio.xdmf.common import xdmf_idx_to_meshio_type

    runs: list[tuple[str, list[Any]]] = []
    at = 0
    while at < len(data):
        kind = xdmf_idx_to_meshio_type.get(int(data[at]), "")
        n = num_nodes_per_cell.get(kind, 0)
        first = at + (2 if data[at] == _LINE else 1)
        if not n:
            raise ValueError(f"cells of type {int(data[at])} are not known")
        if first + n > len(data) or (data[at] == _LINE and data[at + 1] != n):
            raise ValueError("a cell of the mixed topology is cut short or a polyline")
        if not runs or runs[-1][0] != kind:
            runs.append((kind, []))
        runs[-1][1].append(data[first : first + n])
        at = first + n
    return [(kind, np.array(rows)) for kind, rows in runs]
