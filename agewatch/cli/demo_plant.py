"""The demo's own copy of the invented plant, and the daemon that watches it."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import agewatch
from agewatch.cli.demo_signals import EndedBySignals
from agewatch.errors import UsageError
from agewatch.messages.signing import secret_of

END_WITHIN_S = 15.0
"""The daemon promises less; after this it is ended the hard way."""
SECRET_FILE = "demo.secret"  # noqa: S105 - the name of a file

Process = subprocess.Popen[bytes]

_PACKAGE = Path(agewatch.__file__).parent


def copy_plant(folder: Path) -> str:
    """Copy the invented plant into `folder`, and lay a new signing secret beside it, which is returned."""
    shutil.copytree(_original(), folder, dirs_exist_ok=True)
    secret = secret_of(os.urandom(32))
    file = os.open(folder / SECRET_FILE, os.O_CREAT | os.O_WRONLY | os.O_EXCL, 0o600)
    with os.fdopen(file, "w", encoding="ascii") as written:
        written.write(secret)
    return secret


def write_settings(folder: Path, receiver_url: str) -> Path:
    """Settings of the copy: the plant's own, and a receiver."""
    config = folder / "demo.toml"
    config.write_text(
        f"""\
include = ["plant.toml"]
[daemon]
http_port = 0
[[endpoint]]
name = "logistics"
url = "{receiver_url}"
secret_file = "{SECRET_FILE}"
""",
        encoding="utf-8",
    )
    return config


@contextmanager
def daemon(config: Path, log: Path, signals: EndedBySignals) -> Iterator[Process]:
    """A daemon of its own process for as long as the block runs; it is ended by its process id on every path."""
    process: Process | None = None
    try:
        with signals.held():  # else a signal could leave a process whose id nobody knows
            process = _started(config, log)
        yield process
    finally:
        if process is not None:
            with signals.held():
                end(process)


def end(process: Process) -> int:
    """End the daemon, cleanly if it can; its exit status."""
    if process.poll() is None:
        process.send_signal(signal.SIGTERM)
    try:
        return process.wait(END_WITHIN_S)
    except subprocess.TimeoutExpired:
        process.kill()
        return process.wait()
    finally:
        if process.stdin is not None:
            process.stdin.close()


def _started(config: Path, log: Path) -> Process:
    paths = [str(_PACKAGE.parent), *filter(None, [os.environ.get("PYTHONPATH")])]
    with log.open("wb") as said:
        return subprocess.Popen(  # noqa: S603 - this very program
            [sys.executable, "-m", "agewatch", "run", "--while-stdin", "--config", str(config)],
            stdin=subprocess.PIPE,  # closed with this process, in whatever way it ends
            stdout=said,
            stderr=said,
            env={**os.environ, "PYTHONPATH": os.pathsep.join(paths)},
            start_new_session=True,
        )


def _original() -> Path:
    """Inside the installed package, or beside it in a checkout."""
    for folder in (_PACKAGE / "demo_inventory", _PACKAGE.parent / "demo_inventory"):
        if (folder / "plant.toml").is_file():
            return folder
    raise UsageError(f"the invented plant is missing from {_PACKAGE}; install agewatch again")
