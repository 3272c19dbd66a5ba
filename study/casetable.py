"""One TOML table while it is read: values come out in SI, faults go to the notebook.

Each ``take`` returns None where the key is absent or at fault, so that reading
goes on and the rest of the file is judged as well.
"""

import math
from collections.abc import Mapping, Sequence
from difflib import get_close_matches
from unicodedata import category

from midradius.thermo import units
from midradius.thermo.errors import InputFault

from .casefaults import Notebook, shown_key
from .caselines import KeyPath

Range = tuple[float, float]


class Table:
    """The keys of one table, and the notebook for what is wrong with them."""

    def __init__(self, data: Mapping[str, object], place: KeyPath, notes: Notebook) -> None:
        self._data = data
        self.place = place
        self.notes = notes

    def key(self, name: str) -> KeyPath:
        """The full path of a key of this table."""
        return (*self.place, name)

    def raw(self, name: str) -> object:
        """The value as TOML gave it; None where absent."""
        return self._data.get(name)

    def names(self) -> tuple[str, ...]:
        """The keys that are written."""
        return tuple(self._data)

    def has(self, name: str) -> bool:
        """Whether the key is written, right or wrong."""
        return name in self._data

    def fault(self, name: str, allowed: str, remedy: str = "") -> None:
        """Note that the value of this key must change."""
        self.notes.add(self.key(name), self.raw(name), allowed, remedy)

    def refuse(self, name: str, sentence: str, remedy: str = "") -> None:
        """Note in a sentence of its own why this key is not answered."""
        self.notes.refuse(self.key(name), sentence, remedy)

    def missing(self, name: str, allowed: str, remedy: str = "") -> None:
        """Note that this key must be given."""
        self.notes.missing(self.key(name), allowed, remedy)

    def quantity(self, name: str, kind: units.Kind, within: Range) -> float | None:
        """A text with a unit, in SI."""
        if not self.has(name):
            return None
        return quantity(self.notes, self.key(name), self.raw(name), kind, within)

    def text(self, name: str, longest: int) -> str | None:
        """A text of one line, not empty."""
        value = self.raw(name)
        if value is None:
            return None
        if not isinstance(value, str) or not is_line(value, longest):
            self.fault(name, f"a text in quotes, on one line, of 1 to {longest} characters")
            return None
        return value

    def choice(self, name: str, known: Sequence[str]) -> str | None:
        """One word of a closed list; the nearest is named where it is another."""
        value = self.raw(name)
        if value is None or (isinstance(value, str) and value in known):
            return value
        self.fault(name, one_of(known), nearest(value, known))
        return None

    def integer(self, name: str, within: tuple[int, int]) -> int | None:
        """A whole number without unit."""
        value = self.raw(name)
        if value is None:
            return None
        whole = isinstance(value, int) and not isinstance(value, bool)
        if isinstance(value, int) and whole and within[0] <= value <= within[1]:
            return value
        self.fault(name, f"a whole number, {within[0]} to {within[1]}, without quotes")
        return None

    def number(self, name: str, meaning: str) -> float | None:
        """A finite number without unit; ``meaning`` says of what."""
        value = self.raw(name)
        if value is None:
            return None
        if isinstance(value, int | float) and not isinstance(value, bool):
            try:
                if math.isfinite(value):
                    return float(value)
            except OverflowError:
                pass
        self.fault(name, f"a finite number, {meaning}, without quotes")
        return None

    def table(self, name: str, what: str) -> "Table | None":
        """A table under this key; ``what`` shows how to write it."""
        value = self.raw(name)
        if value is None:
            return None
        if isinstance(value, dict):
            return Table(value, self.key(name), self.notes)
        self.fault(name, f"a table, written as {what}")
        return None

    def items(self, name: str, what: str) -> list[tuple[KeyPath, object]]:
        """The items of an array, each with its path; ``what`` shows how to write it."""
        value = self.raw(name)
        if value is None:
            return []
        if isinstance(value, list):
            return [((*self.key(name), place), item) for place, item in enumerate(value)]
        self.fault(name, f"an array, written as {what}")
        return []

    def only(
        self,
        known: Sequence[str],
        remedies: Mapping[str, str] | None = None,
        silent: Sequence[str] = (),
    ) -> None:
        """Note every key that is not known here.

        ``remedies`` are for keys known elsewhere; ``silent`` ones are answered
        by the caller.
        """
        for name in self._data:
            if name not in known and name not in silent:
                here = shown_key(self.place)
                allowed = f"one of the keys {', '.join(known)}" + (f" of {here}" if here else "")
                remedy = (remedies or {}).get(name) or nearest(name, known)
                self.fault(name, allowed, remedy or "Take it out.")


def quantity(
    notes: Notebook, key: KeyPath, value: object, kind: units.Kind, within: Range
) -> float | None:
    """One value with a unit in SI, or None and a note."""
    try:
        found = units.parse(value, kind)
    except InputFault as fault:
        notes.pass_on(key, value, fault)
        return None
    if within[0] <= found <= within[1]:
        return found
    notes.add(key, value, f"{units.show(within[0], kind)} to {units.show(within[1], kind)}")
    return None


def is_line(text: str, longest: int = 200) -> bool:
    """Whether a text is one line that prints: not blank, no control characters."""
    prints = (category(letter) for letter in text[: longest + 1])
    return (
        len(text.strip()) > 0
        and len(text) <= longest
        and all(kind[0] != "C" and kind not in ("Zl", "Zp") for kind in prints)
    )


def one_of(known: Sequence[str]) -> str:
    """``a, b or c`` in quotes."""
    quoted = [f'"{word}"' for word in known]
    return ", ".join(quoted[:-1]) + f" or {quoted[-1]}" if len(quoted) > 1 else quoted[0]


def nearest(value: object, known: Sequence[str]) -> str:
    """A remedy that names the word nearest to a wrong one, or nothing."""
    folded = {word.casefold(): word for word in known}
    near = get_close_matches(str(value)[:80].casefold(), folded, n=1, cutoff=0.55)
    return f'Write "{folded[near[0]]}" if that is meant.' if near else ""
