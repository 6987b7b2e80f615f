"""The work of a turn: assess the store, move the alarms on, and keep all that follows in one transaction."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from agewatch.alarms import Alarm, AlarmKey, Effect, Timing, Transition, advance_all
from agewatch.climate.outlook import RECENT_S
from agewatch.daemon.conditions import conditions
from agewatch.daemon.status import Tick, put_tick
from agewatch.messages import compose
from agewatch.plant.assess import assess, first_leg_s
from agewatch.plant.assessment import Assessment
from agewatch.plant.inventory import Readings
from agewatch.plant.records import JournalRow
from agewatch.plant.settings import AlarmSettings, Settings
from agewatch.store import Store, Transaction, View, queries, writes

_DAY_S = 86_400.0


@dataclass(frozen=True, slots=True)
class Turn:
    """What one turn came to."""

    assessment: Assessment
    alarms: tuple[Alarm, ...]
    """All that are not at rest."""
    effects: Sequence[Effect]
    messages: int
    """Put into the outbox."""


def take_turn(store: Store, settings: Settings, digest: str, now_s: Callable[[], float]) -> Turn:
    """Assess every stored coil, move every alarm on, and keep both with journal and messages, or none of it.

    `now_s` tells plant time. Raises StoreError.
    """
    with store.read() as view:
        assessment, readings = assess_store(view, settings, digest, now_s())
    with store.write() as tx:
        writes.put_assessment(tx, assessment)
        turn = advance_alarms(tx, assessment, readings, settings)
        put_tick(tx, Tick(assessment.at_s, newest_reading_s(readings, assessment.at_s)))
    return turn


def assess_store(view: View, settings: Settings, digest: str, at_s: float) -> tuple[Assessment, Readings]:
    """The store as it stands, evaluated at `at_s`, and the readings that it rests on."""
    coils = queries.inventory(view, at_s)
    # The outlook rests on the last weeks, however young the coils are.
    known = queries.readings(view, since_s=min(first_leg_s(coils, at_s), at_s - RECENT_S) - _DAY_S)
    return assess(coils, known, queries.outlook(view), settings, digest, at_s), known


def advance_alarms(tx: Transaction, assessment: Assessment, known: Readings, settings: Settings) -> Turn:
    """Move every alarm on by what `assessment` and the state of feeds, sensors and receivers show."""
    before = {alarm.key: alarm for alarm in queries.alarms(tx)}
    seen = conditions(tx, assessment, known, settings, before)
    changed, effects = advance_all(before, seen, timing_of(settings.alarm))
    messages = record(tx, changed, effects, settings, assessment.at_s)
    after: dict[AlarmKey, Alarm] = before | {alarm.key: alarm for alarm in changed}
    standing = tuple(alarm for alarm in after.values() if not alarm.at_rest)
    return Turn(assessment, standing, effects, messages)


def record(
    tx: Transaction, changed: Iterable[Alarm], effects: Sequence[Effect], settings: Settings, at_s: float
) -> int:
    """Keep changed alarms with the journal rows and messages that tell of them; how many messages."""
    cause = str(queries.last_journal_seq(tx))
    messages = compose(effects, settings.endpoint, site=settings.site.name, at_s=at_s, cause=cause)
    writes.put_alarms(tx, changed)
    writes.append_journal(tx, journal_rows(effects))
    writes.put_messages(tx, messages)
    return len(messages)


def journal_rows(effects: Iterable[Effect]) -> Iterator[JournalRow]:
    """The rows that tell every transition."""
    for effect in effects:
        if isinstance(effect, Transition):
            yield JournalRow(
                at_s=effect.at_s,
                topic="alarm",
                kind=str(effect.kind),
                subject=effect.subject,
                actor=effect.actor,
                before=str(effect.before),
                after=str(effect.after),
                reason=effect.reason,
                detail=effect.detail,
            )


def timing_of(alarm: AlarmSettings) -> Timing:
    return Timing(alarm.on_delay.total_seconds(), alarm.off_delay.total_seconds())


def newest_reading_s(known: Readings, at_s: float) -> float | None:
    """Time of the newest reading that is not after `at_s`; None: there is none."""
    past = known.at_s[known.at_s <= at_s]
    return float(np.max(past)) if len(past) else None
