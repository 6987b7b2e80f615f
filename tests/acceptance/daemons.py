"""A plant in a folder, and daemons over it as processes of their own."""

from __future__ import annotations

import json
import signal
import socket
import sqlite3
import subprocess
import sys
from collections import Counter
from collections.abc import Callable, Sequence
from contextlib import closing
from http.client import HTTPConnection
from pathlib import Path
from threading import Condition

from agewatch.clock import SystemClock
from agewatch.messages.received import ReceivedMessage
from agewatch.messages.sink import Sink
from agewatch.plant.records import JournalRow, OutboxMessage
from agewatch.store import open_reader, queries
from tests.daemon.samples import COIL_HEAD, FRESH, OLD, PLANT, temperatures
from tests.messages.samples import SECRET
from tests.processes import LONG_S, environment

COILS = [f"C-{number:02}" for number in range(12)]


class Receiver:
    """A sink, and a way to wait for what it receives. It can be ended, and come back at the same port."""

    def __init__(self) -> None:
        self.messages: list[ReceivedMessage] = []
        self._news = Condition()
        self._sink = Sink([SECRET], SystemClock(), self._take)
        self.port = self._sink.port
        self._sink.start()

    def wait_for(self, wanted: Callable[[Sequence[ReceivedMessage]], bool]) -> None:
        """Wait until the messages so far are as wanted."""
        with self._news:
            assert self._news.wait_for(lambda: wanted(self.messages), LONG_S), self.messages

    def end(self) -> None:
        self._sink.stop()

    def come_back(self) -> None:
        self._sink = Sink([SECRET], SystemClock(), self._take, port=self.port)
        self._sink.start()

    def _take(self, message: ReceivedMessage) -> None:
        with self._news:
            self.messages.append(message)
            self._news.notify_all()


class Works:
    """A folder with settings and files, whose messages go to `port`; at most one daemon at a time is expected."""

    def __init__(self, folder: Path, port: int) -> None:
        self.folder = folder
        self.config = folder / "plant.toml"
        self.started: list[subprocess.Popen[bytes]] = []
        (folder / "secret").write_text(SECRET)
        (folder / "coils.csv").write_text(
            COIL_HEAD + FRESH + "".join(OLD.replace("C-OLD", coil) for coil in COILS)
        )
        (folder / "temps.csv").write_text(temperatures("T1", "T2"))
        self.config.write_text(
            f'{PLANT}[[endpoint]]\nname = "logistics"\nurl = "http://127.0.0.1:{port}/"\nsecret_file = "secret"\n'
        )

    def change(self, before: str, after: str) -> None:
        """Change the settings."""
        settings = self.config.read_text()
        assert before in settings
        self.config.write_text(settings.replace(before, after))

    def start(self, **more: str) -> subprocess.Popen[bytes]:
        """Start a daemon, and do not wait for anything."""
        with (self.folder / f"daemon-{len(self.started)}.log").open("wb") as log:
            process = subprocess.Popen(
                [
                    sys.executable,
                    "-m",
                    "agewatch",
                    "run",
                    "--config",
                    str(self.config),
                    "--log",
                    "json",
                    "--while-stdin",
                ],
                env=environment(more),
                stdin=subprocess.PIPE,  # so that no daemon outlives the tests, whatever ends them
                stderr=log,
            )
        self.started.append(process)
        return process

    def start_ready(self, **more: str) -> subprocess.Popen[bytes]:
        """Start a daemon, and wait until it says that it is ready."""
        with ServiceManager(self.folder / f"notify-{len(self.started)}.sock") as manager:
            process = self.start(NOTIFY_SOCKET=str(manager.path), **more)
            assert manager.next() == b"READY=1", self.log()
        return process

    def log(self) -> list[dict[str, str]]:
        """What the last daemon said."""
        text = (self.folder / f"daemon-{len(self.started) - 1}.log").read_text()
        return [json.loads(line) for line in text.splitlines() if line.startswith("{")]

    def ask(self, request: dict[str, str]) -> dict[str, object]:
        """One request at the control socket."""
        with socket.socket(socket.AF_UNIX) as peer:
            peer.settimeout(LONG_S)
            peer.connect(str(self.folder / "agewatch.sock"))
            peer.sendall(json.dumps(request).encode() + b"\n")
            reply: dict[str, object] = json.loads(peer.recv(65_536))
            return reply

    def outbox(self) -> list[OutboxMessage]:
        with open_reader("sqlite:///var/agewatch.db", self.folder) as reader, reader.read() as view:
            return queries.messages(view)

    def journal(self) -> list[JournalRow]:
        with open_reader("sqlite:///var/agewatch.db", self.folder) as reader, reader.read() as view:
            return queries.journal(view)

    def database(self) -> closing[sqlite3.Connection]:
        """A connection of another program."""
        return closing(sqlite3.connect(self.folder / "var" / "agewatch.db", isolation_level=None))

    def end_all(self) -> None:
        for process in self.started:
            if process.poll() is None:
                process.kill()
            process.wait(LONG_S)
            if process.stdin is not None:
                process.stdin.close()


class ServiceManager:
    """Hears what a service tells its manager."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self._socket = socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM)
        self._socket.bind(str(path))
        self._socket.settimeout(LONG_S)

    def next(self) -> bytes:
        return self._socket.recv(100)

    def __enter__(self) -> ServiceManager:
        return self

    def __exit__(self, *_: object) -> None:
        self._socket.close()


def terminate(process: subprocess.Popen[bytes], within_s: float) -> int:
    """End the process with SIGTERM; its exit status."""
    process.send_signal(signal.SIGTERM)
    return process.wait(within_s)


def get(port: int, path: str) -> tuple[int, str]:
    """A page of the daemon's."""
    with closing(HTTPConnection("127.0.0.1", port, timeout=LONG_S)) as connection:
        connection.request("GET", path)
        response = connection.getresponse()
        return response.status, response.read().decode()


def free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as probe:
        return int(probe.getsockname()[1])


def held(messages: Sequence[ReceivedMessage]) -> Counter[str]:
    """How often each coil was told to be held, counting a message that came again once."""
    told = {message.id: message for message in messages if message.type == "agewatch.coil.held"}
    return Counter(coil for message in told.values() for coil in message.coils)


def all_held(messages: Sequence[ReceivedMessage]) -> bool:
    return set(held(messages)) == set(COILS)
