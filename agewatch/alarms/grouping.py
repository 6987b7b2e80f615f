"""Alarms of one kind, location and hour are announced as one group: a heat wave is one piece of news."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from agewatch.alarms.kinds import AlarmKind, Priority, highest
from agewatch.alarms.lifecycle import Alarm

HOUR_S = 3600


@dataclass(frozen=True, slots=True)
class Group:
    """Standing alarms that are announced together; `subjects` in order of urgency, then of name."""

    kind: AlarmKind
    location: str
    hour_s: int
    """Start of the hour in which they were raised, seconds since 1970."""
    priority: Priority
    """The highest of its alarms."""
    subjects: tuple[str, ...]
    unacknowledged: int


def group(alarms: Iterable[Alarm]) -> list[Group]:
    """Groups of the alarms that stand or wait to be acknowledged: most urgent first, then earliest."""
    members: dict[tuple[AlarmKind, str, int], list[Alarm]] = {}
    for alarm in alarms:
        if alarm.raised_s is not None and (alarm.standing or alarm.needs_acknowledging):
            hour_s = int(alarm.raised_s // HOUR_S) * HOUR_S
            members.setdefault((alarm.kind, alarm.location, hour_s), []).append(alarm)
    groups = [_group(*key, together) for key, together in members.items()]
    return sorted(groups, key=lambda one: (one.priority.rank, one.hour_s, one.kind, one.location))


def _group(kind: AlarmKind, location: str, hour_s: int, together: list[Alarm]) -> Group:
    ordered = sorted(together, key=lambda alarm: (alarm.priority.rank, alarm.subject))
    return Group(
        kind,
        location,
        hour_s,
        highest(alarm.priority for alarm in ordered),
        tuple(alarm.subject for alarm in ordered),
        sum(alarm.needs_acknowledging for alarm in ordered),
    )
