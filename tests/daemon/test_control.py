"""The control socket, spoken to over a real Unix socket."""

from __future__ import annotations

import json
import os
import pwd
import socket
import stat
from collections.abc import Iterator
from pathlib import Path

import pytest

from agewatch.daemon import control
from agewatch.daemon.control import ControlSocket, Reply, Request
from agewatch.errors import ControlError

ME = f"user:{pwd.getpwuid(os.getuid()).pw_name}"


class Listener:
    """A control socket that says yes, and what it heard."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.heard: list[tuple[Request, str]] = []
        self.refused: list[tuple[str, str]] = []
        self.socket = ControlSocket(path, self._answer, self._refuse)
        self.socket.start()

    def _answer(self, request: Request, actor: str) -> Reply:
        self.heard.append((request, actor))
        if request["action"] == "break":
            raise RuntimeError("a fault of the program")
        return Reply(True, "done")

    def _refuse(self, actor: str, reason: str) -> Reply:
        self.refused.append((actor, reason))
        return Reply(False, reason)


@pytest.fixture
def listener(tmp_path: Path) -> Iterator[Listener]:
    one = Listener(tmp_path / "var" / "control.sock")
    yield one
    one.socket.stop()


def say(path: Path, line: bytes) -> bytes:
    """Say something, and no more; what comes back until the peer hangs up."""
    with socket.socket(socket.AF_UNIX) as peer:
        peer.settimeout(10.0)
        peer.connect(str(path))
        peer.sendall(line)
        peer.shutdown(socket.SHUT_WR)
        heard = b""
        while more := peer.recv(4096):
            heard += more
        return heard


def test_request_is_answered(listener: Listener) -> None:
    """One JSON line in, one JSON line out; the actor is the peer's user, whatever the line claims."""
    line = {"action": "acknowledge", "kind": "k", "subject": "s", "actor": "user:somebody-else"}
    reply = say(listener.path, json.dumps(line).encode() + b"\n")
    assert json.loads(reply) == {"ok": True, "said": "done"}
    assert listener.heard == [(line, ME)]


@pytest.mark.parametrize(
    ("line", "wrong"),
    [
        (b"", "ended within"),
        (b'{"action": "acknowledge"}', "ended within"),
        (b"acknowledge\n", "JSON object"),
        (b'["acknowledge"]\n', '"action"'),
        (b'{"kind": "k"}\n', '"action"'),
        (b'{"action": 7}\n', '"action"'),
        (b"\xff\xfe\n", "JSON object"),
        (b'{"action": "\\ud800"}\n', "JSON object"),
        (b"[" * 60_000 + b"\n", "JSON object"),
        (b'{"action": "' + b"x" * control.LINE_LIMIT + b'"}\n', "at most"),
    ],
)
def test_malformed_request_is_refused(listener: Listener, line: bytes, wrong: str) -> None:
    """A line that is no request gets an answer that says so, and is told of with its actor."""
    reply = json.loads(say(listener.path, line))
    assert not reply["ok"]
    assert wrong in reply["said"]
    assert listener.refused == [(ME, reply["said"])]
    assert listener.heard == []


def test_silent_peer_is_cut_off(listener: Listener, monkeypatch: pytest.MonkeyPatch) -> None:
    """A peer that says nothing is refused after a while, and holds up nobody meanwhile."""
    monkeypatch.setattr(control, "WAIT_S", 0.2)
    with socket.socket(socket.AF_UNIX) as silent:
        silent.settimeout(10.0)
        silent.connect(str(listener.path))
        assert json.loads(say(listener.path, b'{"action": "a"}\n'))["ok"]
        assert not json.loads(silent.recv(4096))["ok"]


def test_more_peers_than_places_are_turned_away(listener: Listener) -> None:
    """While all places are taken by silent peers a further one is hung up on; afterwards all is as before."""
    silent = [socket.socket(socket.AF_UNIX) for _ in range(control.AT_ONCE)]
    try:
        for peer in silent:
            peer.connect(str(listener.path))
        with socket.socket(socket.AF_UNIX) as further:
            further.settimeout(10.0)
            further.connect(str(listener.path))
            assert further.recv(1) == b""
    finally:
        for peer in silent:
            peer.close()
    replies = (say(listener.path, b'{"action": "a"}\n') for _ in range(1000))
    assert any(reply for reply in replies)


def test_fault_of_the_program_ends_one_request_only(listener: Listener) -> None:
    """When answering fails, the peer is hung up on and the next one is served."""
    assert say(listener.path, b'{"action": "break"}\n') == b""
    assert json.loads(say(listener.path, b'{"action": "a"}\n'))["ok"]


def test_socket_is_for_its_user_and_group(listener: Listener) -> None:
    """Others than owner and group may not connect."""
    assert stat.S_IMODE(listener.path.stat().st_mode) == 0o660


def test_socket_of_a_dead_daemon_is_replaced(tmp_path: Path) -> None:
    """A socket file on which nobody listens is replaced."""
    path = tmp_path / "control.sock"
    with socket.socket(socket.AF_UNIX) as dead:
        dead.bind(str(path))
    listener = Listener(path)
    assert json.loads(say(path, b'{"action": "a"}\n'))["ok"]
    listener.socket.stop()
    assert not path.exists()


def test_socket_of_a_living_daemon_is_left_alone(listener: Listener) -> None:
    """Where another daemon listens, the second is refused and the first goes on."""
    with pytest.raises(ControlError, match="another daemon listens"):
        Listener(listener.path)
    assert json.loads(say(listener.path, b'{"action": "a"}\n'))["ok"]


def test_file_of_another_kind_is_left_alone(tmp_path: Path) -> None:
    """A file that is no socket is never removed."""
    path = tmp_path / "notes.txt"
    path.write_text("keep me")
    with pytest.raises(ControlError, match="another kind"):
        Listener(path)
    assert path.read_text() == "keep me"


def test_path_that_cannot_be_bound(tmp_path: Path) -> None:
    """A path too long for a socket is refused with advice."""
    with pytest.raises(ControlError, match="short path"):
        Listener(tmp_path / ("x" * 120))
