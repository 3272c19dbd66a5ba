"""The result folder: whole or not there, and nothing of anybody else's is touched."""

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from midradius.study import folder as folder_module
from midradius.study.folder import MARK, ResultFolder
from midradius.thermo.errors import InputFault


def fill(target: Path, text: str = "first") -> None:
    with ResultFolder(target) as work:
        (work / "fields").mkdir()
        (work / "profile.csv").write_text(text)
        (work / "fields" / "step.vtu").write_text(text)


def names(folder: Path) -> list[str]:
    return sorted(p.relative_to(folder).as_posix() for p in folder.rglob("*"))


WHOLE = [MARK, "fields", "fields/step.vtu", "profile.csv"]


def test_a_finished_folder_holds_the_files_and_nothing_stays_beside_it(tmp_path: Path) -> None:
    fill(tmp_path / "out")
    assert names(tmp_path / "out") == WHOLE
    assert names(tmp_path)[0] == "out"
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


def test_the_target_does_not_exist_while_the_run_works(tmp_path: Path) -> None:
    with ResultFolder(tmp_path / "out") as work:
        assert work.parent == tmp_path
        assert work.name.startswith(".")
        assert not (tmp_path / "out").exists()
    assert (tmp_path / "out").is_dir()


def test_an_earlier_result_is_replaced_as_a_whole(tmp_path: Path) -> None:
    fill(tmp_path / "out")
    with ResultFolder(tmp_path / "out") as work:
        assert (tmp_path / "out" / "profile.csv").read_text() == "first"
        (work / "profile.csv").write_text("second")
    assert names(tmp_path / "out") == [MARK, "profile.csv"]
    assert (tmp_path / "out" / "profile.csv").read_text() == "second"
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


