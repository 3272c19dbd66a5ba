"""The command as a person at a terminal, a script or a careless file meets it."""

import json
import os
import pty
import re
import signal
import subprocess
import sys
from collections.abc import Callable
from importlib import metadata
from pathlib import Path

import pytest

from midradius.fem.furnace import furnace_names
from midradius.thermo.phases import PHASE_NAMES

ESCAPE = "\x1b"
HEAVY = (
    "scipy",
    "numba",
    "matplotlib",
    "h5py",
    "meshio",
    "vtk",
    "vtkmodules",
    "pyvista",
    "ht",
    "pandas",
    "rich",
)


def listing(folder: Path) -> list[tuple[str, int]]:
    return sorted((str(p), p.lstat().st_mtime_ns) for p in folder.rglob("*"))


@pytest.fixture
def case(tmp_path: Path, small: str) -> Path:
    path = tmp_path / "case.toml"
    path.write_text(small, encoding="utf-8")
    return path


# Help and mistakes of the hand


def test_help_shows_examples_exit_codes_and_every_command(call) -> None:
    for flag in ("-h", "--help"):
        answer = call(flag)
        assert (answer.code, answer.err) == (0, "")
        for part in ("midradius run shaft.toml --out shaft", "130  interrupted", "Exit codes"):
            assert part in answer.out
        for command in ("check", "media", "new", "run", "schema", "steels"):
            assert re.search(rf"^  {command} +[A-Z][^.]*\.$", answer.out, re.MULTILINE), command


@pytest.mark.parametrize("command", ["run", "check", "new", "steels", "media", "schema"])
def test_every_command_has_help_of_its_own(call, command: str) -> None:
    answer = call(command, "--help")
    assert (answer.code, answer.err) == (0, "")
    assert answer.out.startswith(f"Usage: midradius {command} ")


def test_the_help_of_run_shows_examples_and_what_the_folder_holds(call) -> None:
    said = call("run", "--help").out
    assert "midradius run shaft.toml --out shaft --json > shaft.json" in said
    for name in ("fields.pvd", "final.vtu", "histories.csv", "profile.csv", "record.h5"):
        assert name in said


def test_the_version_is_that_of_the_package(call) -> None:
    assert call("--version").out == f"midradius, version {metadata.version('midradius')}\n"


@pytest.mark.parametrize(
    ("words", "hint"),
    [
        (("rum", "case.toml"), "'run'"),
        (("run", "case.toml", "--jsn"), "--json"),
        (("new", "--form", "cube"), "'slab', 'round', 'tube', 'ball', 'bar', 'ring'"),
        (("run",), "CASE"),
        (("run", "case.toml", "out"), "unexpected extra argument (out)"),
        (("steels", "37CrZz9"), "midradius steels lists all"),
    ],
)
def test_a_mistyped_command_is_answered_with_what_is_meant(
    call, words: tuple[str, ...], hint: str
) -> None:
    answer = call(*words)
    assert (answer.code, answer.out) == (2, "")
    assert hint in answer.err


# What is printed, and where


def test_json_is_one_document_alone_on_stdout_even_where_a_person_watches(
    start: Callable[..., subprocess.Popen[str]], case: Path
) -> None:
    watcher, side = pty.openpty()
    process = start("run", "case.toml", "--out", "out", "--json", stderr=side)
    os.close(side)
    out, _ = process.communicate(timeout=120)
    assert process.returncode == 0
    assert read_all(watcher) == ""
    document = json.loads(out)
    assert out == json.dumps(document, indent=1) + "\n"
    assert document["heat_balance_relative"] < 1e-6
    for key in ("time_error_K", "grid_error_K"):
        assert isinstance(document[key], float)
    assert [p["name"] for p in document["positions"]] == ["surface", "mid-radius", "core"]
    for position in document["positions"]:
        assert isinstance(position["depth_mm"], float)
        assert isinstance(position["hardness_hv"], float)
        assert position["hardness_hrc"] is None or 20.0 < position["hardness_hrc"] < 70.0
        assert position["time_800_500_s"] > 0.0
        assert list(position["phases"]) == list(PHASE_NAMES)
        assert abs(sum(position["phases"].values()) - 1.0) < 1e-9
    assert (case.parent / "out" / "fields.pvd").is_file()


