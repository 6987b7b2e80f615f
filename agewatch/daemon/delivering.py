"""One worker for each endpoint: what the outbox holds for it is sent in order, and what came of it is kept.

A message is sent only after its transaction is kept, and counts as delivered only after the receiver took it:
a crash between the two sends it again under the same id. A slow receiver delays nothing but itself.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from threading import Event, Thread

from agewatch.alarms import AGEWATCH
from agewatch.clock import Clock
from agewatch.daemon.loops import Loop, OnFailure
from agewatch.messages import Outcome, OutcomeKind, after_attempt, endpoint_after
from agewatch.messages.delivery import attempt, open_session
from agewatch.messages.retry import Chance
from agewatch.plant.records import EndpointState, JournalRow, MessageState, OutboxMessage
from agewatch.plant.settings import Endpoint
from agewatch.store import Store, queries, writes

LOOK_EVERY_S = 1.0
"""Real seconds between two looks at the outbox when nobody wakes the worker."""
PATIENCE_S = 60.0
"""A worker is stuck when one attempt takes this much longer than its time limits allow [real s]."""

_log = logging.getLogger(__name__)


@dataclass(frozen=True, slots=True)
class Receiver:
    """An endpoint with its secret; `folder` is that of the settings."""

    endpoint: Endpoint
    secret: str
    folder: Path


class Deliverer:
    """Delivers to one endpoint, in a thread of its own, from `start` to `stop`."""

    def __init__(
        self,
        store: Store,
        receiver: Receiver,
        clock: Clock,
        world: Clock,
        chance: Chance,
        on_failure: OnFailure,
        attempted: Callable[[str, Outcome], None],
    ) -> None:
        """`world` is the time that receivers go by: signatures carry it, also while the plant's time is replayed."""
        endpoint = receiver.endpoint
        allowed_s = (endpoint.connect_timeout + endpoint.read_timeout).total_seconds() + PATIENCE_S
        self.loop = Loop(f"deliver {endpoint.name}", allowed_s, on_failure)
        self._store = store
        self._endpoint = endpoint
        self._receiver = receiver
        self._clock = clock
        self._world = world
        self._chance = chance
        self._attempted = attempted
        self._session = open_session()
        self._news = Event()
        self._stopping = Event()
        self._thread = Thread(target=self._work, name=self.loop.name, daemon=True)

    def start(self) -> None:
        self.loop.beat()
        self._thread.start()

    def wake(self) -> None:
        """There is something in the outbox."""
        self._news.set()

    def stop(self) -> None:
        """Begin no more attempts."""
        self._stopping.set()
        self._news.set()

    def wait(self, within_s: float) -> bool:
        """Whether the worker has ended. What an abandoned attempt comes to is not kept: it is sent again."""
        if self._thread.is_alive():
            self._thread.join(max(0.0, within_s))
        return not self._thread.is_alive()

    def send_due(self) -> None:
        """Send all that is due now, in order within each location. Raises StoreError."""
        while not self._stopping.is_set() and (heads := self._heads()):
            for message in heads:
                if self._stopping.is_set() or self._is_disabled():
                    return
                self._send(message)

    def _work(self) -> None:
        while not self._stopping.is_set():
            self._news.clear()
            self.loop.turn(self.send_due)
            self._news.wait(LOOK_EVERY_S)

    def _heads(self) -> list[OutboxMessage]:
        with self._store.read() as view:
            due = queries.due_messages(view, self._clock.now_s())
        return [message for message in due if message.endpoint == self._endpoint.name]

    def _is_disabled(self) -> bool:
        state = self._state()
        return state.disabled_s is not None and state.disabled_url == self._endpoint.url

    def _state(self) -> EndpointState:
        with self._store.read() as view:
            states = queries.endpoints(view)
        unknown = EndpointState(self._endpoint.name, None, "", None, "")
        return next((state for state in states if state.name == self._endpoint.name), unknown)

    def _send(self, message: OutboxMessage) -> None:
        self.loop.beat()
        outcome = attempt(
            self._endpoint,
            self._receiver.secret,
            message,
            self._world.now_s(),
            folder=self._receiver.folder,
            session=self._session,
        )
        self._attempted(self._endpoint.name, outcome)
        if not self._stopping.is_set() or outcome.kind is OutcomeKind.DELIVERED:
            self._keep(message, outcome)

    def _keep(self, message: OutboxMessage, outcome: Outcome) -> None:
        now_s = self._clock.now_s()
        after = after_attempt(message, outcome, now_s, self._chance, attempts=self._endpoint.attempts)
        before = self._state()
        state = endpoint_after(before, outcome, now_s, self._endpoint.url)
        with self._store.write() as tx:
            if after.state is MessageState.DELIVERED:
                writes.message_delivered(tx, after.message_id, now_s)
            elif after.state is MessageState.SET_ASIDE:
                writes.message_set_aside(tx, after.message_id, after.last_error)
            else:
                writes.message_retry(tx, after.message_id, after.next_attempt_s, after.last_error)
            if state != before:
                writes.put_endpoint(tx, state)
            writes.append_journal(tx, self._journal(after, before, state, now_s))
        self._tell(after, before, state)

    def _journal(
        self, after: OutboxMessage, before: EndpointState, state: EndpointState, now_s: float
    ) -> Iterator[JournalRow]:
        where = {"endpoint": self._endpoint.name, "url": self._endpoint.url}

        def row(kind: str, subject: str, was: str, became: str, reason: str) -> JournalRow:
            return JournalRow(now_s, "message", kind, subject, AGEWATCH, was, became, reason, where)

        if after.state is MessageState.SET_ASIDE:
            yield row(
                "set-aside", after.message_id, str(MessageState.WAITING), str(after.state), after.last_error
            )
        if state.disabled_url != before.disabled_url:
            yield row("endpoint-disabled", state.name, "in use", "disabled", state.last_error)

    def _tell(self, after: OutboxMessage, before: EndpointState, state: EndpointState) -> None:
        name = self._endpoint.name
        if after.state is MessageState.SET_ASIDE:
            _log.error("message %s to %s is set aside: %s", after.message_id, name, after.last_error)
        if state.failing_since_s is not None and before.failing_since_s is None:
            _log.warning("messages to %s do not get through: %s", name, state.last_error)
        if before.failing_since_s is not None and state.failing_since_s is None:
            _log.info("messages to %s get through again", name)
