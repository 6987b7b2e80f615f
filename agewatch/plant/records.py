"""What the rooms keep in the store and hand to each other: journal rows, messages, sources, kept rejects."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum

from agewatch.plant.tables import Reject


@dataclass(frozen=True, slots=True)
class JournalRow:
    """One thing that happened. The journal only ever grows."""

    at_s: float
    topic: str
    """One of "alarm", "coil", "feed", "message" or "daemon"."""
    kind: str
    """The alarm's kind, or what happened."""
    subject: str
    actor: str
    """Who did it: "agewatch" or "user:NAME"."""
    before: str
    after: str
    reason: str
    detail: Mapping[str, object]
    """The values behind it, by name; each is text, a number, a flag or None."""


class MessageState(StrEnum):
    """Where a message stands on its way out."""

    WAITING = "waiting"
    DELIVERED = "delivered"
    SET_ASIDE = "set-aside"


@dataclass(frozen=True, slots=True)
class OutboxMessage:
    """One message to one endpoint."""

    message_id: str
    """The same for ever, at every attempt."""
    endpoint: str
    location: str
    """Order is kept for each (endpoint, location); "" where none applies."""
    type: str
    body: str
    """The JSON text that is sent, unchanged, at every attempt."""
    created_s: float
    state: MessageState
    attempts: int
    next_attempt_s: float
    delivered_s: float | None
    last_error: str
    seq: int | None
    """Place in the order; None until the store has given it one."""


@dataclass(frozen=True, slots=True)
class EndpointState:
    """What delivery has learnt about an endpoint."""

    name: str
    disabled_s: float | None
    """The receiver said that it is gone (410): nothing is sent to `disabled_url` any more."""
    disabled_url: str
    failing_since_s: float | None
    last_error: str


@dataclass(frozen=True, slots=True)
class SourceRecord:
    """One file of a feed, as it was last read."""

    feed: str
    path: str
    fingerprint: str
    """Of the content, so that the same file is not taken in twice."""
    read_s: float
    rows: int
    rejects: int


@dataclass(frozen=True, slots=True)
class StoredReject:
    """A row that could not be used, kept until somebody mends it."""

    reject_id: int
    feed: str
    received_s: float
    resubmitted_s: float | None
    """When the row, mended, was taken in; None: it still waits."""
    reject: Reject


@dataclass(frozen=True, slots=True)
class Put:
    """What putting rows into the store did, by count of rows (of several with one key, the last counts)."""

    new: int
    changed: int
    same: int
