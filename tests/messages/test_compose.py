"""From alarms that come, change and go to messages."""

from __future__ import annotations

import json
from collections.abc import Sequence
from random import Random
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from agewatch.alarms import (
    Acknowledged,
    Alarm,
    AlarmKind,
    Effect,
    Event,
    Observed,
    Priority,
    Timing,
    advance,
)
from agewatch.messages import compose, heartbeats
from agewatch.plant.records import MessageState, OutboxMessage
from agewatch.plant.settings import Endpoint

NOW = 1_800_000_000.0
PULL, HOLD = AlarmKind.RETURN_BEFORE_PRESS, AlarmKind.RETURNED_IN_STORE
DETAIL = {
    "grade": "DC04",
    "part": "hood-outer",
    "press_s": NOW + 7200.0,
    "return_p10_s": NOW + 3600.0,
    "return_p50_s": None,
    "return_risk": 0.30000000000000004,
    "pull_risk": 0.1,
    "pull_by_s": NOW - 1800.0,
    "starting_point": True,
    "reason": "the plateau may return before the planned pressing",
}


def endpoint(name: str = "logistics", *types: str) -> Endpoint:
    return Endpoint(name=name, url="https://receiver.example/in", secret_env="SECRET", types=list(types))


def seen(
    active: bool = True,
    *,
    priority: Priority = Priority.HIGH,
    location: str = "BAY-1",
    **changes: object,
) -> Observed:
    return Observed(NOW, active, priority, location, {**DETAIL, **changes})


def effects_of(kind: AlarmKind, subject: str, *events: Event) -> tuple[Effect, ...]:
    """What the last of `events` does to the alarm that the others led to."""
    alarm = Alarm.at_rest_for(kind, subject)
    for event in events[:-1]:
        alarm, _ = advance(alarm, event, Timing())
    return advance(alarm, events[-1], Timing())[1]


def told(effects: Sequence[Effect], *endpoints: Endpoint) -> list[OutboxMessage]:
    return compose(effects, endpoints or (endpoint(),), site="Works Lhota", at_s=NOW, cause="7")


def heads(messages: Sequence[OutboxMessage]) -> list[tuple[str, str, list[str]]]:
    return [(message.type, message.location, names(message)) for message in messages]


def names(message: OutboxMessage) -> list[str]:
    data = json.loads(message.body)["data"]
    return [entry.get("coil_id") or entry["subject"] for entry in data.get("coils", data.get("alarms"))]


def only_entry(message: OutboxMessage) -> dict[str, Any]:
    data = json.loads(message.body)["data"]
    (entry,) = data.get("coils", data.get("alarms"))
    assert isinstance(entry, dict)
    return entry


def test_a_pull_is_requested_with_all_that_logistics_needs() -> None:
    """The message names the coil, where it stands, until when, how sure that is, and what to mind."""
    (message,) = told(effects_of(PULL, "C-1", seen()))
    assert (message.endpoint, message.location, message.type) == (
        "logistics",
        "BAY-1",
        "agewatch.pull.requested",
    )
    assert (message.state, message.attempts, message.next_attempt_s, message.seq) == (
        MessageState.WAITING,
        0,
        NOW,
        None,
    )
    event = json.loads(message.body)
    assert event["id"] == message.message_id
    assert only_entry(message) == {
        "coil_id": "C-1",
        "grade": "DC04",
        "part": "hood-outer",
        "pull_by": "2027-01-15T07:30:00.000Z",
        "press_at": "2027-01-15T10:00:00.000Z",
        "return_p10": "2027-01-15T09:00:00.000Z",
        "return_p50": None,
        "return_risk": 0.3,
        "priority": "high",
        "reason": "the plateau may return before the planned pressing",
        "starting_point": True,
    }
    assert "ISO 6892-1" in event["data"]["caution"]
    assert "rules for lifting" in event["data"]["caution"]


