"""From what happened to the alarms in one turn to the messages that tell it. Pure."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from agewatch.alarms import RATIONALISATION, Alarm, AlarmKind, Changed, Cleared, Effect, Raised
from agewatch.alarms.lifecycle import Detail
from agewatch.alarms.rationalisation import ESTIMATE_CAUTION, LIFTING_CAUTION
from agewatch.clock import rfc3339
from agewatch.messages.body import Body, Entry, MessageType, News, bodies, heartbeat_body
from agewatch.plant.records import MessageState, OutboxMessage

if TYPE_CHECKING:
    from agewatch.plant.settings import Endpoint

_COIL_CAUTION = f"{ESTIMATE_CAUTION} {LIFTING_CAUTION}"


@dataclass(frozen=True, slots=True)
class _Told:
    """One entry on its way into a message; `urgency` orders the entries of one message."""

    type: MessageType
    location: str
    urgency: tuple[int, str, str]
    entry: Entry


def compose(
    effects: Iterable[Effect], endpoints: Sequence[Endpoint], *, site: str, at_s: float, cause: str
) -> list[OutboxMessage]:
    """The messages of one turn, in the order in which they are to be sent.

    at_s: time of the turn [s since 1970]. cause: a key that the store gives once, such as the seq of the
    journal's last row before this turn; see body.py for what it does. Equal inputs give equal messages; the
    order of `effects` is irrelevant. A coil that moves is withdrawn where it was and requested where it is.
    """
    grouped: dict[tuple[str, MessageType], list[_Told]] = {}
    for effect in effects:
        for told in _tell(effect):
            grouped.setdefault((told.location, told.type), []).append(told)
    order = {kind: place for place, kind in enumerate(MessageType)}
    keys = sorted(grouped, key=lambda key: (key[0], order[key[1]]))
    all_news = [_news(location, kind, grouped[location, kind], site, at_s) for location, kind in keys]
    return [
        _message(body, endpoint.name, news.location, news.type, at_s)
        for endpoint in endpoints
        for news in all_news
        if _takes(endpoint, news.type)
        for body in bodies(news, endpoint.name, cause)
    ]


def heartbeats(
    endpoints: Sequence[Endpoint], *, site: str, at_s: float, cause: str, values: Mapping[str, object]
) -> list[OutboxMessage]:
    """A sign of life for every endpoint that takes one; `values` (text, numbers, flags) tells how it is."""
    return [
        _message(
            heartbeat_body(site, at_s, values, endpoint.name, cause),
            endpoint.name,
            "",
            MessageType.HEARTBEAT,
            at_s,
        )
        for endpoint in endpoints
        if _takes(endpoint, MessageType.HEARTBEAT)
    ]


def _takes(endpoint: Endpoint, kind: MessageType) -> bool:
    return not endpoint.types or kind in endpoint.types


def _message(body: Body, endpoint: str, location: str, kind: MessageType, at_s: float) -> OutboxMessage:
    return OutboxMessage(
        message_id=body.message_id,
        endpoint=endpoint,
        location=location,
        type=kind,
        body=body.text,
        created_s=at_s,
        state=MessageState.WAITING,
        attempts=0,
        next_attempt_s=at_s,
        delivered_s=None,
        last_error="",
        seq=None,
    )


def _news(location: str, kind: MessageType, told: list[_Told], site: str, at_s: float) -> News:
    entries = [one.entry for one in sorted(told, key=lambda one: one.urgency)]
    return News(kind, site, location, at_s, entries, _COIL_CAUTION if kind.lists == "coils" else "")


@dataclass(frozen=True, slots=True)
class _Voice:
    """How one kind of alarm is told: type and entry when it comes, goes and changes."""

    comes: MessageType
    goes: MessageType
    changes: MessageType | None
    full: Callable[[Alarm], Entry]
    brief: Callable[[Alarm, str], Entry]


def _tell(effect: Effect) -> Iterator[_Told]:
    if isinstance(effect, Raised):
        voice = _voice(effect.alarm.kind)
        yield _told(voice.comes, effect.alarm, voice.full(effect.alarm))
    elif isinstance(effect, Cleared):
        voice = _voice(effect.alarm.kind)
        yield _told(voice.goes, effect.alarm, voice.brief(effect.alarm, _reason(effect.alarm)))
    elif isinstance(effect, Changed):
        yield from _tell_change(effect.before, effect.after)


def _tell_change(before: Alarm, after: Alarm) -> Iterator[_Told]:
    voice = _voice(after.kind)
    if before.location != after.location:
        moved = f"moved to {after.location or 'an unknown location'}"
        yield _told(voice.goes, before, voice.brief(before, moved))
        yield _told(voice.comes, after, voice.full(after))
    elif voice.changes is not None:
        changed = [
            name
            for name, is_changed in (
                ("press_at", before.detail.get("press_s") != after.detail.get("press_s")),
                ("priority", before.priority != after.priority),
            )
            if is_changed
        ]
        yield _told(voice.changes, after, {**voice.full(after), "changed": changed})


def _told(kind: MessageType, alarm: Alarm, entry: Entry) -> _Told:
    date = _time(alarm.detail, "pull_by_s") or "~"
    return _Told(kind, alarm.location, (alarm.priority.rank, date, f"{alarm.subject} {alarm.kind}"), entry)


def _coil_in_full(alarm: Alarm) -> Entry:
    detail = alarm.detail
    return {
        "coil_id": alarm.subject,
        "grade": detail.get("grade"),
        "part": detail.get("part"),
        "pull_by": _time(detail, "pull_by_s"),
        "press_at": _time(detail, "press_s"),
        "return_p10": _time(detail, "return_p10_s"),
        "return_p50": _time(detail, "return_p50_s"),
        "return_risk": _share(detail, "return_risk"),
        "priority": alarm.priority,
        "reason": _reason(alarm),
        "starting_point": detail.get("starting_point"),
    }


def _held_in_full(alarm: Alarm) -> Entry:
    return {name: value for name, value in _coil_in_full(alarm).items() if name != "pull_by"}


def _coil_in_brief(alarm: Alarm, reason: str) -> Entry:
    detail = alarm.detail
    return {
        "coil_id": alarm.subject,
        "grade": detail.get("grade"),
        "part": detail.get("part"),
        "reason": reason,
    }


def _alarm_in_full(alarm: Alarm) -> Entry:
    record = RATIONALISATION[alarm.kind]
    return {
        "kind": alarm.kind,
        "subject": alarm.subject,
        "priority": alarm.priority,
        "title": record.title,
        "reason": _reason(alarm),
        "consequence": record.consequence,
        "action": record.action,
        "time_to_respond": record.time_to_respond,
    }


def _alarm_in_brief(alarm: Alarm, reason: str) -> Entry:
    return {"kind": alarm.kind, "subject": alarm.subject, "reason": reason}


_PULL = _Voice(
    MessageType.PULL_REQUESTED,
    MessageType.PULL_WITHDRAWN,
    MessageType.PULL_CHANGED,
    _coil_in_full,
    _coil_in_brief,
)
_HOLD = _Voice(MessageType.COIL_HELD, MessageType.COIL_RELEASED, None, _held_in_full, _coil_in_brief)
_SYSTEM = _Voice(MessageType.ALARM_RAISED, MessageType.ALARM_CLEARED, None, _alarm_in_full, _alarm_in_brief)


def _voice(kind: AlarmKind) -> _Voice:
    return {AlarmKind.RETURN_BEFORE_PRESS: _PULL, AlarmKind.RETURNED_IN_STORE: _HOLD}.get(kind, _SYSTEM)


def _reason(alarm: Alarm) -> str:
    return str(alarm.detail.get("reason", ""))


def _share(detail: Detail, name: str) -> float | None:
    value = detail.get(name)
    return round(value, 4) if isinstance(value, int | float) else None


def _time(detail: Detail, name: str) -> str | None:
    value = detail.get(name)
    return rfc3339(value) if isinstance(value, int | float) else None
