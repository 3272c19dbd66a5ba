"""The mesher's own process: ``python -m midradius.fem.outlineworker REQUEST.json``.

gmsh keeps global state, can end its process, and carries a licence of its own
(GPL-2.0-or-later). So it runs as a separate program that takes one file and
leaves two, an answer (JSON) and a mesh (.msh 4.1, in mm); nothing here is
imported by the rest of midradius.

Request: ``name``, ``mesh`` and ``answer`` (paths), ``sense``, ``first`` and
``longest`` (cell sizes [mm]; longest 0 to follow the depth), ``growth``,
``most_nodes``, ``uncooled`` (zones that need no fine cells), and either
``loops`` (outer first; pieces with ``kind``, ``zone``, ``points`` [mm],
``middle``) or ``step`` (path) with an optional ``slice``: ``point`` [mm] and the
unit vectors ``x``, ``y`` of the section's coordinates.
"""

import json
import math
import sys
from pathlib import Path
from typing import Any

AXIS = "axis"
SURFACE = "surface"
PER_TURN = 32  # cells around a full turn of a curved boundary
CELLS_DEEP = {2: 12.0, 3: 6.0}  # cells over the mean depth, content per cooled surface
TRIES = 6
NODES = {2: 1.16, 3: 1.6}  # per size^dim of content: 2 triangles or 5.3 tetrahedra a node
NEAR = 1e-6  # of the size: nearer than this is on the axis or in the plane


class Refused(Exception):
    """What cannot be meshed: what is allowed, and a remedy."""

    def __init__(self, allowed: str, remedy: str) -> None:
        super().__init__(remedy)
        self.allowed = allowed
        self.remedy = remedy


def main(request_path: str) -> None:
    """Answer one request; every failure is an answer too."""
    request = json.loads(Path(request_path).read_text(encoding="utf-8"))
    answer: dict[str, Any]
    try:
        import gmsh
    except (ImportError, OSError) as error:
        answer = {"missing": str(error)}
    else:
        gmsh.initialize(interruptible=False, readConfigFiles=False)
        gmsh.option.setNumber("General.Terminal", 0)
        try:
            answer = _answer(gmsh, request)
        except Refused as refused:
            answer = {"allowed": refused.allowed, "remedy": refused.remedy}
        except Exception as error:
            answer = {"allowed": "an outline that can be meshed", "remedy": f"gmsh: {error}"}
    Path(request["answer"]).write_text(json.dumps(answer), encoding="utf-8")


def _answer(gmsh: Any, request: dict[str, Any]) -> dict[str, Any]:
    axes = None
    if "loops" in request:
        _from_loops(gmsh, request)
        dim = 2
    else:
        axes = _from_step(gmsh, request)
        dim = 3 if request["sense"] == "solid" else 2
    bodies = gmsh.model.getEntities(dim)
    if not bodies:
        raise Refused("an outline that encloses something", "Nothing of the part is there.")
    if len(bodies) > 1:
        raise Refused("one body", f"There are {len(bodies)}; mesh each in a file of its own.")
    size = math.dist(*_box(gmsh, dim, bodies[0][1]))
    zones = _zones(gmsh, request, dim, axes, size)
    cad = float(gmsh.model.occ.getMass(dim, bodies[0][1]))
    gmsh.model.addPhysicalGroup(dim, [bodies[0][1]], name="body")
    for zone, tags in zones.items():
        gmsh.model.addPhysicalGroup(dim - 1, tags, name=zone)
    cooled = [
        tag for zone, tags in zones.items() if zone not in request["uncooled"] for tag in tags
    ]
    first, notes = _mesh(gmsh, request, dim, cooled, cad)
    if axes is not None:
        gmsh.model.mesh.affineTransform(_to_plane(axes))
    gmsh.option.setNumber("Mesh.MshFileVersion", 4.1)
    gmsh.write(request["mesh"])
    return _report(gmsh, dim, cad) | {"zones": sorted(zones), "first": first, "notes": notes}


def _from_loops(gmsh: Any, request: dict[str, Any]) -> None:
    occ = gmsh.model.occ
    wires = []
    for loop in request["loops"]:
        corner: dict[tuple[float, float], int] = {}
        curves = []
        for piece in loop:
            points = piece["points"]
            ends = []
            for end in (points[0], points[-1]):
                key = (end[0], end[1])
                if key not in corner:
                    corner[key] = occ.addPoint(*key, 0.0)
                ends.append(corner[key])
            if piece["kind"] == "line":
                tag = occ.addLine(*ends)
            elif piece["kind"] == "arc":
                middle = occ.addPoint(*piece["middle"], 0.0)
                tag = occ.addCircleArc(ends[0], middle, ends[1], center=False)
                occ.remove([(0, middle)])
            else:
                between = [occ.addPoint(*point, 0.0) for point in points[1:-1]]
                tag = occ.addSpline([ends[0], *between, ends[1]])
                occ.remove([(0, point) for point in between])
            piece["tag"] = tag
            curves.append(tag)
        wires.append(occ.addCurveLoop(curves))
    occ.addPlaneSurface(wires)
    occ.synchronize()


