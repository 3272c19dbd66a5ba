"""A case as TOML text that reads back as the same case."""

import re
from collections.abc import Iterable
from pathlib import Path

from midradius.thermo.errors import InputFault
from midradius.thermo.grades import grade
from midradius.thermo.ratechoice import DEFAULT
from midradius.thermo.units import show

from . import casekeys as keys
from .case import (
    Case,
    Grid,
    MediumUse,
    MeshFile,
    Need,
    OutlineFile,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
    position,
    with_unit,
)
from .seriescase import GivenInput, SeriesCase
from .steelfile import FileSteel
from .tankwrite import tank_lines

_BARE = re.compile(r"[A-Za-z0-9_-]+")


def dumps(case: Case | SeriesCase) -> str:
    """The TOML text of a case, every quantity exact to the last digit.

    A film curve inside the folder of ``case.path`` is written relative to it.
    """
    folder = case.path.parent if case.path else Path()
    lines = [f"title = {_quoted(case.title)}", "", "[steel]", *_steel(case.steel, folder)]
    if isinstance(case, SeriesCase):
        lines += ["", "[temperatures]", *_temperatures(case.temperatures, folder)]
    else:
        lines += ["", "[section]", *_section(case.section, folder)]
    for stage in case.route:
        lines += ["", "[[route]]", *_stage(stage, folder)]
    for need in case.needs:
        lines += ["", "[[need]]", *_need(need)]
    if isinstance(case, SeriesCase):
        points = ", ".join(_point(place) for place in case.outputs.positions)
        lines += ["", "[output]", f"positions = [{points}]"] if points else []
        return "\n".join(lines) + "\n"
    lines += ["", "[output]", *_outputs(case.outputs)]
    lines += ["", "[grid]", *_grid(case.grid)]
    lines += tank_lines(case.load, case.tank, case.shift, folder)
    return "\n".join(lines) + "\n"


def _section(section: SectionInput, folder: Path) -> list[str]:
    lines = [f'form = "{section.form}"']
    for name in keys.ALL_DIMENSIONS:
        size = getattr(section, name)
        if size is not None:
            lines.append(f"{name} = {_length(size)}")
    if section.mesh and section.mesh.outline:
        lines += _outline(section.mesh, section.mesh.outline, folder)
    elif section.mesh:
        lines += _mesh(section.mesh, folder)
    if section.bore_medium:
        lines.append(f"bore_medium = {_inline(section.bore_medium, folder)}")
    if section.emissivity != SectionInput("slab").emissivity:
        lines.append(f"emissivity = {section.emissivity!r}")
    return lines


def _mesh(mesh: MeshFile, folder: Path) -> list[str]:
    lines = [
        f"file = {_quoted(_beside(mesh.file, folder))}",
        f'length_unit = "{mesh.length_unit}"',
        f'sense = "{mesh.sense}"',
    ]
    return lines + _symmetry(mesh)


def _symmetry(mesh: MeshFile) -> list[str]:
    return [f"symmetry = {_list(map(_quoted, mesh.symmetry))}"] if mesh.symmetry else []


def _list(written: Iterable[str]) -> str:
    return f"[{', '.join(written)}]"


def _outline(mesh: MeshFile, outline: OutlineFile, folder: Path) -> list[str]:
    lines = [f"file = {_quoted(_beside(outline.file, folder))}", f'sense = "{mesh.sense}"']
    if outline.length_unit is not None:
        lines.append(f'length_unit = "{outline.length_unit}"')
    if outline.layers:
        lines.append(f"layers = {_list(map(_quoted, outline.layers))}")
    if outline.cut is not None:
        cut = outline.cut
        parts = [f"point = {_list(map(_length, cut.point))}"]
        parts.append(f"normal = {_list(map(repr, cut.normal))}")
        if cut.axis is not None:
            parts.append(f"axis = {_list(map(repr, cut.axis))}")
        lines.append(f"slice = {{ {', '.join(parts)} }}")
    if outline.finest is not None:
        lines.append(f"finest = {_length(outline.finest)}")
    return lines + _symmetry(mesh)


def _temperatures(given: GivenInput, folder: Path) -> list[str]:
    lines = [f"file = {_quoted(_beside(given.file, folder))}"]
    for name in ("time_unit", "temperature_unit", "length_unit", "array"):
        value = getattr(given, name)
        if value is not None:
            lines.append(f"{name} = {_quoted(value)}")
    if given.time_column is not None:
        places = ", ".join(f"{_key(name)} = {_quoted(at)}" for name, at in given.columns.items())
        more = f", places = {{ {places} }}" if places else ""
        lines.append(f"columns = {{ time = {_quoted(given.time_column)}{more} }}")
    if given.decimal != "point":
        lines.append(f"decimal = {_quoted(given.decimal)}")
    if given.starts_at is not None:
        lines.append(f'starts_at = "{show(given.starts_at, "duration")}"')
    return lines


def _point(place: PositionInput) -> str:
    if place.node is not None:
        return f"{{ name = {_quoted(place.name)}, node = {place.node} }}"
    return _quoted(place.name) if place.coordinates is None else _place(place)


def _steel(steel: SteelInput, folder: Path) -> list[str]:
    lines = _of_file(steel.file, folder) if steel.file else [_grade(steel)]
    if steel.grain_astm is not None:
        lines.append(f'austenite_grain = "ASTM {_number(steel.grain_astm)}"')
    if steel.kinetics.name != DEFAULT.name:
        lines.append(f"kinetics = {_quoted(steel.kinetics.name)}")
    if steel.transformation is not None:
        lines.append(f"transformation = {_quoted(_beside(steel.transformation, folder))}")
    if steel.calibration is not None:
        lines.append(f"calibration = {_quoted(_beside(steel.calibration.path, folder))}")
    return lines


