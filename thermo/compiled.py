"""One decorator for compiled kernels: cached safely, or compiled anew each time.

The compiler's own cache looks only at the file of each function. A kernel that
calls one of another file would keep running the old code of that file, so the
cache folder here carries a digest of every file that holds kernels. Where no
folder can be written the kernels are compiled in each process.
"""

import hashlib
import os
import shutil
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import numba

F = TypeVar("F", bound=Callable[..., Any])

_PREFIX = "midradius-kernels-"
_FLOORS = ("thermo", "fem")


def kernel(function: F) -> F:
    """Compile ``function`` without the interpreter lock, cached where possible."""
    return _compiled(function, forceinline=False)


def inner_kernel(function: F) -> F:
    """A kernel whose code is copied into its callers.

    For what is called at every node: a call hands over each array as seven numbers,
    which takes longer than the work.
    """
    return _compiled(function, forceinline=True)


def _compiled(function: F, *, forceinline: bool) -> F:
    options: dict[str, Any] = {
        "nogil": True,
        "fastmath": False,
        "error_model": "numpy",
        "forceinline": forceinline,
    }
    folder = cache_folder()
    if folder is not None:
        with _cached_in(folder):
            try:
                compiled: F = numba.njit(cache=True, **options)(function)
                return compiled
            except RuntimeError:  # the folder stopped being writable
                pass
    plain: F = numba.njit(cache=False, **options)(function)
    return plain


@cache
def cache_folder() -> Path | None:
    """Where compiled kernels of exactly this source are kept; None if nowhere.

    Beside the package where that can be written, else in the user's cache.
    """
    digest = _digest()
    if digest is None:
        return None
    home = os.environ.get("XDG_CACHE_HOME") or os.path.join(os.path.expanduser("~"), ".cache")
    for parent in (Path(__file__).parent / "__pycache__", Path(home) / "midradius"):
        folder = parent / f"{_PREFIX}{digest}"
        if _writable(folder):
            if parent.name == "__pycache__":  # this copy of the package needs no other
                for old in parent.glob(f"{_PREFIX}*"):
                    if old != folder:
                        shutil.rmtree(old, ignore_errors=True)
            return folder
    return None


def _digest() -> str | None:
    """A digest of all files with kernels, of the compiler and of the interpreter."""
    found = hashlib.sha256(f"{numba.__version__} {sys.version}".encode())
    root = Path(__file__).parents[1]
    try:
        for floor in _FLOORS:
            for path in sorted((root / floor).glob("*.py")):
                text = path.read_bytes()
                if b"@kernel" in text or b"@inner_kernel" in text:
                    found.update(path.name.encode() + b"\0" + text)
    except OSError:  # a zipped or otherwise unreadable package
        return None
    return found.hexdigest()[:16]


def _writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        probe = folder / f".probe-{os.getpid()}"
        probe.write_bytes(b"")
        probe.unlink()
    except OSError:
        return False
    return True


@contextmanager
def _cached_in(folder: Path) -> Iterator[None]:
    """The compiler reads its cache folder from a setting, once per function."""
    settings: Any = numba.config  # its type stubs do not list the settings
    before = settings.CACHE_DIR
    settings.CACHE_DIR = str(folder)
    try:
        yield
    finally:
        settings.CACHE_DIR = before
