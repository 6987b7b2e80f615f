"""What AgeWatch made of it: alarms, the journal, the latest assessment, the state of the daemon."""

from __future__ import annotations

import json
from typing import Any

from sqlalchemy import ColumnElement, func, select

from agewatch.alarms import Alarm, AlarmKind, AlarmState, Priority
from agewatch.plant.assessment import Assessment
from agewatch.plant.records import JournalRow
from agewatch.store import schema
from agewatch.store.access import View
from agewatch.store.columns import unpack
from agewatch.store.values import to_s


def alarms(view: View) -> list[Alarm]:
    """Every alarm that is not at rest, by kind and subject."""
    return [
        Alarm(
            kind=AlarmKind(row.kind),
            subject=row.subject,
            location=row.location,
            state=AlarmState(row.state),
            priority=Priority(row.priority),
            active=row.active,
            active_since_s=to_s(row.active_since_ms),
            inactive_since_s=to_s(row.inactive_since_ms),
            raised_s=to_s(row.raised_ms),
            acknowledged_s=to_s(row.acknowledged_ms),
            acknowledged_by=row.acknowledged_by,
            detail=json.loads(row.detail),
        )
        for row in view.connection.execute(
            select(schema.alarm).order_by(schema.alarm.c.kind, schema.alarm.c.subject)
        )
    ]


def shown_alarms(view: View) -> list[Alarm]:
    """The alarms that people have to see: the most urgent first, of equals the newest."""
    shown = [each for each in alarms(view) if each.state is not AlarmState.NORMAL]
    return sorted(shown, key=lambda each: (each.priority.rank, -(each.raised_s or 0.0), each.key))


def journal(
    view: View, *, topic: str | None = None, subject: str | None = None, limit: int | None = None
) -> list[JournalRow]:
    """Journal rows, the newest first."""
    conditions = [
        column == value
        for column, value in ((schema.journal.c.topic, topic), (schema.journal.c.subject, subject))
        if value is not None
    ]
    return _journal(view, conditions, limit)


def coil_journal(view: View, coil_id: str, limit: int | None = None) -> list[JournalRow]:
    """What happened to a coil, and to its alarms, the newest first."""
    return _journal(
        view, [schema.journal.c.topic.in_(("coil", "alarm")), schema.journal.c.subject == coil_id], limit
    )


def last_journal_seq(view: View) -> int:
    """Number of the newest journal row; 0 while there is none."""
    newest: int | None = view.connection.execute(select(func.max(schema.journal.c.seq))).scalar_one()
    return newest or 0


def latest_assessment_id(view: View) -> int | None:
    """Tells whether there is a newer assessment than the one at hand, without reading it."""
    newest: int | None = view.connection.execute(
        select(func.max(schema.assessment.c.assessment_id))
    ).scalar_one()
    return newest


def latest_assessment(view: View) -> Assessment | None:
    """None: there is none yet, or none that this version of the program wrote."""
    newest = select(schema.assessment.c.columns).order_by(schema.assessment.c.assessment_id.desc()).limit(1)
    packed: bytes | None = view.connection.execute(newest).scalar_one_or_none()
    return None if packed is None else unpack(packed)


def status(view: View) -> dict[str, Any]:
    """What the daemon last told of itself, by key."""
    return {
        key: json.loads(value)
        for key, value in view.fetch(select(schema.status.c.key, schema.status.c.value))
    }


def _journal(view: View, conditions: list[ColumnElement[bool]], limit: int | None) -> list[JournalRow]:
    chosen = select(schema.journal).where(*conditions).order_by(schema.journal.c.seq.desc()).limit(limit)
    return [
        JournalRow(
            to_s(row.at_ms),
            row.topic,
            row.kind,
            row.subject,
            row.actor,
            row.before,
            row.after,
            row.reason,
            json.loads(row.detail),
        )
        for row in view.connection.execute(chosen)
    ]
