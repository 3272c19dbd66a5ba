"""Makes the sample meshes of this folder: ``python meshes/make_meshes.py [FOLDER]``.

Needs the extra ``midradius[cad]``. All parts are invented parts of Hallgrund Forge.
The flat ones are drawn with ezdxf and go through `midradius mesh`; of the rail the
drawing stays here as well. The bracket is built by gmsh, which runs as a program
of its own.
"""

import math
import subprocess
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import ezdxf

from midradius.fem.outline import Sense, mesh_outline

MOST_NODES = 1600  # keeps a file below 300 kB; a run halves every edge


Side = tuple[float, float, float, str]  # corner where it begins, bulge, zone


def drawn(space: Any, sides: list[Side]) -> None:
    """Sides from corner to corner, each on the layer of its zone."""
    for (x, y, bulge, zone), (x_next, y_next, *_) in zip(sides, sides[1:] + sides[:1], strict=True):
        if bulge:
            ends = [(x, y, bulge), (x_next, y_next, 0.0)]
            space.add_lwpolyline(ends, format="xyb", dxfattribs={"layer": zone})
        else:
            space.add_line((x, y), (x_next, y_next), dxfattribs={"layer": zone})


QUARTER = math.tan(math.pi / 8.0)  # bulge of a quarter turn to the left
INWARD = -QUARTER


def stepped_shaft(space: Any) -> None:
    """Half section of a shaft with two steps and fillets, radius along x."""
    drawn(
        space,
        [
            (0.0, 0.0, 0.0, "end"),
            (60.0, 0.0, 0.0, "side"),
            (60.0, 132.0, INWARD, "side"),
            (68.0, 140.0, 0.0, "side"),
            (95.0, 140.0, 0.0, "side"),
            (95.0, 292.0, QUARTER, "side"),
            (87.0, 300.0, 0.0, "side"),
            (48.0, 300.0, INWARD, "side"),
            (40.0, 308.0, 0.0, "side"),
            (40.0, 420.0, 0.0, "end"),
            (0.0, 420.0, 0.0, "axis"),
        ],
    )


def gear_blank(space: Any) -> None:
    """Half section of a gear blank: hub, web, rim."""
    drawn(
        space,
        [
            (35.0, 0.0, 0.0, "faces"),
            (62.0, 0.0, 0.0, "faces"),
            (62.0, 16.0, INWARD, "faces"),
            (68.0, 22.0, 0.0, "faces"),
            (112.0, 22.0, INWARD, "faces"),
            (118.0, 16.0, 0.0, "faces"),
            (118.0, 10.0, 0.0, "faces"),
            (150.0, 10.0, 0.0, "rim"),
            (150.0, 70.0, 0.0, "faces"),
            (118.0, 70.0, 0.0, "faces"),
            (118.0, 64.0, INWARD, "faces"),
            (112.0, 58.0, 0.0, "faces"),
            (68.0, 58.0, INWARD, "faces"),
            (62.0, 64.0, 0.0, "faces"),
            (62.0, 80.0, 0.0, "faces"),
            (35.0, 80.0, 0.0, "bore"),
        ],
    )


def forged_hub(space: Any) -> None:
    """Half section of a hub as forged: drafts, round edges, a punched bore."""
    drawn(
        space,
        [
            (30.0, 0.0, 0.0, "bottom"),
            (130.0, 0.0, 0.38, "outside"),
            (140.0, 10.0, 0.0, "outside"),
            (136.0, 40.0, 0.36, "outside"),
            (126.0, 48.0, 0.0, "outside"),
            (92.0, 51.0, -0.36, "outside"),
            (80.0, 62.0, 0.0, "outside"),
            (72.0, 128.0, 0.38, "outside"),
            (64.0, 136.0, 0.0, "outside"),
            (38.0, 136.0, 0.0, "bore"),
        ],
    )


