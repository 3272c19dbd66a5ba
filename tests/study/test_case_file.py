"""The case file as a file, and what its values become."""

import os
import sys
from pathlib import Path

import pytest
from numpy.testing import assert_allclose

from midradius.study import casefile
from midradius.study.case import MediumUse, PositionInput
from midradius.thermo.errors import InputFault

SHAFT = """
title = "Pump shaft 4711-20, forged"

[steel]
grade = "42 crmo4"
austenite_grain = "ASTM 7"

[section]
form = "round"
diameter = "11.8 in"

[[route]]
stage = "soak"
at = "1580 degF"
time = "4 h 30 min"
[[route]]
stage = "transfer"
medium = "Still Air"
time = "45 s"
[[route]]
stage = "quench"
medium = "mineral oil, agitated"
bath = "60 °C"
until = "12 mm below surface below 150 degC"
faces = { side = { film = "film.csv", bath = "50 degC" } }

[output]
positions = ["surface", "12 mm below surface", { name = "coupon", at = ["20 mm"] }]
times = ["10 s", "5 min"]

[grid]
cells = 120
"""


@pytest.fixture
def shaft(tmp_path: Path) -> Path:
    (tmp_path / "film.csv").write_text("surface_degC,htc_W_per_m2K\n20,300\n860,500\n")
    path = tmp_path / "shaft.toml"
    path.write_text(SHAFT, encoding="utf-8")
    return path


def refusal(path: Path) -> str:
    with pytest.raises(casefile.CaseFaults) as caught:
        casefile.read(path)
    return str(caught.value).replace(str(path), "FILE")


def test_every_value_of_a_case_arrives_in_si(shaft: Path) -> None:
    case = casefile.read(shaft)
    assert case.title == "Pump shaft 4711-20, forged"
    assert (case.steel.steel.name, case.steel.grain_astm) == ("42CrMo4", 7.0)
    assert case.section.form == "round"
    assert case.section.diameter is not None
    assert_allclose(case.section.diameter, 11.8 * 0.0254, rtol=1e-15, atol=0.0)
    soak, transfer, quench = case.route
    assert (soak.kind, soak.at, soak.time) == ("soak", 1133.15, 16_200.0)
    assert (transfer.medium, transfer.time) == (MediumUse("still air"), 45.0)
    assert quench.medium == MediumUse("mineral oil, agitated", bath=333.15)
    assert quench.until is not None
    assert quench.until.position == "12 mm below surface"
    assert (quench.until.temp, quench.until.sense) == (423.15, "below")
    film = MediumUse(film_file=shaft.parent / "film.csv", bath=323.15)
    assert quench.faces == {"side": film}
    assert case.outputs.positions == (
        PositionInput("surface", "surface"),
        PositionInput("12 mm below surface", "depth", depth=0.012),
        PositionInput("coupon", "coordinates", coordinates=(0.02,)),
    )
    assert case.outputs.field_times == (10.0, 300.0)
    assert (case.grid.cells, case.grid.accuracy) == ((120,), 0.5)
    assert (case.text, case.path) == (SHAFT, shaft)


def test_a_place_is_found_by_its_output_name_or_its_trade_term(shaft: Path) -> None:
    case = casefile.read(shaft)
    assert case.position("coupon").coordinates == (0.02,)
    assert case.position("quarter thickness").kind == "quarter thickness"
    with pytest.raises(InputFault, match='Write "core" if that is meant.'):
        case.position("kore")


@pytest.mark.parametrize(
    ("section", "zones", "n_dim"),
    [
        ('form = "slab"\nthickness = "50 mm"', ("near face", "far face"), 1),
        ('form = "round"\ndiameter = "50 mm"', ("side",), 1),
        (
            'form = "round"\ndiameter = "50 mm"\nlength = "90 mm"',
            ("side", "near end", "far end"),
            2,
        ),
        ('form = "tube"\noutside = "50 mm"\nbore = "20 mm"', ("outside", "bore"), 1),
        ('form = "ball"\ndiameter = "50 mm"', ("surface",), 1),
        ('form = "bar"\nwidth = "50 mm"\nheight = "20 mm"', ("left", "right", "bottom", "top"), 2),
        (
            'form = "ring"\noutside = "90 mm"\nbore = "50 mm"\nheight = "30 mm"',
            ("outside", "bore", "bottom", "top"),
            2,
        ),
    ],
)
def test_each_form_has_its_zones_and_each_zone_may_have_its_medium(
    section: str, zones: tuple[str, ...], n_dim: int
) -> None:
    faces = ", ".join(f'"{zone}" = "insulated"' for zone in zones)
    case = casefile.loads(
        f"[steel]\ncomposition = {{ C = 0.45, Mn = 0.7 }}\n[section]\n{section}\n"
        '[[route]]\nstage = "soak"\nat = "850 degC"\ntime = "1 h"\n'
        f'[[route]]\nstage = "hold"\ntime = "1 h"\nfaces = {{ {faces} }}\n'
    )
    assert case.section.zones == zones
    assert case.section.n_dim == n_dim
    assert set(case.route[1].faces) == set(zones)
    assert case.title == "untitled"


