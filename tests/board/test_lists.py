"""Order and filter of the coil list and the alarm list."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.alarms import AlarmKind, AlarmState, Priority
from agewatch.board.alarm_list import SORTABLE as ALARMS_SORTABLE
from agewatch.board.alarm_list import arranged, of_coil
from agewatch.board.coil_list import MOST_FIRST, SORTABLE, CoilList
from agewatch.board.order import URGENCY, Order
from agewatch.plant.assessment import Verdict
from tests.board.plant import ALARMS, COILS, NAN, alarm, assessment_of, coil

verdicts = st.sampled_from(list(Verdict))
days = st.floats(-30, 60) | st.just(NAN)
coil_lists = st.lists(
    st.builds(lambda v, r, p: coil("", v, returns_d=r, press_d=p), verdicts, days, days)
).map(
    lambda coils: CoilList(assessment_of([replace(each, coil_id=f"C{n:03}") for n, each in enumerate(coils)]))
)
orders = st.builds(Order, st.sampled_from(list(SORTABLE)), st.booleans())


@given(coil_lists, orders)
def test_ordering_loses_and_doubles_no_coil(coils: CoilList, order: Order) -> None:
    """Whatever the order, every coil stands in the list once."""
    assert sorted(coils.arranged(order, "")) == list(range(len(coils.assessment)))


@given(coil_lists)
def test_hold_and_pull_come_first_by_slack_then_by_p10(coils: CoilList) -> None:
    """The order of urgency, checked against a plain sort of each coil's own values."""
    columns = coils.assessment
    group = {Verdict.HOLD: 0, Verdict.PULL: 0, Verdict.WATCH: 1, Verdict.UNASSESSED: 2, Verdict.CLEAR: 3}

    def rank(row: int) -> tuple[float, ...]:
        slack_h, p10_s = columns.slack_h[row], columns.return_p10_s[row]
        return (
            group[Verdict(columns.verdict[row])],
            np.isnan(slack_h), np.nan_to_num(slack_h),
            np.isnan(p10_s), np.nan_to_num(p10_s), row,
        )  # fmt: skip

    assert coils.arranged(Order(), "").tolist() == sorted(range(len(columns)), key=rank)


@given(coil_lists, st.sampled_from(["return", "press", "slack", "risk", "equivalent_age"]), st.booleans())
def test_values_that_are_missing_stand_last_either_way(coils: CoilList, by: str, descending: bool) -> None:
    """A coil without a date is never the first by date."""
    values = coils._values(by)[coils.arranged(Order(by, descending), "")]
    missing = np.isnan(values)
    assert np.all(missing[int(np.sum(~missing)) :])
    steps = np.diff(values[~missing])
    assert np.all(steps <= 0 if descending else steps >= 0)


def test_asking_for_a_column_again_turns_it_round_and_urgency_never() -> None:
    """The urgent end of a column comes first: most risk, least slack."""
    assert Order().chosen("risk", MOST_FIRST) == Order("risk", True)
    assert Order("risk", True).chosen("risk", MOST_FIRST) == Order("risk", False)
    assert Order().chosen("slack", MOST_FIRST) == Order("slack", False)
    assert Order().chosen(URGENCY, MOST_FIRST) == Order()


@pytest.mark.parametrize(
    ("words", "found"),
    [
        ("hood-outer", ["C1001", "C1002"]),
        ("HOOD yard", ["C1002"]),
        ("bay-2 pull", ["C1003"]),
        ("x9", ["C1005"]),
        ("unassessed", ["C1005"]),
        ("1003", ["C1003"]),
        ("hood fender", []),
        ("[red]", []),
    ],
)
def test_all_words_must_match_somewhere_in_the_coil(words: str, found: list[str]) -> None:
    """Grade, part, location, verdict or number, in any case and any order."""
    coils = CoilList(assessment_of())
    assert [coils.assessment.coil_id[row] for row in coils.arranged(Order(), words)] == found


def test_more_words_never_find_more() -> None:
    """Typing on narrows down, also when words are taken away and typed again."""
    coils = CoilList(assessment_of())
    one, two = coils.matching("bay"), coils.matching("bay pull")
    assert one is not None
    assert two is not None
    assert np.all(two <= one)
    assert np.array_equal(coils.matching("bay"), one)
    assert coils.matching("  ") is None


def test_a_number_is_found_whole_before_by_its_beginning_before_by_its_inside() -> None:
    """Of several coils the best likeness is meant."""
    coils = CoilList(assessment_of([coil(name) for name in ("A12", "12", "123", "B2")]))
    rows = coils.arranged(Order("coil"), "")
    assert [coils.first_like(text, rows) for text in ("12", "1", "2", "a1", " ", "9")] == [
        0,
        0,
        0,
        2,
        None,
        None,
    ]


def test_counts_are_of_every_verdict() -> None:
    """Also of those that no coil has."""
    assert CoilList(assessment_of()).counts() == {
        Verdict.HOLD: 1, Verdict.PULL: 2, Verdict.WATCH: 1, Verdict.UNASSESSED: 1, Verdict.CLEAR: len(COILS) - 5,
    }  # fmt: skip


def test_alarms_that_wait_come_first_by_priority_then_the_newest() -> None:
    """What somebody has to look at now stands above what has been seen."""
    assert [(each.subject, each.state) for each in arranged(ALARMS, Order(), "")] == [
        ("C1002", AlarmState.UNACKNOWLEDGED),
        ("C1001", AlarmState.UNACKNOWLEDGED),
        ("T104", AlarmState.UNACKNOWLEDGED),
        ("C1005", AlarmState.RETURNED_UNACKNOWLEDGED),
        ("C1003", AlarmState.ACKNOWLEDGED),
    ]


@pytest.mark.parametrize("by", list(ALARMS_SORTABLE))
def test_alarms_can_be_ordered_by_every_column_both_ways(by: str) -> None:
    """Turned round, the first is the last (of what differs)."""
    there, back = (arranged(ALARMS, Order(by, turned), "") for turned in (False, True))
    assert sorted(map(id, there)) == sorted(map(id, back)) == sorted(map(id, ALARMS))
    assert by == URGENCY or [each.key for each in there] != [each.key for each in back]


def test_alarms_are_found_by_words_and_by_coil() -> None:
    """A sensor with the name of a coil is not the coil."""
    sensor = alarm(AlarmKind.SENSOR_SILENT, "C1001", Priority.LOW)
    assert [each.subject for each in arranged(ALARMS, Order(), "silent bay-2")] == ["T104"]
    assert of_coil([*ALARMS, sensor], "C1001") == [ALARMS[0]]
