"""Putting what AgeWatch made of it: assessments, alarms, journal rows, the state of the daemon."""

from __future__ import annotations

from collections.abc import Iterable

from sqlalchemy import bindparam, delete, insert, select

from agewatch.alarms import Alarm
from agewatch.plant.assessment import Assessment
from agewatch.plant.records import JournalRow
from agewatch.store.access import Transaction
from agewatch.store.bulk import put_keyed
from agewatch.store.columns import pack
from agewatch.store.schema import alarm, assessment, journal, status
from agewatch.store.values import to_json, to_ms


def put_assessment(tx: Transaction, made: Assessment, keep: int = 2) -> int:
    """Store an assessment, and forget all but the last `keep`; its id."""
    assessment_id: int = tx.connection.execute(
        insert(assessment)
        .values(
            at_ms=to_ms(made.at_s),
            model=made.model,
            settings_digest=made.settings_digest,
            coils=len(made),
            columns=pack(made),
        )
        .returning(assessment.c.assessment_id)
    ).scalar_one()
    last = select(assessment.c.assessment_id).order_by(assessment.c.assessment_id.desc()).limit(keep)
    tx.connection.execute(delete(assessment).where(assessment.c.assessment_id.not_in(last)))
    return assessment_id


def put_alarms(tx: Transaction, alarms: Iterable[Alarm]) -> None:
    """Store alarms as they stand; those at rest are forgotten, which changes nothing for them."""
    last = {each.key: each for each in alarms}
    gone = [{"of": str(kind), "about": subject} for (kind, subject), each in last.items() if each.at_rest]
    if gone:
        one = (alarm.c.kind == bindparam("of"), alarm.c.subject == bindparam("about"))
        tx.connection.execute(delete(alarm).where(*one), gone)
    put_keyed(tx, alarm, [_alarm_row(each) for each in last.values() if not each.at_rest])


def append_journal(tx: Transaction, rows: Iterable[JournalRow]) -> None:
    """Add rows, in their order. What stands in the journal is never changed."""
    values = [
        {
            "at_ms": to_ms(row.at_s),
            "topic": row.topic,
            "kind": row.kind,
            "subject": row.subject,
            "actor": row.actor,
            "before": row.before,
            "after": row.after,
            "reason": row.reason,
            "detail": to_json(dict(row.detail)),
        }
        for row in rows
    ]
    if values:
        tx.connection.execute(insert(journal), values)


def put_status(tx: Transaction, key: str, value: object, now_s: float) -> None:
    """What the daemon tells of itself under `key`, in place of what it told before: anything that JSON can hold."""
    put_keyed(tx, status, [(key, to_json(value), to_ms(now_s))])


def _alarm_row(each: Alarm) -> tuple[object, ...]:
    return (
        str(each.kind),
        each.subject,
        each.location,
        str(each.state),
        str(each.priority),
        each.active,
        to_ms(each.active_since_s),
        to_ms(each.inactive_since_s),
        to_ms(each.raised_s),
        to_ms(each.acknowledged_s),
        each.acknowledged_by,
        to_json(dict(each.detail)),
    )
