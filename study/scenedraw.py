"""Draws the part: ``python -m midradius.study.scenedraw REQUEST.npz FOLDER``.

pyvista renders the body alone, without a display; matplotlib sets it on a sheet
with headings and scales, so that letters look the same in all pictures.
"""

import json
import math
import os
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from midradius.fem.meshraw import SHAPES
from midradius.study.chart import DPI, SIZE, SMALL, WIDTH_INCH, around, label
from midradius.study.palette import BLACK, GUIDE, MAP, PHASE, PHASE_LABEL
from midradius.thermo.arrays import Array, IntArray

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

Image = NDArray[np.uint8]

HARDNESS, PHASES = "hardness.png", "phases.png"
TEMPERATURE, COOLING = "temperature.png", "cooling.gif"
STRIP = 6  # moments in the strip
FRAMES = 24
FRAME_MS, LAST_MS = 180, 1800
PIXELS = 900  # of one rendered view, the longer side
TOWARDS = (0.9, -1.5, 0.85)  # from the part to the eye, for a solid
MARGIN = 1.03  # white around the part
HIGHEST_INCH = 8.5
EDGE_ANGLE = 30.0  # degrees: sharper edges are drawn as lines


@dataclass(frozen=True)
class Scene:
    """What is to be drawn: ``temps`` (n_time, n_point), ``phases`` (n, n_point)."""

    heading: str
    sense: str
    points: Array
    cells: tuple[tuple[str, IntArray], ...]
    times: Array
    temps: NDArray[np.floating]
    hardness: Array
    phases: Mapping[str, Array]
    core: Array | None

    @property
    def solid(self) -> bool:
        """Whether the part has three dimensions."""
        return SHAPES[self.cells[0][0]].dim == 3


def read(path: Path) -> Scene:
    """The scene that the parent process left."""
    with np.load(path, allow_pickle=False) as data:
        about = json.loads(str(data["about"]))
        return Scene(
            heading=about["heading"],
            sense=about["sense"],
            points=data["points"],
            cells=tuple((kind, data[f"cells_{k}"]) for k, kind in enumerate(about["kinds"])),
            times=data["times"],
            temps=data["temps"],
            hardness=data["hardness"],
            phases=dict(zip(about["phases"], data["phases"], strict=True)),
            core=None if about["core"] is None else np.array(about["core"]),
        )