@pytest.mark.parametrize(
    ("later", "changed"),
    [
        (seen(press_s=NOW + 90_000.0), ["press_at"]),
        (seen(priority=Priority.LOW), ["priority"]),
        (seen(priority=Priority.LOW, press_s=None), ["press_at", "priority"]),
    ],
)
def test_a_pull_that_changes_says_what_changed(later: Observed, changed: list[str]) -> None:
    """A new pressing or priority of a standing pull is told with the whole entry and what changed in it."""
    (message,) = told(effects_of(PULL, "C-1", seen(), later))
    assert message.type == "agewatch.pull.changed"
    assert only_entry(message)["changed"] == changed


def test_a_pull_that_merely_drifts_is_not_told_again() -> None:
    """Another risk or date of return alone is no message: not every new estimate calls the planner."""
    assert told(effects_of(PULL, "C-1", seen(), seen(return_risk=0.4, return_p10_s=NOW))) == []


def test_a_coil_that_moves_is_withdrawn_there_and_requested_here() -> None:
    """Both locations hear of a move, each in its own order of messages."""
    messages = told(effects_of(PULL, "C-1", seen(), seen(location="BAY-2")))
    assert heads(messages) == [
        ("agewatch.pull.withdrawn", "BAY-1", ["C-1"]),
        ("agewatch.pull.requested", "BAY-2", ["C-1"]),
    ]
    assert only_entry(messages[0]) == {
        "coil_id": "C-1",
        "grade": "DC04",
        "part": "hood-outer",
        "reason": "moved to BAY-2",
    }


def test_a_pull_that_no_longer_holds_is_withdrawn_with_its_reason() -> None:
    """The planner learns that a pull is off, where it was requested, and why."""
    gone = seen(False, location="", reason="the coil is no longer in store")
    (message,) = told(effects_of(PULL, "C-1", seen(), gone))
    assert (message.type, message.location) == ("agewatch.pull.withdrawn", "BAY-1")
    assert only_entry(message)["reason"] == "the coil is no longer in store"


def test_a_returned_coil_is_held_and_released() -> None:
    """A hold names its pressing but no time to pull by, and its end is a release."""
    (held,) = told(effects_of(HOLD, "C-1", seen()))
    assert held.type == "agewatch.coil.held"
    assert "pull_by" not in only_entry(held)
    assert only_entry(held)["press_at"] == "2027-01-15T10:00:00.000Z"
    (released,) = told(effects_of(HOLD, "C-1", seen(), seen(False, reason="a test found no plateau")))
    assert released.type == "agewatch.coil.released"
    assert only_entry(released)["reason"] == "a test found no plateau"


def test_a_held_coil_that_moves_is_held_where_it_is() -> None:
    """A hold follows its coil; a new priority alone is not told."""
    assert heads(told(effects_of(HOLD, "C-1", seen(), seen(location="YARD")))) == [
        ("agewatch.coil.released", "BAY-1", ["C-1"]),
        ("agewatch.coil.held", "YARD", ["C-1"]),
    ]
    assert told(effects_of(HOLD, "C-1", seen(), seen(priority=Priority.LOW))) == []


@pytest.mark.parametrize("kind", [kind for kind in AlarmKind if kind not in (PULL, HOLD)])
def test_every_other_kind_is_told_as_an_alarm(kind: AlarmKind) -> None:
    """An alarm of the system says what it means and what to do, and when it is over."""
    look = Observed(NOW, True, Priority.LOW, "", {"reason": "last reading: never"})
    (raised,) = told(effects_of(kind, "T101", look))
    assert (raised.type, raised.location) == ("agewatch.alarm.raised", "")
    entry = only_entry(raised)
    assert (entry["kind"], entry["subject"], entry["reason"]) == (kind, "T101", "last reading: never")
    assert entry["action"]
    gone = Observed(NOW, False, Priority.LOW, "", {"reason": "it speaks again"})
    (cleared,) = told(effects_of(kind, "T101", look, gone))
    assert cleared.type == "agewatch.alarm.cleared"
    assert only_entry(cleared) == {"kind": kind, "subject": "T101", "reason": "it speaks again"}


def test_an_acknowledgement_is_no_message() -> None:
    """What people do on the board stays on the board."""
    assert told(effects_of(PULL, "C-1", seen(), Acknowledged(NOW, "user:eva", ""))) == []


