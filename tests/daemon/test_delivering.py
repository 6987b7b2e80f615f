"""Workers that deliver: a real store, real servers, and a plant clock that moves when it is told to."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import ExitStack, closing, contextmanager
from datetime import timedelta
from pathlib import Path
from socket import create_server
from threading import Event
from time import monotonic

import pytest
from pytest_httpserver import HTTPServer
from werkzeug import Request, Response

from agewatch.clock import StoppedClock, SystemClock
from agewatch.daemon.delivering import Deliverer, Receiver
from agewatch.errors import StoreError
from agewatch.messages import MessageType, Outcome, OutcomeKind
from agewatch.messages.body import News, bodies
from agewatch.messages.sink import Sink
from agewatch.plant.records import EndpointState, JournalRow, MessageState, OutboxMessage
from agewatch.plant.settings import Endpoint
from agewatch.store import Store, open_store, queries, writes
from tests.messages.samples import NOW, SECRET

LONG_S = 10.0


class Outbox:
    """A store with an outbox, and what its workers told of themselves."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.store: Store = open_store("sqlite:///agewatch.db", folder)
        self.clock = StoppedClock(NOW)
        self.failures: list[tuple[str, Exception]] = []
        self.outcomes: list[tuple[str, OutcomeKind]] = []
        self.tried = Event()

    def put(self, endpoint: str, *coils: str, location: str = "BAY-1") -> list[str]:
        """Messages to an endpoint; their ids."""
        messages = [self._message(endpoint, coil, location) for coil in coils]
        with self.store.write() as tx:
            writes.put_messages(tx, messages)
        return [message.message_id for message in messages]

    def worker(self, name: str, url: str, **more: object) -> Deliverer:
        """A worker for an endpoint at `url`; retries are due as late as the rules allow."""
        endpoint = Endpoint.model_validate({"name": name, "url": url, "secret_env": "SECRET", **more})
        receiver = Receiver(endpoint, SECRET, self.folder)
        return Deliverer(
            self.store, receiver, self.clock, SystemClock(), lambda: 0.999, self._failed, self._attempted
        )

    def messages(self) -> dict[str, OutboxMessage]:
        with self.store.read() as view:
            return {message.message_id: message for message in queries.messages(view)}

    def endpoint(self, name: str) -> EndpointState | None:
        with self.store.read() as view:
            return next((state for state in queries.endpoints(view) if state.name == name), None)

    def journal(self) -> list[JournalRow]:
        with self.store.read() as view:
            return queries.journal(view)

    def _message(self, endpoint: str, coil: str, location: str) -> OutboxMessage:
        now_s = self.clock.now_s()
        news = News(MessageType.PULL_REQUESTED, "Works Lhota", location, now_s, ({"coil_id": coil},))
        (body,) = bodies(news, endpoint, "7")
        return OutboxMessage(
            body.message_id, endpoint, location, news.type, body.text, now_s, MessageState.WAITING, 0, now_s,
            None, "", None,
        )  # fmt: skip

    def _failed(self, name: str, error: Exception, again: bool) -> None:
        self.failures.append((name, error))

    def _attempted(self, endpoint: str, outcome: Outcome) -> None:
        self.outcomes.append((endpoint, outcome.kind))
        self.tried.set()


@pytest.fixture
def outbox(tmp_path: Path) -> Iterator[Outbox]:
    one = Outbox(tmp_path)
    yield one
    one.store.close()
    assert one.failures == []


@pytest.fixture
def sink() -> Iterator[Sink]:
    with Sink([SECRET], SystemClock(), lambda _: None) as one:
        yield one


def answering(server: HTTPServer, *statuses: int) -> list[str]:
    """Have the server answer with these statuses in turn, the last one for ever; the ids that it sees."""
    seen: list[str] = []

    def handle(request: Request) -> Response:
        seen.append(request.headers["webhook-id"])
        return Response(status=statuses[min(len(seen), len(statuses)) - 1])

    server.expect_request("/in", method="POST").respond_with_handler(handle)
    return seen


@contextmanager
def refusing_updates(database: Path, table: str) -> Iterator[None]:
    """The database refuses every change of a row of `table`."""
    with closing(sqlite3.connect(database, isolation_level=None)) as other:
        other.execute(
            f"CREATE TRIGGER refuse BEFORE UPDATE ON {table} BEGIN SELECT RAISE(ABORT, 'disk trouble'); END"
        )
        yield
        other.execute("DROP TRIGGER refuse")


def test_messages_arrive_in_order_and_count_as_delivered(outbox: Outbox, sink: Sink) -> None:
    """What waits is sent in order, verifies at the receiver, and is then no longer waiting."""
    ids = outbox.put("logistics", "C-1", "C-2", "C-3")
    outbox.worker("logistics", sink.url).send_due()
    assert [message.id for message in sink.received] == ids
    assert all(message.verified for message in sink.received)
    assert {message.state for message in outbox.messages().values()} == {MessageState.DELIVERED}


def test_worker_wakes_and_stops(outbox: Outbox, sink: Sink) -> None:
    """A worker that runs sends what it is woken for, and ends when it is told to."""
    worker = outbox.worker("logistics", sink.url)
    worker.start()
    outbox.put("logistics", "C-1")
    worker.wake()
    assert outbox.tried.wait(LONG_S)
    worker.stop()
    assert worker.wait(LONG_S)
    assert [message.verified for message in sink.received] == [True]