class Camera:
    """A part before a camera; it holds the renderer, hence a class.

    ``arrays`` (n_point,) by name are what can be shown: a solid is cut once for all.
    """

    def __init__(self, scene: Scene, arrays: Mapping[str, NDArray[Any]]) -> None:
        if sys.platform.startswith("linux") and not os.environ.get("DISPLAY"):
            # else vtk looks for a display first, and complains
            os.environ.setdefault("VTK_DEFAULT_OPENGL_WINDOW", "vtkEGLRenderWindow")
        import pyvista

        draws: Any = pyvista  # whose decorators hide what its methods take
        self._solid = scene.solid
        grid = draws.UnstructuredGrid(
            {SHAPES[kind].vtk: block for kind, block in scene.cells}, scene.points
        )
        for name, values in arrays.items():
            grid.point_data[name] = np.asarray(values, dtype=np.float64)
        low, high = scene.points.min(axis=0), scene.points.max(axis=0)
        size = high - low
        # the upright plane that shows the more of the inside
        across = bool(size[0] >= size[1])
        towards = np.array(TOWARDS if across else (-TOWARDS[1], TOWARDS[0], TOWARDS[2]))
        self._bodies = {}
        self._face: Any = None
        if self._solid:
            at = 0.5 * (low + high) if scene.core is None else scene.core
            normal = (0.0, -1.0, 0.0) if across else (1.0, 0.0, 0.0)
            self._bodies[False] = _outside(grid)
            self._bodies[True] = _outside(grid.clip(normal=normal, origin=at, invert=True))
            # the cut alone once more, a hair before it: without shades its colours read true
            self._face = grid.slice(normal=normal, origin=at)
            self._face.points = self._face.points + 1e-4 * float(size.max()) * np.array(normal)
            right, up = _extent(scene.points, towards)
        else:
            towards = np.array((0.0, 0.0, 1.0))
            self._bodies[True] = _outside(grid)
            right, up = size[0], size[1]
        scale = PIXELS / max(right, up)
        width, height = (max(80, math.ceil(MARGIN * scale * side)) for side in (right, up))
        self.mm_per_pixel = 1.0 / scale
        self._plotter = draws.Plotter(off_screen=True, window_size=(width, height))
        self._plotter.set_background("white")
        self._plotter.enable_anti_aliasing("ssaa")
        self._plotter.enable_parallel_projection()
        far = 10.0 * float(np.linalg.norm(size))
        camera = self._plotter.camera
        camera.focal_point = 0.5 * (low + high)
        camera.position = 0.5 * (low + high) + far * towards / np.linalg.norm(towards)
        camera.up = (0.0, 0.0, 1.0) if self._solid else (0.0, 1.0, 0.0)
        camera.parallel_scale = 0.5 * height / scale
        camera.clipping_range = (0.1 * far, 2.0 * far)

    def view(
        self, name: str, colours: Any, limits: tuple[float, float], *, opened: bool = True
    ) -> Image:
        """The part with an array in colours; ``opened`` cuts a solid and looks inside."""
        body, edges = self._bodies[opened or not self._solid]
        self._plotter.renderer.RemoveAllViewProps()
        lit = [(body, self._solid)]
        if self._solid and opened:
            lit.append((self._face, False))
        for mesh, lighting in lit:
            self._plotter.add_mesh(
                mesh,
                scalars=name,
                cmap=colours,
                clim=limits,
                nan_color="#D8D8D8",
                show_scalar_bar=False,
                reset_camera=False,
                lighting=lighting,
                ambient=0.7,
                diffuse=0.4,
                specular=0.0,
                copy_mesh=True,
                render=False,
            )
        self._plotter.add_mesh(
            edges, color=GUIDE, line_width=2.0, lighting=False, reset_camera=False, render=False
        )
        self._plotter.render()
        image = self._plotter.screenshot(return_img=True)
        return np.ascontiguousarray(image[..., :3], dtype=np.uint8)


def _outside(grid: Any) -> tuple[Any, Any]:
    """The surface of a body and the lines along its edges."""
    surface = grid.extract_surface(algorithm=None)
    edges = surface.extract_feature_edges(EDGE_ANGLE)
    edges.clear_data()
    return surface, edges


def _extent(points: Array, towards: Array) -> tuple[float, float]:
    """Width and height of a solid as the camera sees it."""
    ahead = towards / np.linalg.norm(towards)
    right = np.cross((0.0, 0.0, 1.0), ahead)
    right /= np.linalg.norm(right)
    up = np.cross(ahead, right)
    return float(np.ptp(points @ right)), float(np.ptp(points @ up))


def draw(scene: Scene, folder: Path) -> tuple[Path, ...]:
    """Draw all pictures of a scene into an existing folder."""
    strip, frames = _moments(scene, STRIP), _moments(scene, FRAMES)
    arrays: dict[str, NDArray[Any]] = {"hardness": scene.hardness}
    arrays |= {name: 100.0 * share for name, share in scene.phases.items()}
    arrays |= {_at(k): scene.temps[k] for k in sorted({*strip, *frames})}
    camera = Camera(scene, arrays)
    written = [_hardness(scene, camera, folder / HARDNESS)]
    if scene.phases:
        written.append(_phases(scene, camera, folder / PHASES))
    if len(scene.temps) > 1:
        written.append(_temperature(scene, camera, strip, folder / TEMPERATURE))
        written.append(_cooling(scene, camera, frames, folder / COOLING))
    return tuple(written)


def _at(moment: int) -> str:
    return f"temperature {moment}"


