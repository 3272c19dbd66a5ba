"""Results written back on the mesh that the temperatures came on.

One VTU: the points, cells and arrays of the file as they were, in their order, and what was
computed beside them. An array of ours whose name is taken gets ``computed_`` in front; what
was there keeps its name. Points are metres where the case said how long a unit is.

Format
------
As in :mod:`midradius.fem.fields`: VTK XML through meshio, base64, zlib, float64, nan kept.
"""

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from midradius.fem.fields import FINAL, UNIT_ENDINGS, for_meshio
from midradius.fem.histories import GivenMesh
from midradius.fem.meshraw import SHAPES, family
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

TAKEN = "computed_"


def write_on_mesh(folder: Path, mesh: GivenMesh, at_end: Mapping[str, Array]) -> Path:
    """Write ``final.vtu`` into an existing folder and return its path.

    Parameters
    ----------
    folder
        Where to write.
    mesh
        The mesh of the file with its arrays.
    at_end
        Arrays (n_node,) with the unit in the name; nan where not available.

    Raises
    ------
    InputFault
        An array without a unit in its name, or of another length than the points.
    """
    import meshio

    for name, values in at_end.items():
        if not name.endswith(UNIT_ENDINGS):
            raise InputFault("field name", name, f"one ending with {', '.join(UNIT_ENDINGS)}")
        if values.shape != (len(mesh.points),):
            raise InputFault(f"shape of {name}", f"{values.shape}", f"({len(mesh.points)},)")
    own = {
        (TAKEN + name if name in mesh.point_data else name): np.asarray(values, dtype=np.float64)
        for name, values in at_end.items()
    }
    for kind, _ in mesh.cells:  # it knows how to write some kinds that it cannot hold
        meshio._mesh.topological_dimension.setdefault(kind, SHAPES[family(kind)].dim)
    path = folder / FINAL
    written = meshio.Mesh(
        mesh.points,
        for_meshio(mesh.cells),
        point_data={**{k: np.array(v) for k, v in mesh.point_data.items()}, **own},
        cell_data=_by_block(mesh),
    )
    meshio.write(path, written, file_format="vtu", binary=True, compression="zlib")
    return path


def _by_block(mesh: GivenMesh) -> dict[str, list[np.ndarray]]:
    cuts = np.cumsum([len(block) for _, block in mesh.cells])[:-1]
    return {name: np.split(np.array(values), cuts) for name, values in mesh.cell_data.items()}
