"""Assessments, alarms, the journal and the daemon's status."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any

import numpy as np
import pytest
from sqlalchemy import Executable, delete, update

from agewatch.alarms import Alarm, AlarmKind, AlarmState, Priority
from agewatch.errors import StoreError
from agewatch.plant.assessment import Assessment
from agewatch.plant.inventory import Coded
from agewatch.plant.records import JournalRow
from agewatch.store import Store, schema
from agewatch.store.queries import (
    alarms,
    coil_journal,
    journal,
    last_journal_seq,
    latest_assessment,
    latest_assessment_id,
    shown_alarms,
    status,
)
from agewatch.store.writes import append_journal, put_alarms, put_assessment, put_status
from tests.contract.rows import NOW

RAISED = Alarm(
    kind=AlarmKind.RETURN_BEFORE_PRESS,
    subject="C1",
    location="BAY-1",
    state=AlarmState.ACKNOWLEDGED,
    priority=Priority.HIGH,
    active=True,
    active_since_s=NOW - 60.0,
    inactive_since_s=None,
    raised_s=NOW,
    acknowledged_s=NOW + 30.5,
    acknowledged_by="user:ann",
    detail={
        "press_s": NOW + 100.25,
        "risk": 0.4,
        "reason": "Plateau wird früher kehren",
        "exposed": True,
        "part": None,
    },
)
GONE = replace(RAISED, state=AlarmState.NORMAL, active=False, active_since_s=None, inactive_since_s=NOW)


def assessment(*names: str, at_s: float = NOW) -> Assessment:
    """An assessment of coils with these names; every number is the coil's place."""
    place = np.arange(len(names), dtype=float)
    plain = {
        "at_s": at_s,
        "model": "m",
        "settings_digest": "d",
        "coil_id": np.array([*names, None], dtype=object)[:-1],
        "verdict": place.astype(np.int8),
        "starting_point": place > 0,
    }
    coded = Coded(np.full(len(names), -1, np.int32), ())
    given: dict[str, Any] = {
        field.name: plain.get(field.name, coded if field.type == "Coded" else place)
        for field in fields(Assessment)
    }
    return Assessment(**given)


def happened(subject: str, *, topic: str = "coil", kind: str = "moved", at_s: float = NOW) -> JournalRow:
    return JournalRow(at_s, topic, kind, subject, "agewatch", "A", "B", "why", {"risk": 0.5, "part": None})


def test_the_latest_assessment_is_the_one_put_last(store: Store) -> None:
    """Ids rise, so that a reader can tell whether there is a newer one."""
    with store.read() as view:
        assert (latest_assessment(view), latest_assessment_id(view)) == (None, None)
    with store.write() as tx:
        first = put_assessment(tx, assessment("C1"))
        second = put_assessment(tx, assessment("C1", "C2", at_s=NOW + 60.0))
    with store.read() as view:
        latest = latest_assessment(view)
        assert latest_assessment_id(view) == second > first
    assert latest is not None
    assert (latest.at_s, latest.coil_id.tolist()) == (NOW + 60.0, ["C1", "C2"])


def test_older_assessments_are_forgotten(store: Store) -> None:
    """Only the last few stay, and ids are not used again."""
    for turn in range(4):
        with store.write() as tx:
            newest = put_assessment(tx, assessment("C1", at_s=NOW + turn), keep=2)
    with store.read() as view:
        kept = view.connection.execute(schema.assessment.select()).all()
    assert [row.at_ms / 1000.0 for row in kept] == [NOW + 2, NOW + 3]
    assert newest == 4


def test_alarms_come_back_as_they_were(store: Store) -> None:
    """Every field survives, the values behind the alarm too; putting one again replaces it."""
    with store.write() as tx:
        put_alarms(tx, [replace(RAISED, state=AlarmState.UNACKNOWLEDGED), replace(RAISED, subject="C2")])
        put_alarms(tx, [RAISED])
    with store.read() as view:
        assert alarms(view) == [RAISED, replace(RAISED, subject="C2")]


