"""The record: exact round trip, damage found, nothing under its name until it is whole."""

import hashlib
import signal
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest

from midradius.fem import record as record_module
from midradius.fem.record import Quantity, provenance, read_record, verify_record, write_record
from midradius.thermo.errors import InputFault

TEMP = np.linspace(20.0, 860.0, 12000).reshape(40, 300)
DATA = {
    "fields/temperature": Quantity(TEMP, "degC", "temperature"),
    "fields/gap": Quantity(np.array([1.5, np.nan, -0.0]), "s", "with a gap"),
    "grid/node": Quantity(np.arange(7), "1", "numbers of nodes"),
    "balance/closure": Quantity(np.asarray(3e-9), "1", "closure"),
    "nothing": Quantity(np.zeros((0, 3)), "1", "an empty table"),
}
TEXT = {"case_toml": 'title = "Welle Ø 300, Stück 1"\n', "notes_json": "[]", "empty": ""}


def written(path: Path, **changes: object) -> Path:
    content: dict[str, object] = {"data": DATA, "text": TEXT, "made_by": provenance()}
    write_record(path, **(content | changes))  # type: ignore[arg-type]
    return path


def test_what_is_read_equals_what_was_written_bit_for_bit(tmp_path: Path) -> None:
    record = read_record(written(tmp_path / "r.h5"))
    assert record.data.keys() == DATA.keys()
    for name, quantity in DATA.items():
        again = record.data[name]
        assert again.values.dtype == quantity.values.dtype
        assert again.values.shape == quantity.values.shape
        assert again.values.tobytes() == quantity.values.tobytes()
        assert (again.units, again.long_name) == (quantity.units, quantity.long_name)
    assert record.text == TEXT
    assert record.provenance["version_numpy"] == np.__version__


def test_every_number_has_units_and_a_long_name_and_large_ones_a_checksum(tmp_path: Path) -> None:
    with h5py.File(written(tmp_path / "r.h5")) as file:
        found = []
        file["midradius/data"].visititems(
            lambda name, item: found.append(item) if isinstance(item, h5py.Dataset) else None
        )
        assert len(found) == len(DATA)
        assert all(item.attrs["units"] and item.attrs["long_name"] for item in found)
        temp = file["midradius/data/fields/temperature"]
        assert (temp.compression, temp.compression_opts) == ("gzip", 1)
        assert temp.shuffle
        assert temp.fletcher32
        assert file["midradius"].attrs["status"] == "complete"


def test_a_fresh_record_verifies(tmp_path: Path) -> None:
    path = tmp_path / "r.h5"
    root = write_record(path, data=DATA, text=TEXT, made_by=provenance())
    check = verify_record(path)
    assert check.faults == ()
    assert check.root_sha256 == root == read_record(path).root_sha256
    assert check.n_dataset == len(DATA) + len(TEXT) + len(provenance())


def test_digest_of_a_dataset_is_the_sha256_of_what_the_layout_says(tmp_path: Path) -> None:
    with h5py.File(written(tmp_path / "r.h5")) as file:
        kept = file["midradius/sha256/data/grid/node"].asstr()[()]
        text = file["midradius/sha256/text/case_toml"].asstr()[()]
    by_hand = b"<i8|(7,)|1|numbers of nodes|" + b"".join(k.to_bytes(8, "little") for k in range(7))
    assert kept == hashlib.sha256(by_hand).hexdigest()
    assert text == hashlib.sha256(TEXT["case_toml"].encode()).hexdigest()


def test_the_root_digest_ignores_who_ran_it_when_and_in_which_order(tmp_path: Path) -> None:
    first = verify_record(written(tmp_path / "a.h5", made_by={"created_utc": "2001-01-01"}))
    other = verify_record(
        written(
            tmp_path / "b.h5",
            made_by={"created_utc": "2031-01-01", "host": "elsewhere"},
            data=dict(reversed(DATA.items())),
        )
    )
    assert first.root_sha256 == other.root_sha256


@pytest.mark.parametrize(
    "changes",
    [
        {"text": TEXT | {"case_toml": "x"}},
        {"data": DATA | {"grid/node": Quantity(np.arange(7), "mm", "numbers of nodes")}},
        {"data": DATA | {"grid/node": Quantity(np.arange(8), "1", "numbers of nodes")}},
        {
            "data": DATA
            | {"fields/temperature": Quantity(np.nextafter(TEMP, 0), "degC", "temperature")}
        },
    ],
)
def test_the_root_digest_follows_every_input_number_and_unit(
    tmp_path: Path, changes: dict[str, object]
) -> None:
    first = verify_record(written(tmp_path / "a.h5"))
    other = verify_record(written(tmp_path / "b.h5", **changes))
    assert first.root_sha256 != other.root_sha256


def edit(path: Path, action: str) -> None:
    with h5py.File(path, "r+") as file:
        group = file["midradius"]
        if action == "number":
            group["data/fields/temperature"][3, 5] += 1e-9
        elif action == "units":
            group["data/fields/temperature"].attrs["units"] = "K"
        elif action == "text":
            group["text/case_toml"][()] = "another case"
        elif action == "remove":
            del group["data/grid/node"]
        elif action == "add":
            group["data/extra"] = np.zeros(3)
        elif action == "status":
            del group.attrs["status"]
        elif action == "root":
            group.attrs["root_sha256"] = "0" * 64
        elif action == "provenance":
            group["provenance/python"][()] = "2.7"


