"""Tests are imported by path, so the module beside them needs its folder named."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
