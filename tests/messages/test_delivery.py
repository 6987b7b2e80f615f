"""The HTTP call against real servers: what is sent, what each answer means, and that nothing holds it up."""

from __future__ import annotations

import socket
import ssl
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager, suppress
from pathlib import Path
from threading import Event, Thread
from time import monotonic

import pytest
import trustme
from pytest_httpserver import HTTPServer
from werkzeug import Request, Response

from agewatch.messages.delivery import attempt, open_session
from agewatch.messages.retry import Outcome, OutcomeKind, after_attempt
from agewatch.messages.signing import verify
from agewatch.plant.records import MessageState
from agewatch.plant.settings import Endpoint
from tests.messages.samples import NOW, SECRET, endpoint, message

ANYWHERE = Path("/nonexistent")
HEAD = b"HTTP/1.1 500 Trouble\r\nContent-Length: 1000000\r\n\r\n"


def send(to: Endpoint) -> Outcome:
    return attempt(to, SECRET, message(), NOW, folder=ANYWHERE)


@contextmanager
def raw_server(answer: Callable[[socket.socket, Event], None]) -> Iterator[str]:
    """A server that reads one request and then does what `answer` does with the socket."""
    ended = Event()

    def serve() -> None:
        connection, _ = listener.accept()
        with connection, suppress(OSError):
            connection.settimeout(5)
            while b'"coils"' not in connection.recv(65_536):
                pass
            answer(connection, ended)

    with socket.create_server(("127.0.0.1", 0)) as listener:
        listener.settimeout(5)
        thread = Thread(target=serve)
        thread.start()
        try:
            yield f"http://127.0.0.1:{listener.getsockname()[1]}/in"
        finally:
            ended.set()
            thread.join()


def drip(at_once: bytes, content: bytes) -> Callable[[socket.socket, Event], None]:
    """Sends `at_once`, then one byte of `content` each 20 ms until the test is over."""

    def answer(connection: socket.socket, ended: Event) -> None:
        connection.sendall(at_once)
        for byte in content:
            connection.sendall(bytes([byte]))
            if ended.wait(0.02):
                return

    return answer


def test_a_message_arrives_as_it_is_with_a_signature_that_holds(httpserver: HTTPServer) -> None:
    """Body, type and the three headers reach the receiver, and the receiver's check of them holds."""
    requests: list[Request] = []
    bodies: list[bytes] = []

    def receive(request: Request) -> Response:
        requests.append(request)
        bodies.append(request.get_data())
        return Response(status=204)

    httpserver.expect_request("/in", method="POST").respond_with_handler(receive)
    assert send(endpoint(httpserver.url_for("/in"))) == Outcome(OutcomeKind.DELIVERED)
    (request,), (body,) = requests, bodies
    assert body.decode() == message().body
    assert request.content_type == "application/cloudevents+json; charset=utf-8"
    assert request.headers["user-agent"].startswith("AgeWatch/")
    assert request.headers["webhook-id"] == message().message_id
    assert verify(
        [SECRET],
        request.headers["webhook-id"],
        request.headers["webhook-timestamp"],
        body,
        request.headers["webhook-signature"],
        now_s=NOW,
    )


def test_every_attempt_is_signed_anew_under_the_same_id(httpserver: HTTPServer) -> None:
    """The timestamp moves with the attempt, the id does not (Standard Webhooks 1.0)."""
    seen: list[tuple[str, str]] = []

    def receive(request: Request) -> Response:
        seen.append((request.headers["webhook-id"], request.headers["webhook-timestamp"]))
        return Response(status=500 if len(seen) == 1 else 200)

    httpserver.expect_request("/in").respond_with_handler(receive)
    to = endpoint(httpserver.url_for("/in"))
    with open_session() as session:
        kinds = [
            attempt(to, SECRET, message(), NOW + wait_s, folder=ANYWHERE, session=session).kind
            for wait_s in (0.0, 600.0)
        ]
    assert kinds == [OutcomeKind.IN_TROUBLE, OutcomeKind.DELIVERED]
    assert seen == [(message().message_id, str(int(NOW))), (message().message_id, str(int(NOW) + 600))]