def test_values_that_numpy_made_can_stand_in_an_alarm(store: Store) -> None:
    """Numbers and flags of arrays are stored as the plain ones they are."""
    detail = {"risk": np.float64(0.25), "coils": np.int32(3), "exposed": np.bool_(True)}
    with store.write() as tx:
        put_alarms(tx, [replace(RAISED, detail=detail)])
    with store.read() as view:
        assert alarms(view)[0].detail == {"risk": 0.25, "coils": 3, "exposed": True}


def test_an_alarm_at_rest_is_forgotten(store: Store) -> None:
    """What is normal with nothing pending takes no room."""
    with store.write() as tx:
        put_alarms(tx, [RAISED, replace(RAISED, subject="C2")])
        put_alarms(tx, [GONE])
    with store.read() as view:
        assert [alarm.subject for alarm in alarms(view)] == ["C2"]


def test_shown_alarms_stand_most_urgent_first(store: Store) -> None:
    """High before low, of equals the newest first; what merely waits out its delay is not shown."""
    pending = replace(RAISED, subject="waits", state=AlarmState.NORMAL)
    low = replace(RAISED, subject="low", priority=Priority.LOW, raised_s=NOW + 9.0)
    newer = replace(RAISED, subject="newer", raised_s=NOW + 5.0)
    with store.write() as tx:
        put_alarms(tx, [low, RAISED, pending, newer])
    with store.read() as view:
        assert [alarm.subject for alarm in shown_alarms(view)] == ["newer", "C1", "low"]


def test_the_journal_gives_rows_back_newest_first(store: Store) -> None:
    """Rows keep their order whatever their times say, can be had by topic and subject, and are numbered."""
    told = [
        happened("C1"),
        happened("C1", topic="alarm", at_s=NOW - 5),
        happened("C2"),
        happened("F", topic="feed"),
    ]
    with store.write() as tx:
        append_journal(tx, told[:2])
        append_journal(tx, [])
        append_journal(tx, told[2:])
    with store.read() as view:
        assert journal(view) == told[::-1]
        assert journal(view, topic="coil") == [told[2], told[0]]
        assert journal(view, topic="coil", subject="C1") == [told[0]]
        assert journal(view, limit=1) == [told[3]]
        assert coil_journal(view, "C1") == [told[1], told[0]]
        assert coil_journal(view, "C1", limit=1) == [told[1]]
        assert last_journal_seq(view) == 4


def test_an_empty_journal_has_no_number(store: Store) -> None:
    """Numbers begin at 1."""
    with store.read() as view:
        assert (journal(view), last_journal_seq(view)) == ([], 0)


@pytest.mark.parametrize("change", [update(schema.journal).values(reason="other"), delete(schema.journal)])
def test_the_journal_is_append_only(store: Store, change: Executable) -> None:
    """Not even the writer can change or remove a row."""
    with store.write() as tx:
        append_journal(tx, [happened("C1")])
    with pytest.raises(StoreError, match="append-only"), store.write() as tx:
        tx.connection.execute(change)
    with store.read() as view:
        assert journal(view) == [happened("C1")]


def test_a_text_with_half_a_character_is_refused(store: Store) -> None:
    """Half a surrogate pair cannot be stored: the error says so, and nothing of the change is kept."""
    with pytest.raises(StoreError, match=r"'\\ud800' is no character"), store.write() as tx:
        append_journal(tx, [happened("C1"), happened("C\ud800")])
    with store.read() as view:
        assert journal(view) == []


def test_status_keeps_the_last_value_of_each_key(store: Store) -> None:
    """Anything that JSON can hold comes back as it was."""
    value = {"list": [1, 2.5, None, True, "ž"], "nested": {"a": {}}}
    with store.write() as tx:
        put_status(tx, "tick", 1, NOW)
        put_status(tx, "tick", value, NOW)
        put_status(tx, "site", "Pressewerk", NOW)
    with store.read() as view:
        assert status(view) == {"tick": value, "site": "Pressewerk"}


def test_a_value_without_a_json_form_is_refused(store: Store) -> None:
    """What could not be read again is not written."""
    with pytest.raises(TypeError, match="set has no JSON form"), store.write() as tx:
        put_status(tx, "tick", {1, 2}, NOW)
