"""What people ask of the daemon, on a real store."""

from __future__ import annotations

import pytest

from agewatch.daemon.actions import ACTIONS, answer
from agewatch.daemon.control import Reply, Request
from agewatch.daemon.desk import Desk
from tests.daemon.samples import HOUR_S, NOW_S, TinyPlant

NOVAK = "user:novak"
HELD = {"action": "acknowledge", "kind": "returned-in-store", "subject": "C-OLD"}


def ask(plant: TinyPlant, request: Request) -> Reply:
    return answer(Desk(plant.store, plant.loaded.settings, plant.clock), request, NOVAK)


def test_acknowledge(plant: TinyPlant) -> None:
    """Acknowledging keeps who did it, when and why, and tells no receiver."""
    plant.round()
    plant.clock.move_to(NOW_S + HOUR_S)
    messages = plant.messages()
    reply = ask(plant, {**HELD, "reason": "taken off the plan"})
    assert reply == Reply(True, "returned-in-store of C-OLD is acknowledged")
    alarm = plant.alarms()["returned-in-store", "C-OLD"]
    assert (alarm.state, alarm.acknowledged_by, alarm.acknowledged_s) == (
        "acknowledged",
        NOVAK,
        NOW_S + HOUR_S,
    )
    row = plant.journal()[-1]
    assert (row.topic, row.kind, row.subject, row.actor) == ("alarm", "returned-in-store", "C-OLD", NOVAK)
    assert (row.before, row.after, row.reason) == ("unacknowledged", "acknowledged", "taken off the plan")
    assert plant.messages() == messages


@pytest.mark.parametrize(
    ("request_", "said"),
    [
        ({"action": "launch"}, "no such action; there is acknowledge, resubmit"),
        ({"action": "acknowledge"}, "needs the kind and the subject"),
        ({**HELD, "kind": "bad-weather"}, "needs the kind and the subject"),
        ({**HELD, "subject": ["C-OLD"]}, "needs the kind and the subject"),
        ({**HELD, "reason": 7}, "needs the kind and the subject"),
        ({"action": "resubmit"}, "the text of each row by the number"),
        ({"action": "resubmit", "mended": ["row"]}, "the text of each row by the number"),
        ({"action": "resubmit", "mended": {"one": "row"}}, "the text of each row by the number"),
        ({"action": "resubmit", "mended": {"1": 7}}, "the text of each row by the number"),
        (
            {"action": "resubmit", "mended": {"99": "row"}},
            "0 taken in, 1 still rejected: 99: no such row waits",
        ),
        ({**HELD, "subject": "C-FRESH"}, "no alarm returned-in-store of C-FRESH waits"),
        ({**HELD, "subject": "\x1b[2J"}, "no alarm returned-in-store of \\x1b[2J waits"),
    ],
)
def test_refusal_is_told_and_journalled(plant: TinyPlant, request_: Request, said: str) -> None:
    """What cannot be done is answered with the reason, and journalled with the actor; nothing else changes."""
    plant.round()
    before = plant.alarms(), len(plant.journal())
    reply = ask(plant, request_)
    assert not reply.ok
    assert said in reply.said
    row = plant.journal()[-1]
    assert (row.topic, row.kind, row.actor, row.reason) == ("daemon", "request-refused", NOVAK, reply.said)
    assert row.detail["action"] == request_["action"]
    assert (plant.alarms(), len(plant.journal())) == (before[0], before[1] + 1)


def test_second_acknowledgement_is_refused(plant: TinyPlant) -> None:
    """An alarm that is acknowledged already stays as it was acknowledged first."""
    plant.round()
    assert ask(plant, HELD).ok
    plant.clock.move_to(NOW_S + HOUR_S)
    assert not ask(plant, HELD).ok
    assert plant.alarms()["returned-in-store", "C-OLD"].acknowledged_s == NOW_S


def test_every_action_can_be_asked_for_badly(plant: TinyPlant) -> None:
    """Each action answers a request that lacks everything, instead of failing."""
    for action in ACTIONS:
        assert not ask(plant, {"action": action}).ok
