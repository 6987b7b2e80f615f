"""What an import brings along, each looked at in a process of its own."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
PURE_ROOMS = ("aging", "climate", "alarms")
HEAVY = {
    "alembic", "apscheduler", "click", "jinja2", "matplotlib", "prometheus_client", "pydantic", "requests", "rich",
    "sqlalchemy", "textual",
}  # fmt: skip
IMPORT_ROOM = """
import importlib, pkgutil, sys
room = importlib.import_module(sys.argv[1])
for module in pkgutil.walk_packages(room.__path__, room.__name__ + "."):
    importlib.import_module(module.name)
print(*{name.partition(".")[0] for name in sys.modules}, *sys.modules)
"""
IMPORT_MODULE = """
import importlib, sys
importlib.import_module(sys.argv[1])
print(*{name.partition(".")[0] for name in sys.modules})
"""


def modules_after(script: str, name: str) -> set[str]:
    """Names of all modules that a new process has after importing `name`."""
    command = [sys.executable, "-c", script, name]
    said = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, timeout=60, check=True)
    return set(said.stdout.split())


@pytest.mark.parametrize("room", PURE_ROOMS)
def test_pure_room_brings_no_outside_world(room: str) -> None:
    """No module of a pure room brings in a database, a file format, a screen, a network library or the clock."""
    modules = modules_after(IMPORT_ROOM, f"agewatch.{room}")
    assert modules & (HEAVY | {"agewatch.clock"}) == set()


def test_help_needs_click_only() -> None:
    """The command line as such brings in none of the libraries that its commands need."""
    modules = modules_after(IMPORT_MODULE, "agewatch.cli")
    assert "click" in modules
    assert modules & (HEAVY - {"click"} | {"numpy", "scipy"}) == set()


def test_daemon_needs_no_screen() -> None:
    """The daemon, which runs for years without a terminal, does not bring in the screen library."""
    modules = modules_after(IMPORT_MODULE, "agewatch.cli.run")
    assert modules & {"textual", "rich"} == set()
