"""The demo as a newcomer starts it, without its board."""

from __future__ import annotations

import re
import signal
import subprocess
import sys
from pathlib import Path
from shutil import rmtree
from time import monotonic

import pytest

from agewatch.plant.assessment import Verdict
from tests.processes import LONG_S, agewatch, environment


def processes_about(text: str) -> list[str]:
    """Command lines of running processes that name `text`."""
    lines = []
    for process in Path("/proc").glob("[0-9]*/cmdline"):
        try:
            line = process.read_bytes().replace(b"\0", b" ").decode(errors="replace")
        except OSError:
            continue  # it has ended meanwhile
        if text in line:
            lines.append(line)
    return lines


def children_of(process_id: int) -> list[str]:
    """Command lines of the processes that one has started."""
    children = " ".join(task.read_text() for task in Path(f"/proc/{process_id}/task").glob("*/children"))
    return [
        Path(f"/proc/{child}/cmdline").read_bytes().replace(b"\0", b" ").decode()
        for child in children.split()
    ]


def test_headless_demo_shows_the_whole_job() -> None:
    """Every verdict is there, alarms stand, every message verifies, and nothing is left running or lying about."""
    run = agewatch("demo", "--headless", "--for", "6s", "--keep")
    assert run.returncode == 0, run.stderr
    counts = {word: int(count) for count, word in re.findall(r"(\d+) (\w+)", run.stdout.splitlines()[0])}
    assert all(counts[verdict.word] > 0 for verdict in Verdict)
    assert re.search(r"^return-before-press ", run.stdout, re.MULTILINE)
    assert re.search(r"agewatch\.pull\.requested .*  verified$", run.stdout, re.MULTILINE)
    assert "NOT VERIFIED" not in run.stdout
    folder = run.stderr.strip().removeprefix("kept: ")
    assert (Path(folder) / "var" / "agewatch.db").is_file()
    assert processes_about(folder) == []
    rmtree(folder)


@pytest.mark.parametrize(
    ("number", "status"), [(signal.SIGTERM, 128 + signal.SIGTERM), (signal.SIGKILL, -signal.SIGKILL)]
)
def test_demo_that_is_ended_ends_its_daemon(number: signal.Signals, status: int) -> None:
    """SIGTERM ends demo and daemon, and the scratch folder goes; even SIGKILL leaves no daemon behind."""
    command = [sys.executable, "-m", "agewatch", "demo", "--headless", "--for", "10min"]
    with subprocess.Popen(command, env=environment()) as demo:
        daemon: list[str] = []
        while not daemon:
            assert demo.poll() is None
            daemon = [line for line in children_of(demo.pid) if "agewatch run" in line]
        folder = Path(daemon[0].split("--config ")[1].strip()).parent
        demo.send_signal(number)
        assert demo.wait(LONG_S) == status
    until_s = monotonic() + LONG_S
    while processes_about(str(folder)):
        assert monotonic() < until_s
    assert folder.exists() == (number == signal.SIGKILL)
    rmtree(folder, ignore_errors=True)
