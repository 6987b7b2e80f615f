"""Three pages on loopback for whoever watches the daemon: alive, ready, and its figures."""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence
from http import HTTPStatus
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from threading import Thread

from prometheus_client import CollectorRegistry
from prometheus_client.exposition import choose_encoder

from agewatch.errors import SettingsError

WAIT_S = 5.0
"""A client that says nothing for this long is cut off."""

Troubles = Callable[[], Sequence[str]]
"""One sentence for each thing that is wrong; none when all is well."""


class Health:
    """Serves /livez, /readyz and /metrics from `start` to `stop`."""

    def __init__(self, port: int, alive: Troubles, ready: Troubles, registry: CollectorRegistry) -> None:
        """Bind at once; port 0 takes a free one. Raises SettingsError where the port is taken."""
        try:
            self._server = _Server(("127.0.0.1", port), _Handler)
        except OSError as fault:
            raise SettingsError(
                [
                    f"daemon.http_port {port}: {fault.strerror}; give a free port, or 0 to serve no health pages"
                ]
            ) from fault
        self._server.alive, self._server.ready, self._server.registry = alive, ready, registry
        self._thread = Thread(target=self._server.serve_forever, args=(0.1,), name="health", daemon=True)

    @property
    def port(self) -> int:
        return int(self._server.server_address[1])

    def start(self) -> None:
        self._thread.start()

    def stop(self) -> None:
        if self._thread.is_alive():
            self._server.shutdown()
            self._thread.join()
        self._server.server_close()


class _Server(ThreadingHTTPServer):
    daemon_threads = True
    alive: Troubles
    ready: Troubles
    registry: CollectorRegistry


class _Handler(BaseHTTPRequestHandler):
    """HTTP/1.0: one page for each connection, so that stopping never waits for an idle one."""

    server: _Server
    timeout = WAIT_S

    def do_GET(self) -> None:
        if self.path == "/livez":
            self._state(self.server.alive())
        elif self.path == "/readyz":
            self._state(self.server.ready())
        elif self.path == "/metrics":
            encode, content_type = choose_encoder(self.headers.get("accept", ""))
            self._answer(HTTPStatus.OK, content_type, encode(self.server.registry))
        else:
            self._answer(HTTPStatus.NOT_FOUND, "text/plain", b"pages: /livez /readyz /metrics\n")

    def log_message(self, format: str, *args: object) -> None:  # noqa: A002 - as the base class has it
        """Silent: a look at the daemon is no event."""

    def _state(self, troubles: Sequence[str]) -> None:
        status = HTTPStatus.SERVICE_UNAVAILABLE if troubles else HTTPStatus.OK
        body = json.dumps({"ok": not troubles, "troubles": list(troubles)}).encode("ascii")
        self._answer(status, "application/json", body + b"\n")

    def _answer(self, status: HTTPStatus, content_type: str, body: bytes) -> None:
        self.send_response(status)
        self.send_header("content-type", content_type)
        self.send_header("content-length", str(len(body)))
        self.end_headers()
        self.wfile.write(body)