def test_an_empty_folder_is_taken(tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    fill(tmp_path / "out")
    assert names(tmp_path / "out") == WHOLE


def test_missing_parents_are_made_and_taken_back_on_failure(tmp_path: Path) -> None:
    with pytest.raises(RuntimeError), ResultFolder(tmp_path / "a" / "b" / "out"):
        raise RuntimeError
    assert names(tmp_path) == []
    fill(tmp_path / "a" / "b" / "out")
    assert names(tmp_path / "a" / "b" / "out") == WHOLE


@pytest.mark.parametrize("error", [RuntimeError, KeyboardInterrupt, SystemExit])
def test_an_interrupted_run_leaves_nothing_new_and_the_old_result(
    tmp_path: Path, error: type[BaseException]
) -> None:
    fill(tmp_path / "out")
    for target in ("out", "other"):
        with pytest.raises(error), ResultFolder(tmp_path / target) as work:
            (work / "half.csv").write_text("half")
            raise error
    assert [p.name for p in tmp_path.iterdir()] == ["out"]
    assert (tmp_path / "out" / "profile.csv").read_text() == "first"


def foreign_file(place: Path) -> None:
    place.write_text("a letter")


def foreign_folder(place: Path) -> None:
    place.mkdir()
    (place / "letter.txt").write_text("a letter")


def foreign_subfolder(place: Path) -> None:
    (place / "photos").mkdir(parents=True)


def result_with_a_note(place: Path) -> None:
    fill(place)
    (place / "fields" / "note.txt").write_text("mine")


def result_with_a_link(place: Path) -> None:
    fill(place)
    (place / "link").symlink_to("/")


def false_mark(place: Path) -> None:
    foreign_folder(place)
    (place / MARK).write_text("something else\nletter.txt\n")


@pytest.mark.parametrize(
    "make",
    [
        foreign_file,
        foreign_folder,
        foreign_subfolder,
        result_with_a_note,
        result_with_a_link,
        false_mark,
    ],
)
def test_what_is_not_ours_is_refused_before_the_run_and_left_alone(tmp_path: Path, make) -> None:
    place = tmp_path / "out"
    make(place)
    before = names(tmp_path)
    with pytest.raises(InputFault) as fault:
        ResultFolder(place).check()
    assert fault.value.quantity == "output folder"
    assert "a new folder, an empty folder or an earlier midradius result" in str(fault.value)
    with pytest.raises(InputFault), ResultFolder(place):
        pytest.fail("entered")
    assert names(tmp_path) == before


def test_a_thing_put_there_during_the_run_is_not_overwritten(tmp_path: Path) -> None:
    place = tmp_path / "out"
    with pytest.raises(InputFault), ResultFolder(place) as work:
        (work / "profile.csv").write_text("new")
        foreign_folder(place)
    assert names(tmp_path) == ["out", "out/letter.txt"]


@pytest.mark.parametrize(
    "place", ["file/out", "file/deeper/out", "x" * 300, f"deeper/{'x' * 300}/out", "nul\0byte"]
)
def test_a_place_that_cannot_be_is_refused_before_the_run(tmp_path: Path, place: str) -> None:
    (tmp_path / "file").write_text("a file")
    with pytest.raises(InputFault):
        ResultFolder(tmp_path / place).check()
    assert names(tmp_path) == ["file"]


@pytest.mark.skipif(not Path("/proc/self").exists(), reason="needs a folder nobody can write")
def test_a_place_where_nobody_may_write_is_refused_before_the_run() -> None:
    with pytest.raises(InputFault, match="a place that can be written"):
        ResultFolder(Path("/proc/out")).check()
    with pytest.raises(InputFault):
        ResultFolder(Path("/")).check()


def test_a_read_only_parent_is_refused_before_the_run(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(path: object, mode: int = 0o777) -> None:
        raise PermissionError(13, "Permission denied", str(path))

    monkeypatch.setattr(folder_module.os, "mkdir", refuse)
    with pytest.raises(InputFault, match="Permission denied"):
        ResultFolder(tmp_path / "out").check()


def test_check_leaves_nothing_behind(tmp_path: Path) -> None:
    ResultFolder(tmp_path / "a" / "out").check()
    assert names(tmp_path) == []


def test_the_longest_name_that_the_file_system_takes_works(tmp_path: Path) -> None:
    fill(tmp_path / ("x" * 255))
    assert names(tmp_path / ("x" * 255)) == WHOLE


def test_a_relative_target_does_not_follow_a_change_of_the_working_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "elsewhere").mkdir()
    monkeypatch.chdir(tmp_path)
    with ResultFolder(Path("out")) as work:
        (work / "profile.csv").write_text("x")
        os.chdir(tmp_path / "elsewhere")
    assert (tmp_path / "out" / "profile.csv").is_file()


def test_a_link_to_an_earlier_result_stays_a_link(tmp_path: Path) -> None:
    fill(tmp_path / "real")
    (tmp_path / "out").symlink_to(tmp_path / "real")
    fill(tmp_path / "out", "second")
    assert (tmp_path / "out").is_symlink()
    assert (tmp_path / "real" / "profile.csv").read_text() == "second"


def test_a_failing_replacement_puts_the_old_result_back(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    fill(tmp_path / "out")
    rename, calls = os.rename, []

    def fail_once(source: Path, target: Path) -> None:
        calls.append(source)
        if len(calls) == 2:
            raise OSError(28, "No space left on device")
        rename(source, target)

    monkeypatch.setattr(folder_module.os, "rename", fail_once)
    with pytest.raises(OSError, match="No space"):
        fill(tmp_path / "out", "second")
    assert (tmp_path / "out" / "profile.csv").read_text() == "first"
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


CHILD = """
import os, signal, sys, time
from pathlib import Path
from midradius.study import folder
place, act = Path(sys.argv[1]), sys.argv[2]
if act == "between":
    rename = os.rename
    def rename_and_die(source, target):
        rename(source, target)
        os.kill(os.getpid(), signal.SIGKILL)
    os.rename = rename_and_die
with folder.ResultFolder(place) as work:
    (work / "profile.csv").write_text("child")
    print("working", flush=True)
    if act == "wait":
        time.sleep(60)
"""


def child(place: Path, act: str) -> subprocess.Popen[str]:
    process = subprocess.Popen(
        [sys.executable, "-c", CHILD, str(place), act],
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
        text=True,
    )
    assert process.stdout is not None
    assert process.stdout.readline() == "working\n"
    return process


def end(process: subprocess.Popen[str], number: int) -> None:
    process.send_signal(number)
    process.communicate(timeout=30)


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_ctrl_c_in_a_real_process_leaves_nothing(tmp_path: Path) -> None:
    end(child(tmp_path / "out", "wait"), signal.SIGINT)
    assert names(tmp_path) == []


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_a_killed_run_leaves_no_target_and_the_next_run_sweeps_its_remains(
    tmp_path: Path,
) -> None:
    end(child(tmp_path / "out", "wait"), signal.SIGKILL)
    assert not (tmp_path / "out").exists()
    assert len(list(tmp_path.iterdir())) == 1
    fill(tmp_path / "out")
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_the_remains_of_a_living_run_or_of_another_target_are_not_swept(tmp_path: Path) -> None:
    process = child(tmp_path / "out", "wait")
    end(child(tmp_path / "other", "wait"), signal.SIGKILL)
    try:
        fill(tmp_path / "out")
        assert len(list(tmp_path.iterdir())) == 3
    finally:
        end(process, signal.SIGINT)
    assert len(list(tmp_path.iterdir())) == 2


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_a_run_killed_in_the_midst_of_a_replacement_loses_no_result(tmp_path: Path) -> None:
    fill(tmp_path / "out")
    process = child(tmp_path / "out", "between")
    process.communicate(timeout=30)
    assert process.returncode == -signal.SIGKILL
    assert not (tmp_path / "out").exists()
    with pytest.raises(KeyboardInterrupt), ResultFolder(tmp_path / "out"):
        raise KeyboardInterrupt
    assert (tmp_path / "out" / "profile.csv").read_text() == "first"
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_kills_at_any_moment_leave_a_whole_result_or_none(tmp_path: Path) -> None:
    code = (
        "import sys; from pathlib import Path\n"
        "from midradius.study.folder import ResultFolder\n"
        "print('working', flush=True)\n"
        "for n in range(10**6):\n"
        "    with ResultFolder(Path(sys.argv[1])) as work:\n"
        "        (work / 'a').write_text(str(n))\n"
        "        (work / 'b').write_text(str(n))\n"
    )
    place = tmp_path / "out"
    for k in range(8):
        process = subprocess.Popen(
            [sys.executable, "-c", code, str(place)], stdout=subprocess.PIPE, text=True
        )
        assert process.stdout is not None
        process.stdout.readline()
        time.sleep(0.02 + 0.0137 * k)
        end(process, signal.SIGKILL)
        if place.exists():
            assert names(place) == [MARK, "a", "b"]
            assert (place / "a").read_text() == (place / "b").read_text()
    fill(place)
    assert [p.name for p in tmp_path.iterdir()] == ["out"]