def _hardness(scene: Scene, camera: Camera, path: Path) -> Path:
    limits = around(scene.hardness, least=10.0, margin=0.0)
    titles = {False: "outside", True: "cut open"} if scene.solid else {True: ""}
    images = [camera.view("hardness", MAP, limits, opened=opened) for opened in titles]
    figure, axes = _sheet(scene, images, list(titles.values()), camera, columns=2)
    _scale(figure, axes, MAP, limits, "hardness [HV]")
    return _save(figure, path)


def _phases(scene: Scene, camera: Camera, path: Path) -> Path:
    from matplotlib.colors import LinearSegmentedColormap

    limits = (0.0, 100.0)
    maps = {
        name: LinearSegmentedColormap.from_list(name, ["#F7F7F7", PHASE[name]])
        for name in scene.phases
    }
    images = [camera.view(name, colours, limits) for name, colours in maps.items()]
    titles = [
        f"{PHASE_LABEL[name]}, {100.0 * share.min():.0f} to {100.0 * share.max():.0f} %"
        for name, share in scene.phases.items()
    ]
    figure, axes = _sheet(scene, images, titles, camera, columns=3, own_scales=True)
    for one, colours in zip(axes, maps.values(), strict=True):
        _scale(figure, [one], colours, limits, "mass fraction [%]")
    return _save(figure, path)


def _temperature(scene: Scene, camera: Camera, moments: list[int], path: Path) -> Path:
    limits = _temp_limits(scene)
    images = [camera.view(_at(k), MAP, limits) for k in moments]
    tall = images[0].shape[0] > 1.6 * images[0].shape[1]
    columns = len(moments) if tall else 3
    titles = [_moment_text(scene, k) for k in moments]
    figure, axes = _sheet(scene, images, titles, camera, columns=columns)
    _scale(figure, axes, MAP, limits, "temperature [°C]")
    return _save(figure, path)


def _cooling(scene: Scene, camera: Camera, moments: list[int], path: Path) -> Path:
    """An animation over moments between which about as much heat is given off."""
    from PIL import Image as Pictures

    limits = _temp_limits(scene)
    images = [camera.view(_at(k), MAP, limits) for k in moments]
    titles = [_moment_text(scene, k) for k in moments]
    figure, (axes,) = _sheet(
        scene, images[:1], titles[:1], camera, columns=1, width=0.75 * WIDTH_INCH
    )
    _scale(figure, [axes], MAP, limits, "temperature [°C]")
    frames = [_drawn(figure)]
    figure.set_layout_engine("none")  # nothing moves between frames
    for image, title in zip(images[1:], titles[1:], strict=True):
        axes.images[0].set_data(image)
        axes.set_title(label(title), fontsize=SMALL, pad=4.0)
        frames.append(_drawn(figure))
    top, bottom = _filled(frames[0])
    pictures = [Pictures.fromarray(frame[top:bottom]) for frame in frames]
    # each frame with colours of its own, else the scale would show as steps
    indexed = [p.quantize(colors=255, dither=Pictures.Dither.NONE) for p in pictures]
    indexed[0].save(
        path,
        save_all=True,
        append_images=indexed[1:],
        duration=[FRAME_MS] * (len(indexed) - 1) + [LAST_MS],
        loop=0,
    )
    return path


def _moment_text(scene: Scene, k: int) -> str:
    temps = scene.temps[k]
    return f"{_time(scene.times[k])}: {temps.min():.0f} to {temps.max():.0f} °C"


def _temp_limits(scene: Scene) -> tuple[float, float]:
    low, high = around((float(scene.temps.min()), float(scene.temps.max())), least=20.0, margin=0.0)
    return 50.0 * math.floor(low / 50.0), 50.0 * math.ceil(high / 50.0)


def _moments(scene: Scene, count: int) -> list[int]:
    """Stored times between which the part cools by about as much each time."""
    if not len(scene.temps):
        return []
    mean = scene.temps.mean(axis=1)
    wanted = np.linspace(float(mean[0]), float(mean[-1]), count)
    nearest = {int(np.argmin(np.abs(mean - level))) for level in wanted}
    return sorted(nearest | {0, len(mean) - 1})


