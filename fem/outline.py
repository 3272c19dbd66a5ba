"""From an outline of CAD to a mesh file: DXF, a STEP face, a STEP solid or a slice of it.

Model
-----
Cells of ``first`` at the cooled surface, growing by ``GROWTH`` per length of depth, as the
temperature of a cooled body does: steep near the surface, flat inside. The first
cell follows the rule of the ready-made forms: a share of k/h, the depth over
which the strongest film acts. Area or volume of the cells are compared with the
mass property that the CAD kernel states of the shape.

Source
------
The rule: `section.FIRST_OVER_FILM` (ours); meshing: Geuzaine and Remacle, "Gmsh",
Int. J. Numer. Meth. Engng 79, 2009, 1309 (remembered).

Holds for
---------
One body without inner boundaries. The mesher runs in a process of its own
(`outlineworker`), so that neither its state nor its failures reach a run.
"""

import importlib.util
import json
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Literal

import numpy as np

from midradius.fem.outlineloops import Piece, refuse
from midradius.fem.section import FIRST_OVER_FILM, HOT_STEEL_K
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault, MidradiusError

Sense = Literal["plane", "axisymmetric", "solid"]
SENSES: tuple[Sense, ...] = ("plane", "axisymmetric", "solid")
GROWTH = 0.25
# A run halves every edge once for its answer, where that stays below 40 000 nodes in
# a plane and 60 000 in a solid: twice the cells that the film asks for, and so many.
HALVED_BY_RUN = 2.0
MOST_NODES: Mapping[Sense, int] = {"plane": 9_500, "axisymmetric": 9_500, "solid": 7_000}
UNCOOLED = ("axis", "symmetry")
DXF = (".dxf",)
STEP = (".step", ".stp")
LONGEST_RUN = 1800.0  # s
AREA_DIFFERS = 1e-3  # between our polygons and the mesher's curves: one of us misread them
CONTENT_DIFFERS = 0.01  # between cells and CAD: more is said
MISSING = (
    "Meshing an outline needs gmsh and ezdxf, which are not installed: "
    "pip install 'midradius[cad]'."
)
_STANDARD: Mapping[int, tuple[float, float, float]] = {
    0: (1.0, 0.0, 0.0),
    1: (0.0, 1.0, 0.0),
    2: (0.0, 0.0, 1.0),
}


class MissingExtra(MidradiusError):
    """An optional library is not there; the text holds the command that installs it."""


@dataclass(frozen=True)
class Slice:
    """A plane through ``point`` [m] with a ``normal``; ``axis`` runs along y or z of the section.

    For an axisymmetric section the axis of rotation passes through ``point``.
    """

    point: tuple[float, float, float]
    normal: tuple[float, float, float]
    axis: tuple[float, float, float] | None = None


@dataclass(frozen=True)
class Meshed:
    """What was made: sizes in SI of the sense (m2 or m3), lengths in m.

    ``content`` is that of the cells, ``cad_content`` that of the shape; ``worst``
    the lowest quality of a cell, 1 for an equilateral one; ``first`` the surface
    cell that was used.
    """

    path: Path
    sense: Sense
    n_node: int
    n_cell: int
    content: float
    cad_content: float
    worst: float
    first: float
    size: tuple[float, float, float]
    zones: tuple[str, ...]
    notes: tuple[str, ...]

    @property
    def missing_share(self) -> float:
        """How much less the cells hold than the shape, relative."""
        return 1.0 - self.content / self.cad_content


def first_cell(film: float, accuracy: float) -> float:
    """Surface cell [m] for a film coefficient [W/(m2 K)] and an accuracy [K].

    Twice the first of the cells that `section.cut` takes along a side, since a run
    halves them; the error falls with the square of the size.
    """
    return float(HALVED_BY_RUN * FIRST_OVER_FILM * HOT_STEEL_K / film * np.sqrt(accuracy / 0.5))


