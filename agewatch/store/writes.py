"""Everything that can be put into a store: functions of a Transaction, by subject in writes_*.py."""

from agewatch.store.writes_feeds import mark_resubmitted, put_rejects, put_rows, put_source
from agewatch.store.writes_messages import (
    message_delivered,
    message_resend,
    message_retry,
    message_set_aside,
    put_endpoint,
    put_messages,
)
from agewatch.store.writes_records import append_journal, put_alarms, put_assessment, put_status

__all__ = [
    "append_journal",
    "mark_resubmitted",
    "message_delivered",
    "message_resend",
    "message_retry",
    "message_set_aside",
    "put_alarms",
    "put_assessment",
    "put_endpoint",
    "put_messages",
    "put_rejects",
    "put_rows",
    "put_source",
    "put_status",
]
