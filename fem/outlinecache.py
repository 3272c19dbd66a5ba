"""Outlines meshed once: the same outline, asked for the same cells, finds its mesh again.

A mesh is known by a digest of the outline's bytes, of all that was asked and of our
own meshing code. Mesh and statement are made in a folder of their own and moved into
place whole, the statement last; it holds the digest of its mesh, so that neither a
torn file nor two processes at once can pass for a mesh.
"""

import atexit
import hashlib
import json
import os
import shutil
import tempfile
from dataclasses import asdict, replace
from functools import cache
from pathlib import Path
from typing import Any

from midradius.fem.outline import Meshed, Sense, Slice, check_source, mesh_outline
from midradius.fem.outlineloops import refuse
from midradius.thermo.errors import InputFault

LARGEST = 500_000_000  # bytes of an outline


def meshed_once(
    source: Path,
    *,
    sense: Sense,
    first: float,
    length_unit: str | None = None,
    layers: tuple[str, ...] = (),
    cut: Slice | None = None,
    uncooled: tuple[str, ...],
) -> Meshed:
    """As `mesh_outline`, into the user's cache; meshed only where it is not there yet.

    Raises
    ------
    MissingExtra, InputFault
        As `mesh_outline`; nothing is kept then.
    """
    check_source(source)
    data = _bytes(source)
    asked: dict[str, Any] = {
        "sense": sense,
        "first": first,
        "length_unit": length_unit,
        "layers": layers,
        "cut": cut,
        "uncooled": uncooled,
    }
    known = asked | {"kind": source.suffix.lower(), "cut": cut and asdict(cut)}
    digest = hashlib.sha256(json.dumps(known, sort_keys=True).encode() + _code() + data)
    target = cache_folder() / f"{digest.hexdigest()[:32]}.msh"
    found = _found(target)
    if found is not None:
        return found
    try:
        with tempfile.TemporaryDirectory(prefix=".making-", dir=target.parent) as folder:
            # of these bytes, whatever happens to the file meanwhile
            copy, mesh, told = (Path(folder) / name for name in (source.name, "a.msh", "a.json"))
            copy.write_bytes(data)
            made = replace(mesh_outline(copy, mesh, **asked), path=target)
            stated = asdict(made) | {"path": None, "sha256": _sha256(mesh)}
            told.write_text(json.dumps(stated), encoding="utf-8")
            os.replace(mesh, target)
            os.replace(told, target.with_suffix(".json"))
    except OSError as error:
        raise InputFault(
            "cache folder",
            f'"{target.parent}"',
            "a place that can be written",
            f"{error.strerror or error}. Or set XDG_CACHE_HOME to another folder.",
        ) from error
    return made


def cache_folder() -> Path:
    """Where meshes are kept: in the user's cache, else in a folder that ends with the run."""
    home = os.environ.get("XDG_CACHE_HOME") or os.path.join(os.path.expanduser("~"), ".cache")
    folder = Path(home) / "midradius" / "outlines"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError:
        return _passing()


@cache
def _passing() -> Path:
    folder = tempfile.mkdtemp(prefix="midradius-")
    atexit.register(shutil.rmtree, folder, ignore_errors=True)
    return Path(folder)


def _bytes(source: Path) -> bytes:
    try:
        with source.open("rb") as file:
            data = file.read(LARGEST + 1)
    except OSError as error:
        raise refuse(source.name, "a file that can be read", f"{error.strerror}.") from error
    if len(data) > LARGEST:
        raise refuse(source.name, f"at most {LARGEST // 1_000_000} MB", "Take small details out.")
    return data


@cache
def _code() -> bytes:
    """A digest of the modules that mesh: other code, other meshes."""
    found = hashlib.sha256()
    for path in sorted(Path(__file__).parent.glob("outline*.py")):
        found.update(path.read_bytes())
    return found.digest()


def _sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def _found(target: Path) -> Meshed | None:
    """The kept mesh, None where there is none or where it is not whole."""
    try:
        told = json.loads(target.with_suffix(".json").read_text(encoding="utf-8"))
        if told.pop("sha256") != _sha256(target):
            return None
        found: dict[str, Any] = {
            name: tuple(value) if isinstance(value, list) else value for name, value in told.items()
        }
        return Meshed(**found | {"path": target})
    except (OSError, ValueError, TypeError, KeyError, AttributeError):
        return None
