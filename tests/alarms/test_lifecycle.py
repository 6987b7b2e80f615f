"""The life of one alarm: delays, acknowledging, what is told, and clocks that jump."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.alarms import (
    Acknowledged,
    Alarm,
    AlarmKind,
    AlarmState,
    Changed,
    Cleared,
    Effect,
    Event,
    Observed,
    Priority,
    Raised,
    Timing,
    Transition,
    advance,
    replay,
)
from agewatch.errors import StoreError

DAY = 86_400.0
NEW = Alarm.at_rest_for(AlarmKind.RETURN_BEFORE_PRESS, "C-1")
SLOW = Timing(on_delay_s=60.0, off_delay_s=1800.0)
OVER_ON_S, OVER_OFF_S = 60.001, 1800.001
"""The delays and a millisecond more: differences of floating times are rounded."""


def seen(
    at_s: float,
    active: bool = True,
    *,
    priority: Priority = Priority.LOW,
    location: str = "BAY-1",
    press_s: float | None = None,
    reason: str = "risk 0.3",
) -> Observed:
    return Observed(at_s, active, priority, location, {"press_s": press_s, "reason": reason})


def run(alarm: Alarm, events: list[Event], timing: Timing) -> tuple[Alarm, list[Effect]]:
    effects: list[Effect] = []
    for event in events:
        alarm, follows = advance(alarm, event, timing)
        effects.extend(follows)
    return alarm, effects


def test_without_a_delay_the_first_look_raises() -> None:
    """A condition is raised at once where no delay is set, with the values of that look."""
    alarm, effects = advance(NEW, seen(100.0, priority=Priority.HIGH), Timing())
    assert (alarm.state, alarm.priority, alarm.location) == (
        AlarmState.UNACKNOWLEDGED,
        Priority.HIGH,
        "BAY-1",
    )
    assert (alarm.raised_s, alarm.active_since_s, alarm.inactive_since_s) == (100.0, 100.0, None)
    assert [type(effect) for effect in effects] == [Transition, Raised]


def test_a_condition_has_to_hold_for_its_on_delay() -> None:
    """Nothing is raised, and nothing told, before the condition has held for the on-delay."""
    alarm, effects = run(NEW, [seen(0.0), seen(59.9)], SLOW)
    assert (alarm.state, effects) == (AlarmState.NORMAL, [])
    alarm, effects = run(alarm, [seen(60.0)], SLOW)
    assert alarm.state is AlarmState.UNACKNOWLEDGED
    assert alarm.active_since_s == 0.0


def test_an_interrupted_condition_starts_its_on_delay_anew() -> None:
    """Looks without the condition end the wait: three short spells are not one long one."""
    alarm, effects = run(NEW, [seen(0.0), seen(50.0, False), seen(55.0), seen(100.0)], SLOW)
    assert (alarm.state, effects) == (AlarmState.NORMAL, [])


def test_a_wavering_condition_stays_one_alarm() -> None:
    """A condition that comes back within its off-delay neither clears nor is raised again."""
    raised, _ = run(NEW, [seen(0.0), seen(60.0)], SLOW)
    alarm, effects = run(raised, [seen(100.0, False), seen(1000.0), seen(1100.0, False)], SLOW)
    assert (alarm.state, effects) == (AlarmState.UNACKNOWLEDGED, [])


def test_what_is_gone_unseen_waits_for_its_acknowledgement() -> None:
    """An alarm that clears before anybody acknowledged it stays on show until somebody does."""
    raised, _ = advance(NEW, seen(0.0), Timing())
    returned, effects = advance(raised, seen(10.0, False, reason="risk 0.01"), Timing())
    assert returned.state is AlarmState.RETURNED_UNACKNOWLEDGED
    assert [type(effect) for effect in effects] == [Transition, Cleared]
    closed, effects = advance(returned, Acknowledged(20.0, "user:eva", "seen"), Timing())
    assert closed.state is AlarmState.NORMAL
    assert closed.at_rest
    assert [type(effect) for effect in effects] == [Transition]


def test_acknowledging_names_the_person_and_the_reason() -> None:
    """The journal row of an acknowledgement carries who, when, why, and the values behind the alarm."""
    raised, _ = advance(NEW, seen(0.0, press_s=900.0), Timing())
    alarm, (effect,) = advance(raised, Acknowledged(5.0, "user:eva", "crane is booked"), Timing())
    assert (alarm.acknowledged_s, alarm.acknowledged_by) == (5.0, "user:eva")
    assert effect == Transition(
        AlarmKind.RETURN_BEFORE_PRESS,
        "C-1",
        AlarmState.UNACKNOWLEDGED,
        AlarmState.ACKNOWLEDGED,
        5.0,
        "user:eva",
        "crane is booked",
        {"press_s": 900.0, "reason": "risk 0.3"},
    )


def test_acknowledging_twice_changes_nothing() -> None:
    """A second acknowledgement keeps the first one's name and adds nothing to the journal."""
    alarm, _ = run(NEW, [seen(0.0), Acknowledged(5.0, "user:eva", "")], Timing())
    assert advance(alarm, Acknowledged(6.0, "user:jan", ""), Timing()) == (alarm, ())
    assert advance(NEW, Acknowledged(6.0, "user:jan", ""), Timing()) == (NEW, ())


