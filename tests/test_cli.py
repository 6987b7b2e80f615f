"""The command line as a whole: help, bad usage, and how errors are told. Commands run as processes of their own."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path
from time import monotonic

import pytest

from agewatch import __version__
from agewatch.cli import COMMANDS

ROOT = Path(__file__).parent.parent
HELP_WITHIN_S = 0.25


def agewatch(*arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the program with a clean environment."""
    kept = {name: value for name, value in os.environ.items() if name != "AGEWATCH_CONFIG"}
    return subprocess.run(
        [sys.executable, "-m", "agewatch", *arguments],
        cwd=ROOT / "tests",  # where no config/plant.toml is
        env={**kept, "PYTHONPATH": str(ROOT), **environment},
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )


def complaint(run: subprocess.CompletedProcess[str]) -> str:
    """The one line that a failed command says."""
    assert run.stdout == ""
    (line,) = run.stderr.splitlines()
    return line


def test_help_names_every_command() -> None:
    """The help lists all commands that there are, each with its sentence."""
    said = agewatch("--help")
    assert said.returncode == 0
    for name, sentence in COMMANDS.items():
        assert f"{name:<8}" in said.stdout
        assert " ".join(sentence.split()) in " ".join(said.stdout.split())


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_explains_itself(name: str) -> None:
    """Each command has a help of its own, which begins as the list does."""
    said = agewatch(name, "--help")
    assert said.returncode == 0
    assert said.stderr == ""
    assert f"agewatch {name}" in said.stdout


def test_help_comes_at_once() -> None:
    """`--help` takes at most a quarter of a second; the best of some, for the machine may be busy."""
    took_s = []
    for _ in range(5):
        began_s = monotonic()
        agewatch("--help")
        took_s.append(monotonic() - began_s)
    assert min(took_s) <= HELP_WITHIN_S


def test_version() -> None:
    """`--version` names program and version."""
    assert agewatch("--version").stdout == f"agewatch {__version__}\n"


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["frobnicate"], "No such command 'frobnicate'."),
        (["assess", "--frobnicate"], "No such option"),
        (["assess", "--at", "yesterday"], "2026-07-18T05:30:00Z"),
        (["assess", "--at", "2026-07-18T05:30:00"], "no RFC 3339 time"),
        (["assess", "--json", "--csv"], "exclude each other"),
        (["sink"], "--secret-env or --secret-file"),
        (["sink", "--secret-env", "NOT_THERE"], "NOT_THERE"),
        (["demo", "--for", "a while"], "25s"),
    ],
)
def test_bad_usage(arguments: list[str], said: str) -> None:
    """Bad usage is one line on stderr and exit status 2."""
    run = agewatch(*arguments)
    assert run.returncode == 2
    assert complaint(run).startswith("agewatch: ")
    assert said in run.stderr


@pytest.mark.parametrize("name", ["run", "board", "assess", "check"])
def test_missing_settings(name: str) -> None:
    """Without settings every command says which file is missing and how to name another."""
    run = agewatch(name)
    assert run.returncode == 2
    assert "config/plant.toml" in complaint(run)
    assert "--config" in run.stderr


def test_settings_by_environment(tmp_path: Path) -> None:
    """AGEWATCH_CONFIG names the settings where --config does not."""
    run = agewatch("check", AGEWATCH_CONFIG=str(tmp_path / "elsewhere.toml"))
    assert run.returncode == 2
    assert str(tmp_path / "elsewhere.toml") in complaint(run)


def test_every_fault_of_the_settings_has_its_line(tmp_path: Path) -> None:
    """Settings with several faults are refused with a line for each: file, key, what is allowed."""
    plant = tmp_path / "plant.toml"
    plant.write_text(
        '[site]\nname = "Works"\ntimezone = "Europe/Lhota"\n[location.BAY]\nsensor = ["T1"]\n[grade]\n'
    )
    run = agewatch("check", "--config", str(plant))
    lines = run.stderr.splitlines()
    assert run.returncode == 2
    assert all(line.startswith(f"agewatch: {plant}: ") for line in lines)
    assert [line.split(": ")[2] for line in lines] == ["site.timezone", "location.BAY.sensor"]


def test_traceback_on_request_only(tmp_path: Path) -> None:
    """Where in the program an error came from is told with --debug only."""
    config = str(tmp_path / "none.toml")
    assert "Traceback" not in agewatch("check", "--config", config).stderr
    assert "Traceback" in agewatch("check", "--config", config, "--debug").stderr
