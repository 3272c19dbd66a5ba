"""The result folder: built beside its place, moved there whole.

While a run works, its files lie in a hidden folder next to the target, on the
same file system. When all is written it is renamed to the target; on an error
or Ctrl-C it is removed. A killed process leaves the hidden folder, which the
next run for the same target sweeps away; the target itself is at every moment
absent, the old result, or the new one (between two renames of a replacement it
is absent for an instant; a kill in that instant is mended by the next run).

The file ``.midradius-result`` in a finished folder lists what belongs to it. An
earlier result is replaced only if it holds nothing else: a note that somebody
put there is never deleted.
"""

import contextlib
import hashlib
import os
import re
import secrets
import shutil
import socket
import sys
from pathlib import Path
from types import TracebackType

from midradius.thermo.errors import InputFault

MARK = ".midradius-result"
_MARK_HEAD = "midradius result folder 1"
_ALLOWED = "a new folder, an empty folder or an earlier midradius result"


class ResultFolder:
    """Context manager that yields the folder to write into.

    >>> with ResultFolder(Path("shaft-result")) as work:  # doctest: +SKIP
    ...     (work / "profile.csv").write_text("...")

    Parameters
    ----------
    target
        Where the finished folder shall stand; missing parents are made.

    Raises
    ------
    InputFault
        From `check` and on entry: the place is a file, a folder with anything
        but an earlier result in it, a mount point, or cannot be written.
    """

    def __init__(self, target: Path) -> None:
        self.target = target
        self._place = target
        self._work: Path | None = None
        self._made: list[Path] = []

    def check(self) -> None:
        """Refuse a target that could not be written; leaves nothing behind."""
        place = self._resolved()
        if os.path.lexists(place):
            self._check_existing(place)
        missing = [p for p in place.parents if not os.path.exists(p)]
        ground = next(p for p in place.parents if p not in missing)
        trial = ground / _name(place, "try")
        try:
            for path in (place, *missing):
                with contextlib.suppress(FileNotFoundError):
                    os.lstat(ground / path.name)  # fails for a name that is too long
            os.mkdir(trial)
            os.rmdir(trial)
        except OSError as fault:
            raise self._fault("a place that can be written", fault) from fault

    def __enter__(self) -> Path:
        self.check()
        # Once: a change of the working folder must not move a relative target.
        place = self._place = self._resolved()
        sweep(place)
        try:
            for parent in reversed([p for p in place.parents if not os.path.exists(p)]):
                os.mkdir(parent)
                self._made.append(parent)
            self._work = place.parent / _name(place, "new")
            os.mkdir(self._work)
        except BaseException as fault:
            self._discard()
            if isinstance(fault, OSError):
                raise self._fault("a place that can be written", fault) from fault
            raise
        return self._work

    def __exit__(
        self,
        kind: type[BaseException] | None,
        value: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        try:
            if kind is None:
                self._publish()
        finally:
            self._discard()

    def _resolved(self) -> Path:
        try:
            return self.target.resolve()
        except (OSError, RuntimeError, ValueError) as fault:
            raise self._fault("a usable path", fault) from fault

    def _check_existing(self, place: Path) -> None:
        if not place.is_dir():
            raise InputFault(
                "output folder",
                shown(self.target),
                _ALLOWED,
                "A file of that name is there.",
            )
        if os.path.ismount(place):
            raise InputFault(
                "output folder",
                shown(self.target),
                "a folder that can be moved",
                "This one is a mount point: name a folder inside it.",
            )
        try:
            foreign = _foreign(place)
        except OSError as fault:
            raise self._fault(_ALLOWED, fault) from fault
        if foreign:
            raise InputFault(
                "output folder",
                shown(self.target),
                _ALLOWED,
                f"It holds {foreign}: choose another place, or move that away.",
            )

    def _publish(self) -> None:
        assert self._work is not None
        place = self._place
        if os.path.lexists(place):
            self._check_existing(place)
        files = sorted(p for p in self._work.rglob("*") if p.is_file())
        listing = [_MARK_HEAD, *(p.relative_to(self._work).as_posix() for p in files)]
        (self._work / MARK).write_text("\n".join(listing) + "\n", encoding="utf-8")
        for path in (*files, self._work / MARK):
            _sync(path)
        aside = place.parent / _name(place, "old")
        try:
            if place.exists():
                os.rename(place, aside)
            os.rename(self._work, place)
        except BaseException:
            if aside.exists() and not place.exists():
                os.rename(aside, place)
            raise
        self._work = None
        self._made = []
        shutil.rmtree(aside, ignore_errors=True)

    def _discard(self) -> None:
        if self._work is not None:
            shutil.rmtree(self._work, ignore_errors=True)
            self._work = None
        for parent in reversed(self._made):
            with contextlib.suppress(OSError):
                os.rmdir(parent)
        self._made = []

    def _fault(self, allowed: str, fault: Exception) -> InputFault:
        # Without the hidden name that was tried, which would only puzzle.
        reason = getattr(fault, "strerror", None) or str(fault)
        return InputFault("output folder", shown(self.target), allowed, f"{reason}.")


def shown(target: Path) -> str:
    """A path on one line of a message, whatever its name holds."""
    return '"' + "".join(c if c.isprintable() else "?" for c in str(target)) + '"'


def sweep(place: Path) -> None:
    """Clear what dead processes of this machine left beside ``place``.

    An earlier result that was set aside and never replaced is put back.
    """
    start = _stem(place)
    pattern = re.compile(re.escape(start) + r"(\d+)-[0-9a-f]+-(new|old|try)$")
    if not place.parent.is_dir():
        return
    for entry in list(place.parent.iterdir()):
        match = pattern.match(entry.name)
        if match is None or _alive(int(match[1])):
            continue
        if match[2] == "old" and not os.path.lexists(place):
            with contextlib.suppress(OSError):
                os.rename(entry, place)
        else:
            shutil.rmtree(entry, ignore_errors=True)


def _stem(place: Path) -> str:
    # A digest, not the name: the hidden name must not outgrow the file system's
    # limit when the target's name just fits it. The host, because a process
    # number says nothing about another machine on a shared disk.
    digest = hashlib.sha256(os.fsencode(place.name)).hexdigest()[:10]
    host = re.sub(r"[^A-Za-z0-9]", "", socket.gethostname())[:24] or "host"
    return f".midradius-{digest}-{host}-"


def _name(place: Path, role: str) -> str:
    return f"{_stem(place)}{os.getpid()}-{secrets.token_hex(4)}-{role}"


def _foreign(place: Path) -> str:
    """Name one thing in the folder that no run put there, or ``""``."""
    mark = place / MARK
    lines: list[str] = []
    if mark.is_file() and not mark.is_symlink():
        lines = mark.read_text(encoding="utf-8", errors="replace").splitlines()
    if lines[:1] != [_MARK_HEAD]:
        return next((entry.name for entry in place.iterdir()), "")
    known = {MARK, *lines[1:]}
    for path in sorted(place.rglob("*")):
        name = path.relative_to(place).as_posix()
        if name not in known and (path.is_symlink() or not path.is_dir()):
            return name
    return ""


def _sync(path: Path) -> None:
    # Some file systems refuse fsync; the rename still gives whole or nothing
    # unless the power fails.
    with path.open("rb+") as file, contextlib.suppress(OSError):
        os.fsync(file.fileno())


def _alive(pid: int) -> bool:
    if sys.platform == "win32":
        # os.kill(pid, 0) would send Ctrl-C on Windows.
        import ctypes

        kernel = ctypes.windll.kernel32
        handle = kernel.OpenProcess(0x1000, False, pid)
        if not handle:
            return False
        code = ctypes.c_ulong()
        kernel.GetExitCodeProcess(handle, ctypes.byref(code))
        kernel.CloseHandle(handle)
        return code.value == 259
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    except (PermissionError, OverflowError):
        return True
    return True