def _from_step(gmsh: Any, request: dict[str, Any]) -> dict[str, list[float]] | None:
    """Import; with a slice leave its section alone, and return the section's axes."""
    occ = gmsh.model.occ
    gmsh.option.setString("Geometry.OCCTargetUnit", "MM")
    found = occ.importShapes(request["step"])
    occ.synchronize()
    solids = [tag for dim, tag in found if dim == 3]
    faces = [tag for dim, tag in found if dim == 2]
    if request["sense"] == "solid":
        if not solids:
            raise Refused("a STEP file with a solid", "It holds none.")
        return None
    cut = request.get("slice")
    if solids and cut is None:
        raise Refused(
            "sliced by a plane for this sense",
            'It holds a solid: give slice = { point = [...], normal = [...] }, or sense = "solid".',
        )
    if solids:
        assert cut is not None
        _slice(gmsh, solids, cut, axis=request["sense"] == "axisymmetric")
        return dict(cut)
    if cut is not None:
        raise Refused("a STEP file with a solid, to be sliced", "It holds none.")
    if not faces:
        raise Refused("a STEP file with a solid or a face", "It holds neither.")
    low, high = _box(gmsh, 2, faces[0])
    if high[2] - low[2] > NEAR * math.dist(low, high):
        raise Refused(
            "a face that lies flat in x and y", "Turn it so, or give the solid and a slice."
        )
    return {
        "point": [0.0, 0.0, 0.5 * (low[2] + high[2])],
        "x": [1.0, 0.0, 0.0],
        "y": [0.0, 1.0, 0.0],
    }


def _slice(gmsh: Any, solids: list[int], cut: dict[str, list[float]], *, axis: bool) -> None:
    occ = gmsh.model.occ
    boxes = [_box(gmsh, 3, tag) for tag in solids]
    far = max(math.dist(corner, cut["point"]) for low, high in boxes for corner in (low, high))
    far *= 2.0
    corners = [
        occ.addPoint(*(cut["point"][k] + a * cut["x"][k] + b * cut["y"][k] for k in range(3)))
        for a, b in (
            (0.0 if axis else -far, -far),
            (far, -far),
            (far, far),
            (-far * (not axis), far),
        )
    ]
    lines = [occ.addLine(corners[k], corners[(k + 1) % 4]) for k in range(4)]
    sheet = occ.addPlaneSurface([occ.addCurveLoop(lines)])
    parts, _ = occ.intersect([(3, tag) for tag in solids], [(2, sheet)])
    occ.synchronize()
    if not any(dim == 2 for dim, _ in parts):
        raise Refused("a plane that cuts the solid", "The plane misses it.")


def _zones(
    gmsh: Any, request: dict[str, Any], dim: int, axes: dict[str, list[float]] | None, size: float
) -> dict[str, list[int]]:
    """Boundary entities by zone; what lies on the axis of rotation is no surface."""
    body = gmsh.model.getEntities(dim)
    named = {p["tag"]: p["zone"] for loop in request.get("loops", ()) for p in loop}
    zones: dict[str, list[int]] = {}
    for _, signed in gmsh.model.getBoundary(body, combined=True, oriented=False):
        tag = abs(signed)
        zone = named.get(tag, SURFACE)
        if request["sense"] == "axisymmetric":
            ends = _radii(gmsh, tag, axes)
            if min(ends) < -NEAR * size:
                raise Refused(
                    "on one side of the axis x = 0",
                    f"It reaches to x = {min(ends):.6g} mm; draw the half with x >= 0.",
                )
            if max(abs(r) for r in ends) <= NEAR * size:
                zone = AXIS
        zones.setdefault(zone, []).append(tag)
    return zones


def _radii(gmsh: Any, tag: int, axes: dict[str, list[float]] | None) -> list[float]:
    """The coordinate x of the section at five points of a curve [mm]."""
    (low,), (high,) = gmsh.model.getParametrizationBounds(1, tag)
    flat = gmsh.model.getValue(1, tag, [low + (high - low) * k / 4.0 for k in range(5)])
    points = [flat[3 * k : 3 * k + 3] for k in range(5)]
    if axes is None:
        return [float(p[0]) for p in points]
    return [sum((p[k] - axes["point"][k]) * axes["x"][k] for k in range(3)) for p in points]


def _box(gmsh: Any, dim: int, tag: int) -> tuple[tuple[float, ...], tuple[float, ...]]:
    box = gmsh.model.getBoundingBox(dim, tag)
    return box[:3], box[3:]


def _to_plane(axes: dict[str, list[float]]) -> list[float]:
    """Rows of the map from space to the section's coordinates, as gmsh takes them."""
    x, y, point = axes["x"], axes["y"], axes["point"]
    n = [
        x[1] * y[2] - x[2] * y[1],
        x[2] * y[0] - x[0] * y[2],
        x[0] * y[1] - x[1] * y[0],
    ]
    rows = []
    for row in (x, y, n):
        rows += [*row, -sum(a * b for a, b in zip(row, point, strict=True))]
    return rows