@pytest.mark.parametrize(
    ("status", "headers", "expected"),
    [
        (200, {}, Outcome(OutcomeKind.DELIVERED)),
        (429, {"Retry-After": "17"}, Outcome(OutcomeKind.IN_TROUBLE, "it answered 429: no", 17.0)),
        (
            503,
            {"Retry-After": "Fri, 15 Jan 2027 08:01:00 GMT"},
            Outcome(OutcomeKind.IN_TROUBLE, "it answered 503: no", 60.0),
        ),
        (410, {}, Outcome(OutcomeKind.GONE, "it answered 410: no")),
        (422, {}, Outcome(OutcomeKind.REFUSED, "it answered 422: no")),
    ],
)
def test_each_answer_is_understood(
    httpserver: HTTPServer, status: int, headers: dict[str, str], expected: Outcome
) -> None:
    """Status, what the receiver said, and when it wants to be asked again."""
    httpserver.expect_request("/in").respond_with_data("no", status=status, headers=headers)
    assert send(endpoint(httpserver.url_for("/in"))) == expected


def test_a_redirect_is_a_failure_and_not_followed(httpserver: HTTPServer) -> None:
    """No message, and no signature, goes to where a receiver points."""
    elsewhere: list[Request] = []

    def receive(request: Request) -> Response:
        elsewhere.append(request)
        return Response(status=204)

    httpserver.expect_request("/elsewhere").respond_with_handler(receive)
    target = httpserver.url_for("/elsewhere")
    httpserver.expect_request("/in").respond_with_data("", status=307, headers={"Location": target})
    outcome = send(endpoint(httpserver.url_for("/in")))
    assert outcome == Outcome(OutcomeKind.REFUSED, f"it answered 307 (redirect to {target} not followed)")
    assert elsewhere == []


def test_what_a_receiver_says_is_made_harmless(httpserver: HTTPServer) -> None:
    """Control characters in an answer cannot steer the terminal or the log that shows the reason."""
    httpserver.expect_request("/in").respond_with_data(b"\x1b[2Jgone\r\nnext \xff", status=500)
    assert send(endpoint(httpserver.url_for("/in"))).reason == r"it answered 500: \x1b[2Jgone\x0d\x0anext �"


def test_an_answer_that_never_comes_ends_in_time() -> None:
    """A receiver that takes the message and says nothing is left after the read timeout."""

    def say_nothing(connection: socket.socket, ended: Event) -> None:
        ended.wait(5)

    with raw_server(say_nothing) as url:
        began_s = monotonic()
        outcome = send(endpoint(url, read_s=0.3))
        assert monotonic() - began_s < 2.0
    assert outcome == Outcome(OutcomeKind.IN_TROUBLE, "no whole answer within 0.3 s")


@pytest.mark.parametrize("at_once", [b"HTTP/1.1 200 ", HEAD])
def test_a_drip_is_cut(at_once: bytes) -> None:
    """Bytes that come one by one, in the head or in the body, do not stretch the read timeout."""
    with raw_server(drip(at_once, b"x" * 500)) as url:
        began_s = monotonic()
        outcome = send(endpoint(url, read_s=0.4))
        assert monotonic() - began_s < 3.0
    assert outcome.kind is OutcomeKind.IN_TROUBLE


def test_a_slow_body_does_not_undo_a_success() -> None:
    """The status decides: who has said 200 has the message, whatever becomes of the answer's body."""
    with raw_server(drip(b"HTTP/1.1 200 OK\r\nContent-Length: 900\r\n\r\n", b"x" * 900)) as url:
        began_s = monotonic()
        assert send(endpoint(url, read_s=0.4)) == Outcome(OutcomeKind.DELIVERED)
        assert monotonic() - began_s < 3.0


