"""The life of one alarm, after the states of ISA-18.2: from (alarm, event) to (alarm, effects), pure.

Two layers. The *condition* layer holds what the plant shows and waits out the delays; it turns
observations into the signals `RAISE` and `CLEAR`. The *state* layer is the table `_NEXT`. A state that
hides an alarm without stopping its evaluation (shelved, suppressed by design, out of service) or keeps
it (latched) adds rows to the table and a signal or two; the condition layer goes on below it unchanged.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from enum import Enum, StrEnum, auto

from agewatch.alarms.kinds import AlarmKind, Priority
from agewatch.errors import StoreError

Detail = Mapping[str, object]
"""The values behind an alarm, by name; each is text, a number, a flag or None, so that it can be stored."""

AlarmKey = tuple[AlarmKind, str]
"""Kind and subject: there is one alarm for each."""

AGEWATCH = "agewatch"
"""The actor of every change that no person made."""


class AlarmState(StrEnum):
    """Where an alarm stands towards the people who watch it."""

    NORMAL = "normal"
    UNACKNOWLEDGED = "unacknowledged"
    ACKNOWLEDGED = "acknowledged"
    RETURNED_UNACKNOWLEDGED = "returned-to-normal-unacknowledged"


class _Signal(Enum):
    RAISE = auto()
    CLEAR = auto()
    ACKNOWLEDGE = auto()


_NEXT: Mapping[tuple[AlarmState, _Signal], AlarmState] = {
    (AlarmState.NORMAL, _Signal.RAISE): AlarmState.UNACKNOWLEDGED,
    (AlarmState.UNACKNOWLEDGED, _Signal.ACKNOWLEDGE): AlarmState.ACKNOWLEDGED,
    (AlarmState.UNACKNOWLEDGED, _Signal.CLEAR): AlarmState.RETURNED_UNACKNOWLEDGED,
    (AlarmState.ACKNOWLEDGED, _Signal.CLEAR): AlarmState.NORMAL,
    (AlarmState.RETURNED_UNACKNOWLEDGED, _Signal.RAISE): AlarmState.UNACKNOWLEDGED,
    (AlarmState.RETURNED_UNACKNOWLEDGED, _Signal.ACKNOWLEDGE): AlarmState.NORMAL,
}

_STANDING = frozenset({AlarmState.UNACKNOWLEDGED, AlarmState.ACKNOWLEDGED})

_TOLD_DETAILS = {"press_s": "planned pressing changed"}
"""Details whose change somebody has to hear of while the alarm stands, and in which words."""


@dataclass(frozen=True, slots=True)
class Alarm:
    """One alarm. `location`, `priority` and `detail` are as last told, not as last observed."""

    kind: AlarmKind
    subject: str
    """Coil, sensor, location, feed or endpoint."""
    location: str
    """"" where none applies."""
    state: AlarmState
    priority: Priority
    active: bool
    """The condition as last observed, before any delay."""
    active_since_s: float | None
    """When the condition last came; None while it is gone."""
    inactive_since_s: float | None
    """When the condition last went; None while it is there."""
    raised_s: float | None
    acknowledged_s: float | None
    acknowledged_by: str | None
    detail: Detail

    @classmethod
    def at_rest_for(cls, kind: AlarmKind, subject: str) -> Alarm:
        """The alarm of a condition that nobody has seen yet."""
        return cls(
            kind, subject, "", AlarmState.NORMAL, Priority.LOW, False, None, None, None, None, None, {}
        )

    @property
    def key(self) -> AlarmKey:
        return self.kind, self.subject

    @property
    def standing(self) -> bool:
        """Raised and not cleared, acknowledged or not."""
        return self.state in _STANDING

    @property
    def needs_acknowledging(self) -> bool:
        return (self.state, _Signal.ACKNOWLEDGE) in _NEXT

    @property
    def unsettled(self) -> bool:
        """Learning that the condition is gone would still change it."""
        return self.active or self.standing

    @property
    def at_rest(self) -> bool:
        """Normal, with nothing pending: forgetting it changes nothing."""
        return self.state is AlarmState.NORMAL and not self.active


@dataclass(frozen=True, slots=True)
class Timing:
    """How long a condition has to hold before it is raised, and to be gone before it is cleared."""

    on_delay_s: float = 0.0
    off_delay_s: float = 0.0


@dataclass(frozen=True, slots=True)
class Observed:
    """A look at the condition. With `active` false, `location` and `priority` are not used."""

    at_s: float
    active: bool
    priority: Priority
    location: str
    detail: Detail


@dataclass(frozen=True, slots=True)
class Acknowledged:
    """A person has seen the alarm."""

    at_s: float
    actor: str
    reason: str


Event = Observed | Acknowledged


@dataclass(frozen=True, slots=True)
class Transition:
    """For the journal. Before and after are alike where a standing alarm moved or changed urgency."""

    kind: AlarmKind
    subject: str
    before: AlarmState
    after: AlarmState
    at_s: float
    actor: str
    reason: str
    detail: Detail


@dataclass(frozen=True, slots=True)
class Raised:
    """The alarm stands from now on."""

    alarm: Alarm


@dataclass(frozen=True, slots=True)
class Changed:
    """A standing alarm moved, or its priority or its pressing changed."""

    before: Alarm
    after: Alarm


@dataclass(frozen=True, slots=True)
class Cleared:
    """The alarm stands no more. Its location is the one last told, its detail the values that cleared it."""

    alarm: Alarm


Effect = Transition | Raised | Changed | Cleared


def advance(alarm: Alarm, event: Event, timing: Timing) -> tuple[Alarm, tuple[Effect, ...]]:
    """The alarm after `event`, and what follows from it for journal and messages.

    The very same object comes back where nothing changed. A clock that was set back starts a running delay
    anew from the time it now shows: the alarm may come or go later than the delay says, never earlier, and
    never not at all.
    """
    if isinstance(event, Acknowledged):
        return _acknowledge(alarm, event)
    seen = _follow_condition(alarm, event)
    if event.active:
        if alarm.standing:
            return _keep_told(seen, event)
        if _elapsed_s(seen.active_since_s, event.at_s) >= timing.on_delay_s:
            return _raise(seen, event)
    elif alarm.standing and _elapsed_s(seen.inactive_since_s, event.at_s) >= timing.off_delay_s:
        return _clear(seen, event)
    return seen, ()


def replay(transitions: Iterable[Transition]) -> AlarmState:
    """The state that one alarm's journal leads to, from normal on.

    Raises StoreError where a step does not follow from the one before it.
    """
    state = AlarmState.NORMAL
    lawful = {(before, after) for (before, _), after in _NEXT.items()} | {(kept, kept) for kept in _STANDING}
    for step in transitions:
        if step.before != state or (step.before, step.after) not in lawful:
            raise StoreError(
                f"journal of {step.kind} {step.subject}: goes from {step.before} to {step.after} while the "
                f"alarm is {state}; rows are missing or were changed: restore the store from a backup"
            )
        state = step.after
    return state


def _elapsed_s(since_s: float | None, at_s: float) -> float:
    return 0.0 if since_s is None else at_s - since_s


def _follow_condition(alarm: Alarm, event: Observed) -> Alarm:
    """The alarm with the condition as observed; its since is never later than the clock."""
    since_s = alarm.active_since_s if event.active else alarm.inactive_since_s
    if alarm.active == event.active and since_s is not None and since_s <= event.at_s:
        return alarm
    if not event.active and alarm.at_rest:
        return alarm
    return replace(
        alarm,
        active=event.active,
        active_since_s=event.at_s if event.active else None,
        inactive_since_s=None if event.active else event.at_s,
    )


def _raise(alarm: Alarm, event: Observed) -> tuple[Alarm, tuple[Effect, ...]]:
    after = replace(
        alarm,
        state=_NEXT[alarm.state, _Signal.RAISE],
        location=event.location,
        priority=event.priority,
        raised_s=event.at_s,
        acknowledged_s=None,
        acknowledged_by=None,
        detail=event.detail,
    )
    return after, (_transition(alarm, after, event.at_s, AGEWATCH, _reason(event.detail)), Raised(after))


def _clear(alarm: Alarm, event: Observed) -> tuple[Alarm, tuple[Effect, ...]]:
    after = replace(alarm, state=_NEXT[alarm.state, _Signal.CLEAR], detail=event.detail)
    return after, (_transition(alarm, after, event.at_s, AGEWATCH, _reason(event.detail)), Cleared(after))


def _keep_told(alarm: Alarm, event: Observed) -> tuple[Alarm, tuple[Effect, ...]]:
    changes = _changes(alarm, event)
    if not changes:
        return alarm, ()
    after = replace(alarm, location=event.location, priority=event.priority, detail=event.detail)
    reason = "; ".join(changes)
    return after, (_transition(alarm, after, event.at_s, AGEWATCH, reason), Changed(alarm, after))


def _changes(alarm: Alarm, event: Observed) -> list[str]:
    told = []
    if event.location != alarm.location:
        told.append(f"moved from {alarm.location or 'nowhere'} to {event.location or 'nowhere'}")
    if event.priority != alarm.priority:
        told.append(f"priority {alarm.priority} became {event.priority}")
    told.extend(
        words for name, words in _TOLD_DETAILS.items() if event.detail.get(name) != alarm.detail.get(name)
    )
    return told


def _acknowledge(alarm: Alarm, event: Acknowledged) -> tuple[Alarm, tuple[Effect, ...]]:
    if not alarm.needs_acknowledging:
        return alarm, ()
    after = replace(
        alarm,
        state=_NEXT[alarm.state, _Signal.ACKNOWLEDGE],
        acknowledged_s=event.at_s,
        acknowledged_by=event.actor,
    )
    return after, (_transition(alarm, after, event.at_s, event.actor, event.reason),)


def _transition(before: Alarm, after: Alarm, at_s: float, actor: str, reason: str) -> Transition:
    return Transition(
        before.kind, before.subject, before.state, after.state, at_s, actor, reason, after.detail
    )


def _reason(detail: Detail) -> str:
    """The sentence that a rule gives along with its values."""
    return str(detail.get("reason", ""))