@pytest.mark.parametrize(
    ("action", "sentence"),
    [
        ("number", "data/fields/temperature differs from its digest"),
        ("units", "data/fields/temperature differs from its digest"),
        ("text", "text/case_toml differs from its digest"),
        ("remove", "data/grid/node is missing"),
        ("add", "data/extra cannot be read"),
        ("status", "the record was never finished"),
        ("root", "the root digest does not fit the contents"),
        ("provenance", "provenance/python differs from its digest"),
    ],
)
def test_any_later_change_is_found_and_named(tmp_path: Path, action: str, sentence: str) -> None:
    path = written(tmp_path / "r.h5")
    edit(path, action)
    assert any(fault.startswith(sentence) for fault in verify_record(path).faults)


def test_a_flipped_bit_in_the_numbers_is_found(tmp_path: Path) -> None:
    path = written(tmp_path / "r.h5")
    with h5py.File(path) as file:
        place = file["midradius/data/fields/temperature"].id.get_chunk_info(0).byte_offset
    content = bytearray(path.read_bytes())
    content[place + 40] ^= 1
    path.write_bytes(content)
    faults = verify_record(path).faults
    assert any(fault.startswith("data/fields/temperature cannot be read") for fault in faults)
    with pytest.raises(InputFault):
        read_record(path)


@pytest.mark.parametrize("share", [0.0, 0.01, 0.3, 0.9, 0.999])
def test_a_file_cut_short_is_refused_with_a_sentence(tmp_path: Path, share: float) -> None:
    path = written(tmp_path / "r.h5")
    content = path.read_bytes()
    path.write_bytes(content[: int(share * len(content))])
    for reader in (read_record, verify_record):
        with pytest.raises(InputFault, match="It could not be read"):
            reader(path)


def test_a_missing_record_is_told_without_the_words_of_its_library(tmp_path: Path) -> None:
    with pytest.raises(InputFault) as told:
        read_record(tmp_path / "none.h5")
    assert told.value.remedy == "There is no such file: name a result folder, or its record.h5."


def test_another_hdf5_file_and_a_missing_one_are_refused(tmp_path: Path) -> None:
    with h5py.File(tmp_path / "other.h5", "w") as file:
        file["x"] = 1.0
    for name in ("other.h5", "none.h5"):
        for reader in (read_record, verify_record):
            with pytest.raises(InputFault):
                reader(tmp_path / name)


def test_an_unfinished_record_is_not_read(tmp_path: Path) -> None:
    path = written(tmp_path / "r.h5")
    edit(path, "status")
    with pytest.raises(InputFault, match="a finished record"):
        read_record(path)


@pytest.mark.parametrize(
    "quantity",
    [
        Quantity(np.zeros(2), "", "no units"),
        Quantity(np.zeros(2), "K", ""),
        Quantity(np.array(["a"]), "1", "words"),
        Quantity(np.array([1j]), "1", "complex"),
    ],
)
def test_a_number_without_units_or_no_number_is_refused(tmp_path: Path, quantity: Quantity) -> None:
    with pytest.raises(InputFault):
        written(tmp_path / "r.h5", data={"x": quantity})
    assert list(tmp_path.iterdir()) == []


def test_an_interrupted_writer_keeps_the_old_record_and_leaves_nothing_else(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = written(tmp_path / "r.h5")
    before = path.read_bytes()

    def interrupt(_: Path) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(record_module, "_sync", interrupt)
    with pytest.raises(KeyboardInterrupt):
        written(path, text={"case_toml": "new"})
    assert path.read_bytes() == before
    assert [p.name for p in tmp_path.iterdir()] == ["r.h5"]


def test_a_killed_writer_leaves_no_file_under_the_final_name(tmp_path: Path) -> None:
    code = (
        "import os, signal, sys; from pathlib import Path; import numpy as np\n"
        "from midradius.fem import record\n"
        "record._sync = lambda path: os.kill(os.getpid(), signal.SIGKILL)\n"
        "data = {'x': record.Quantity(np.zeros(9), '1', 'zeros')}\n"
        "record.write_record(Path(sys.argv[1]), data=data, text={}, made_by={})\n"
    )
    path = tmp_path / "r.h5"
    done = subprocess.run([sys.executable, "-c", code, str(path)], check=False)
    assert done.returncode == -signal.SIGKILL
    assert not path.exists()


def layout_versions(content: bytes) -> list[int]:
    """Versions of all data layout messages (HDF5 file format specification, IV.A.1.b, IV.A.2.i)."""
    versions = []
    start = content.find(b"OHDR")
    while start >= 0:
        flags = content[start + 5]
        at = start + 6 + (16 if flags & 0x20 else 0) + (4 if flags & 0x10 else 0)
        width = 1 << (flags & 3)
        end = at + width + int.from_bytes(content[at : at + width], "little")
        at += width
        while at + 4 <= end:
            kind, size = content[at], int.from_bytes(content[at + 1 : at + 3], "little")
            at += 4 + (2 if flags & 0x04 else 0)
            if kind == 8:
                versions.append(content[at])
            at += size
        start = content.find(b"OHDR", start + 4)
    return versions


def test_files_have_the_layout_that_the_hdf5_inside_vtk_can_open(tmp_path: Path) -> None:
    # Measured: VTK 9.7 (HDF5 1.14) refuses layout version 5, which h5py 3.16 (HDF5 2.0)
    # writes as its newest, and crashes.
    content = written(tmp_path / "r.h5").read_bytes()
    versions = layout_versions(content)
    assert len(versions) >= len(DATA)
    assert max(versions) <= 4
    assert len(content) < TEMP.nbytes