def test_an_endless_answer_is_read_no_further_than_its_limit() -> None:
    """Of an answer without end only the beginning is taken."""

    def flood(connection: socket.socket, ended: Event) -> None:
        connection.sendall(b"HTTP/1.1 500 Trouble\r\n\r\n")
        while not ended.is_set():
            connection.sendall(b"y" * 65_536)

    with raw_server(flood) as url:
        outcome = send(endpoint(url))
    assert outcome == Outcome(OutcomeKind.IN_TROUBLE, "it answered 500: " + "y" * 200 + "…")


def test_a_receiver_that_puts_off_for_ever_is_left_in_time() -> None:
    """Interim answers without end ("continue") do not stretch the read timeout either."""

    def put_off(connection: socket.socket, ended: Event) -> None:
        while not ended.is_set():
            connection.sendall(b"HTTP/1.1 100 Continue\r\n\r\n" * 100)

    with raw_server(put_off) as url:
        began_s = monotonic()
        outcome = send(endpoint(url, read_s=0.3))
        assert monotonic() - began_s < 3.0
    assert outcome == Outcome(OutcomeKind.IN_TROUBLE, "no whole answer within 0.3 s")


def test_a_receiver_that_takes_no_more_connections_is_left_in_time() -> None:
    """A full queue of connections ends in the connect timeout, which the reason names."""
    with socket.create_server(("127.0.0.1", 0), backlog=0) as full:
        address = full.getsockname()
        with ExitStack() as waiting:
            with suppress(TimeoutError):
                while True:
                    waiting.enter_context(socket.create_connection(address, timeout=0.2))
            outcome = send(endpoint(f"http://127.0.0.1:{address[1]}/in", connect_s=0.3))
    assert outcome == Outcome(OutcomeKind.IN_TROUBLE, "no connection within 0.3 s")


def test_a_time_limit_of_nothing_is_an_outcome() -> None:
    """A limit of 0 s that got past the settings stops the message with its reason, and not the worker."""
    outcome = send(endpoint("http://127.0.0.1:9/in", connect_s=0.0))
    assert outcome.kind is OutcomeKind.IN_TROUBLE
    assert "timeout" in outcome.reason


def test_a_receiver_that_is_not_there_is_named_so() -> None:
    """A refused connection is trouble of the receiver, to be tried again."""
    with socket.create_server(("127.0.0.1", 0)) as free:
        port = free.getsockname()[1]
    outcome = send(endpoint(f"http://127.0.0.1:{port}/in"))
    assert outcome.kind is OutcomeKind.IN_TROUBLE
    assert outcome.reason.startswith("no connection: ")
    assert "refused" in outcome.reason


def test_a_receiver_that_hangs_up_is_tried_again() -> None:
    """A connection closed without an answer may or may not have delivered: the message is sent again."""
    with raw_server(lambda connection, _: connection.close()) as url:
        outcome = send(endpoint(url))
    assert outcome.kind is OutcomeKind.IN_TROUBLE
    assert outcome.reason.startswith("no connection: ")