def _of_file(file: FileSteel, folder: Path) -> list[str]:
    return [f"file = {_quoted(_beside(file.path, folder))}", f"name = {_quoted(file.name)}"]


def _beside(path: Path, folder: Path) -> str:
    inside = path.is_relative_to(folder)
    return (path.relative_to(folder) if inside else path).as_posix()


def _grade(steel: SteelInput) -> str:
    try:
        if grade(steel.steel.name) == steel.steel:
            return f"grade = {_quoted(steel.steel.name)}"
    except InputFault:
        pass
    amounts = steel.steel.composition.as_dict().items()
    written = ", ".join(f"{name} = {amount!r}" for name, amount in amounts if amount)
    return f"composition = {{ {written} }}"


def _stage(stage: Stage, folder: Path) -> list[str]:
    lines = [f'stage = "{stage.kind}"']
    if stage.kind == "heat":
        lines.append(f'furnace = "{show(stage.at or 0.0, "temperature")}"')
        if stage.start is not None:
            lines.append(f'from = "{show(stage.start, "temperature")}"')
        if stage.ramp is not None:
            lines.append(f'ramp = "{show(stage.ramp, "heating rate")}"')
    elif stage.at is not None:
        lines.append(f'at = "{show(stage.at, "temperature")}"')
    if stage.medium:
        lines += [f"{key} = {value}" for key, value in _medium(stage.medium, folder)]
    if stage.time is not None:
        lines.append(f'time = "{show(stage.time, "duration")}"')
    if stage.until:
        temp = show(stage.until.temp, "temperature")
        lines.append(f"until = {_quoted(f'{stage.until.position} {stage.until.sense} {temp}')}")
    if stage.faces:
        faces = [f"{_key(zone)} = {_inline(use, folder)}" for zone, use in stage.faces.items()]
        lines.append(f"faces = {{ {', '.join(faces)} }}")
    return lines


def _medium(use: MediumUse, folder: Path) -> list[tuple[str, str]]:
    pairs = []
    if use.film_file is not None:
        pairs.append(("film", _quoted(_beside(use.film_file, folder))))
    elif use.name is not None:
        pairs.append(("medium", _quoted(use.name)))
    if use.bath is not None:
        pairs.append(("bath", f'"{show(use.bath, "temperature")}"'))
    return pairs


def _inline(use: MediumUse, folder: Path) -> str:
    pairs = _medium(use, folder)
    if len(pairs) == 1 and pairs[0][0] == "medium":
        return pairs[0][1]
    return "{ " + ", ".join(f"{key} = {value}" for key, value in pairs) + " }"


def _need(need: Need) -> list[str]:
    lines = [] if need.to is not None else [f"position = {_quoted(need.position)}"]
    lines.append(f'quantity = "{need.quantity}"')
    if need.to is not None:
        lines.append(f'to = "{with_unit(need.to, need.to_unit)}"')
    low, high = (
        None if limit is None else f'"{with_unit(limit, need.unit)}"'
        for limit in (need.at_least, need.at_most)
    )
    if low and high:
        lines.append(f"between = [{low}, {high}]")
    else:
        lines.append(f"at_least = {low}" if low else f"at_most = {high}")
    return lines


def _outputs(outputs: Outputs) -> list[str]:
    places = ", ".join(_place(place) for place in outputs.positions)
    lines = [f"positions = [{places}]"]
    for path in outputs.paths:
        start, end = (f"[{', '.join(_length(x) for x in at)}]" for at in (path.start, path.end))
        written = f"name = {_quoted(path.name)}, from = {start}, to = {end}"
        lines.append(f"  {{ {written}, points = {path.n_point} }},")
    if outputs.paths:
        lines[1:] = ["paths = [", *lines[1:], "]"]
    usual = Outputs(())
    if outputs.field_format != usual.field_format:
        lines.append(f'format = "{outputs.field_format}"')
    if outputs.pictures != usual.pictures:
        lines.append(f'pictures = "{outputs.pictures}"')
    if outputs.field_times:
        times = ", ".join(f'"{show(time, "duration")}"' for time in outputs.field_times)
        return [*lines, f"times = [{times}]"]
    return [*lines, f"fields = {outputs.n_field}"]


def _place(place: PositionInput) -> str:
    try:
        if position(place.name) == place:
            return _quoted(place.name)
    except InputFault:
        pass
    if place.coordinates is not None:
        at = ", ".join(_length(value) for value in place.coordinates)
        return f"{{ name = {_quoted(place.name)}, at = [{at}] }}"
    return f"{{ name = {_quoted(place.name)}, depth = {_length(place.depth or 0.0)} }}"


def _grid(grid: Grid) -> list[str]:
    lines = [f'accuracy = "{show(grid.accuracy, "temperature difference")}"']
    if grid.cells:
        lines.insert(0, f"cells = [{', '.join(str(count) for count in grid.cells)}]")
    return lines


def _length(value: float) -> str:
    return f'"{show(value, "length")}"'


def _number(value: float) -> str:
    return repr(value).removesuffix(".0")


def _key(name: str) -> str:
    return name if _BARE.fullmatch(name) else _quoted(name)


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(_visible(letter) for letter in escaped) + '"'


def _visible(letter: str) -> str:
    code = ord(letter)
    return f"\\u{code:04x}" if code < 0x20 or code == 0x7F else letter
