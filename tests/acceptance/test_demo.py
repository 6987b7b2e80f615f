"""The demo as a newcomer starts it, without its board."""

from __future__ import annotations

import re
import signal
import subprocess
import sys
from pathlib import Path
from shutil import rmtree

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


def test_demo_that_is_ended_ends_its_daemon() -> None:
    """SIGTERM ends demo and daemon, and the scratch folder goes."""
    command = [sys.executable, "-m", "agewatch", "demo", "--headless", "--for", "10min"]
    with subprocess.Popen(command, env=environment()) as demo:
        daemon: list[str] = []
        while not daemon:
            assert demo.poll() is None
            daemon = [line for line in processes_about("agewatch run --config") if "agewatch-demo-" in line]
        folder = Path(daemon[0].split("--config ")[1].strip()).parent
        demo.send_signal(signal.SIGTERM)
        assert demo.wait(LONG_S) == 128 + signal.SIGTERM
    assert processes_about(str(folder)) == []
    assert not folder.exists()