def test_nothing_is_taken_from_the_environment(
    httpserver: HTTPServer, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """Proxies, certificate bundles and passwords that the environment names are not used."""
    for name in ("HTTP_PROXY", "http_proxy", "HTTPS_PROXY", "ALL_PROXY"):
        monkeypatch.setenv(name, "http://127.0.0.1:9")
    monkeypatch.setenv("REQUESTS_CA_BUNDLE", str(tmp_path / "missing.pem"))
    passwords = tmp_path / "netrc"
    passwords.write_text("default login eva password secret\n")
    monkeypatch.setenv("NETRC", str(passwords))
    monkeypatch.delenv("NO_PROXY", raising=False)
    monkeypatch.delenv("no_proxy", raising=False)
    seen: list[str | None] = []

    def receive(request: Request) -> Response:
        seen.append(request.headers.get("authorization"))
        return Response(status=204)

    httpserver.expect_request("/in").respond_with_handler(receive)
    assert send(endpoint(httpserver.url_for("/in"))).kind is OutcomeKind.DELIVERED
    assert seen == [None]


@pytest.fixture(scope="module")
def authority() -> trustme.CA:
    return trustme.CA()


@contextmanager
def tls_server(authority: trustme.CA, host: str) -> Iterator[HTTPServer]:
    context = ssl.SSLContext(ssl.PROTOCOL_TLS_SERVER)
    authority.issue_cert(host).configure_cert(context)
    with HTTPServer(host="127.0.0.1", ssl_context=context) as server:
        server.expect_request("/in").respond_with_data("", status=204)
        yield server


def test_a_private_authority_is_trusted_when_named(
    authority: trustme.CA, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A plant's own authority works through ca_file, relative to the settings, not the environment."""
    authority.cert_pem.write_to_path(str(tmp_path / "plant-ca.pem"))
    monkeypatch.setenv("REQUESTS_CA_BUNDLE", str(tmp_path / "missing.pem"))
    with tls_server(authority, "127.0.0.1") as server:
        to = endpoint(f"https://127.0.0.1:{server.port}/in", ca_file="plant-ca.pem")
        assert attempt(to, SECRET, message(), NOW, folder=tmp_path).kind is OutcomeKind.DELIVERED


@pytest.mark.parametrize(("host", "ca_file"), [("127.0.0.1", None), ("receiver.example", "plant-ca.pem")])
def test_a_certificate_that_does_not_fit_is_refused(
    authority: trustme.CA, tmp_path: Path, host: str, ca_file: str | None
) -> None:
    """An unknown authority or another host's certificate stops the message before anything is sent."""
    authority.cert_pem.write_to_path(str(tmp_path / "plant-ca.pem"))
    with tls_server(authority, host) as server:
        to = endpoint(f"https://127.0.0.1:{server.port}/in", ca_file=ca_file)
        outcome = attempt(to, SECRET, message(), NOW, folder=tmp_path)
        assert server.log == []
    assert outcome.kind is OutcomeKind.IN_TROUBLE
    assert outcome.reason.startswith("its certificate is not trusted")
    assert "certificate verify failed" in outcome.reason


def test_a_missing_authority_file_is_an_outcome_that_names_it(tmp_path: Path) -> None:
    """A ca_file that is not there stops the message with its name, and not the worker."""
    to = endpoint("https://127.0.0.1:9/in", ca_file="missing.pem")
    outcome = attempt(to, SECRET, message(), NOW, folder=tmp_path)
    assert outcome.kind is OutcomeKind.IN_TROUBLE
    assert str(tmp_path / "missing.pem") in outcome.reason


def test_a_handshake_without_an_answer_ends_in_time() -> None:
    """A server that speaks no TLS and keeps the connection open is left after the connect timeout."""
    with socket.create_server(("127.0.0.1", 0)) as listener:
        to = endpoint(f"https://127.0.0.1:{listener.getsockname()[1]}/in", connect_s=0.3)
        began_s = monotonic()
        outcome = send(to)
        assert monotonic() - began_s < 5.0
    assert outcome.kind is OutcomeKind.IN_TROUBLE


def test_the_order_is_kept_by_sending_the_head_of_the_line_only(httpserver: HTTPServer) -> None:
    """Trying only the first waiting message, each to its end, delivers every message once and in order."""
    arrived: list[str] = []
    refusals = iter([503, 503, 200, 500, 200, 429, 200])

    def receive(request: Request) -> Response:
        status = next(refusals)
        if status == 200:
            arrived.append(request.headers["webhook-id"])
        return Response(status=status)

    httpserver.expect_request("/in").respond_with_handler(receive)
    to = endpoint(httpserver.url_for("/in"))
    line = [message(coil) for coil in ("C-1", "C-2", "C-3")]
    now_s = NOW
    with open_session() as session:
        while waiting := [one for one in line if one.state is MessageState.WAITING]:
            head = waiting[0]
            now_s = max(now_s, head.next_attempt_s)
            outcome = attempt(to, SECRET, head, now_s, folder=ANYWHERE, session=session)
            line[line.index(head)] = after_attempt(head, outcome, now_s, lambda: 0.5, attempts=12)
    assert arrived == [one.message_id for one in line]
    assert [one.attempts for one in line] == [3, 2, 2]
