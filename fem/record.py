"""One HDF5 file that holds a run: what went in, what came out, and proof that both are whole.

Layout
------
Everything lies in the group ``/midradius``.

* ``data/...``: numbers. Each dataset has the attributes ``units`` and
  ``long_name``; arrays are stored with gzip level 1, byte shuffle and a
  Fletcher-32 checksum per chunk.
* ``text/...``: UTF-8 strings; those whose path ends with ``_json`` hold JSON.
* ``provenance/...``: strings that say who computed it, with what and when.
* ``sha256/...``: one digest per dataset above, under the same path.
* attributes ``layout``, ``root_sha256`` and, written last, ``status``.

A digest covers type, shape, values as little-endian bytes, units and long
name, not the compressed bytes, which differ between builds of HDF5. The root
digest covers ``data`` and ``text`` and leaves out ``provenance``: two runs with
the same input and the same numbers share it, whenever and wherever they ran.

The file is built under another name, synced and moved into place. A killed
writer leaves no file under the final name. ``libver`` is pinned to the 1.10
format: VTK's HDF5 crashes on newer layouts.
"""

import hashlib
import os
import platform
import sys
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import UTC, datetime
from importlib import metadata
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from midradius.thermo.errors import InputFault

LAYOUT = 1
GROUP = "midradius"
_LIBVER = ("v110", "v110")
_PACKAGES = ("midradius", "numpy", "scipy", "numba", "h5py", "meshio")


@dataclass(frozen=True)
class Quantity:
    """Numbers with their unit (``"1"`` for a fraction or a count) and what they are."""

    values: NDArray[Any]
    units: str
    long_name: str


@dataclass(frozen=True)
class Record:
    """A record as read: paths such as ``"fields/hardness"`` are the keys."""

    data: Mapping[str, Quantity]
    text: Mapping[str, str]
    provenance: Mapping[str, str]
    root_sha256: str


@dataclass(frozen=True)
class Verification:
    """What a check of a record found; ``faults`` is empty for a whole one."""

    root_sha256: str
    n_dataset: int
    faults: tuple[str, ...]


def provenance() -> dict[str, str]:
    """Versions and platform of this process, and the present time (UTC)."""
    versions = {f"version_{name}": _version(name) for name in _PACKAGES}
    return {
        "created_utc": datetime.now(UTC).isoformat(timespec="seconds"),
        "platform": platform.platform(),
        "machine": platform.machine(),
        "python": sys.version.split()[0],
        **versions,
    }


def _version(name: str) -> str:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return "not installed"


def write_record(
    path: Path,
    *,
    data: Mapping[str, Quantity],
    text: Mapping[str, str],
    made_by: Mapping[str, str],
) -> str:
    """Write a complete record and return its root digest.

    Parameters
    ----------
    path
        The final name; a file that exists there is replaced once the new one
        is whole and on the disk.
    data
        Numbers by path; float64 or int64, any shape, nan allowed.
    text
        Strings by path.
    made_by
        Strings left out of the root digest, see `provenance`.

    Raises
    ------
    InputFault
        A quantity without units or long name, or not numeric.
    """
    import h5py

    for name, quantity in data.items():
        if not quantity.units or not quantity.long_name:
            raise InputFault(f"units of {name}", repr(quantity.units), "stated, '1' for none")
        if quantity.values.dtype.kind not in "fiu":
            raise InputFault(f"type of {name}", str(quantity.values.dtype), "a real number")
    part = path.with_name(f".{path.name}.part")
    try:
        with h5py.File(part, "w", libver=_LIBVER) as file:
            group = file.create_group(GROUP)
            digests = _fill(group, data, text, made_by)
            for name, digest in digests.items():
                group.create_dataset(f"sha256/{name}", data=digest)
            root = _root(digests)
            group.attrs["layout"] = LAYOUT
            group.attrs["root_sha256"] = root
            file.flush()
            group.attrs["status"] = "complete"
        _sync(part)
        os.replace(part, path)
    except BaseException:
        part.unlink(missing_ok=True)
        raise
    return root


def _fill(
    group: Any, data: Mapping[str, Quantity], text: Mapping[str, str], made_by: Mapping[str, str]
) -> dict[str, str]:
    digests = {}
    for name, quantity in data.items():
        values = np.asarray(quantity.values)
        # A single number has no chunks, so neither compression nor checksum.
        packing: dict[str, Any] = (
            {"compression": "gzip", "compression_opts": 1, "shuffle": True, "fletcher32": True}
            if values.size and values.ndim
            else {}
        )
        dataset = group.create_dataset(f"data/{name}", data=values, **packing)
        dataset.attrs["units"] = quantity.units
        dataset.attrs["long_name"] = quantity.long_name
        digests[f"data/{name}"] = _digest(values, quantity.units, quantity.long_name)
    for place, strings in (("text", text), ("provenance", made_by)):
        for name, string in strings.items():
            group.create_dataset(f"{place}/{name}", data=string)
            digests[f"{place}/{name}"] = hashlib.sha256(string.encode()).hexdigest()
    return digests


