"""Is the tool itself well? The ages in the head of the screen, and a plain sentence for each thing that is wrong."""

from __future__ import annotations

from agewatch.alarms import RATIONALISATION, Alarm, AlarmKind, Priority
from agewatch.board.data import Site, Snapshot
from agewatch.board.look import PRIORITY_DIGITS, Span
from agewatch.board.times import day_time, span

_TOOL_KINDS = (
    AlarmKind.STORE_TROUBLE,
    AlarmKind.CLOCK_STEP,
    AlarmKind.DELIVERY_FAILING,
    AlarmKind.FEED_STALE,
    AlarmKind.LOCATION_UNCOVERED,
)
"""Alarms that make the rest of the board less true, the worst first."""


def ages(snapshot: Snapshot | None, site: Site, now_s: float) -> tuple[Span, ...]:
    """How old the last assessment and the last reading are."""
    if snapshot is None:
        return (Span("reading the store …", "quiet"),)
    assessed_s = snapshot.assessment.at_s if snapshot.assessment is not None else None
    return (
        *_age("assessed", assessed_s, now_s, site.silent_after_s),
        Span("  "),
        *_age("reading", snapshot.pulse.reading_s, now_s, site.readings_old_after_s),
    )


def alarm_counts(snapshot: Snapshot | None, *, short: bool = False) -> tuple[Span, ...]:
    """Standing alarms by priority, and how many alarms wait to be acknowledged; `short` takes less room."""
    alarms = snapshot.alarms if snapshot is not None else ()
    spans: list[Span] = [] if short else [Span("alarms ", "quiet")]
    for priority in Priority:
        count = sum(alarm.standing and alarm.priority is priority for alarm in alarms)
        tone = priority.value if count else "quiet"
        if short:
            spans.append(Span(f" {priority.value} {count} ", tone))
        else:
            spans += (
                Span(f" {PRIORITY_DIGITS[priority]} ", tone),
                Span(f"{priority.value} {count}  ", "plain" if count else "quiet"),
            )
    waiting = sum(alarm.needs_acknowledging for alarm in alarms)
    words = f" {waiting} unackn." if short else f"{waiting} unacknowledged"
    spans.append(Span(words, "strong" if waiting else "quiet"))
    return tuple(spans)


def troubles(snapshot: Snapshot | None, unread: str | None, site: Site, now_s: float) -> tuple[str, ...]:
    """A sentence for each thing that is wrong with the tool, the worst first; empty when it is well.

    `unread`: why the last try to read the store failed.
    """
    found: list[str] = []
    if unread is not None:
        found.append(f"The store cannot be read: {unread}.{_shown_since(snapshot, site)}")
    if snapshot is None:
        return tuple(found)
    if _silent(snapshot, site, now_s):
        found.append(_silence(snapshot, now_s))
    elif snapshot.assessment is None:
        found.append("There is no assessment yet: the daemon is still at its first round.")
    elif now_s - snapshot.assessment.at_s > site.silent_after_s:
        old = span(now_s - snapshot.assessment.at_s)
        found.append(f"The daemon runs, but its last assessment is {old} old: see the alarms, call plant IT.")
    found += _told_by(snapshot.alarms)
    return tuple(found)


def _age(name: str, at_s: float | None, now_s: float, old_after_s: float) -> tuple[Span, Span]:
    if at_s is None:
        return Span(f"{name} ", "quiet"), Span("never", "trouble")
    age_s = max(0.0, now_s - at_s)
    return Span(f"{name} ", "quiet"), Span(
        f"{span(age_s)} ago", "trouble" if age_s > old_after_s else "plain"
    )


def _silent(snapshot: Snapshot, site: Site, now_s: float) -> bool:
    tick_s = snapshot.pulse.tick_s
    return tick_s is None or now_s - tick_s > site.silent_after_s


def _silence(snapshot: Snapshot, now_s: float) -> str:
    tick_s = snapshot.pulse.tick_s
    if tick_s is None:
        return "The daemon has never run on this store: start it with `agewatch run`."
    since = span(now_s - tick_s)
    return (
        f"The daemon has been silent for {since}: nothing here is renewed, no alarm is raised. "
        "Start it, or call plant IT."
    )


def _shown_since(snapshot: Snapshot | None, site: Site) -> str:
    if snapshot is None or snapshot.assessment is None:
        return ""
    return f" What stands here is of {day_time(snapshot.assessment.at_s, site.zone)}."


def _told_by(alarms: tuple[Alarm, ...]) -> list[str]:
    sentences = []
    for kind in _TOOL_KINDS:
        subjects = [alarm.subject for alarm in alarms if alarm.kind is kind and alarm.standing]
        if subjects:
            more = f" and {len(subjects) - 1} more" if len(subjects) > 1 else ""
            sentences.append(f"{RATIONALISATION[kind].title}: {subjects[0]}{more}.")
    return sentences