def test_quiet_prints_nothing(start: Callable[..., subprocess.Popen[str]], case: Path) -> None:
    # nowhere to keep the settings and the font cache of the drawing library
    process = start("run", "case.toml", "--quiet", env={"HOME": "/proc/nowhere"})
    assert process.communicate(timeout=120) == ("", "")
    assert process.returncode == 0
    assert (case.parent / "case" / "record.h5").is_file()


def read_all(terminal: int) -> str:
    """All that was written to a terminal whose other side is closed."""
    said = b""
    while True:
        try:
            more = os.read(terminal, 65536)
        except OSError:  # the way a terminal says that the other side is gone
            more = b""
        if not more:
            os.close(terminal)
            return said.decode()
        said += more


def test_the_bar_with_the_simulated_time_is_for_a_person_who_watches(
    start: Callable[..., subprocess.Popen[str]], case: Path
) -> None:
    watcher, side = pty.openpty()
    env = {"TERM": "xterm-256color", "NO_COLOR": ""}
    process = start("run", "case.toml", "--out", "out", stderr=side, env=env)
    os.close(side)
    out, _ = process.communicate(timeout=120)
    bar = read_all(watcher)
    assert "cooling" in bar
    assert re.search(r"[0-9] (s|min|h) of about 1 min 40 s", bar), bar
    assert ESCAPE not in out
    assert " of about " not in out
    assert out.startswith("Stud HF-0001\n")
    assert out.endswith("Written to out\n")


def test_no_color_is_honoured(start: Callable[..., subprocess.Popen[str]], case: Path) -> None:
    watcher, side = pty.openpty()
    env = {"TERM": "xterm-256color", "NO_COLOR": "1"}
    process = start("run", "case.toml", "--out", "out", stdout=side, stderr=side, env=env)
    os.close(side)
    said = read_all(watcher)
    assert process.wait(timeout=120) == 0
    assert "Written to out" in said
    codes = {c for found in re.findall(r"\x1b\[([0-9;]*)m", said) for c in found.split(";")}
    assert codes <= {"", "0", "1"}, codes  # bold at most


def test_a_summary_in_a_pipe_is_plain_text(call, case: Path) -> None:
    said = call("run", "case.toml", "--out", "out").out
    assert ESCAPE not in said
    for part in ("C45E", "mid-radius", "heat balance", "How far to trust it", "Caution"):
        assert part in said


@pytest.mark.parametrize("words", ["steels", "run case.toml --out out"])
def test_a_reader_that_leaves_early_ends_it_quietly(tmp_path: Path, case: Path, words: str) -> None:
    command = Path(sys.executable).parent / "midradius"
    line = f"{{ {command} {words}; echo $? > code; }} | head -n 1"
    done = subprocess.run(
        ["sh", "-c", line], cwd=tmp_path, capture_output=True, text=True, timeout=120, check=True
    )
    assert done.stderr == ""
    assert len(done.stdout.splitlines()) == 1
    assert (tmp_path / "code").read_text() == "0\n"


def test_an_answer_that_cannot_be_printed_is_no_success(
    start: Callable[..., subprocess.Popen[str]],
) -> None:
    with open("/dev/full", "w") as full:
        process = start("steels", stdout=full)
        _, err = process.communicate(timeout=60)
    assert err == "The answer could not be printed: No space left on device.\n"
    assert process.returncode == 2


def test_letters_that_the_terminal_does_not_have_are_no_reason_to_fail(
    start: Callable[..., subprocess.Popen[str]], case: Path, small: str
) -> None:
    case.write_text(small.replace("Stud", "Bolzen für Hällgrund Ø"), encoding="utf-8")
    env = {"PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"}
    process = start("run", "case.toml", "--out", "out", env=env)
    out, err = process.communicate(timeout=120)
    assert (process.returncode, err) == (0, "")
    assert out.startswith("Bolzen f\\xfcr H\\xe4llgrund \\xd8 HF-0001\n")
    assert out.isascii()


def test_json_holds_any_letter_and_is_ascii_so_that_no_encoding_can_spoil_it(
    call, case: Path, small: str
) -> None:
    case.write_text(small.replace("Stud", "Bolzen für Ø"), encoding="utf-8")
    out = call("run", "case.toml", "--out", "out", "--json").out
    assert out.isascii()
    assert json.loads(out)["title"] == "Bolzen für Ø HF-0001"