def test_failure_holds_the_line_until_it_passes(outbox: Outbox, httpserver: HTTPServer) -> None:
    """After a failure nothing of that location is sent before the retry is due; then all comes in order."""
    seen = answering(httpserver, 503, 204)
    ids = outbox.put("logistics", "C-1", "C-2")
    worker = outbox.worker("logistics", httpserver.url_for("/in"))
    worker.send_due()
    assert seen == ids[:1]
    state = outbox.endpoint("logistics")
    assert state is not None
    assert state.failing_since_s == NOW
    assert "503" in state.last_error
    first = outbox.messages()[ids[0]]
    assert (first.attempts, first.state) == (1, MessageState.WAITING)
    outbox.clock.move_to(first.next_attempt_s)
    worker.send_due()
    assert seen == [ids[0], *ids]
    assert outbox.endpoint("logistics") == EndpointState("logistics", None, "", None, "")


def test_locations_do_not_hold_up_each_other(outbox: Outbox, httpserver: HTTPServer) -> None:
    """A message that fails holds up its own location only."""
    seen = answering(httpserver, 503, 204)
    bay = outbox.put("logistics", "C-1", location="BAY-1")
    yard = outbox.put("logistics", "C-2", location="YARD")
    outbox.worker("logistics", httpserver.url_for("/in")).send_due()
    assert seen == bay + yard
    assert outbox.messages()[yard[0]].state is MessageState.DELIVERED


def test_silent_endpoint_delays_no_other(outbox: Outbox, sink: Sink) -> None:
    """While one receiver never answers, another has its messages at once."""
    with create_server(("127.0.0.1", 0)) as silent, ExitStack() as running:
        slow = outbox.worker(
            "slow", f"http://127.0.0.1:{silent.getsockname()[1]}/", read_timeout=timedelta(seconds=2)
        )
        quick = outbox.worker("quick", sink.url)
        outbox.put("slow", "C-1")
        outbox.put("quick", "C-1")
        began_s = monotonic()
        for worker in (slow, quick):
            worker.start()
            running.callback(worker.wait, LONG_S)
            running.callback(worker.stop)
        assert outbox.tried.wait(LONG_S)
        assert outbox.outcomes == [("quick", OutcomeKind.DELIVERED)]
        assert monotonic() - began_s < 1.5


def test_refused_message_is_set_aside(outbox: Outbox, httpserver: HTTPServer) -> None:
    """A message refused as often as the settings allow is set aside with its reason, and the next one goes."""
    answering(httpserver, 422, 204)
    ids = outbox.put("logistics", "C-1", "C-2")
    outbox.worker("logistics", httpserver.url_for("/in"), attempts=1).send_due()
    messages = outbox.messages()
    assert messages[ids[0]].state is MessageState.SET_ASIDE
    assert messages[ids[1]].state is MessageState.DELIVERED
    (row,) = outbox.journal()
    assert (row.topic, row.kind, row.subject) == ("message", "set-aside", ids[0])
    assert "422" in row.reason


def test_receiver_that_is_gone_is_left_alone(outbox: Outbox, httpserver: HTTPServer, sink: Sink) -> None:
    """After a 410 nothing more is sent there and nothing is lost; at a new address all of it goes out."""
    seen = answering(httpserver, 410)
    ids = outbox.put("logistics", "C-1", "C-2")
    gone = outbox.worker("logistics", httpserver.url_for("/in"))
    gone.send_due()
    outbox.clock.move_to(NOW + 3600.0)
    gone.send_due()
    assert seen == ids[:1]
    (row,) = outbox.journal()
    assert (row.kind, row.subject, row.after) == ("endpoint-disabled", "logistics", "disabled")
    outbox.worker("logistics", sink.url).send_due()
    assert [message.id for message in sink.received] == ids


def test_crash_before_the_mark_sends_again_under_the_same_id(outbox: Outbox, sink: Sink) -> None:
    """Where the store fails between the answer and the mark, the message is sent again, with the id it had."""
    ids = outbox.put("logistics", "C-1")
    worker = outbox.worker("logistics", sink.url)
    with refusing_updates(outbox.folder / "agewatch.db", "message"):
        assert not worker.loop.turn(worker.send_due)
    ((name, error),) = outbox.failures
    assert name == "deliver logistics"
    assert isinstance(error, StoreError)
    outbox.failures.clear()
    worker.send_due()
    assert [message.id for message in sink.received] == [ids[0], ids[0]]
    assert [message.duplicate for message in sink.received] == [False, True]
    assert outbox.messages()[ids[0]].attempts == 1


def test_abandoned_failure_is_not_kept(outbox: Outbox, httpserver: HTTPServer) -> None:
    """A worker that was told to end while it sends does not touch the store for a failure any more."""
    worker = outbox.worker("logistics", httpserver.url_for("/in"))

    def handle(_: Request) -> Response:
        worker.stop()
        return Response(status=503)

    httpserver.expect_request("/in").respond_with_handler(handle)
    outbox.put("logistics", "C-1", "C-2")
    before = outbox.messages()
    worker.send_due()
    assert outbox.messages() == before