def rail(space: Any) -> None:
    """Section of a crane rail: foot, web, head."""
    right: list[Side] = [
        (75.0, 0.0, 0.0, "side"),
        (75.0, 9.0, 0.0, "side"),
        (24.0, 22.0, -0.35, "side"),
        (14.0, 36.0, 0.0, "side"),
        (14.0, 96.0, -0.3, "side"),
        (20.0, 106.0, 0.0, "side"),
        (36.0, 112.0, 0.0, "head"),
        (36.0, 134.0, 0.38, "head"),
        (26.0, 146.0, 0.0, "head"),
    ]
    # mirrored, a side begins where it ended; its bulge turns over twice
    ends = [*right[1:], (26.0, 146.0, 0.0, "head")]
    left: list[Side] = [
        (-end[0], end[1], side[2], side[3])
        for side, end in zip(right[-2::-1], ends[-2::-1], strict=True)
    ]
    drawn(space, [*right, *left, (-75.0, 0.0, 0.0, "foot")])


BRACKET = """
import sys
import gmsh

gmsh.initialize(readConfigFiles=False)
gmsh.option.setNumber("General.Terminal", 0)
occ = gmsh.model.occ
foot = occ.addBox(0, 0, 0, 160, 90, 36)
wall = occ.addBox(0, 0, 0, 40, 90, 130)
ends = [occ.addPoint(x, 33, z) for x, z in ((30, 30), (102, 30), (102, 36), (40, 84), (30, 84))]
sides = [occ.addLine(a, b) for a, b in zip(ends, ends[1:] + ends[:1])]
rib = occ.extrude([(2, occ.addPlaneSurface([occ.addCurveLoop(sides)]))], 0, 24, 0)
rib = [(dim, tag) for dim, tag in rib if dim == 3]
whole, _ = occ.fuse([(3, foot)], [(3, wall), *rib])
holes = [(3, occ.addCylinder(125, y, -1, 0, 0, 40, 11)) for y in (22, 68)]
holes.append((3, occ.addCylinder(-1, 45, 105, 44, 0, 0, 14)))
part, _ = occ.cut(whole, holes)
occ.synchronize()
zones = {"base": [], "holes": [], "surface": []}
for _, face in gmsh.model.getBoundary(part, oriented=False):
    low, high = (gmsh.model.getBoundingBox(2, face)[k : k + 3] for k in (0, 3))
    kind = gmsh.model.getType(2, face)
    zone = "base" if high[2] < 0.01 else "holes" if kind == "Cylinder" else "surface"
    zones[zone].append(face)
for zone, faces in zones.items():
    gmsh.model.addPhysicalGroup(2, faces, name=zone)
gmsh.model.addPhysicalGroup(3, [tag for _, tag in part], name="body")
gmsh.option.setNumber("Mesh.MeshSizeMax", 12.0)
gmsh.option.setNumber("Mesh.MeshSizeFromCurvature", 10)
gmsh.option.setNumber("Mesh.RandomFactor", 1e-9)
gmsh.model.mesh.generate(3)
gmsh.model.mesh.optimize("Netgen")
gmsh.option.setNumber("Mesh.MshFileVersion", 4.1)
gmsh.write(sys.argv[1])
print(gmsh.model.occ.getMass(3, part[0][1]))
gmsh.finalize()
"""

FLAT: dict[str, tuple[Callable[[Any], None], Sense]] = {
    "stepped-shaft": (stepped_shaft, "axisymmetric"),
    "gear-blank": (gear_blank, "axisymmetric"),
    "forged-hub": (forged_hub, "axisymmetric"),
    "crane-rail": (rail, "plane"),
}


def draw(fill: Callable[[Any], None], path: Path) -> None:
    """A drawing in mm."""
    document = ezdxf.new("R2000")
    document.units = ezdxf.units.MM
    fill(document.modelspace())
    document.saveas(path)


def main(folder: Path) -> None:
    """Write all sample meshes into a folder."""
    with tempfile.TemporaryDirectory() as work:
        for name, (fill, sense) in FLAT.items():
            drawing = Path(work) / f"{name}.dxf"
            draw(fill, drawing)
            made = mesh_outline(
                drawing, folder / f"{name}.msh", sense=sense, first=1.2e-3, most_nodes=MOST_NODES
            )
            print(
                f"{name}: {made.n_node} nodes, {made.content * 1e6:.6g} mm2, "
                f"CAD {made.cad_content * 1e6:.6g} mm2, zones {', '.join(made.zones)}"
            )
            if name == "crane-rail":
                (folder / drawing.name).write_bytes(drawing.read_bytes())
    target = folder / "bracket.msh"
    subprocess.run([sys.executable, "-c", BRACKET, str(target)], check=True)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
