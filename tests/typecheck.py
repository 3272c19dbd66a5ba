"""Check the types of the three floors: ``python tests/typecheck.py``.

mypy does not follow the import hook of an editable install, so the folders are
linked under the name that they are imported by.
"""

import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]


def link_floors() -> None:
    package = ROOT / ".typecheck" / "midradius"
    package.mkdir(parents=True, exist_ok=True)
    for floor in ("thermo", "fem", "study"):
        link = package / floor
        if not link.exists():
            link.symlink_to(Path("..", "..", floor), target_is_directory=True)


if __name__ == "__main__":
    link_floors()
    command = [sys.executable, "-m", "mypy", "-p", "midradius", *sys.argv[1:]]
    sys.exit(subprocess.run(command, cwd=ROOT, check=False).returncode)
