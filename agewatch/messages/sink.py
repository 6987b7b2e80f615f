"""A receiver for trials on loopback: checks each signature, knows what came before, shows one line a message.

It answers 204 to a message whose signature holds, the first time and every further time; 403 where it does
not hold (credentials were given and do not suffice; 401 would have to name a way to log in, and there is
none); 400 where headers or body cannot be used; 405 for anything but POST; 413 for a body that is too long.
"""

from __future__ import annotations

import sys
from collections import OrderedDict, deque
from collections.abc import Callable, Sequence
from http import HTTPStatus
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from threading import Lock, Thread
from types import TracebackType
from typing import Self

from agewatch.clock import Clock
from agewatch.messages.received import Content, ReceivedMessage, check, read_content
from agewatch.messages.signing import ID_HEADER, Verification, key_of

BODY_LIMIT = 65_536
"""Longest body that is read, in bytes; AgeWatch's own are shorter than 20,000."""
KEPT = 10_000
DISCARDED = 1_000_000
"""Of a longer body so much is read and dropped, so that its sender gets to read the answer."""
WAIT_S = 10.0
"""A sender that sends nothing for this long is cut off."""

Show = Callable[[ReceivedMessage], None]


class Sink:
    """Receives in a thread of its own from `start` to `stop`; also a context manager."""

    def __init__(
        self,
        secrets: Sequence[str],
        clock: Clock,
        show: Show,
        *,
        host: str = "127.0.0.1",
        port: int = 0,
        kept: int = KEPT,
    ) -> None:
        """Bind at once: `port` 0 takes a free one. Raises SettingsError (secrets) and OSError (address).

        kept: how many messages are remembered, in `received` and to know what comes again.
        """
        for secret in secrets:
            key_of(secret)
        self._secrets = tuple(secrets)
        self._clock = clock
        self._show = show
        self._seen: OrderedDict[str, None] = OrderedDict()
        self._kept = kept
        self._received: deque[ReceivedMessage] = deque(maxlen=kept)
        self._turn = Lock()
        self._server = _Server((host, port), _Handler, self)
        self._thread = Thread(target=self._server.serve_forever, args=(0.05,), name="sink", daemon=True)

    @property
    def url(self) -> str:
        """Where messages go."""
        return f"http://{self._server.server_address[0]!s}:{self.port}/"

    @property
    def port(self) -> int:
        return int(self._server.server_address[1])

    @property
    def received(self) -> list[ReceivedMessage]:
        """The last `kept` messages, oldest first."""
        with self._turn:
            return list(self._received)

    def start(self) -> None:
        self._thread.start()

    def stop(self) -> None:
        """Take no more messages and free the port; the sender of a half received one will try again."""
        self._server.shutdown()
        self._thread.join()
        self._server.server_close()

    def __enter__(self) -> Self:
        self.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.stop()

    def take(self, headers: dict[str, str], body: bytes) -> tuple[HTTPStatus, str]:
        """Receive one message: remember and show it; the answer's status and, where it fails, the reason."""
        now_s = self._clock.now_s()
        verification = check(headers, body, self._secrets, now_s)
        content = read_content(body)
        self._keep(headers.get(ID_HEADER, ""), verification, content, now_s)
        if not verification:
            missing = verification.reason.endswith("is missing")
            return HTTPStatus.BAD_REQUEST if missing else HTTPStatus.FORBIDDEN, verification.reason
        if not content.readable:
            return HTTPStatus.BAD_REQUEST, "the body is no CloudEvents 1.0 event in JSON"
        return HTTPStatus.NO_CONTENT, ""

    def _keep(self, message_id: str, verification: Verification, content: Content, now_s: float) -> None:
        with self._turn:
            duplicate = verification.holds and message_id in self._seen
            if verification:
                self._seen[message_id] = None
            if len(self._seen) > self._kept:
                self._seen.popitem(last=False)
            message = ReceivedMessage(
                id=message_id,
                type=content.type,
                subject=content.subject,
                time=content.time,
                coils=content.coils,
                verified=verification.holds,
                reason=verification.reason,
                duplicate=duplicate,
                received_s=now_s,
            )
            self._received.append(message)
            self._show(message)


class _Server(ThreadingHTTPServer):
    """Its threads are not waited for: a sender that drips must not hold up the end."""

    daemon_threads = True

    def __init__(self, address: tuple[str, int], handler: type[BaseHTTPRequestHandler], sink: Sink) -> None:
        super().__init__(address, handler)
        self.sink = sink

    def handle_error(self, request: object, client_address: object) -> None:
        """A sender that hung up is its own affair; all else is reported as usual."""
        if not isinstance(sys.exception(), ConnectionError):
            super().handle_error(request, client_address)  # type: ignore[arg-type]


class _Handler(BaseHTTPRequestHandler):
    """HTTP/1.0: one message for each connection, so that stopping never waits for an idle one."""

    server: _Server
    timeout = WAIT_S

    def do_POST(self) -> None:
        length = self.headers.get("content-length", "")
        if not (length.isascii() and length.isdigit()):
            self._answer(HTTPStatus.BAD_REQUEST, "content-length is missing or no number")
        elif len(length) > 9 or int(length) > BODY_LIMIT:
            self.rfile.read(min(int(length[:9]), DISCARDED))
            self._answer(HTTPStatus.REQUEST_ENTITY_TOO_LARGE, f"the body is over {BODY_LIMIT} bytes")
        else:
            body = self.rfile.read(int(length))
            if len(body) < int(length):
                self._answer(HTTPStatus.BAD_REQUEST, "the body is shorter than content-length says")
            else:
                self._answer(*self.server.sink.take({k.lower(): v for k, v in self.headers.items()}, body))

    def do_other(self) -> None:
        self._answer(HTTPStatus.METHOD_NOT_ALLOWED, "messages come by POST", allow="POST")

    do_GET = do_HEAD = do_PUT = do_PATCH = do_DELETE = do_OPTIONS = do_other  # noqa: N815

    def log_message(self, format: str, *args: object) -> None:  # noqa: A002 - as the base class has it
        """Silent: what is worth a line is shown by `show`."""

    def _answer(self, status: HTTPStatus, text: str, **headers: str) -> None:
        body = f"{text}\n".encode() if text else b""
        self.send_response(status)
        for name, value in headers.items():
            self.send_header(name, value)
        if body:
            self.send_header("content-type", "text/plain; charset=utf-8")
            self.send_header("content-length", str(len(body)))
        self.end_headers()
        if self.command != "HEAD":
            self.wfile.write(body)
