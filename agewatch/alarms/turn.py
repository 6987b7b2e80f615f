"""One turn of all alarms: what was observed goes in, changed alarms and their effects come out."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass

from agewatch.alarms.kinds import AlarmKind, Priority
from agewatch.alarms.lifecycle import Alarm, AlarmKey, Effect, Observed, Timing, advance


@dataclass(frozen=True, slots=True)
class Condition:
    """A look at the condition of one alarm."""

    kind: AlarmKind
    subject: str
    observed: Observed

    @property
    def key(self) -> AlarmKey:
        return self.kind, self.subject


def advance_all(
    alarms: Mapping[AlarmKey, Alarm], conditions: Iterable[Condition], timing: Timing
) -> tuple[list[Alarm], list[Effect]]:
    """The alarms that changed, and the effects in the order of `conditions`.

    An alarm that comes back at rest (`Alarm.at_rest`) need not be kept: the journal has its story.
    """
    changed: dict[AlarmKey, Alarm] = {}
    effects: list[Effect] = []
    for condition in conditions:
        key = condition.key
        before = changed.get(key) or alarms.get(key) or Alarm.at_rest_for(*key)
        after, follows = advance(before, condition.observed, timing)
        if after is not before:
            changed[key] = after
            effects.extend(follows)
    return list(changed.values()), effects


def unmentioned(
    alarms: Mapping[AlarmKey, Alarm],
    kinds: Collection[AlarmKind],
    mentioned: Collection[AlarmKey],
    at_s: float,
    reason: str,
) -> list[Condition]:
    """The condition is gone for every unsettled alarm of `kinds` that a full look at the plant left out.

    `reason` says why, for example that a coil has left the store or a sensor the settings.
    """
    return [
        ended(alarm, at_s, reason)
        for key, alarm in alarms.items()
        if alarm.kind in kinds and alarm.unsettled and key not in mentioned
    ]


def ended(alarm: Alarm, at_s: float, reason: str) -> Condition:
    """The condition of `alarm` is gone because its subject is."""
    detail = {**alarm.detail, "reason": reason}
    return Condition(alarm.kind, alarm.subject, Observed(at_s, False, Priority.LOW, alarm.location, detail))