def test_a_file_name_that_is_not_utf8_is_a_name_like_any_other(call, case: Path) -> None:
    odd = os.fsdecode(b"b\xffd.toml")
    case.rename(case.parent / odd)
    answer = call("run", odd, "--out", "out")
    assert (answer.code, answer.err) == (0, "")
    assert (case.parent / "out" / "record.h5").is_file()


# Other commands


def test_check_says_sound_and_writes_nothing(call, case: Path) -> None:
    before = listing(case.parent)
    answer = call("check", "case.toml")
    assert (answer.code, answer.out, answer.err) == (0, "case.toml: sound (Stud HF-0001)\n", "")
    assert listing(case.parent) == before


def test_media_that_heat_are_listed_with_the_furnaces_they_are_for(call) -> None:  # type: ignore[no-untyped-def]
    lines = call("media", "--heating").out.splitlines()
    assert [line[:28].strip() for line in lines] == list(furnace_names())
    assert lines[3] == "vacuum furnace               300 to 1200 degC   film +-20 %"


@pytest.mark.parametrize("options", [(), ("--heating",)])
def test_media_as_json_are_the_same_list_with_units(call, options: tuple[str, ...]) -> None:  # type: ignore[no-untyped-def]
    said = json.loads(call("media", "--json", *options).out)["media"]
    lines = call("media", *options).out.splitlines()
    assert [item["name"] for item in said] == [re.split(r" {2,}", line)[0] for line in lines]
    spans = [(item["lowest_degC"], item["highest_degC"]) for item in said]
    assert all(low < high for low, high in spans if low is not None)
    assert all(set(item) >= {"film_uncertainty_pct", "cautions"} for item in said)


def test_media_and_steels_are_lists_of_what_a_case_may_name(call, case: Path, small: str) -> None:
    media = [line[:26].strip() for line in call("media").out.splitlines()]
    steels = [line.split()[0] for line in call("steels").out.splitlines()]
    assert {"still air", "mineral oil, agitated", "water, still", "nitrate salt, agitated"} <= {
        *media
    }
    assert {"42CrMo4", "C45E", "4140", "100Cr6"} <= {*steels}
    for grade in steels:
        case.write_text(small.replace("C45E", grade).replace("850", "1000"), encoding="utf-8")
        assert call("check", "case.toml").code == 0, grade
    for medium in media:
        text = small.replace("mineral oil, agitated", medium)
        if medium in ("insulated", "end-quench water jet"):
            text = text.replace('bath = "60 degC"\n', "")
        elif medium.startswith("nitrate"):
            text = text.replace("60 degC", "200 degC")
        case.write_text(text, encoding="utf-8")
        assert call("check", "case.toml").code == 0, medium


def test_steels_are_found_by_a_part_of_their_name_in_any_case(call) -> None:
    found = [line.split()[0] for line in call("steels", "crmo4").out.splitlines()]
    assert {"25CrMo4", "34CrMo4", "42CrMo4"} <= {*found}
    assert all("CrMo4" in name for name in found)


def test_new_does_not_touch_what_is_there(call, case: Path) -> None:
    before = listing(case.parent)
    answer = call("new", "case.toml")
    assert (answer.code, answer.out) == (2, "")
    assert "exists already and was not touched" in answer.err
    assert listing(case.parent) == before


def test_new_shows_the_next_command_and_prints_to_the_screen_without_a_file(
    call, tmp_path: Path
) -> None:
    answer = call("new", "my shaft.toml")
    assert (answer.code, answer.out) == (0, "")
    assert answer.err == (
        "Wrote 'my shaft.toml'. Next: midradius run 'my shaft.toml' --out 'my shaft'\n"
    )
    screen = call("new")
    assert (screen.code, screen.err) == (0, "")
    assert screen.out == (tmp_path / "my shaft.toml").read_text(encoding="utf-8")


def test_a_starter_of_given_temperatures_asks_for_their_file_first(call, case: Path) -> None:  # type: ignore[no-untyped-def]
    said = call("new", "--temperatures", "logged.toml").err
    assert said == (
        "Wrote logged.toml. Next: name your file of temperatures in it, then "
        "midradius run logged.toml --out logged\n"
    )


