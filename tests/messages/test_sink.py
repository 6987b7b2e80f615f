"""The receiver for trials, against real senders on loopback."""

from __future__ import annotations

import socket
import struct
from collections.abc import Iterator
from dataclasses import replace
from http.client import HTTPConnection
from pathlib import Path

import pytest

from agewatch.clock import StoppedClock
from agewatch.errors import SettingsError
from agewatch.messages.delivery import attempt
from agewatch.messages.received import ReceivedMessage
from agewatch.messages.retry import Outcome, OutcomeKind
from agewatch.messages.signing import headers, secret_of
from agewatch.messages.sink import BODY_LIMIT, Sink
from tests.messages.samples import NOW, SECRET, endpoint, message

ANYWHERE = Path("/nonexistent")
OTHER = secret_of(b"another key of 24 bytes!")


@pytest.fixture
def shown() -> list[ReceivedMessage]:
    return []


@pytest.fixture
def sink(shown: list[ReceivedMessage]) -> Iterator[Sink]:
    with Sink([SECRET], StoppedClock(NOW), shown.append) as running:
        yield running


def send(sink: Sink, coil: str = "C-1", *, secret: str = SECRET, now_s: float = NOW) -> Outcome:
    return attempt(endpoint(sink.url), secret, message(coil), now_s, folder=ANYWHERE)


def speak(sink: Sink, method: str, body: bytes, sent: dict[str, str]) -> tuple[int, str, dict[str, str]]:
    connection = HTTPConnection("127.0.0.1", sink.port, timeout=5)
    try:
        connection.request(method, "/", body, sent)
        answer = connection.getresponse()
        return answer.status, answer.read().decode(), {k.lower(): v for k, v in answer.getheaders()}
    finally:
        connection.close()


def signed(body: bytes) -> dict[str, str]:
    return headers(SECRET, message().message_id, int(NOW), body)


def test_a_good_message_is_taken_and_shown(sink: Sink, shown: list[ReceivedMessage]) -> None:
    """What AgeWatch sends is verified, listed with its coils, and shown once."""
    assert send(sink) == Outcome(OutcomeKind.DELIVERED)
    assert sink.received == shown
    assert shown == [
        ReceivedMessage(
            id=message().message_id,
            type="agewatch.pull.requested",
            subject="BAY-1",
            time="2027-01-15T08:00:00.000Z",
            coils=("C-1",),
            verified=True,
            reason="",
            duplicate=False,
            received_s=NOW,
        )
    ]


def test_a_message_that_comes_again_is_known(sink: Sink) -> None:
    """At-least-once delivery may repeat a message: it is accepted again and marked, by its id alone."""
    for coil in ("C-1", "C-2", "C-1"):
        assert send(sink, coil).kind is OutcomeKind.DELIVERED
    assert [(one.coils, one.duplicate) for one in sink.received] == [
        (("C-1",), False),
        (("C-2",), False),
        (("C-1",), True),
    ]


def test_a_forged_message_is_refused_and_does_not_spoil_the_true_one(sink: Sink) -> None:
    """A wrong key is refused with 403 and shown so; the id it used is still new when the true one comes."""
    assert send(sink, secret=OTHER) == Outcome(
        OutcomeKind.REFUSED, "it answered 403: no signature is by a known secret"
    )
    assert send(sink).kind is OutcomeKind.DELIVERED
    assert [(one.verified, one.duplicate) for one in sink.received] == [(False, False), (True, False)]
    assert sink.received[0].reason == "no signature is by a known secret"


def test_an_old_message_is_refused(sink: Sink) -> None:
    """A recorded message played back after the tolerance is not verified."""
    assert send(sink, now_s=NOW - 301.0).reason == "it answered 403: webhook-timestamp is 301 s old"


def test_only_posts_are_taken(sink: Sink) -> None:
    """Every other method is told which one is right, and nothing is recorded."""
    for method in ("GET", "HEAD", "PUT", "PATCH", "DELETE", "OPTIONS"):
        status, _, answer = speak(sink, method, b"", {})
        assert (status, answer["allow"]) == (405, "POST")
    assert sink.received == []