def mesh_outline(
    source: Path,
    target: Path,
    *,
    sense: Sense,
    first: float,
    length_unit: str | None = None,
    layers: tuple[str, ...] = (),
    cut: Slice | None = None,
    longest: float | None = None,
    most_nodes: int | None = None,
    uncooled: tuple[str, ...] = UNCOOLED,
) -> Meshed:
    """Mesh ``source`` and write ``target``, a .msh file of version 4.1 in mm.

    Parameters
    ----------
    source, target
        A .dxf or .step file; the mesh file, written whole or not at all.
    sense
        What the section stands for; ``"solid"`` needs a STEP solid.
    first, longest
        Size of the surface cells and the largest size [m]; the largest follows
        from the depth of the part if None.
    length_unit
        Of a drawing that states none: mm, cm, m, in, ft.
    layers
        Layers of a drawing that are read; all that are shown if empty.
    cut
        The plane of a section through a solid.
    most_nodes
        Above that number the surface cells become larger, and a note says so.
    uncooled
        Zones where no heat leaves, that need no fine cells.

    Raises
    ------
    MissingExtra
        gmsh or ezdxf is not installed.
    InputFault
        The file or the plane cannot give one body, or the target cannot be written.
    """
    check_source(source)
    suffix = source.suffix.lower()
    request: dict[str, Any] = {
        "name": source.name,
        "sense": sense,
        "first": first * 1e3,
        "longest": (longest or 0.0) * 1e3,
        "growth": GROWTH,
        "most_nodes": most_nodes or MOST_NODES[sense],
        "uncooled": list(uncooled),
    }
    notes: tuple[str, ...] = ()
    drawn = None
    if suffix in DXF:
        if sense == "solid" or cut is not None:
            raise refuse(
                source.name,
                'a section with sense = "plane" or "axisymmetric", without slice',
                "A drawing is flat: a solid comes as STEP.",
            )
        from midradius.fem.outlinedxf import read_dxf

        found = read_dxf(source, unit=length_unit, layers=layers)
        notes, drawn = found.notes, found.outline.area * found.metre**2
        mm = found.metre * 1e3
        request["loops"] = [
            [_told(piece, mm) for piece in loop.pieces] for loop in found.outline.loops
        ]
    else:
        if length_unit is not None or layers:
            raise InputFault(
                "length_unit" if length_unit is not None else "layers",
                f'"{length_unit if length_unit is not None else ", ".join(layers)}"',
                "left out for a STEP file",
                "It states its unit itself, and has no layers.",
            )
        request["step"] = str(source.resolve())
        if cut is not None:
            request["slice"] = axes_of(cut, sense)
    made = _made(request, source, target, sense)
    if drawn is not None and abs(drawn / made.cad_content - 1.0) > AREA_DIFFERS:
        target.unlink(missing_ok=True)
        raise refuse(
            source.name,
            "an outline that reader and mesher understand alike",
            f"The reader finds {drawn * 1e6:.6g} mm2, the mesher {made.cad_content * 1e6:.6g} mm2: "
            "replace splines by arcs and lines.",
        )
    if abs(made.missing_share) > CONTENT_DIFFERS:
        notes += (
            f"the cells hold {100.0 * made.missing_share:.2g} % less than the shape: "
            "ask for finer cells",
        )
    return replace(made, notes=notes + made.notes)


def _told(piece: Piece, mm: float) -> dict[str, Any]:
    return {
        "kind": piece.kind,
        "zone": piece.zone,
        "points": (piece.points * mm).tolist(),
        "middle": None if piece.middle is None else [v * mm for v in piece.middle],
    }


def check_source(source: Path) -> None:
    """Look whether an outline can be read at all.

    Raises
    ------
    MissingExtra
        gmsh or ezdxf is not installed.
    InputFault
        Another kind of file, or none.
    """
    suffix = source.suffix.lower()
    if suffix not in DXF + STEP:
        raise refuse(source.name, f"one of these kinds: {', '.join(DXF + STEP)}", "")
    needed = ("gmsh", "ezdxf") if suffix in DXF else ("gmsh",)
    if any(importlib.util.find_spec(name) is None for name in needed):
        raise MissingExtra(MISSING)
    try:
        if source.is_file() and source.stat().st_size:
            return
        reason = "The file is empty." if source.is_file() else "There is no such file."
        if source.exists() and not source.is_file():
            reason = "This is a folder or a device."
    except OSError as error:
        reason = f"{error.strerror or error}."
    raise refuse(source.name, "a file with an outline", reason)


