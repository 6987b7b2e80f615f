"""The life cycle beside an independent model: a table in words, and the looks since the last change."""

from __future__ import annotations

from random import Random
from typing import ClassVar

from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, initialize, invariant, rule, run_state_machine_as_test

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

WORDS = {
    ("normal", "raise"): "unacknowledged",
    ("unacknowledged", "acknowledge"): "acknowledged",
    ("unacknowledged", "clear"): "returned-to-normal-unacknowledged",
    ("acknowledged", "clear"): "normal",
    ("returned-to-normal-unacknowledged", "acknowledge"): "normal",
    ("returned-to-normal-unacknowledged", "raise"): "unacknowledged",
}
"""The four states of ISA-18.2 that are needed (state names from memory: its state diagram)."""
STANDS = ("unacknowledged", "acknowledged")
PAIRS = {(before, after) for (before, _), after in WORDS.items()} | {(state, state) for state in STANDS}
PLACES = st.sampled_from(["BAY-1", "BAY-2"])


class Beside(RuleBasedStateMachine):
    """Shows alarm and model the same looks and acknowledgements, on a clock that is sometimes set back."""

    reached_states: ClassVar[set[str]] = set()
    reached_pairs: ClassVar[set[tuple[str, str]]] = set()

    @initialize(on_s=st.sampled_from([0.0, 60.0]), off_s=st.sampled_from([0.0, 300.0]))
    def begin(self, on_s: float, off_s: float) -> None:
        self.timing = Timing(on_s, off_s)
        self.alarm = Alarm.at_rest_for(AlarmKind.SENSOR_SILENT, "T101")
        self.journal: list[Transition] = []
        self.shown_s = 1.8e9
        self.true_s = 0.0
        self.changed_true_s = 0.0
        self.state = "normal"
        self.looks: list[tuple[bool, float]] = []
        self.told = ("", "")

    @rule(step_s=st.sampled_from([0.0, 1.0, 59.0, 60.0, 299.0, 300.0, 86_400.0]))
    def time_passes(self, step_s: float) -> None:
        self.shown_s += step_s
        self.true_s += step_s

    @rule(back_s=st.sampled_from([0.5, 60.0, 3600.0, 3e7]))
    def clock_is_set_back(self, back_s: float) -> None:
        self.shown_s -= back_s

    @rule(active=st.booleans(), place=PLACES, priority=st.sampled_from(Priority))
    def look(self, active: bool, place: str, priority: Priority) -> None:
        if self.looks and self.looks[-1][0] != active:
            self.looks.clear()
        if not self.looks:
            self.changed_true_s = self.true_s
        self.looks.append((active, self.shown_s))
        held_s = self.shown_s - min(at_s for _, at_s in self.looks)
        stands = self.state in STANDS
        expected: list[type[Effect]] = []
        if active and not stands and held_s >= self.timing.on_delay_s:
            assert self.true_s - self.changed_true_s >= self.timing.on_delay_s
            self._model_moves("raise")
            self.told = (place, priority)
            expected = [Transition, Raised]
        elif not active and stands and held_s >= self.timing.off_delay_s:
            assert self.true_s - self.changed_true_s >= self.timing.off_delay_s
            self._model_moves("clear")
            expected = [Transition, Cleared]
        elif active and stands and self.told != (place, priority):
            self.reached_pairs.add((self.state, self.state))
            self.told = (place, priority)
            expected = [Transition, Changed]
        self._advance(Observed(self.shown_s, active, priority, place, {}), expected)

    @rule()
    def acknowledge(self) -> None:
        possible = (self.state, "acknowledge") in WORDS
        if possible:
            self._model_moves("acknowledge")
        self._advance(Acknowledged(self.shown_s, "user:eva", "seen"), [Transition] if possible else [])

    @invariant()
    def states_agree(self) -> None:
        if hasattr(self, "alarm"):
            assert self.alarm.state == self.state
            assert replay(self.journal) == self.alarm.state
            self.reached_states.add(self.state)

    def _model_moves(self, signal: str) -> None:
        after = WORDS[self.state, signal]
        self.reached_pairs.add((self.state, after))
        self.state = after

    def _advance(self, event: Event, expected: list[type[Effect]]) -> None:
        self.alarm, effects = advance(self.alarm, event, self.timing)
        assert [type(effect) for effect in effects] == expected
        self.journal.extend(effect for effect in effects if isinstance(effect, Transition))


def test_the_life_cycle_agrees_with_the_model() -> None:
    """Whatever order looks, acknowledgements and clock changes come in, alarm and model agree."""
    size = settings(max_examples=60, stateful_step_count=40, deadline=None)
    run_state_machine_as_test(Beside, settings=size)


def test_long_walks_reach_every_state_and_every_lawful_pair() -> None:
    """Seeded walks that agree with the model at each step meet all states, all pairs, and no other pair."""
    chance = Random(18)
    walk = Beside()
    walk.reached_states.clear()
    walk.reached_pairs.clear()
    for delays in ((0.0, 0.0), (60.0, 300.0)):
        walk.begin(*delays)
        for _ in range(2500):
            _one_step(walk, chance)
            assert walk.alarm.state == walk.state
            walk.reached_states.add(walk.state)
        assert replay(walk.journal) == walk.alarm.state
    assert walk.reached_states == {str(state) for state in AlarmState}
    assert walk.reached_pairs == PAIRS


def _one_step(walk: Beside, chance: Random) -> None:
    step = chance.random()
    if step < 0.45:
        walk.time_passes(chance.choice([0.0, 1.0, 60.0, 300.0]))
    elif step < 0.5:
        walk.clock_is_set_back(chance.choice([0.5, 3600.0]))
    elif step < 0.9:
        walk.look(chance.random() < 0.5, chance.choice(["BAY-1", "BAY-2"]), chance.choice(list(Priority)))
    else:
        walk.acknowledge()
