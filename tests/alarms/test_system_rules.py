"""Conditions of sensors, locations, feeds and endpoints."""

from __future__ import annotations

import pytest

from agewatch.alarms import AlarmKind, Condition, Timing, advance_all
from agewatch.alarms.rationalisation import RATIONALISATION
from agewatch.alarms.system_rules import (
    Feed,
    Receiver,
    Sensor,
    failing_deliveries,
    high_rejects,
    silent_sensors,
    stale_feeds,
    system_condition,
    uncovered_locations,
)

NOW = 1.8e9
HOUR = 3600.0


def active(conditions: list[Condition]) -> dict[str, bool]:
    return {condition.subject: condition.observed.active for condition in conditions}


def test_a_sensor_is_silent_after_its_time_or_if_it_never_spoke() -> None:
    """Silence is counted from the last reading; a sensor that never sent one is silent from the start."""
    sensors = [
        Sensor("T1", "BAY-1", NOW - 3 * HOUR),
        Sensor("T2", "BAY-1", NOW - 3 * HOUR - 1),
        Sensor("T3", "BAY-2", None),
        Sensor("T4", "BAY-2", NOW + HOUR),
    ]
    conditions = silent_sensors(sensors, NOW, 3 * HOUR)
    assert active(conditions) == {"T1": False, "T2": True, "T3": True, "T4": False}
    assert [one.observed.detail["reason"] for one in conditions] == [
        "last reading: 3.0 h ago",
        "last reading: 3.0 h ago",
        "last reading: never",
        "last reading: 0.0 h ago",
    ]
    assert conditions[2].observed.location == "BAY-2"


def test_a_location_is_uncovered_when_all_its_sensors_are_silent_and_coils_lie_there() -> None:
    """One speaking sensor covers its location; an empty location needs none."""
    sensors = [
        Sensor("T1", "ONE-SPEAKS", NOW - 9 * HOUR),
        Sensor("T2", "ONE-SPEAKS", NOW - 1 * HOUR),
        Sensor("T3", "ALL-SILENT", NOW - 9 * HOUR),
        Sensor("T4", "NEVER", None),
        Sensor("T5", "EMPTY", None),
    ]
    coils = {"ONE-SPEAKS": 5, "ALL-SILENT": 5, "NEVER": 5, "EMPTY": 0, "WITHOUT": 1}
    assert active(uncovered_locations(sensors, coils, NOW, 3 * HOUR)) == {
        "ONE-SPEAKS": False,
        "ALL-SILENT": True,
        "NEVER": True,
        "EMPTY": False,
        "WITHOUT": True,
    }


def test_a_feed_is_stale_when_quiet_too_long_or_unreadable() -> None:
    """A limit makes quiet feeds stale; without one only trouble counts, and trouble is the reason given."""
    feeds = [
        Feed("quiet", NOW - 2 * HOUR, HOUR),
        Feed("lively", NOW - 0.5 * HOUR, HOUR),
        Feed("no-limit", NOW - 900 * HOUR, None),
        Feed("never", None, HOUR),
        Feed("broken", NOW, None, "coils.csv: no such file"),
    ]
    conditions = stale_feeds(feeds, NOW)
    assert active(conditions) == {
        "quiet": True,
        "lively": False,
        "no-limit": False,
        "never": True,
        "broken": True,
    }
    assert conditions[-1].observed.detail["reason"] == "coils.csv: no such file"


@pytest.mark.parametrize(
    ("limit", "count", "fresh", "kept"),
    [(100, 100, True, True), (100, 99, False, True), (100, 49, False, False), (0, 0, False, False)],
)
def test_rejects_have_a_limit_and_a_deadband(limit: int, count: int, fresh: bool, kept: bool) -> None:
    """Rejects are alarmed from the limit on, until half are mended; none is never too many."""
    assert active(high_rejects({"F": count}, {}, NOW, limit)) == {"F": fresh}
    changed, _ = advance_all({}, high_rejects({"F": 1000}, {}, NOW, limit), Timing())
    assert active(high_rejects({"F": count}, {alarm.key: alarm for alarm in changed}, NOW, limit)) == {
        "F": kept
    }


def test_an_endpoint_fails_when_gone_or_set_aside_or_silent_for_long() -> None:
    """Short trouble is no alarm; long trouble, a 410 and messages set aside are, each with its reason."""
    endpoints = [
        Receiver("well", None, disabled=False, set_aside=0),
        Receiver("brief", NOW - 60.0, disabled=False, set_aside=0, last_error="no answer within 15 s"),
        Receiver("long", NOW - HOUR, disabled=False, set_aside=0, last_error="no answer within 15 s"),
        Receiver("gone", None, disabled=True, set_aside=0),
        Receiver("refuses", None, disabled=False, set_aside=2, last_error="it answered 422"),
    ]
    conditions = failing_deliveries(endpoints, NOW, HOUR)
    assert active(conditions) == {"well": False, "brief": False, "long": True, "gone": True, "refuses": True}
    assert [one.observed.detail["reason"] for one in conditions] == [
        "messages get through",
        "messages do not get through: no answer within 15 s",
        "messages do not get through: no answer within 15 s",
        "the receiver has said that it is gone for good (410); nothing is sent to it any more",
        "2 messages are set aside; last answer: it answered 422",
    ]


def test_a_system_condition_has_the_priority_of_its_record() -> None:
    """Kinds without a date to meet take their priority from the rationalisation record."""
    condition = system_condition(
        AlarmKind.CLOCK_STEP, "clock", NOW, active=True, reason="set back by 3600 s", step_s=-3600.0
    )
    assert condition.observed.priority == RATIONALISATION[AlarmKind.CLOCK_STEP].priority
    assert condition.observed.detail == {"reason": "set back by 3600 s", "step_s": -3600.0}
