"""The command line as a whole: help, bad usage, and how errors are told."""

from __future__ import annotations

import resource
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from agewatch import __version__
from agewatch.cli import COMMANDS, main
from tests.processes import agewatch

HELP_WITHIN_S = 0.25


@dataclass(frozen=True)
class Said:
    """What a command said, and its exit status."""

    status: int | str | None
    out: str
    err: str


Run = Callable[..., Said]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Run:
    """Run commands in this process, in an empty folder."""
    monkeypatch.delenv("AGEWATCH_CONFIG", raising=False)
    monkeypatch.chdir(tmp_path)

    def run_one(*arguments: str) -> Said:
        with pytest.raises(SystemExit) as ended:
            main(list(arguments))
        return Said(ended.value.code, *capsys.readouterr())

    return run_one


def complaint(said: Said) -> str:
    """The one line that a failed command says."""
    assert said.out == ""
    (line,) = said.err.splitlines()
    assert line.startswith("agewatch: ")
    return line


def test_help_names_every_command(run: Run) -> None:
    """The help lists all commands that there are, each with its sentence."""
    said = run("--help")
    assert said.status == 0
    for name, sentence in COMMANDS.items():
        assert f"{name:<8}" in said.out
        assert sentence in " ".join(said.out.split())


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_explains_itself(run: Run, name: str) -> None:
    """Each command has a help of its own."""
    said = run(name, "--help")
    assert (said.status, said.err) == (0, "")
    assert f"Usage: agewatch {name}" in said.out


def test_nothing_asked_for_is_bad_usage(run: Run) -> None:
    """Without a command the help is shown, and the exit status says that nothing was done."""
    said = run()
    assert said.status == 2
    assert "Commands:" in said.err


def test_help_comes_at_once() -> None:
    """`--help`, as a process of its own, takes at most a quarter of a second of the processor."""
    took_s = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        assert agewatch("--help").returncode == 0
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        took_s.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)
    assert min(took_s) <= HELP_WITHIN_S


def test_version(run: Run) -> None:
    """`--version` names program and version."""
    assert run("--version") == Said(0, f"agewatch {__version__}\n", "")


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (["frobnicate"], "No such command 'frobnicate'."),
        (["assess", "--frobnicate"], "No such option"),
        (["assess", "--at", "yesterday"], "2026-07-18T05:30:00Z"),
        (["assess", "--at", "2026-07-18T05:30:00"], "no RFC 3339 time"),
        (["assess", "--json", "--csv"], "exclude each other"),
        (["assess", "--store", "--at", "2026-07-18T05:30:00Z"], "exclude each other"),
        (["assess", "--fail-on", "rain"], "'watch', 'pull', 'hold', 'unassessed'"),
        (["sink"], "--secret-env or --secret-file"),
        (["sink", "--secret-env", "NOT_THERE"], "NOT_THERE"),
        (["sink", "--secret-file", "not-there"], "not-there: No such file"),
        (["demo", "--for", "a while"], "25s"),
    ],
)
def test_bad_usage(run: Run, arguments: list[str], told: str) -> None:
    """Bad usage is one line on stderr and exit status 2."""
    said = run(*arguments)
    assert said.status == 2
    assert told in complaint(said)


@pytest.mark.parametrize("name", ["run", "board", "assess", "check"])
def test_missing_settings(run: Run, name: str) -> None:
    """Without settings every command says which file is missing and how to name another."""
    said = run(name)
    assert said.status == 2
    assert "config/plant.toml" in complaint(said)
    assert "--config" in said.err


def test_settings_by_environment(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """AGEWATCH_CONFIG names the settings where --config does not."""
    monkeypatch.setenv("AGEWATCH_CONFIG", "elsewhere.toml")
    assert "elsewhere.toml" in complaint(run("check"))
    assert "nearer.toml" in complaint(run("check", "--config", "nearer.toml"))


def test_every_fault_of_the_settings_has_its_line(run: Run, tmp_path: Path) -> None:
    """Settings with several faults are refused with a line for each: file, key, what is allowed."""
    plant = tmp_path / "plant.toml"
    plant.write_text(
        '[site]\nname = "Works"\ntimezone = "Europe/Lhota"\n[location.BAY]\nsensor = ["T1"]\n[grade]\n'
    )
    said = run("check", "--config", str(plant))
    lines = said.err.splitlines()
    assert said.status == 2
    assert all(line.startswith(f"agewatch: {plant}: ") for line in lines)
    assert [line.split(": ")[2] for line in lines] == ["site.timezone", "location.BAY.sensor"]


def test_traceback_on_request_only(run: Run) -> None:
    """Where in the program an error came from is told with --debug only."""
    assert "Traceback" not in run("check", "--config", "none.toml").err
    assert "Traceback" in run("check", "--config", "none.toml", "--debug").err
