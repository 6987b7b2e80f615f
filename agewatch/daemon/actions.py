"""What people may ask of the daemon: one function for each action, by name."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from agewatch.alarms import Acknowledged, AlarmKind, advance
from agewatch.clock import Clock
from agewatch.daemon.control import Reply, Request
from agewatch.daemon.cycle import record, timing_of
from agewatch.messages.inert import inert
from agewatch.plant.records import JournalRow
from agewatch.plant.settings import Settings
from agewatch.store import Store, queries, writes


@dataclass(frozen=True, slots=True)
class Desk:
    """What actions work on."""

    store: Store
    settings: Settings
    clock: Clock

    def answer(self, request: Request, actor: str) -> Reply:
        """Do what is asked for, or say why not; both are journalled. Raises StoreError."""
        action = ACTIONS.get(str(request.get("action")))
        if action is None:
            return self.refuse(request, actor, f"there is no such action; there is {', '.join(ACTIONS)}")
        reply = action(self, request, actor)
        return reply if reply.ok else self.refuse(request, actor, reply.said)

    def refuse(self, request: Request, actor: str, reason: str) -> Reply:
        """Journal that something was asked for and not done. Raises StoreError."""
        asked = {name: inert(str(request.get(name, ""))) for name in ("action", "kind", "subject")}
        row = JournalRow(
            at_s=self.clock.now_s(),
            topic="daemon",
            kind="request-refused",
            subject=asked["action"],
            actor=actor,
            before="",
            after="",
            reason=reason,
            detail=asked,
        )
        with self.store.write() as tx:
            writes.append_journal(tx, [row])
        return Reply(False, reason)


Action = Callable[[Desk, Request, str], Reply]
"""From the request and its actor to the reply. A refusal is journalled by whoever calls."""


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


ACTIONS: Mapping[str, Action] = {"acknowledge": acknowledge}
