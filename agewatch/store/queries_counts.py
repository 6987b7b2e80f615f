"""Messages that are not delivered, counted."""

from __future__ import annotations

from sqlalchemy import func, select

from agewatch.plant.records import MessageState
from agewatch.store.access import View
from agewatch.store.schema import message

Undelivered = dict[tuple[str, str, MessageState], int]
"""How many messages by endpoint, type and state."""


def undelivered(view: View) -> Undelivered:
    """Messages that wait or are set aside."""
    states = (MessageState.WAITING.value, MessageState.SET_ASIDE.value)
    counts = (
        select(message.c.endpoint, message.c.type, message.c.state, func.count())
        .where(message.c.state.in_(states))
        .group_by(message.c.endpoint, message.c.type, message.c.state)
    )
    return {
        (endpoint, kind, MessageState(state)): count for endpoint, kind, state, count in view.fetch(counts)
    }
