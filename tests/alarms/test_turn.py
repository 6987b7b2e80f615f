"""One turn of all alarms."""

from __future__ import annotations

from collections.abc import Iterable
from random import Random

from hypothesis import given
from hypothesis import strategies as st

from agewatch.alarms import (
    Alarm,
    AlarmKey,
    AlarmKind,
    Condition,
    Effect,
    Observed,
    Priority,
    Raised,
    Timing,
    advance_all,
    unmentioned,
)
from agewatch.alarms.lifecycle import Cleared, Transition

KINDS = st.sampled_from([AlarmKind.SENSOR_SILENT, AlarmKind.FEED_STALE])


def condition(kind: AlarmKind, subject: str, at_s: float, active: bool) -> Condition:
    return Condition(kind, subject, Observed(at_s, active, Priority.LOW, "BAY-1", {"reason": "r"}))


def effects_of(effects: Iterable[Effect], key: AlarmKey) -> list[Effect]:
    mine = []
    for effect in effects:
        if isinstance(effect, Transition):
            owner = (effect.kind, effect.subject)
        elif isinstance(effect, Raised | Cleared):
            owner = effect.alarm.key
        else:
            owner = effect.after.key
        if owner == key:
            mine.append(effect)
    return mine


@given(
    looks=st.lists(
        st.builds(condition, KINDS, st.sampled_from("ABC"), st.floats(0.0, 100.0), st.booleans()), max_size=20
    ),
    seed=st.randoms(use_true_random=False),
)
def test_the_order_of_unrelated_events_is_irrelevant(looks: list[Condition], seed: Random) -> None:
    """Mixing the looks at different subjects otherwise changes no alarm, and no effect of any one of them."""
    timing = Timing(on_delay_s=10.0, off_delay_s=20.0)
    queues = {look.key: [one for one in looks if one.key == look.key] for look in looks}
    mixed: list[Condition] = []
    waiting = {key: list(queue) for key, queue in queues.items()}
    while waiting:
        key = seed.choice(sorted(waiting))
        mixed.append(waiting[key].pop(0))
        waiting = {key: queue for key, queue in waiting.items() if queue}
    changed, effects = advance_all({}, looks, timing)
    changed_mixed, effects_mixed = advance_all({}, mixed, timing)
    assert {alarm.key: alarm for alarm in changed} == {alarm.key: alarm for alarm in changed_mixed}
    for key in queues:
        assert effects_of(effects, key) == effects_of(effects_mixed, key)


def test_two_looks_at_one_subject_follow_each_other() -> None:
    """The second look of a turn continues from the first, and the alarm comes back once."""
    looks = [
        condition(AlarmKind.FEED_STALE, "A", 1.0, True),
        condition(AlarmKind.FEED_STALE, "A", 2.0, False),
    ]
    changed, effects = advance_all({}, looks, Timing())
    assert [alarm.state for alarm in changed] == ["returned-to-normal-unacknowledged"]
    assert [type(effect) for effect in effects] == [Transition, Raised, Transition, Cleared]


def test_a_subject_that_is_no_longer_named_ends_its_alarm() -> None:
    """An alarm of a sensor that left the settings clears with that reason; others are left alone."""
    looks = [
        condition(AlarmKind.SENSOR_SILENT, "T1", 1.0, True),
        condition(AlarmKind.SENSOR_SILENT, "T2", 1.0, True),
        condition(AlarmKind.FEED_STALE, "F", 1.0, True),
    ]
    changed, _ = advance_all({}, looks, Timing())
    alarms: dict[AlarmKey, Alarm] = {alarm.key: alarm for alarm in changed}
    kind = AlarmKind.SENSOR_SILENT
    gone = unmentioned(alarms, {kind}, {(kind, "T2")}, 5.0, "the sensor is no longer in the settings")
    assert [(one.subject, one.observed.active, one.observed.detail["reason"]) for one in gone] == [
        ("T1", False, "the sensor is no longer in the settings")
    ]
    changed, _ = advance_all(alarms, gone, Timing())
    alarms |= {alarm.key: alarm for alarm in changed}
    assert unmentioned(alarms, {kind}, {(kind, "T2")}, 6.0, "again") == []