@pytest.mark.parametrize(
    ("body", "sent", "status", "words"),
    [
        (b"{}", {}, 400, "webhook-id is missing"),
        (b"no event", signed(b"no event"), 400, "the body is no CloudEvents 1.0 event in JSON"),
        (b"", {"Content-Length": "-1"}, 400, "content-length is missing or no number"),
        (b"", {"Content-Length": "ten"}, 400, "content-length is missing or no number"),
        (b"x" * (BODY_LIMIT + 1), {}, 413, f"the body is over {BODY_LIMIT} bytes"),
        (b"x" * 900_000, {}, 413, f"the body is over {BODY_LIMIT} bytes"),
    ],
)
def test_what_cannot_be_used_is_answered_with_a_reason(
    sink: Sink, body: bytes, sent: dict[str, str], status: int, words: str
) -> None:
    """Unusable headers and bodies get 400, bodies that are too long 413, each with words that say why."""
    assert speak(sink, "POST", body, sent)[:2] == (status, f"{words}\n")


def test_a_body_cut_short_is_no_message(sink: Sink) -> None:
    """A sender that ends before it said all gets 400, and nothing is recorded."""
    with socket.create_connection(("127.0.0.1", sink.port), timeout=5) as sender:
        sender.sendall(b"POST / HTTP/1.1\r\nContent-Length: 500\r\n\r\nbeginning")
        sender.shutdown(socket.SHUT_WR)
        assert b" 400 " in sender.recv(4096)
    assert sink.received == []


def test_a_sender_that_says_nothing_does_not_hold_up_the_end(shown: list[ReceivedMessage]) -> None:
    """Stopping frees the port at once although a connection is open, and the port can be taken again."""
    sink = Sink([SECRET], StoppedClock(NOW), shown.append)
    sink.start()
    with socket.create_connection(("127.0.0.1", sink.port), timeout=5):
        sink.stop()
        with Sink([SECRET], StoppedClock(NOW), shown.append, port=sink.port) as again:
            assert send(again).kind is OutcomeKind.DELIVERED


def test_a_sender_that_hangs_up_is_no_error(sink: Sink, capfd: pytest.CaptureFixture[str]) -> None:
    """A connection that is reset in the middle of a message leaves no trace and no message."""
    with socket.create_connection(("127.0.0.1", sink.port), timeout=5) as sender:
        sender.sendall(b"POST / HTTP/1.1\r\nContent-Length: 500\r\n\r\nbeginning")
        sender.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, struct.pack("ii", 1, 0))
    assert send(sink).kind is OutcomeKind.DELIVERED
    assert len(sink.received) == 1
    assert capfd.readouterr().err == ""


def test_a_fault_in_showing_is_reported_and_the_sender_tries_again(capfd: pytest.CaptureFixture[str]) -> None:
    """When a message cannot be shown it is not acknowledged, and the fault is not hidden."""

    def fail(_: ReceivedMessage) -> None:
        raise RuntimeError("the screen is gone")

    with Sink([SECRET], StoppedClock(NOW), fail) as sink:
        assert send(sink).kind is OutcomeKind.IN_TROUBLE
    assert "the screen is gone" in capfd.readouterr().err


def test_only_so_many_messages_are_remembered() -> None:
    """Memory is bounded: what was forgotten is new again."""
    with Sink([SECRET], StoppedClock(NOW), lambda _: None, kept=2) as sink:
        for coil in ("C-1", "C-2", "C-3", "C-1"):
            send(sink, coil)
        assert [(one.coils, one.duplicate) for one in sink.received] == [
            (("C-3",), False),
            (("C-1",), False),
        ]


def test_several_secrets_are_good() -> None:
    """While keys change, messages by the old and by the new one are both verified."""
    with Sink([OTHER, SECRET], StoppedClock(NOW), lambda _: None) as sink:
        assert send(sink).kind is OutcomeKind.DELIVERED
        assert send(sink, "C-2", secret=OTHER).kind is OutcomeKind.DELIVERED


def test_a_bad_secret_stops_the_sink_before_it_starts() -> None:
    """A sink that could verify nothing is refused, and no port is taken."""
    with pytest.raises(SettingsError, match="a signing secret is"):
        Sink(["hunter2"], StoppedClock(NOW), lambda _: None)


def test_a_message_is_compared_with_a_fresh_look_at_the_clock(shown: list[ReceivedMessage]) -> None:
    """The time of receipt is that of the clock at each message."""
    clock = StoppedClock(NOW)
    with Sink([SECRET], clock, shown.append) as sink:
        send(sink)
        clock.move_to(NOW + 200.0)
        send(sink)
    assert [one.received_s for one in shown] == [NOW, NOW + 200.0]
    assert shown[1] == replace(shown[0], received_s=NOW + 200.0, duplicate=True)
