"""The board's words with the daemon, over real Unix sockets."""

from __future__ import annotations

import os
import socket
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from threading import Thread

import pytest

from agewatch.board.control import ask_daemon
from agewatch.daemon.control import ControlSocket, Reply, Request
from agewatch.errors import ControlError

REQUEST = {"action": "acknowledge", "kind": "sensor-silent", "subject": "T104 ü\n\x1b", "reason": ""}


@contextmanager
def _daemon(path: Path, reply: Reply, heard: list[Request]) -> Iterator[None]:
    """The daemon's own socket, which gives `reply` to everything."""

    def answer(request: Request, _actor: str) -> Reply:
        heard.append(request)
        return reply

    served = ControlSocket(path, answer, lambda _actor, reason: Reply(False, reason))
    served.start()
    try:
        yield
    finally:
        served.stop()


@contextmanager
def _peer(path: Path, answer: bytes, *, wait: bool = False) -> Iterator[None]:
    """Somebody who takes one line, says `answer`, and hangs up, or holds the line while `wait`."""
    with socket.socket(socket.AF_UNIX) as listening:
        listening.bind(str(path))
        listening.listen()
        release, released = os.pipe()

        def serve() -> None:
            line, _ = listening.accept()
            with line:
                line.recv(4096)
                line.sendall(answer)
                if wait:
                    os.read(release, 1)

        thread = Thread(target=serve)
        thread.start()
        try:
            yield
        finally:
            os.write(released, b"x")
            thread.join(10.0)
            os.close(release)
            os.close(released)


def test_a_request_reaches_the_daemon_whole_and_its_word_comes_back(tmp_path: Path) -> None:
    """Whatever the names hold, they arrive as they are."""
    heard: list[Request] = []
    with _daemon(tmp_path / "s", Reply(True, "acknowledged"), heard):
        assert ask_daemon(tmp_path / "s", REQUEST) == "acknowledged"
    assert heard == [REQUEST]


def test_a_refusal_is_told_in_the_daemons_words(tmp_path: Path) -> None:
    """The reason is for the person who asked."""
    refusal = Reply(False, "you may look, but not operate")
    with (
        _daemon(tmp_path / "s", refusal, []),
        pytest.raises(ControlError, match=r"^you may look, but not operate$"),
    ):
        ask_daemon(tmp_path / "s", REQUEST)


def test_a_daemon_that_is_not_there_is_said_to_be_not_running(tmp_path: Path) -> None:
    """No socket, or one that a dead daemon left behind."""
    with pytest.raises(ControlError, match=r"the daemon is not running: nobody listens at .*gone"):
        ask_daemon(tmp_path / "gone", REQUEST)
    with socket.socket(socket.AF_UNIX) as left:
        left.bind(str(tmp_path / "left"))
    with pytest.raises(ControlError, match=r"the daemon is not running"):
        ask_daemon(tmp_path / "left", REQUEST)


def test_a_path_that_no_socket_can_have_is_said(tmp_path: Path) -> None:
    """Unix sockets have short paths; a longer one is no crash."""
    with pytest.raises(ControlError, match=r"cannot be reached at"):
        ask_daemon(tmp_path / ("x" * 200), REQUEST)


def test_a_silent_daemon_is_not_waited_for_for_ever(tmp_path: Path) -> None:
    """After the time given the person is told that nothing is known."""
    with (
        _peer(tmp_path / "s", b"", wait=True),
        pytest.raises(ControlError, match=r"did not answer within .* see in the list"),
    ):
        ask_daemon(tmp_path / "s", REQUEST, within_s=0.05)


@pytest.mark.parametrize(
    "answer",
    [b"", b"no json\n", b"[1]\n", b'{"ok": true}\n', b'{"ok": true, "said": "half', b"\xff\xfe\n", b"7\n"],
)
def test_an_answer_that_cannot_be_read_is_said(tmp_path: Path, answer: bytes) -> None:
    """Half a line, or another program's, is never taken for a yes."""
    with _peer(tmp_path / "s", answer), pytest.raises(ControlError, match=r"an answer that cannot be read"):
        ask_daemon(tmp_path / "s", REQUEST)
