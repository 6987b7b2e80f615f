"""The outbox, and what delivery knows of endpoints."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from sqlalchemy import Row, func, select

from agewatch.plant.records import EndpointState, MessageState, OutboxMessage
from agewatch.store.access import View
from agewatch.store.schema import endpoint, message
from agewatch.store.values import to_ms, to_s


def messages(view: View, limit: int | None = None) -> list[OutboxMessage]:
    """Messages of every state, the newest first."""
    return _messages(view.connection.execute(select(message).order_by(message.c.seq.desc()).limit(limit)))


def due_messages(view: View, now_s: float) -> list[OutboxMessage]:
    """What may be sent now: of each (endpoint, location) the message whose turn it is, if it is time."""
    waiting = message.c.state == MessageState.WAITING.value
    heads = select(func.min(message.c.seq)).where(waiting).group_by(message.c.endpoint, message.c.location)
    due = select(message).where(message.c.seq.in_(heads), message.c.next_attempt_ms <= to_ms(now_s))
    return _messages(view.connection.execute(due.order_by(message.c.seq)))


def endpoints(view: View) -> list[EndpointState]:
    """What delivery knows of endpoints, by name; one that never failed may be missing."""
    return [
        EndpointState(
            row.name, to_s(row.disabled_ms), row.disabled_url, to_s(row.failing_since_ms), row.last_error
        )
        for row in view.connection.execute(select(endpoint).order_by(endpoint.c.name))
    ]


def set_aside_counts(view: View) -> dict[str, int]:
    """How many messages of each endpoint wait for a person."""
    set_aside = message.c.state == MessageState.SET_ASIDE.value
    counts = select(message.c.endpoint, func.count()).where(set_aside).group_by(message.c.endpoint)
    return dict(view.fetch(counts))


def _messages(rows: Iterable[Row[Any]]) -> list[OutboxMessage]:
    return [
        OutboxMessage(
            message_id=row.message_id,
            endpoint=row.endpoint,
            location=row.location,
            type=row.type,
            body=row.body,
            created_s=to_s(row.created_ms),
            state=MessageState(row.state),
            attempts=row.attempts,
            next_attempt_s=to_s(row.next_attempt_ms),
            delivered_s=to_s(row.delivered_ms),
            last_error=row.last_error,
            seq=row.seq,
        )
        for row in rows
    ]