def _mesh(
    gmsh: Any, request: dict[str, Any], dim: int, cooled: list[int], content: float
) -> tuple[float, list[str]]:
    """Mesh, with coarser surface cells where there would be too many; the size that was used."""
    edge = float(sum(gmsh.model.occ.getMass(dim - 1, tag) for tag in cooled))
    depth = content / edge if edge else content ** (1.0 / dim)
    longest = deepest = request["longest"] or depth / CELLS_DEEP[dim]
    asked, most = float(request["first"]), int(request["most_nodes"])
    first, growth = min(asked, longest), float(request["growth"])
    while True:
        layer = NODES[dim] * edge / ((dim - 1) * growth * first ** (dim - 1))
        inner = NODES[dim] * content / longest**dim
        if layer + inner <= 1.2 * most:
            break
        first *= 1.1 if layer > 0.4 * most else 1.0
        longest = max(longest * (1.1 if inner > 0.4 * most else 1.0), first)
    for attempt in range(TRIES):
        longest = max(longest, first)
        _sizes(gmsh, dim, cooled, first, longest, growth)
        gmsh.model.mesh.clear()
        gmsh.model.mesh.generate(dim)
        n_node = len(gmsh.model.mesh.getNodes()[0])
        if n_node <= most:
            break
        if attempt == TRIES - 1:
            raise Refused(
                f"a part that {most} nodes can hold", f"It takes {n_node}: allow more nodes."
            )
        excess = 1.03 * (n_node / most) ** (1.0 / (dim - 1))
        first *= excess
        longest *= min(excess, 1.2)
    notes = []
    if first > 1.001 * min(asked, deepest):
        notes.append(
            f"surface cells of {first:.3g} mm instead of the {asked:.3g} mm asked for, to stay "
            f"below {most} nodes"
        )
    elif first < 0.999 * asked:
        notes.append(
            f"surface cells of {first:.3g} mm instead of the {asked:.3g} mm asked for: the part is "
            "thin, and no cell is larger than its depth needs"
        )
    return first, notes


def _sizes(
    gmsh: Any, dim: int, cooled: list[int], first: float, longest: float, growth: float
) -> None:
    option = gmsh.option.setNumber
    option("Mesh.MeshSizeFromPoints", 0)
    option("Mesh.MeshSizeExtendFromBoundary", 0)
    option("Mesh.MeshSizeFromCurvature", PER_TURN if dim == 2 else PER_TURN / 2)
    option("Mesh.MeshSizeMin", 0.25 * first)
    option("Mesh.MeshSizeMax", longest)
    option("Mesh.Algorithm", 6)
    option("Mesh.RandomFactor", 1e-9)
    field = gmsh.model.mesh.field
    for tag in field.list():
        field.remove(tag)
    if not cooled:
        return
    length = max(math.dist(*_box(gmsh, dim - 1, tag)) for tag in cooled)
    away = field.add("Distance")
    field.setNumbers(away, "CurvesList" if dim == 2 else "SurfacesList", cooled)
    field.setNumber(
        away, "Sampling", min(max(20, math.ceil(1.6 * length / first)), 6000 if dim == 2 else 100)
    )
    size = field.add("Threshold")
    field.setNumber(size, "InField", away)
    for key, value in (
        ("SizeMin", first),
        ("SizeMax", longest),
        ("DistMin", 0.0),
        ("DistMax", max((longest - first) / growth, 1e-3 * first)),
    ):
        field.setNumber(size, key, value)
    field.setAsBackgroundMesh(size)


def _report(gmsh: Any, dim: int, cad: float) -> dict[str, Any]:
    import numpy as np

    tags, flat, _ = gmsh.model.mesh.getNodes()
    points = np.asarray(flat).reshape(-1, 3)
    place = np.zeros(int(max(tags)) + 1, dtype=np.int64)
    place[np.asarray(tags, dtype=np.int64)] = np.arange(len(tags))
    kind = 2 if dim == 2 else 4
    cells, corners = gmsh.model.mesh.getElementsByType(kind)
    corner = points[place[np.asarray(corners, dtype=np.int64)].reshape(-1, dim + 1)]
    sides = corner[:, 1:] - corner[:, :1]
    if dim == 2:
        content = 0.5 * np.linalg.norm(np.cross(sides[:, 0], sides[:, 1]), axis=1)
    else:
        content = np.abs(np.linalg.det(sides)) / 6.0
    quality = gmsh.model.mesh.getElementQualities(cells, "gamma")
    return {
        "dim": dim,
        "n_node": len(tags),
        "n_cell": len(cells),
        "cad": cad,
        "meshed": float(content.sum()),
        "worst": float(min(quality)),
        "low": points.min(axis=0).tolist(),
        "high": points.max(axis=0).tolist(),
    }


if __name__ == "__main__":
    main(sys.argv[1])