def _time(seconds: float) -> str:
    if seconds < 120.0:
        return f"{seconds:.3g} s"
    return f"{seconds / 60.0:.3g} min" if seconds < 7200.0 else f"{seconds / 3600.0:.3g} h"


def _sheet(
    scene: Scene,
    images: list[Image],
    titles: list[str],
    camera: Camera,
    *,
    columns: int,
    width: float = WIDTH_INCH,
    own_scales: bool = False,
) -> "tuple[Figure, list[Axes]]":
    """A sheet with the views of one part beside each other, and a bar of known length."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    columns = min(columns, len(images))
    rows = math.ceil(len(images) / columns)
    high, wide = images[0].shape[:2]
    room = width - (0.9 * columns if own_scales else 1.1)
    height = rows * ((high / wide + 0.08) * room / columns + 0.3) + 0.7
    figure = Figure(figsize=(width, min(max(height, 2.4), HIGHEST_INCH)), layout="compressed")
    figure.set_facecolor("white")
    FigureCanvasAgg(figure)
    places = list(figure.subplots(rows, columns, squeeze=False).ravel())
    figure.suptitle(scene.heading, fontsize=SIZE + 1.0)
    for spare in places[len(images) :]:
        spare.set_axis_off()
    long = max(high, wide)
    down = high + 0.03 * long
    for k, (axes, image, title) in enumerate(zip(places, images, titles, strict=False)):
        axes.imshow(image, interpolation="antialiased")
        axes.set_axis_off()
        axes.set_title(label(title), fontsize=SMALL, pad=4.0)
        # the same room below each, so that rows and columns stay even
        axes.set_xlim(-0.5, wide - 0.5)
        axes.set_ylim(down + 0.035 * long, -0.5)
        if k == 0:
            _length(axes, wide, down, camera.mm_per_pixel)
    return figure, places[: len(images)]


def _length(axes: "Axes", wide: int, down: float, mm_per_pixel: float) -> None:
    """A bar below the view that says how long it is."""
    rough = 0.35 * wide * mm_per_pixel
    decade = 10.0 ** math.floor(math.log10(rough))
    length = max(s * decade for s in (1.0, 2.0, 5.0) if s * decade <= rough)
    pixels, margin = length / mm_per_pixel, 0.5 * wide * (1.0 - 1.0 / MARGIN)
    axes.plot([margin, margin + pixels], [down, down], color=BLACK, lw=2.0, clip_on=False)
    axes.text(
        margin + pixels + 0.02 * wide,
        down,
        f"{length:g} mm",
        fontsize=SMALL,
        va="center",
        clip_on=False,
    )


def _scale(
    figure: "Figure", axes: "list[Axes]", colours: Any, limits: tuple[float, float], name: str
) -> None:
    from matplotlib.cm import ScalarMappable
    from matplotlib.colors import Normalize

    bar = figure.colorbar(
        ScalarMappable(Normalize(*limits), colours),
        ax=axes,
        location="right",
        shrink=0.85,
        aspect=22,
        pad=0.02,
    )
    bar.set_label(name, fontsize=SMALL)
    bar.ax.tick_params(labelsize=SMALL)


def _drawn(figure: "Figure") -> Image:
    figure.set_dpi(DPI)
    canvas: Any = figure.canvas
    canvas.draw()
    return np.array(canvas.buffer_rgba())[..., :3]


def _filled(picture: Image) -> tuple[int, int]:
    """First and last row that hold anything, with a little white around."""
    rows = np.flatnonzero((picture < 255).any(axis=(1, 2)))
    return max(int(rows[0]) - 12, 0), int(rows[-1]) + 13


def _save(figure: "Figure", path: Path) -> Path:
    from matplotlib.image import imsave

    picture = _drawn(figure)
    top, bottom = _filled(picture)
    imsave(path, picture[top:bottom], format="png", dpi=DPI, metadata={"Software": "midradius"})
    return path


if __name__ == "__main__":
    draw(read(Path(sys.argv[1])), Path(sys.argv[2]))
