"""From the columns of an assessment to the conditions of its coils."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from agewatch.alarms import (
    Alarm,
    AlarmKey,
    AlarmKind,
    Condition,
    Priority,
    Raised,
    Timing,
    advance_all,
)
from agewatch.alarms.rules import CoilColumns, Names, coil_conditions

NOW = 1.8e9
HOUR = 3600.0
DAY = 24 * HOUR
NAN = float("nan")
HORIZON = 14 * DAY
PULL, HOLD, BLIND = (
    AlarmKind.RETURN_BEFORE_PRESS,
    AlarmKind.RETURNED_IN_STORE,
    AlarmKind.UNASSESSABLE_COIL,
)


def names(values: Sequence[str | None]) -> Names:
    return np.array(list(values), dtype=object)


def coils(
    *,
    ids: Sequence[str] = ("C-1",),
    press_h: float = 100.0,
    p10_h: float = 90.0,
    risk: float = 0.0,
    held: bool = False,
    unassessed: bool = False,
    location: str | None = "BAY-1",
    pull_risk: float = 0.10,
) -> CoilColumns:
    """Coils that are all alike; hours count from now."""

    def every(value: float) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        return np.full(len(ids), value)

    return CoilColumns(
        coil_id=names(ids),
        grade=names(["DC04"] * len(ids)),
        part=names(["hood-outer"] * len(ids)),
        location=names([location] * len(ids)),
        press_s=every(NOW + press_h * HOUR),
        return_p10_s=every(NOW + p10_h * HOUR),
        return_p50_s=every(NOW + 2 * p10_h * HOUR),
        return_risk=every(risk),
        held=np.full(len(ids), held),
        unassessed=np.full(len(ids), unassessed),
        reason=names(["one sentence"] * len(ids)),
        starting_point=np.full(len(ids), True),
        pull_risk=every(pull_risk),
        lead_time_s=every(24 * HOUR),
    )


def look(columns: CoilColumns, alarms: dict[AlarmKey, Alarm], at_s: float = NOW) -> list[Condition]:
    return coil_conditions(columns, alarms, at_s, HORIZON)


def turn(columns: CoilColumns, alarms: dict[AlarmKey, Alarm], at_s: float = NOW) -> dict[AlarmKey, Alarm]:
    changed, _ = advance_all(alarms, look(columns, alarms, at_s), Timing())
    return {**alarms, **{alarm.key: alarm for alarm in changed}}


def standing(columns: CoilColumns) -> dict[AlarmKey, Alarm]:
    alarms = turn(columns, {})
    assert all(alarm.standing for alarm in alarms.values())
    return alarms


def test_a_sound_coil_never_becomes_an_object() -> None:
    """Coils that ask for nothing and have no alarm leave no condition."""
    assert look(coils(ids=["A", "B", "C"], risk=0.099), {}) == []


def test_a_risk_at_its_level_asks_for_a_pull() -> None:
    """The level itself counts, and the condition carries the values that caused it."""
    (condition,) = look(coils(risk=0.10), {})
    assert condition.key == (PULL, "C-1")
    assert condition.observed.active
    assert condition.observed.location == "BAY-1"
    assert condition.observed.detail == {
        "grade": "DC04",
        "part": "hood-outer",
        "press_s": NOW + 100 * HOUR,
        "return_p10_s": NOW + 90 * HOUR,
        "return_p50_s": NOW + 180 * HOUR,
        "return_risk": 0.10,
        "pull_risk": 0.10,
        "pull_by_s": NOW + 66 * HOUR,
        "starting_point": True,
        "reason": "one sentence",
    }


@pytest.mark.parametrize(("risk", "active"), [(0.10, True), (0.05, True), (0.0499, False)])
def test_a_standing_pull_ends_below_half_its_level(risk: float, active: bool) -> None:
    """Between half the level and the level a standing pull goes on, though it would not be raised there."""
    alarms = turn(coils(risk=risk), standing(coils(risk=0.2)))
    assert alarms[PULL, "C-1"].standing is active


@pytest.mark.parametrize(
    ("p10_days", "fresh", "kept"),
    [(13.9, True, True), (14.1, False, True), (27.9, False, True), (28.1, False, False), (NAN, False, False)],
)
def test_without_a_pressing_the_horizon_decides(p10_days: float, fresh: bool, kept: bool) -> None:
    """With no pressing planned a pull is asked for inside the horizon, and stands until twice as far off."""
    columns = coils(press_h=NAN, p10_h=24 * p10_days, risk=NAN)
    assert [condition.observed.active for condition in look(columns, {})] == [True] * fresh
    alarms = standing(coils(press_h=NAN, p10_h=24.0, risk=NAN))
    assert turn(columns, alarms)[PULL, "C-1"].standing is kept


def test_a_coil_that_has_returned_is_held_and_no_longer_pulled() -> None:
    """A return ends the pull (bringing the coil forward is no use any more) and raises the hold."""
    alarms = turn(coils(risk=1.0, held=True), standing(coils(risk=0.2)))
    assert not alarms[PULL, "C-1"].standing
    assert alarms[HOLD, "C-1"].standing


def test_losing_sight_of_a_coil_does_not_call_it_sound() -> None:
    """A pull or hold stands on, with its values, while the coil cannot be assessed; its new place is told."""
    before = {**standing(coils(risk=0.2)), **standing(coils(held=True))}
    blind = coils(press_h=50.0, p10_h=NAN, risk=NAN, unassessed=True, location="YARD")
    alarms = turn(blind, before)
    assert {alarm.key for alarm in alarms.values() if alarm.standing} == {
        (PULL, "C-1"),
        (HOLD, "C-1"),
        (BLIND, "C-1"),
    }
    assert alarms[PULL, "C-1"].location == "YARD"
    assert alarms[PULL, "C-1"].detail == before[PULL, "C-1"].detail


def test_a_coil_that_left_the_store_ends_its_alarms() -> None:
    """Pressed, shipped or scrapped: whatever stood about the coil clears, and says why."""
    before = standing(coils(ids=["C-1", "C-2"], risk=0.2))
    conditions = look(coils(ids=["C-2"], risk=0.2), before)
    gone = next(condition for condition in conditions if condition.subject == "C-1")
    assert not gone.observed.active
    assert gone.observed.detail["reason"] == "the coil is no longer in store"
    assert gone.observed.detail["grade"] == "DC04"


def test_a_coil_without_a_location_has_an_empty_one() -> None:
    """No location is "", as the store keeps it."""
    (condition,) = look(coils(unassessed=True, location=None), {})
    assert condition.key == (BLIND, "C-1")
    assert condition.observed.location == ""


@pytest.mark.parametrize(
    ("left_h", "priority"),
    [(-5.0, "high"), (23.9, "high"), (24.1, "medium"), (71.9, "medium"), (72.1, "low")],
)
def test_priority_comes_from_the_time_left_to_act(left_h: float, priority: str) -> None:
    """Less than one lead time (24 h) left is high, less than three medium, more is low."""
    (condition,) = look(coils(press_h=200.0, p10_h=left_h, risk=0.5), {})
    assert condition.observed.priority == priority
    (condition,) = look(coils(press_h=left_h, p10_h=200.0, risk=0.5), {})
    assert condition.observed.priority == priority


def test_a_hold_is_urgent_by_its_pressing_alone() -> None:
    """The return of a held coil lies behind: what counts is when it would be pressed; no pressing is low."""
    (soon,) = look(coils(press_h=10.0, p10_h=-50.0, held=True), {})
    (never,) = look(coils(press_h=NAN, p10_h=-50.0, held=True), {})
    assert (soon.observed.priority, never.observed.priority) == (Priority.HIGH, Priority.LOW)


def test_a_wavering_estimate_does_not_waver_the_priority() -> None:
    """A priority rises at its limit and falls only with a quarter more time left."""
    alarms = standing(coils(p10_h=24.1, risk=0.5))
    for left_h, priority in [
        (23.9, "high"),
        (24.1, "high"),
        (29.9, "high"),
        (30.1, "medium"),
        (89.9, "medium"),
    ]:
        alarms = turn(coils(press_h=500.0, p10_h=left_h, risk=0.5), alarms)
        assert alarms[PULL, "C-1"].priority == priority, left_h


def test_nothing_is_told_twice_while_nothing_changes() -> None:
    """The same assessment again leaves every alarm object as it is."""
    columns = coils(ids=["A", "B"], risk=0.3)
    alarms = standing(columns)
    assert advance_all(alarms, look(columns, alarms, NOW + 60.0), Timing()) == ([], [])


COIL = st.tuples(
    st.sampled_from([NAN, -10.0, 5.0, 60.0, 2000.0]),
    st.sampled_from([NAN, -10.0, 5.0, 60.0, 400.0, 2000.0]),
    st.sampled_from([NAN, 0.0, 0.04, 0.06, 0.3, 1.0]),
    st.sampled_from(["", "held", "unassessed"]),
)


def _mixed(rows: Sequence[tuple[float, float, float, str]], ids: Sequence[str]) -> CoilColumns:
    base = coils(ids=ids)
    return replace(
        base,
        press_s=NOW + HOUR * np.array([row[0] for row in rows], dtype=float),
        return_p10_s=NOW + HOUR * np.array([row[1] for row in rows], dtype=float),
        return_risk=np.array([row[2] for row in rows], dtype=float),
        held=np.array([row[3] == "held" for row in rows], dtype=bool),
        unassessed=np.array([row[3] == "unassessed" for row in rows], dtype=bool),
    )


@settings(max_examples=50)
@given(data=st.data(), first=st.lists(COIL, min_size=1, max_size=6))
def test_the_order_of_the_coils_is_irrelevant(
    data: st.DataObject, first: list[tuple[float, float, float, str]]
) -> None:
    """The alarms after two turns depend neither on the order of the rows nor on the other coils."""
    ids = [f"C-{number}" for number in range(len(first))]
    second = [data.draw(COIL) for _ in first]
    order = data.draw(st.permutations(range(len(first))))
    together = turn(_mixed(second, ids), turn(_mixed(first, ids), {}))
    shuffled = turn(_mixed([second[i] for i in order], [ids[i] for i in order]), turn(_mixed(first, ids), {}))
    assert shuffled == together
    for row, coil in enumerate(ids):
        alone = turn(_mixed([second[row]], [coil]), turn(_mixed([first[row]], [coil]), {}))
        assert alone == {key: alarm for key, alarm in together.items() if key[1] == coil}


@settings(max_examples=50)
@given(data=st.data(), first=st.lists(COIL, min_size=1, max_size=6))
def test_what_stands_has_told_how_things_are(
    data: st.DataObject, first: list[tuple[float, float, float, str]]
) -> None:
    """Skipping the coils whose alarm cannot change loses no change of place, pressing or priority."""
    ids = [f"C-{number}" for number in range(len(first))]
    after = _mixed([data.draw(COIL) for _ in first], ids)
    after.location[:] = [data.draw(st.sampled_from(["BAY-1", "BAY-2", None])) for _ in first]
    alarms = turn(after, turn(_mixed(first, ids), {}), NOW + 60.0)
    fresh = {condition.key: condition.observed for condition in look(after, {}, NOW + 60.0)}
    for key, seen in fresh.items():
        assert alarms[key].standing
        assert alarms[key].location == seen.location
        assert alarms[key].detail["press_s"] == seen.detail["press_s"]
        assert alarms[key].priority.rank <= seen.priority.rank


def test_many_coils_raise_in_one_turn() -> None:
    """Every coil at risk among many is raised exactly once, in the order of the rows."""
    ids = [f"C-{number:05d}" for number in range(5000)]
    columns = coils(ids=ids)
    columns.return_risk[::50] = 0.5
    _, effects = advance_all({}, look(columns, {}), Timing())
    assert [effect.alarm.subject for effect in effects if isinstance(effect, Raised)] == ids[::50]
