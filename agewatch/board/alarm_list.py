"""Which alarms stand in the alarm list, and in which order."""

from __future__ import annotations

from collections.abc import Callable, Iterable

from agewatch.alarms import COIL_KINDS, RATIONALISATION, Alarm, AlarmState
from agewatch.board.order import URGENCY, Order

STATE_WORDS = {
    AlarmState.NORMAL: "normal",
    AlarmState.UNACKNOWLEDGED: "● unacknowledged",
    AlarmState.ACKNOWLEDGED: "✓ acknowledged",
    AlarmState.RETURNED_UNACKNOWLEDGED: "○ returned to normal",
}
"""Full disc: unseen and there; hollow: unseen and gone again; tick: seen."""

_SORT: dict[str, Callable[[Alarm], tuple[object, ...]]] = {
    URGENCY: lambda alarm: (not alarm.needs_acknowledging, not alarm.standing, alarm.priority.rank),
    "priority": lambda alarm: (alarm.priority.rank,),
    "state": lambda alarm: (not alarm.needs_acknowledging, not alarm.standing),
    "since": lambda alarm: (-(alarm.raised_s or 0.0),),
    "what": lambda alarm: (RATIONALISATION[alarm.kind].title,),
    "subject": lambda alarm: (alarm.subject.casefold(),),
    "location": lambda alarm: (alarm.location.casefold(),),
    "by": lambda alarm: ((alarm.acknowledged_by or "").casefold(),),
}
SORTABLE = {
    URGENCY: "urgency",
    "priority": "priority",
    "state": "state",
    "since": "raised",
    "what": "what",
    "subject": "about",
    "location": "location",
    "by": "acknowledged by",
}


def arranged(alarms: Iterable[Alarm], order: Order, words: str) -> list[Alarm]:
    """The alarms with all `words` in their text, ordered; like ones stand by urgency, then the newest first."""
    wanted = words.casefold().split()
    kept = [alarm for alarm in alarms if all(word in _text(alarm) for word in wanted)]
    kept.sort(key=_SORT["since"])
    kept.sort(key=_SORT[URGENCY])
    if order.by != URGENCY:
        kept.sort(key=_SORT[order.by], reverse=order.descending)
    return kept


def of_coil(alarms: Iterable[Alarm], coil_id: str) -> list[Alarm]:
    """The alarms about one coil, the most urgent first."""
    return arranged((a for a in alarms if a.kind in COIL_KINDS and a.subject == coil_id), Order(), "")


def _text(alarm: Alarm) -> str:
    words = (
        RATIONALISATION[alarm.kind].title,
        alarm.kind.value,
        alarm.subject,
        alarm.location,
        alarm.priority.value,
        STATE_WORDS[alarm.state],
        alarm.acknowledged_by or "",
    )
    return " ".join(words).casefold()
