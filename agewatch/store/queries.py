"""Everything that can be asked of a store: functions of a View, by subject in queries_*.py."""

from agewatch.store.queries_counts import undelivered
from agewatch.store.queries_feeds import (
    open_reject_counts,
    open_rejects,
    outlook,
    readings,
    source_records,
    sources,
)
from agewatch.store.queries_inventory import inventory
from agewatch.store.queries_messages import due_messages, endpoints, messages, set_aside_counts
from agewatch.store.queries_records import (
    alarms,
    coil_journal,
    journal,
    last_journal_seq,
    latest_assessment,
    latest_assessment_id,
    shown_alarms,
    status,
)

__all__ = [
    "alarms",
    "coil_journal",
    "due_messages",
    "endpoints",
    "inventory",
    "journal",
    "last_journal_seq",
    "latest_assessment",
    "latest_assessment_id",
    "messages",
    "open_reject_counts",
    "open_rejects",
    "outlook",
    "readings",
    "set_aside_counts",
    "shown_alarms",
    "source_records",
    "sources",
    "status",
    "undelivered",
]