def _digest(values: NDArray[Any], units: str, long_name: str) -> str:
    little = np.ascontiguousarray(values).astype(values.dtype.newbyteorder("<"), copy=False)
    head = f"{little.dtype.str}|{values.shape}|{units}|{long_name}|"
    return hashlib.sha256(head.encode() + little.tobytes()).hexdigest()


def _root(digests: Mapping[str, str]) -> str:
    lines = sorted(f"{n} {d}" for n, d in digests.items() if not n.startswith("provenance/"))
    return hashlib.sha256("\n".join(lines).encode()).hexdigest()


def _sync(path: Path) -> None:
    with path.open("rb+") as file:
        os.fsync(file.fileno())


def read_record(path: Path) -> Record:
    """Read a whole record.

    Raises
    ------
    InputFault
        The file is missing, is no midradius record, is damaged, or was never
        finished.
    """
    import h5py

    if not path.is_file():
        remedy = "There is no such file: name a result folder, or its record.h5."
        raise InputFault("record", str(path), "a whole midradius record", remedy)
    try:
        with h5py.File(path, "r") as file:
            group = file[GROUP]
            if group.attrs.get("status") != "complete":
                raise InputFault("record", str(path), "a finished record")
            numbers = {
                name: Quantity(dataset[()], dataset.attrs["units"], dataset.attrs["long_name"])
                for name, dataset in _datasets(group, "data")
            }
            strings = {
                place: {name: dataset.asstr()[()] for name, dataset in _datasets(group, place)}
                for place in ("text", "provenance")
            }
            root = str(group.attrs["root_sha256"])
    except (OSError, KeyError, RuntimeError, ValueError) as fault:
        raise InputFault(
            "record", str(path), "a whole midradius record", f"It could not be read: {fault}"
        ) from fault
    numbers = {
        name: Quantity(np.asarray(q.values), q.units, q.long_name) for name, q in numbers.items()
    }
    return Record(numbers, strings["text"], strings["provenance"], root)


def _datasets(group: Any, place: str) -> Iterator[tuple[str, Any]]:
    import h5py

    found: list[tuple[str, Any]] = []

    def collect(name: str, item: Any) -> None:
        if isinstance(item, h5py.Dataset):
            found.append((name, item))

    if place in group:
        group[place].visititems(collect)
    return iter(found)


def verify_record(path: Path) -> Verification:
    """Recompute every digest of a record and compare.

    Returns
    -------
    Verification
        The root digest recomputed from the contents, the number of datasets,
        and one sentence per fault.

    Raises
    ------
    InputFault
        The file cannot be opened, or is no midradius record.
    """
    import h5py

    faults: list[str] = []
    fresh: dict[str, str] = {}
    try:
        with h5py.File(path, "r") as file:
            group = file[GROUP]
            stored = dict(_strings(group, "sha256", faults))
            for name, dataset in _datasets(group, "data"):
                try:
                    values = np.asarray(dataset[()])
                    fresh[f"data/{name}"] = _digest(
                        values, dataset.attrs["units"], dataset.attrs["long_name"]
                    )
                except (OSError, KeyError, RuntimeError, ValueError) as fault:
                    faults.append(f"data/{name} cannot be read: {fault}")
            for place in ("text", "provenance"):
                for name, string in _strings(group, place, faults):
                    fresh[f"{place}/{name}"] = hashlib.sha256(string.encode()).hexdigest()
            if group.attrs.get("status") != "complete":
                faults.append("the record was never finished")
            kept_root = str(group.attrs.get("root_sha256", ""))
    except (OSError, KeyError, RuntimeError) as fault:
        raise InputFault(
            "record", str(path), "a midradius record", f"It could not be read: {fault}"
        ) from fault
    faults += [f"{name} is missing" for name in sorted(stored.keys() - fresh.keys())]
    faults += [f"{name} was added later" for name in sorted(fresh.keys() - stored.keys())]
    both = sorted(fresh.keys() & stored.keys())
    faults += [f"{name} differs from its digest" for name in both if fresh[name] != stored[name]]
    root = _root(fresh)
    if root != kept_root:
        faults.append("the root digest does not fit the contents")
    return Verification(root, len(fresh), tuple(faults))


def _strings(group: Any, place: str, faults: list[str]) -> Iterator[tuple[str, str]]:
    for name, dataset in _datasets(group, place):
        try:
            yield name, dataset.asstr()[()]
        except (OSError, RuntimeError, ValueError, TypeError) as fault:
            faults.append(f"{place}/{name} cannot be read: {fault}")