def test_what_comes_again_has_to_be_acknowledged_again() -> None:
    """An acknowledgement does not outlive its alarm."""
    alarm, _ = run(NEW, [seen(0.0), Acknowledged(1.0, "user:eva", ""), seen(2.0, False), seen(3.0)], Timing())
    assert (alarm.state, alarm.acknowledged_by) == (AlarmState.UNACKNOWLEDGED, None)


def test_the_same_object_comes_back_when_nothing_changed() -> None:
    """A standing alarm whose values merely drift is not written again."""
    raised, _ = advance(NEW, seen(0.0), Timing())
    after, effects = advance(raised, seen(60.0, reason="risk 0.31"), Timing())
    assert after is raised
    assert effects == ()
    assert advance(NEW, seen(0.0, False), Timing())[0] is NEW


@pytest.mark.parametrize(
    ("look", "words"),
    [
        (seen(60.0, location="BAY-2"), "moved from BAY-1 to BAY-2"),
        (seen(60.0, priority=Priority.HIGH), "priority low became high"),
        (seen(60.0, press_s=5000.0), "planned pressing changed"),
    ],
)
def test_a_standing_alarm_tells_of_its_changes(look: Observed, words: str) -> None:
    """Place, priority and pressing of a standing alarm are journalled and told when they change, once."""
    raised, _ = advance(NEW, seen(0.0), Timing())
    after, effects = advance(raised, look, Timing())
    assert effects == (
        Transition(NEW.kind, "C-1", raised.state, raised.state, 60.0, "agewatch", words, look.detail),
        Changed(raised, after),
    )
    assert advance(after, replace(look, at_s=61.0), Timing()) == (after, ())


def test_an_alarm_clears_where_it_was_last_told() -> None:
    """A cleared alarm is where the receivers know it to be; its values are those that cleared it."""
    raised, _ = advance(NEW, seen(0.0), Timing())
    _, effects = advance(raised, seen(1.0, False, location="BAY-9", reason="cool there"), Timing())
    cleared = effects[-1]
    assert isinstance(cleared, Cleared)
    assert cleared.alarm.location == "BAY-1"
    assert cleared.alarm.detail["reason"] == "cool there"


@given(back_s=st.floats(1.0, 10 * 365 * DAY), wait_s=st.floats(0.0, 59.0))
def test_a_clock_set_back_never_raises_early_and_still_raises(back_s: float, wait_s: float) -> None:
    """After the clock is set back, a full on-delay passes by the new time, and then the alarm is raised."""
    start_s = 1.8e9
    alarm, _ = run(NEW, [seen(start_s), seen(start_s + wait_s)], SLOW)
    behind_s = start_s + wait_s - back_s
    alarm, effects = run(alarm, [seen(behind_s), seen(behind_s + 59.0 - wait_s)], SLOW)
    assert effects == []
    alarm, _ = run(alarm, [seen(behind_s + OVER_ON_S), seen(start_s + 60.0)], SLOW)
    assert alarm.state is AlarmState.UNACKNOWLEDGED


