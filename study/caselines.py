"""Where each key of a TOML text stands: a scan for line numbers only.

``tomllib`` gives values without places. This scan walks a text that ``tomllib``
has already accepted, once and in linear time, and notes the first line of every
key, table and array item. It judges nothing; on a text that is not TOML it
stops early and returns what it has.
"""

import re
from bisect import bisect_right
from collections.abc import Mapping
from contextlib import suppress

KeyPath = tuple[str | int, ...]

_GAP = re.compile(r"(?:[ \t\n]|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_BASIC = re.compile(r'"((?:[^"\\\n]|\\.)*)"')
_LITERAL = re.compile(r"'([^'\n]*)'")
_BASIC_BLOCK = re.compile(r'"""(?:[^"\\]|\\.|"{1,2}(?!"))*"{3,5}', re.DOTALL)
_LITERAL_BLOCK = re.compile(r"'''(?:[^']|'{1,2}(?!'))*'{3,5}")
_PLAIN = re.compile(r"[^,\]}\n#]+")
_STRINGS = (_BASIC_BLOCK, _LITERAL_BLOCK, _BASIC, _LITERAL)
_ESCAPE = re.compile(r"\\(u[0-9A-Fa-f]{4}|U[0-9A-Fa-f]{8}|.)")
_ESCAPED = {"b": "\b", "t": "\t", "n": "\n", "f": "\f", "r": "\r"}


def locate(text: str) -> Mapping[KeyPath, int]:
    """First line, counted from 1, of every key path in the text.

    A path is of names and of places in arrays: ``("route", 2, "bath")``.
    """
    scan = _Scan(text.replace("\r\n", "\n"))
    with suppress(_Lost, RecursionError):
        scan.document()
    return scan.lines


def line_of(lines: Mapping[KeyPath, int], path: KeyPath) -> int | None:
    """The line of a path, or of the nearest table around it; None if there is none."""
    while path:
        if path in lines:
            return lines[path]
        path = path[:-1]
    return None


class _Lost(Exception):
    """The text is not what the scan expects."""


class _Scan:
    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.lines: dict[KeyPath, int] = {}
        self._starts = [0] + [found.end() for found in re.finditer("\n", text)]
        self._sizes: dict[KeyPath, int] = {}  # of arrays of tables

    def document(self) -> None:
        table: KeyPath = ()
        while self._next():
            if self._take("[["):
                table = self._header(array=True)
                self._expect("]]")
            elif self._take("["):
                table = self._header(array=False)
                self._expect("]")
            else:
                self._pair(table)

    def _header(self, *, array: bool) -> KeyPath:
        line = self._line()
        path: KeyPath = ()
        names = self._key()
        for count, name in enumerate(names, start=1):
            path += (name,)
            self.lines.setdefault(path, line)
            if array and count == len(names):
                self._sizes[path] = self._sizes.get(path, 0) + 1
            if path in self._sizes:
                path += (self._sizes[path] - 1,)
                self.lines.setdefault(path, line)
        return path

    def _pair(self, table: KeyPath) -> None:
        line = self._line()
        path = table
        for name in self._key():
            path += (name,)
            self.lines.setdefault(path, line)
        self._expect("=")
        self._value(path)

    def _value(self, path: KeyPath) -> None:
        self._next()
        self.lines.setdefault(path, self._line())
        if self._take("["):
            count = 0
            while self._next() and not self._take("]"):
                self._value((*path, count))
                count += 1
                self._next()
                self._take(",")
            return
        if self._take("{"):
            while self._next() and not self._take("}"):
                self._pair(path)
                self._next()
                self._take(",")
            return
        for shape in (*_STRINGS, _PLAIN):
            if found := shape.match(self.text, self.at):
                self.at = found.end()
                return
        raise _Lost

    def _key(self) -> tuple[str, ...]:
        names = []
        while True:
            self._next()
            if found := _BARE_KEY.match(self.text, self.at):
                names.append(found[0])
            elif found := _BASIC.match(self.text, self.at):
                names.append(_ESCAPE.sub(_unescape, found[1]))
            elif found := _LITERAL.match(self.text, self.at):
                names.append(found[1])
            else:
                raise _Lost
            self.at = found.end()
            self._next()
            if not self._take("."):
                return tuple(names)

    def _next(self) -> bool:
        """Pass blanks, line ends and comments; False at the end of the text."""
        found = _GAP.match(self.text, self.at)
        self.at = found.end() if found else self.at
        return self.at < len(self.text)

    def _take(self, token: str) -> bool:
        found = self.text.startswith(token, self.at)
        self.at += len(token) if found else 0
        return found

    def _expect(self, token: str) -> None:
        self._next()
        if not self._take(token):
            raise _Lost

    def _line(self) -> int:
        return bisect_right(self._starts, self.at)


def _unescape(found: re.Match[str]) -> str:
    code = found[1]
    return chr(int(code[1:], 16)) if len(code) > 1 else _ESCAPED.get(code, code)
