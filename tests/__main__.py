"""`python -m tests`: every gate that a change must pass, the tests last. Stops at the first that fails."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent
SCRIPTS = Path(sys.executable).parent

GATES = (
    ("style", [SCRIPTS / "ruff", "check", "."]),
    ("layout", [SCRIPTS / "ruff", "format", "--check", "--quiet", "."]),
    ("types", [SCRIPTS / "mypy"]),
    ("arrows between rooms", [SCRIPTS / "lint-imports"]),
    ("tests", [sys.executable, "-m", "pytest", *sys.argv[1:]]),
)


def main() -> int:
    for name, command in GATES:
        print(f"--- {name}", flush=True)
        status = subprocess.run([str(word) for word in command], cwd=ROOT, check=False).returncode
        if status:
            print(f"--- {name}: failed", flush=True)
            return status
    return 0


if __name__ == "__main__":
    sys.exit(main())
