"""What is wrong with a case file: each fault with its line, all of them together."""

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

from midradius.thermo.errors import InputFault, MidradiusError

from .caselines import KeyPath, line_of

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_LONGEST = 60  # characters of a value in a message
_DEEPEST = 4  # tables within tables shown in a message
_MOST = 40  # faults shown at once


@dataclass(frozen=True)
class Fault:
    """One thing to mend.

    ``value`` is as its writer would recognise it, empty where a key is missing;
    ``key`` is empty where the file as a whole is at fault; where ``allowed`` is
    empty, ``value`` is the whole sentence. ``line`` is None where none can be named.
    """

    line: int | None
    key: str
    value: str
    allowed: str
    remedy: str
    path: str

    def __str__(self) -> str:
        place = f"{self.path}, line {self.line}" if self.line else self.path
        if not self.allowed:
            said = self.value
        elif not self.value:
            said = f"{self.key} is missing, but must be {self.allowed}"
        else:
            said = f"{self.key} = {self.value}, but must be {self.allowed}"
        remedy = f"\n  {self.remedy}" if self.remedy else ""
        return f"{place}: {said}.{remedy}"


class CaseFaults(MidradiusError):
    """All faults of one case file, in the order of its lines."""

    def __init__(self, faults: tuple[Fault, ...]) -> None:
        self.faults = tuple(sorted(faults, key=lambda fault: fault.line or 0))
        shown = [str(fault) for fault in self.faults[:_MOST]]
        if len(self.faults) > _MOST:
            shown.append(f"... and {len(self.faults) - _MOST} more.")
        super().__init__("\n".join(shown))


class Notebook:
    """Collects the faults of one file while it is read; looks up lines only if there are any."""

    def __init__(
        self, path: str, folder: Path, locate: Callable[[], Mapping[KeyPath, int]]
    ) -> None:
        self.folder = folder
        self._path = path
        self._locate = locate
        self._found: list[tuple[KeyPath, str, str, str]] = []

    def add(self, key: KeyPath, value: object, allowed: str, remedy: str = "") -> None:
        """Note a value that must change."""
        self._found.append((key, shown_value(value), allowed, remedy))

    def missing(self, key: KeyPath, allowed: str, remedy: str = "") -> None:
        """Note a key that must be given."""
        self._found.append((key, "", allowed, remedy))

    def refuse(self, key: KeyPath, sentence: str, remedy: str) -> None:
        """Note what cannot be answered, in a sentence of its own."""
        self._found.append((key, sentence, "", remedy))

    def pass_on(self, key: KeyPath, value: object, fault: InputFault) -> None:
        """Note a fault that a lower floor found in this value."""
        self.add(key, value, fault.allowed, fault.remedy)

    def has(self, key: KeyPath) -> bool:
        """Whether this key, or one inside it, is already at fault."""
        return any(found[0][: len(key)] == key for found in self._found)

    def close(self) -> None:
        """Raise :class:`CaseFaults` if anything was noted."""
        if not self._found:
            return
        lines = self._locate()
        raise CaseFaults(
            tuple(
                Fault(line_of(lines, key), shown_key(key), value, allowed, remedy, self._path)
                for key, value, allowed, remedy in self._found
            )
        )


def shown_key(key: KeyPath) -> str:
    """``("route", 2, "bath")`` as ``route[2].bath``."""
    text = ""
    for part in key:
        if isinstance(part, int):
            text += f"[{part}]"
        else:
            name = part if _BARE.fullmatch(part) else _quoted(part)
            name = name if len(name) <= _LONGEST else name[: _LONGEST - 4] + " ..."
            text += f".{name}" if text else name
    return text


def shown_value(value: object, depth: int = 0) -> str:
    """A value of a TOML file on one short line, much as it was written."""
    if isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, str):
        text = _quoted(value)
    elif isinstance(value, dict | list) and depth == _DEEPEST:
        text = "..."
    elif isinstance(value, dict):
        items = [f"{shown_key((k,))} = {shown_value(v, depth + 1)}" for k, v in value.items()]
        text = "{ " + ", ".join(items) + " }" if items else "{}"
    elif isinstance(value, list):
        text = "[" + ", ".join(shown_value(item, depth + 1) for item in value) + "]"
    elif isinstance(value, int) and value.bit_length() > 200:
        text = "a number of many digits"
    else:
        text = str(value)
    return text if len(text) <= _LONGEST else text[: _LONGEST - 4] + " ..."


def _quoted(text: str) -> str:
    safe = "".join(letter if letter.isprintable() else "?" for letter in text[: _LONGEST * 2])
    return f"'{safe}'" if '"' in safe and "'" not in safe else f'"{safe}"'
