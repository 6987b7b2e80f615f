"""The control socket: people's actions come in as one JSON line each, and get one line back."""

from __future__ import annotations

import json
import logging
import socket
import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from socketserver import StreamRequestHandler, ThreadingMixIn, UnixStreamServer
from threading import BoundedSemaphore, Thread
from time import monotonic

from agewatch.daemon.peers import actor_of
from agewatch.errors import ControlError

LINE_LIMIT = 65_536
"""Longest request, in bytes."""
WAIT_S = 5.0
"""A peer has this long to say its line, and to take the answer."""
AT_ONCE = 16
"""Peers served at a time; more are turned away."""

Request = Mapping[str, object]

_log = logging.getLogger(__name__)


@dataclass(frozen=True, slots=True)
class Reply:
    """Whether it was done, and one sentence for the person who asked."""

    ok: bool
    said: str

    def line(self) -> bytes:
        return json.dumps({"ok": self.ok, "said": self.said}).encode("ascii") + b"\n"


Answer = Callable[[Request, str], Reply]
"""From a request and its actor to the reply."""
Refuse = Callable[[str, str], Reply]
"""From the actor of a line that is no request, and what is wrong with it, to the reply."""


class ControlSocket:
    """Listens from `start` to `stop`."""

    def __init__(self, path: Path, answer: Answer, refuse: Refuse) -> None:
        """Bind at once. Raises ControlError where a daemon listens already or another kind of file is there."""
        _clear(path)
        try:
            path.parent.mkdir(parents=True, exist_ok=True)
            self._server = _Server(path, answer, refuse)
        except OSError as fault:
            raise ControlError(
                f"control socket {path}: {fault.strerror or fault}; give daemon.control_socket a short path "
                "in a folder that the daemon may write"
            ) from fault
        self._path = path
        self._thread = Thread(target=self._server.serve_forever, args=(0.1,), name="control", daemon=True)

    def start(self) -> None:
        self._thread.start()

    def stop(self) -> None:
        """Take no more requests; those under way may end by themselves."""
        if self._thread.is_alive():
            self._server.shutdown()
            self._thread.join()
        self._server.server_close()
        self._path.unlink(missing_ok=True)


def is_listening(path: Path) -> bool:
    """Whether a daemon listens at `path`. Raises ControlError where that cannot be found out."""
    if not path.exists() and not path.is_symlink():
        return False
    if not path.is_socket():
        raise ControlError(f"control socket {path}: a file of another kind is there; remove it")
    with socket.socket(socket.AF_UNIX) as probe:
        probe.settimeout(WAIT_S)
        try:
            probe.connect(str(path))
        except ConnectionRefusedError:
            return False
        except OSError as fault:
            raise ControlError(
                f"control socket {path}: {fault.strerror or fault}; see to its rights"
            ) from fault
    return True


def _clear(path: Path) -> None:
    """Remove the socket of a daemon that is gone."""
    if is_listening(path):
        raise ControlError(
            f"control socket {path}: another daemon listens there; stop it, or give another path"
        )
    path.unlink(missing_ok=True)


class _Server(ThreadingMixIn, UnixStreamServer):
    daemon_threads = True
    block_on_close = False
    request_queue_size = AT_ONCE

    def __init__(self, path: Path, answer: Answer, refuse: Refuse) -> None:
        self.answer = answer
        self.refuse = refuse
        self._places = BoundedSemaphore(AT_ONCE)
        super().__init__(str(path), _Handler)

    def server_bind(self) -> None:
        super().server_bind()
        Path(str(self.server_address)).chmod(0o660)  # before it listens: no one gets in earlier

    def verify_request(self, request: object, client_address: object) -> bool:  # noqa: ARG002 - as the base has it
        return self._places.acquire(blocking=False)

    def process_request_thread(self, request: object, client_address: object) -> None:
        try:
            super().process_request_thread(request, client_address)  # type: ignore[arg-type]
        finally:
            self._places.release()

    def handle_error(self, request: object, client_address: object) -> None:  # noqa: ARG002 - as the base has it
        """A fault of the program: the peer gets no answer, the log tells why."""
        _log.error("a request failed: %r", sys.exception(), exc_info=True)


class _Handler(StreamRequestHandler):
    server: _Server
    connection: socket.socket

    def handle(self) -> None:
        actor = actor_of(self.connection)
        line = self._line()
        request = _request(line)
        server = self.server
        reply = server.refuse(actor, request) if isinstance(request, str) else server.answer(request, actor)
        self.connection.settimeout(WAIT_S)
        try:
            self.connection.sendall(reply.line())
        except OSError:
            return  # the peer is gone; what it asked for is done and journalled all the same

    def _line(self) -> bytes:
        """What the peer says up to a line's end, within `WAIT_S`; of a longer line a little over `LINE_LIMIT`."""
        until_s = monotonic() + WAIT_S
        said, ended = b"", False
        try:
            while not ended and (left_s := until_s - monotonic()) > 0:
                self.connection.settimeout(left_s)
                more = self.connection.recv(LINE_LIMIT)
                ended = not more or b"\n" in more
                said = (said + more)[
                    : LINE_LIMIT + 1
                ]  # the rest is read and dropped: unread, it would cut the answer off
        except OSError:
            return said
        return said


def _request(line: bytes) -> Request | str:
    """The request, or why the line is none."""
    if len(line) > LINE_LIMIT:
        return f"a request is one line of at most {LINE_LIMIT} bytes"
    if b"\n" not in line:
        return f"a request is one line, ended within {WAIT_S:.0f} s"
    try:
        request = json.loads(line.partition(b"\n")[0])
        json.dumps(request, ensure_ascii=False).encode()  # half a character cannot be kept
    except (ValueError, RecursionError):
        return "a request is one JSON object in UTF-8 on one line"
    if not isinstance(request, dict) or not isinstance(request.get("action"), str):
        return 'a request is one JSON object with "action"'
    return request
