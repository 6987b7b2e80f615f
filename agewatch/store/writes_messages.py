"""Putting messages into the outbox, and what became of them."""

from __future__ import annotations

from collections.abc import Iterable

from sqlalchemy import insert, update

from agewatch.errors import StoreError
from agewatch.plant.records import EndpointState, MessageState, OutboxMessage
from agewatch.store.access import Transaction
from agewatch.store.bulk import put_keyed
from agewatch.store.schema import endpoint, message
from agewatch.store.values import to_ms


def put_messages(tx: Transaction, messages: Iterable[OutboxMessage]) -> None:
    """Add messages, in their order; each takes the next `seq`. An id that was used before is refused."""
    values = [
        {
            "message_id": each.message_id,
            "endpoint": each.endpoint,
            "location": each.location,
            "type": each.type,
            "body": each.body,
            "created_ms": to_ms(each.created_s),
            "state": str(each.state),
            "attempts": each.attempts,
            "next_attempt_ms": to_ms(each.next_attempt_s),
            "delivered_ms": to_ms(each.delivered_s),
            "last_error": each.last_error,
        }
        for each in messages
    ]
    if values:
        tx.connection.execute(insert(message), values)


def message_delivered(tx: Transaction, message_id: str, now_s: float) -> None:
    """The receiver has taken it."""
    _change(
        tx,
        message_id,
        state=str(MessageState.DELIVERED),
        attempts=message.c.attempts + 1,
        delivered_ms=to_ms(now_s),
        last_error="",
    )


def message_retry(tx: Transaction, message_id: str, next_attempt_s: float, error: str) -> None:
    """An attempt failed; the next is due at `next_attempt_s`."""
    _change(
        tx,
        message_id,
        attempts=message.c.attempts + 1,
        next_attempt_ms=to_ms(next_attempt_s),
        last_error=error,
    )


def message_set_aside(tx: Transaction, message_id: str, error: str) -> None:
    """An attempt failed for good: the message waits for a person, and those behind it go on."""
    _change(
        tx,
        message_id,
        state=str(MessageState.SET_ASIDE),
        attempts=message.c.attempts + 1,
        last_error=error,
    )


def message_resend(tx: Transaction, message_id: str, now_s: float) -> None:
    """A person wants it tried again: it waits for its turn under the same id, the count of attempts begun anew."""
    _change(tx, message_id, state=str(MessageState.WAITING), attempts=0, next_attempt_ms=to_ms(now_s))


def put_endpoint(tx: Transaction, state: EndpointState) -> None:
    row = (
        state.name,
        to_ms(state.disabled_s),
        state.disabled_url,
        to_ms(state.failing_since_s),
        state.last_error,
    )
    put_keyed(tx, endpoint, [row])


def _change(tx: Transaction, message_id: str, **values: object) -> None:
    changed = tx.connection.execute(
        update(message).where(message.c.message_id == message_id).values(**values)
    ).rowcount
    if changed == 0:
        raise StoreError(f"message {message_id}: the outbox does not hold it; nothing was changed")
