"""The program as a process of its own, as people start it."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Mapping
from pathlib import Path

ROOT = Path(__file__).parent.parent
LONG_S = 60.0
"""Far longer than anything takes here; a test that waits this long has failed."""

_NOT_PASSED_ON = ("AGEWATCH_CONFIG", "NOTIFY_SOCKET", "WATCHDOG_USEC", "PYTHONDONTWRITEBYTECODE")


def environment(more: Mapping[str, str] | None = None) -> dict[str, str]:
    """This process's environment without what would steer the program, and `more`."""
    kept = {name: value for name, value in os.environ.items() if name not in _NOT_PASSED_ON}
    return {**kept, "PYTHONPATH": str(ROOT), **(more or {})}


def agewatch(*arguments: str, more: Mapping[str, str] | None = None) -> subprocess.CompletedProcess[str]:
    """Run one command to its end."""
    return subprocess.run(
        [sys.executable, "-m", "agewatch", *arguments],
        cwd=ROOT / "tests",  # where no config/plant.toml is
        env=environment(more),
        capture_output=True,
        text=True,
        timeout=LONG_S,
        check=False,
    )