def test_a_case_without_outputs_gets_surface_core_and_a_place_between() -> None:
    steel = '[steel]\ngrade = "1045"\n[section]\n'
    route = (
        '[[route]]\nstage = "soak"\nat = "850 degC"\ntime = "1 h"\n'
        '[[route]]\nstage = "quench"\nmedium = "fan air"\ntime = "1 h"\n'
    )
    ball = casefile.loads(steel + 'form = "ball"\ndiameter = "50 mm"\n' + route)
    slab = casefile.loads(steel + 'form = "slab"\nthickness = "50 mm"\n' + route)
    assert [place.name for place in ball.outputs.positions] == ["surface", "mid-radius", "core"]
    between = [place.name for place in slab.outputs.positions]
    assert between == ["surface", "quarter thickness", "core"]


def test_a_byte_order_mark_and_windows_line_ends_do_not_matter(shaft: Path) -> None:
    plain = casefile.read(shaft)
    shaft.write_bytes(b"\xef\xbb\xbf" + SHAFT.replace("\n", "\r\n").encode())
    assert casefile.read(shaft) == plain


def test_a_missing_file_is_answered(tmp_path: Path) -> None:
    assert refusal(tmp_path / "none.toml") == (
        "FILE: there is no such file.\n"
        "  Check the path; `midradius new` writes a case to start from."
    )


def test_a_folder_is_answered(tmp_path: Path) -> None:
    assert refusal(tmp_path) == "FILE: this is a folder.\n  Name the case file in it."


@pytest.mark.skipif(sys.platform == "win32", reason="no named pipes in a folder")
def test_a_pipe_is_answered_and_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    assert refusal(tmp_path / "pipe") == (
        "FILE: this is a device or a pipe.\n  Name an ordinary file."
    )


def test_an_unreadable_file_is_answered(shaft: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def closed(*_: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", closed)
    assert refusal(shaft) == "FILE: cannot be read: Permission denied.\n  Check its rights."


@pytest.mark.parametrize("content", [b"", b" \n\n", b"\xef\xbb\xbf"])
def test_an_empty_file_is_answered(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes(content)
    remedy = "`midradius new` writes a case to start from."
    assert refusal(path) == f"FILE: the file is empty.\n  {remedy}"


def test_a_file_of_remarks_only_is_answered(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_text("# nothing\n")
    assert refusal(path) == (
        "FILE: the file holds no keys.\n  `midradius new` writes a case to start from."
    )


def test_a_file_that_is_not_utf8_is_answered_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes('title = "x"\n# Wärme\n'.encode("latin-1"))
    assert refusal(path) == (
        "FILE, line 2: byte 0xe4 is not UTF-8.\n  Save the file as UTF-8 text."
    )


def test_a_huge_file_is_answered_without_reading_it_all(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    with path.open("wb") as file:
        file.truncate(1 << 33)  # 8 GiB, sparse
    assert refusal(path) == (
        "FILE: larger than 1 MB.\n  A case file is some kilobytes: is this the right file?"
    )


@pytest.mark.parametrize(
    ("text", "start"),
    [
        ("[steel]\ngrade = 42CrMo4\n", "FILE, line 2: not TOML: "),
        ("[steel]\ngrade = 'a'\ngrade = 'b'\n", "FILE, line 3: not TOML: "),
        ("a = " + "[" * 5000, "FILE: not TOML: brackets nested too deep."),
        ("a = '", "FILE"),
        ("a = 1\0", "FILE, line 1: not TOML: "),
        ("a = " + "9" * 5000, "FILE: not TOML: "),
    ],
)
def test_what_is_not_toml_is_answered_with_its_line(tmp_path: Path, text: str, start: str) -> None:
    path = tmp_path / "case.toml"
    path.write_text(text)
    said = refusal(path)
    assert said.startswith(start)
    assert "not TOML" in said
    assert said.endswith("Quantities stand in quotes, tables in [brackets], one key on a line.")


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="no such device here")
def test_a_film_that_is_a_device_is_answered_and_not_read(shaft: Path) -> None:
    shaft.write_text(SHAFT.replace("film.csv", "/dev/zero"), encoding="utf-8")
    assert 'film = "/dev/zero", but must be an ordinary file.' in refusal(shaft)


def test_a_film_larger_than_a_curve_can_be_is_not_read(shaft: Path) -> None:
    with (shaft.parent / "film.csv").open("wb") as file:
        file.truncate(1 << 33)
    assert 'film = "film.csv", but must be at most 1 MB.' in refusal(shaft)
