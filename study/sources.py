"""Every model of the package: its work, its status and where it holds.

Found by looking, not by a list: each module of the two lower floors that states a
``SOURCE`` or ``SOURCES`` is one sheet. The range is the "Holds for" part of its
docstring, which Python leaves out when it runs with ``-OO``. The media name a
source each.
"""

import inspect
import re
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from importlib import import_module, resources

from midradius.study.case import Case
from midradius.study.seriescase import SeriesCase
from midradius.thermo.source import Source

FLOORS = ("midradius.thermo", "midradius.fem", "midradius.study")
MEDIA = "midradius.fem.media"
_STATES = re.compile(r"^SOURCES?\b", re.MULTILINE)
_SECTION = re.compile(r"^(?P<title>[A-Z][\w ]*)\n-{3,}$", re.MULTILINE)
UNCHECKED = ("remembered", "estimate")


@dataclass(frozen=True)
class Sheet:
    """What one module says of itself; ``holds`` is its range in words, one line."""

    module: str
    title: str
    holds: str
    sources: tuple[Source, ...]


@dataclass(frozen=True)
class Used:
    """One source with the range of the model that it stands for."""

    source: Source
    holds: str


@cache
def sheets() -> tuple[Sheet, ...]:
    """Every module that rests on published work, floor by floor, by name."""
    return tuple(_sheet(module) for floor in FLOORS for module in _modules(floor))


def find(text: str) -> tuple[Sheet, ...]:
    """The sheets that mention ``text``, in any case, each with the sources that do.

    Where the module itself is called so, all of its sources are kept.
    """
    wanted = text.strip().casefold()
    found = []
    for sheet in sheets():
        sources = sheet.sources
        if wanted not in f"{sheet.module} {sheet.title}".casefold():
            sources = tuple(s for s in sources if wanted in f"{s.model} {s.work}".casefold())
        if sources:
            found.append(Sheet(sheet.module, sheet.title, sheet.holds, sources))
    return tuple(found)


def used(sources: Iterable[Source]) -> tuple[Used, ...]:
    """Sources of a run, each with its range; empty where no module states one."""
    ranges: dict[Source, str] = {}
    for sheet in sheets():
        for source in sheet.sources:
            ranges.setdefault(source, sheet.holds)
    return tuple(Used(source, ranges.get(source, "")) for source in dict.fromkeys(sources))


def of_case(case: Case | SeriesCase) -> tuple[Used, ...]:
    """The sources that a run of ``case`` rests on, found without solving it.

    Raises
    ------
    InputFault
        As the run itself, for what it can say before it solves.
    """
    from midradius.study.basis import sources_of
    from midradius.study.setup import prepare

    if isinstance(case, SeriesCase):
        from midradius.fem.given import SOURCES

        return used(sources_of(case, SOURCES))
    return used(sources_of(case, prepare(case).sources))


def _modules(floor: str) -> list[str]:
    """The modules of a floor that state a source; the others are not even imported."""
    files = resources.files(floor).iterdir()
    texts = {item.name: item.read_text(encoding="utf-8") for item in files if _is_code(item.name)}
    names = {f"{floor}.{name.removesuffix('.py')}": text for name, text in texts.items()}
    return sorted(name for name, text in names.items() if _STATES.search(text) or name == MEDIA)


def _is_code(name: str) -> bool:
    return name.endswith(".py")


def _sheet(name: str) -> Sheet:
    module = import_module(name)
    text = inspect.cleandoc(module.__doc__ or "")
    if name == MEDIA:
        sources = [module.medium(known).source for known in module.names()]
    else:
        sources = list(getattr(module, "SOURCES", ())) or [module.SOURCE]
    title = text.partition("\n")[0].rstrip(".")
    short = name.removeprefix("midradius.")
    return Sheet(short, title, _section(text, "Holds for"), tuple(dict.fromkeys(sources)))


def _section(text: str, title: str) -> str:
    """One underlined section of a docstring, on one line."""
    heads = list(_SECTION.finditer(text))
    for head, after in zip(heads, [*heads[1:], None], strict=True):
        if head["title"] == title:
            body = text[head.end() : after.start() if after else None]
            return " ".join(body.replace("``", "").split())
    return ""