def axes_of(cut: Slice, sense: Sense) -> dict[str, list[float]]:
    """The plane as the mesher takes it: a point [mm], two unit vectors within.

    Raises
    ------
    InputFault
        Directions without length, or an axis that the plane cannot have.
    """
    if sense == "solid":
        raise InputFault("slice", "given", 'left out for sense = "solid"')
    normal = _unit(cut.normal, "slice.normal")
    along = cut.axis
    if along is None:
        if sense == "axisymmetric":
            raise InputFault(
                "slice.axis",
                "not given",
                "the direction of the axis of rotation, such as [0, 0, 1]",
                "The axis passes through slice.point.",
            )
        along = _STANDARD[1 if abs(normal[2]) > 0.9 else 2]
    up = np.asarray(_unit(along, "slice.axis"))
    within = up - (up @ normal) * normal
    if sense == "axisymmetric" and abs(up @ normal) > 1e-6:
        raise InputFault(
            "slice.axis",
            f"{list(along)}",
            "at a right angle to slice.normal",
            "It lies in the plane.",
        )
    if np.linalg.norm(within) < 1e-6:
        raise InputFault("slice.axis", f"{list(along)}", "not along slice.normal")
    y = within / np.linalg.norm(within)
    x = np.cross(y, normal)
    point = [1e3 * v for v in cut.point]
    return {"point": point, "x": x.tolist(), "y": y.tolist()}


def _unit(vector: tuple[float, float, float], name: str) -> Array:
    length = float(np.linalg.norm(vector))
    if not np.isfinite(length) or length == 0.0:
        raise InputFault(name, f"{list(vector)}", "three numbers that are not all zero")
    return np.asarray(vector, dtype=np.float64) / length


def _made(request: dict[str, Any], source: Path, target: Path, sense: Sense) -> Meshed:
    """Run the mesher beside us and move its mesh into place."""
    with tempfile.TemporaryDirectory(prefix="midradius-") as folder:
        work = Path(folder)
        request |= {"mesh": str(work / "made.msh"), "answer": str(work / "answer.json")}
        (work / "request.json").write_text(json.dumps(request), encoding="utf-8")
        command = [sys.executable, "-m", "midradius.fem.outlineworker", str(work / "request.json")]
        try:
            done = subprocess.run(
                command, capture_output=True, timeout=LONGEST_RUN, check=False, text=True
            )
        except subprocess.TimeoutExpired as error:
            raise refuse(
                source.name,
                f"an outline that is meshed within {LONGEST_RUN / 60.0:.0f} minutes",
                "Take small details out, or allow fewer nodes.",
            ) from error
        try:
            answer = json.loads((work / "answer.json").read_text(encoding="utf-8"))
        except (OSError, ValueError) as error:
            said = (done.stderr or done.stdout).strip().splitlines()
            raise refuse(
                source.name,
                "an outline that the mesher survives",
                f"It ended with code {done.returncode}. {said[-1] if said else ''}",
            ) from error
        if "missing" in answer:
            raise MissingExtra(
                f"gmsh is installed but does not start: {answer['missing']}. On Debian: "
                "apt-get install libglu1-mesa libxcursor1 libxft2 libxinerama1 libxrender1."
            )
        if "allowed" in answer:
            raise refuse(source.name, answer["allowed"], answer["remedy"])
        _placed(work / "made.msh", target)
    scale = 1e-3 ** answer["dim"]
    low, high = np.array(answer["low"]), np.array(answer["high"])
    size = (high - low) * 1e-3
    return Meshed(
        path=target,
        sense=sense,
        n_node=answer["n_node"],
        n_cell=answer["n_cell"],
        content=answer["meshed"] * scale,
        cad_content=answer["cad"] * scale,
        worst=answer["worst"],
        first=answer["first"] * 1e-3,
        size=(float(size[0]), float(size[1]), float(size[2])),
        zones=tuple(answer["zones"]),
        notes=tuple(answer["notes"]),
    )


def _placed(made: Path, target: Path) -> None:
    part = target.with_name(f".{target.name}.part")
    try:
        shutil.copyfile(made, part)
        part.replace(target)
    except OSError as error:
        part.unlink(missing_ok=True)
        raise InputFault(
            "mesh file", f'"{target.name}"', "a place that can be written", f"{error.strerror}."
        ) from error
