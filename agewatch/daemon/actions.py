"""What people may ask of the daemon: one function for each action, by name."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from agewatch.alarms import Acknowledged, AlarmKind, advance
from agewatch.daemon.control import Reply, Request
from agewatch.daemon.cycle import record, timing_of
from agewatch.daemon.desk import Desk
from agewatch.daemon.mending import resubmit
from agewatch.messages.inert import inert
from agewatch.store import queries

Action = Callable[[Desk, Request, str], Reply]
"""From the request and its actor to the reply. A refusal is journalled by `answer`."""


def answer(desk: Desk, request: Request, actor: str) -> Reply:
    """Do what is asked for, or say why not; both are journalled. Raises StoreError."""
    action = ACTIONS.get(str(request.get("action")))
    if action is None:
        return desk.refuse(request, actor, f"there is no such action; there is {', '.join(ACTIONS)}")
    reply = action(desk, request, actor)
    return reply if reply.ok else desk.refuse(request, actor, reply.said)


def acknowledge(desk: Desk, request: Request, actor: str) -> Reply:
    """`kind` and `subject` of an alarm, and a `reason` if there is one: a person has seen it."""
    kind, subject, reason = (request.get(name, "") for name in ("kind", "subject", "reason"))
    if kind not in tuple(AlarmKind) or not isinstance(subject, str) or not isinstance(reason, str):
        return Reply(False, "acknowledge needs the kind and the subject of an alarm, and may have a reason")
    now_s = desk.clock.now_s()
    with desk.store.write() as tx:
        alarm = next(
            (each for each in queries.alarms(tx) if (each.kind, each.subject) == (kind, subject)), None
        )
        if alarm is None or not alarm.needs_acknowledging:
            return Reply(False, f"no alarm {kind} of {inert(subject)} waits to be acknowledged")
        event = Acknowledged(now_s, actor, inert(reason, 500))
        after, effects = advance(alarm, event, timing_of(desk.settings.alarm))
        record(tx, [after], effects, desk.settings, now_s)
    return Reply(True, f"{kind} of {inert(subject)} is acknowledged")


ACTIONS: Mapping[str, Action] = {"acknowledge": acknowledge, "resubmit": resubmit}
