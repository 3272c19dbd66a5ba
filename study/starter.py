"""A commented case to start from, one for each form of section, one on given temperatures.

``starter.toml`` is the case of a round; the other forms change its section and
the place that only a round has. The part is invented.
"""

import re
from collections.abc import Mapping
from importlib.resources import files
from typing import cast

from midradius.thermo.errors import InputFault

from .case import Form
from .casetable import nearest, one_of

_SECTION = re.compile(r'form = "round"\n.*?\n\n', re.DOTALL)
_BORE = """# bore_medium = "insulated"     # left out: the bore sees what the outside sees"""

# Form: (title, lines of the section, a place between surface and core)
_FORMS: Mapping[Form, tuple[str, str, str]] = {
    "slab": (
        "Die plate HF-3110",
        'thickness = "120 mm"\n'
        '# faces that differ: faces = { "far face" = "still air" } in a stage of the route',
        "quarter thickness",
    ),
    "round": ("Pinion shaft HF-2207", "", "mid-radius"),
    "tube": (
        "Cylinder liner HF-1482",
        f'outside = "220 mm"\nbore = "120 mm"\n{_BORE}',
        "quarter thickness",
    ),
    "ball": ("Valve ball HF-0915", 'diameter = "140 mm"', "mid-radius"),
    "bar": ("Guide rail HF-5021", 'width = "90 mm"\nheight = "150 mm"', "quarter thickness"),
    "ring": (
        "Slewing ring blank HF-4006",
        f'outside = "600 mm"\nbore = "440 mm"\nheight = "110 mm"\n{_BORE}',
        "quarter thickness",
    ),
}


def text(form: str = "round") -> str:
    """The TOML text of a starter case that runs as it is.

    Raises
    ------
    InputFault
        If ``form`` is not a form of section.
    """
    if form not in _FORMS:
        raise InputFault("form", f'"{form}"', one_of(tuple(_FORMS)), nearest(form, tuple(_FORMS)))
    case = files("midradius.study").joinpath("starter.toml").read_text(encoding="utf-8")
    if form == "round":
        return case
    title, section, between = _FORMS[cast(Form, form)]
    case = case.replace(_FORMS["round"][0], title).replace('"mid-radius"', f'"{between}"')
    if form != "ball":
        case = case.replace("or cells = 200", f"or cells = {_cells(form)}")
    return _SECTION.sub(lambda _: f'form = "{form}"\n{section}\n\n', case, count=1)


def text_with_temperatures() -> str:
    """The TOML text of a starter case on a file of temperatures, which it does not bring."""
    file = files("midradius.study").joinpath("starter_temperatures.toml")
    return file.read_text(encoding="utf-8")


def _cells(form: str) -> str:
    return "[60, 60]" if form in ("bar", "ring") else "200"