# What is imported


@pytest.mark.parametrize(
    ("words", "allowed"),
    [
        ("--help", ()),
        ("run --help", ()),
        ("--version", ()),
        ("new", ()),
        ("steels", ()),
        ("check case.toml", ("numpy",)),
        ("media", ("numpy",)),
        ("schema", ("numpy",)),
    ],
)
def test_a_command_imports_no_more_than_it_needs(
    tmp_path: Path, case: Path, words: str, allowed: tuple[str, ...]
) -> None:
    code = (
        "import sys\n"
        f"sys.argv = ['midradius', *{words.split()!r}]\n"
        "from midradius.study.cli import main\n"
        "try:\n    main()\nexcept SystemExit as leaving:\n    assert not leaving.code\n"
        f"found = [name for name in {('numpy', *HEAVY)!r} if name in sys.modules]\n"
        "print('imported', *found, file=sys.stderr)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=tmp_path, capture_output=True, text=True, check=True
    )
    assert done.stderr.split() == ["imported", *allowed]


# Bad input: exit code 2, one message on stderr, nothing written

EDITS: dict[str, tuple[str, str, str]] = {
    "dimension missing": ('diameter = "30 mm"\n', "", "diameter"),
    "dimension negative": ("30 mm", "-30 mm", "0.5 mm to 10 m"),
    "dimension zero": ("30 mm", "0 mm", "0.5 mm to 10 m"),
    "dimension absurd": ("30 mm", "30 km", "line 8: section.diameter"),
    "dimension without unit": ('"30 mm"', '"30"', "mm"),
    "dimension a number": ('"30 mm"', "30", "line 8: section.diameter"),
    "wrong kind of unit": ("30 mm", "300 degC", "line 8: section.diameter"),
    "not a number": ("30 mm", "nan mm", "line 8: section.diameter"),
    "infinite": ("30 mm", "inf mm", "line 8: section.diameter"),
    "accuracy not a number": ('"4 K"', "nan", "line 26: grid.accuracy"),
    "bore larger than outside": (
        'form = "round"\ndiameter = "30 mm"',
        'form = "tube"\noutside = "200 mm"\nbore = "300 mm"',
        "section.bore",
    ),
    "unknown form": ('"round"', '"sphere"', '"ball"'),
    "unknown grade": ('"C45E"', '"C45F"', "C45E"),
    "unknown medium": ("mineral oil, agitated", "minerals oil", "mineral oil"),
    "unknown key": ("diameter", "diametre", "diameter"),
    "composition over 100 %": (
        'grade = "C45E"',
        "composition = { C = 100.4 }",
        "line 4: steel.composition",
    ),
    "composition outside the models": (
        'grade = "C45E"',
        "composition = { C = 0.4, Cr = 18.0 }",
        "Cr",
    ),
    "bath hotter than the part": ('"60 degC"', '"900 degC"', "line 18: route[1].bath"),
    "soak below Ae1": ('"850 degC"', '"650 degC"', "no austenite forms and nothing can transform"),
    "soak alone": (
        '[[route]]\nstage = "quench"\nmedium = "mineral oil, agitated"\nbath = "60 degC"\n'
        'time = "100 s"\n',
        "",
        "a stage that cools",
    ),
    "temper before any quench": (
        '[[route]]\nstage = "quench"',
        '[[route]]\nstage = "temper"\nat = "600 degC"\ntime = "1 h"\n\n[[route]]\nstage = "quench"',
        "put it last",
    ),
    "temper above Ae1": (
        "\n[output]",
        '\n[[route]]\nstage = "temper"\nat = "800 degC"\ntime = "1 h"\n\n[output]',
        "that is a soak, not a temper",
    ),
    "negative time": ('"100 s"', '"-100 s"', "line 19: route[1].time"),
    "unreachable end": ('time = "100 s"', 'until = "core below 50 degC"', "above the bath"),
    "film missing": (
        'medium = "mineral oil, agitated"',
        'film = "no-such.csv"',
        "no such file",
    ),
    "title with escapes": ("Stud", "\\u001b[31mStud", "title"),
    "not TOML": ('"C45E"', '"C45E', "not TOML"),
}