@given(back_s=st.floats(1.0, 10 * 365 * DAY))
def test_a_clock_set_back_never_makes_an_alarm_vanish(back_s: float) -> None:
    """A standing alarm stays through the step, and the off-delay runs by the clock as it now shows."""
    start_s = 1.8e9
    alarm, _ = run(NEW, [seen(start_s), seen(start_s + 60.0)], SLOW)
    behind_s = start_s + 60.0 - back_s
    for active in (True, False):
        kept, effects = advance(alarm, seen(behind_s, active), SLOW)
        assert (kept.state, effects) == (AlarmState.UNACKNOWLEDGED, ())
    alarm, _ = run(alarm, [seen(start_s + 70.0, False), seen(behind_s, False)], SLOW)
    assert alarm.state is AlarmState.UNACKNOWLEDGED
    alarm, _ = run(alarm, [seen(behind_s + OVER_OFF_S, False), seen(start_s + 70.0 + 1800.0, False)], SLOW)
    assert alarm.state is AlarmState.RETURNED_UNACKNOWLEDGED


HISTORY = st.lists(
    st.one_of(
        st.builds(seen, st.floats(0.0, 1e6), st.booleans(), priority=st.sampled_from(Priority)),
        st.builds(Acknowledged, st.floats(0.0, 1e6), st.just("user:eva"), st.just("")),
    ),
    max_size=12,
)


@given(history=HISTORY, steps=st.lists(st.floats(0.0, 40.0), max_size=6), start_s=st.floats(0.0, 2e6))
def test_what_holds_past_its_on_delay_is_raised_whatever_came_before(
    history: list[Event], steps: list[float], start_s: float
) -> None:
    """From any history, with any clock: a condition seen over the on-delay ends in a standing alarm."""
    alarm, _ = run(NEW, history, SLOW)
    times = [start_s, *(start_s + sum(steps[: count + 1]) for count in range(len(steps)))]
    alarm, _ = run(alarm, [seen(at_s) for at_s in (*times, max(times[-1], start_s + OVER_ON_S))], SLOW)
    assert alarm.standing


@given(history=HISTORY, start_s=st.floats(0.0, 2e6))
def test_what_is_gone_past_its_off_delay_is_cleared_whatever_came_before(
    history: list[Event], start_s: float
) -> None:
    """From any history, with any clock: a condition gone over the off-delay ends a standing alarm."""
    alarm, _ = run(NEW, history, SLOW)
    alarm, _ = run(alarm, [seen(start_s, False), seen(start_s + OVER_OFF_S, False)], SLOW)
    assert not alarm.standing
    assert not alarm.active


@given(history=HISTORY)
def test_the_journal_replays_to_the_state(history: list[Event]) -> None:
    """The transitions alone lead to the stored state, and each begins where the one before it ended."""
    alarm, effects = run(NEW, history, Timing(off_delay_s=5.0))
    journal = [effect for effect in effects if isinstance(effect, Transition)]
    assert replay(journal) == alarm.state
    assert all(first.after == second.before for first, second in pairwise(journal))


def test_a_journal_with_a_missing_row_is_refused() -> None:
    """Replaying a journal that lost a row says so instead of giving some state."""
    _, effects = run(
        NEW, [seen(0.0), Acknowledged(1.0, "user:eva", ""), seen(2.0, False), seen(3.0)], Timing()
    )
    journal = [effect for effect in effects if isinstance(effect, Transition)]
    assert len(journal) == 4
    for lost in range(3):
        with pytest.raises(StoreError, match=r"journal of return-before-press C-1: .*restore the store"):
            replay(journal[:lost] + journal[lost + 1 :])


def test_a_journal_with_an_unlawful_step_is_refused() -> None:
    """A step that no event can cause (normal to acknowledged) is refused."""
    step = Transition(NEW.kind, "C-1", AlarmState.NORMAL, AlarmState.ACKNOWLEDGED, 0.0, "agewatch", "", {})
    with pytest.raises(StoreError, match="from normal to acknowledged"):
        replay([step])