def _busy_turn() -> list[Effect]:
    effects: list[Effect] = []
    for number in range(6):
        place = f"BAY-{number % 2}"
        effects += effects_of(PULL, f"P-{number}", seen(location=place, pull_by_s=NOW - number))
        effects += effects_of(HOLD, f"H-{number}", seen(location=place))
        effects += effects_of(PULL, f"W-{number}", seen(location=place), seen(False))
        effects += effects_of(HOLD, f"R-{number}", seen(location=place), seen(False))
        effects += effects_of(PULL, f"C-{number}", seen(location=place), seen(location=place, press_s=None))
    return effects


def test_one_turn_is_one_message_for_each_location_and_type() -> None:
    """What ends comes before what begins, the most urgent coil stands first, and locations are kept apart."""
    assert heads(told(_busy_turn())) == [
        ("agewatch.coil.released", "BAY-0", ["R-0", "R-2", "R-4"]),
        ("agewatch.pull.withdrawn", "BAY-0", ["W-0", "W-2", "W-4"]),
        ("agewatch.pull.changed", "BAY-0", ["C-0", "C-2", "C-4"]),
        ("agewatch.pull.requested", "BAY-0", ["P-4", "P-2", "P-0"]),
        ("agewatch.coil.held", "BAY-0", ["H-0", "H-2", "H-4"]),
        ("agewatch.coil.released", "BAY-1", ["R-1", "R-3", "R-5"]),
        ("agewatch.pull.withdrawn", "BAY-1", ["W-1", "W-3", "W-5"]),
        ("agewatch.pull.changed", "BAY-1", ["C-1", "C-3", "C-5"]),
        ("agewatch.pull.requested", "BAY-1", ["P-5", "P-3", "P-1"]),
        ("agewatch.coil.held", "BAY-1", ["H-1", "H-3", "H-5"]),
    ]


@settings(max_examples=25)
@given(st.randoms(use_true_random=False))
def test_the_order_of_the_effects_is_irrelevant(shuffle: Random) -> None:
    """Equal turns give equal messages to the byte, ids included."""
    effects = _busy_turn()
    first = told(effects)
    shuffle.shuffle(effects)
    assert told(effects) == first


def test_an_endpoint_gets_the_types_that_it_takes() -> None:
    """The filter is by the full type; no filter takes all; each endpoint has ids of its own."""
    some = endpoint("planning", "agewatch.pull.requested", "agewatch.pull.withdrawn")
    messages = told(_busy_turn(), endpoint(), some)
    assert len([message for message in messages if message.endpoint == "logistics"]) == 10
    assert [message.type for message in messages if message.endpoint == "planning"] == [
        "agewatch.pull.withdrawn",
        "agewatch.pull.requested",
    ] * 2
    ids = [message.message_id for message in messages]
    assert len(set(ids)) == len(ids)


def test_the_same_thing_at_another_place_in_the_journal_has_another_id() -> None:
    """A coil that is requested twice at the same shown time (a clock set back) is two messages."""
    effects = effects_of(PULL, "C-1", seen())
    first = compose(effects, [endpoint()], site="W", at_s=NOW, cause="7")
    again = compose(effects, [endpoint()], site="W", at_s=NOW, cause="7")
    later = compose(effects, [endpoint()], site="W", at_s=NOW, cause="8")
    assert first == again
    assert first[0].message_id != later[0].message_id


def test_heartbeats_go_to_who_takes_them() -> None:
    """A sign of life has no location and goes to every endpoint whose types allow it."""
    endpoints = [
        endpoint(),
        endpoint("pulls", "agewatch.pull.requested"),
        endpoint("it", "agewatch.heartbeat"),
    ]
    beats = heartbeats(endpoints, site="W", at_s=NOW, cause="beat-1", values={"coils": 400})
    assert [(beat.endpoint, beat.location, beat.type) for beat in beats] == [
        ("logistics", "", "agewatch.heartbeat"),
        ("it", "", "agewatch.heartbeat"),
    ]