@pytest.mark.parametrize("what", EDITS)
@pytest.mark.parametrize("command", ["run", "check"])
def test_a_bad_case_is_answered_and_nothing_written(
    call, case: Path, small: str, what: str, command: str
) -> None:
    old, new, hint = EDITS[what]
    assert small.count(old) == 1 or what == "not TOML"
    case.write_text(small.replace(old, new), encoding="utf-8")
    refused(call, case.parent, hint, command)


def refused(call, folder: Path, hint: str, *words: str) -> None:
    before = listing(folder)
    if words[0] in ("run", "check") and len(words) == 1:
        words = (*words, "case.toml")
    out = ("--out", "out") if words[0] == "run" and "--out" not in words else ()
    answer = call(*words, *out)
    assert answer.code == 2, answer
    assert answer.out == ""
    assert hint in answer.err
    assert "Traceback" not in answer.err
    assert len(answer.err.splitlines()) <= 4
    assert listing(folder) == before


def test_an_empty_route_is_refused(call, case: Path, small: str) -> None:
    head, _, rest = small.partition("[[route]]")
    tail = rest[rest.index("[output]") :]
    for route in ("", "route = []\n"):
        case.write_text(route + head + tail, encoding="utf-8")
        refused(call, case.parent, "a soak and at least one stage that cools", "run")


def test_a_later_bath_hotter_than_the_part_at_that_time_is_refused(
    call, case: Path, small: str
) -> None:
    later = (
        '[[route]]\nstage = "hold"\nmedium = "nitrate salt, agitated"\n'
        'bath = "400 degC"\ntime = "1 h"\n\n[output]'
    )
    case.write_text(small.replace("[output]", later), encoding="utf-8")
    assert call("check", "case.toml").code == 0  # it takes the solver to know
    hint = r'case.toml(, line 2[0-9])?: route\[[0-9]\].bath = "400 degC" on "side", but must be'
    assert re.search(hint, call("run", "case.toml", "--out", "out").err)
    refused(call, case.parent, "Heating up again is not computed", "run")


def make_missing(path: Path, _: str) -> str:
    return "there is no such file"


def make_folder(path: Path, _: str) -> str:
    path.mkdir()
    return "this is a folder"


def make_empty(path: Path, _: str) -> str:
    path.write_bytes(b"")
    return "the file is empty"


def make_latin(path: Path, small: str) -> str:
    path.write_bytes(small.replace("Stud", "Stück").encode("latin-1"))
    return "line 1: byte 0xfc is not UTF-8"


def make_picture(path: Path, _: str) -> str:
    path.write_bytes(b"\x89PNG\r\n\x1a\n" + bytes(100))
    return "not UTF-8"


def make_pipe(path: Path, _: str) -> str:
    os.mkfifo(path)
    return "a device or a pipe"


def make_unreadable(path: Path, _: str) -> str:
    # its own memory at address 0: whoever asks, even the superuser, may open but not read it
    path.symlink_to("/proc/self/mem")
    return "cannot be read"


def make_huge(path: Path, _: str) -> str:
    with path.open("wb") as file:
        file.truncate(1 << 33)
    return "larger than 1 MB"


def make_loop(path: Path, _: str) -> str:
    path.symlink_to(path)
    return "cannot be read"


@pytest.mark.parametrize(
    "make",
    [
        make_missing,
        make_folder,
        make_empty,
        make_latin,
        make_picture,
        make_pipe,
        make_unreadable,
        make_huge,
        make_loop,
    ],
    ids=lambda make: make.__name__.removeprefix("make_"),
)
def test_what_is_no_readable_case_file_is_refused(
    call, tmp_path: Path, small: str, make: Callable[[Path, str], str]
) -> None:
    hint = make(tmp_path / "case.toml", small)
    for command in ("run", "check"):
        refused(call, tmp_path, hint, command)


