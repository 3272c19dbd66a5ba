"""The house rules that a machine can check, so that one command checks all."""

import subprocess
import sys
import sysconfig
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]


def passes(*command: str) -> None:
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, f"{' '.join(command)}\n{done.stdout}{done.stderr}"


def test_the_linter_finds_nothing() -> None:
    passes(sys.executable, "-m", "ruff", "check", ".")


def test_every_file_is_formatted() -> None:
    passes(sys.executable, "-m", "ruff", "format", "--check", ".")


def test_the_types_are_right() -> None:
    passes(sys.executable, str(ROOT / "tests" / "typecheck.py"))


def test_every_wall_between_the_floors_stands() -> None:
    # a console script without a module form, so it is found beside the interpreter
    passes(str(Path(sysconfig.get_path("scripts")) / "lint-imports"))
