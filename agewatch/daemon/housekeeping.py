"""What has to be done now and then: a sign of life to every receiver that wants one."""

from __future__ import annotations

from datetime import timedelta

from agewatch.messages import MessageType, heartbeats
from agewatch.plant.records import MessageState
from agewatch.plant.settings import Settings
from agewatch.store import Store, queries, writes
from agewatch.store.queries_counts import undelivered

HOUSEKEEPING_EVERY = timedelta(minutes=5)
"""A receiver that hears nothing for three of these, plant time, has reason to worry."""


def keep_house(store: Store, settings: Settings, now_s: float) -> int:
    """Put signs of life into the outbox; how many. Raises StoreError.

    While one still waits, the receiver gets no other: after an outage it has no use for the old ones.
    """
    with store.write() as tx:
        waits = {
            endpoint
            for endpoint, kind, state in undelivered(tx)
            if kind == MessageType.HEARTBEAT and state is MessageState.WAITING
        }
        endpoints = [endpoint for endpoint in settings.endpoint if endpoint.name not in waits]
        journal = queries.last_journal_seq(tx)
        signs = heartbeats(
            endpoints,
            site=settings.site.name,
            at_s=now_s,
            cause="heartbeat",
            values={"journal_rows": journal},
        )
        writes.put_messages(tx, signs)
    return len(signs)