@pytest.mark.parametrize(
    ("place", "hint"),
    [
        ("letter.txt", "A file of that name is there"),
        ("letter.txt/out", "Not a directory"),
        ("letter.txt/deep/out", "Not a directory"),
        ("mine", "It holds photo.jpg"),
        (".", "It holds"),
        ("case.toml", "A file of that name is there"),
        ("/proc/out", "a place that can be written"),
        ("/", "name a folder inside it"),
        ("x" * 300, "File name too long"),
        ("a\nb" + "x" * 300, "a?b"),
    ],
)
def test_an_output_place_that_cannot_be_is_refused_before_anything_is_solved(
    call, case: Path, monkeypatch: pytest.MonkeyPatch, place: str, hint: str
) -> None:
    (case.parent / "letter.txt").write_text("dear")
    (case.parent / "mine").mkdir()
    (case.parent / "mine" / "photo.jpg").write_text("")

    def solved(*_: object, **__: object) -> None:
        raise AssertionError("solved")

    monkeypatch.setattr("midradius.study.job.solve", solved)
    refused(call, case.parent, hint, "run", "case.toml", "--out", place)


def test_a_case_without_a_suffix_does_not_collide_with_its_own_result(call, case: Path) -> None:
    case.rename(case.parent / "stud")
    assert call("run", "stud", "--quiet").code == 0
    assert (case.parent / "stud-result" / "record.h5").is_file()


def test_a_disk_that_takes_no_more_is_an_answer_and_leaves_nothing(
    start: Callable[..., subprocess.Popen[str]], case: Path
) -> None:
    import resource

    def limited() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))

    before = listing(case.parent)
    process = start("run", "case.toml", "--out", "out", preexec_fn=limited)
    out, err = process.communicate(timeout=120)
    assert (process.returncode, out) == (2, "")
    assert (
        err == 'output folder = "out", but must be a place that takes all files. File too large.\n'
    )
    assert listing(case.parent) == before


def test_a_solver_that_gives_up_is_exit_code_3_and_leaves_nothing(
    call, case: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from midradius.thermo.errors import SolverFault

    def give_up(*_: object, **__: object) -> None:
        raise SolverFault("The heat solver gave up at 3 s.")

    monkeypatch.setattr("midradius.study.runner.run", give_up)
    before = listing(case.parent)
    answer = call("run", "case.toml", "--out", "out")
    assert (answer.code, answer.out) == (3, "")
    assert answer.err == "The heat solver gave up at 3 s.\n"
    assert listing(case.parent) == before


# Interrupted and killed


def wait_for(process: subprocess.Popen[str], folder: Path, pattern: str) -> bool:
    """Until something of that name stands in the folder; False if the process ended before."""
    while process.poll() is None:
        if next(folder.glob(pattern), None) is not None:
            return True
    return False


MOMENTS = {
    "reading": None,
    "solving": ".midradius-*-new",
    "writing": ".midradius-*-new/cooling.png",
}


@pytest.mark.parametrize("moment", MOMENTS)
def test_ctrl_c_leaves_no_half_folder(
    start: Callable[..., subprocess.Popen[str]], case: Path, moment: str
) -> None:
    before = listing(case.parent)
    process = start("run", "case.toml", "--out", "out")
    pattern = MOMENTS[moment]
    if pattern is None:  # the command is loaded once the process reads the case
        while not os.path.exists(f"/proc/{process.pid}/maps") or "numpy" not in Path(
            f"/proc/{process.pid}/maps"
        ).read_text(errors="replace"):
            pass
    else:
        assert wait_for(process, case.parent, pattern)
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=120)
    assert (process.returncode, out) == (130, "")
    assert re.fullmatch(r"Interrupted(; nothing was written)?\.\n", err)
    assert listing(case.parent) == before


@pytest.mark.parametrize("moment", ["solving", "writing"])
def test_a_killed_run_leaves_nothing_that_looks_whole_and_the_next_one_sweeps_up(
    start: Callable[..., subprocess.Popen[str]], call, case: Path, moment: str
) -> None:
    process = start("run", "case.toml", "--out", "out")
    assert wait_for(process, case.parent, MOMENTS[moment] or "")
    process.kill()
    process.communicate(timeout=120)
    (left,) = (p for p in case.parent.iterdir() if p != case)
    assert left.name.startswith(".midradius-")
    assert not (left / ".midradius-result").exists()
    assert call("run", "case.toml", "--out", "out", "--quiet").code == 0
    assert sorted(p.name for p in case.parent.iterdir()) == ["case.toml", "out"]
