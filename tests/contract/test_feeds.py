"""Moves, presses, temperatures, outlook and lab tests; the files they came from; rows that failed."""

from __future__ import annotations

import numpy as np
import pytest

from agewatch.plant.records import Put, SourceRecord
from agewatch.plant.tables import Reject, Row
from agewatch.store import Store
from agewatch.store.queries import (
    open_reject_counts,
    open_rejects,
    outlook,
    readings,
    source_records,
    sources,
)
from agewatch.store.writes import mark_resubmitted, put_rejects, put_rows, put_source
from tests.contract.rows import DAY, NOW, ROLLED, coil, lab, put, read, stays

HOUR = 3600.0


@pytest.mark.parametrize(
    ("table", "first", "corrected"),
    [
        ("moves", ("C1", NOW, "BAY-1"), ("C1", NOW, "BAY-2")),
        ("presses", ("C1", NOW), ("C1", NOW + DAY)),
        ("temperatures", (NOW, "T1", 20.5), (NOW, "T1", 21.0)),
        ("outlook", (NOW, "BAY-1", 20.5), (NOW, "BAY-1", 21.0)),
        ("lab", lab("C1", NOW, 0.1), lab("C1", NOW, 0.3)),
    ],
)
def test_rows_are_counted_as_new_same_or_changed(
    store: Store, table: str, first: Row, corrected: Row
) -> None:
    """The same row twice changes nothing; another value under the same key replaces the first."""
    other: Row = ("C9", *first[1:]) if first[0] == "C1" else (NOW + HOUR, *first[1:])
    assert put(store, table, first) == Put(1, 0, 0)
    assert put(store, table, first, now_s=NOW + DAY) == Put(0, 0, 1)
    assert put(store, table, corrected, other) == Put(1, 1, 0)
    assert put(store, table, corrected, other) == Put(0, 0, 2)


def test_of_several_rows_with_one_key_the_last_counts(store: Store) -> None:
    """A value that is told twice in one go counts once, as told last."""
    assert put(store, "temperatures", (NOW, "T1", 20.0), (NOW, "T1", 21.0)) == Put(1, 0, 0)
    with store.read() as view:
        assert readings(view).celsius.tolist() == [21.0]


def test_no_rows_are_no_error(store: Store) -> None:
    """An empty table changes nothing."""
    for table in ("coils", "moves", "presses", "temperatures", "outlook", "lab"):
        assert put(store, table) == Put(0, 0, 0)


def test_a_table_that_does_not_exist_is_refused(store: Store) -> None:
    """A name that is no canonical table is an error of the caller."""
    with pytest.raises(ValueError, match="bays is no canonical table"), store.write() as tx:
        put_rows(tx, "bays", [], feed="f", now_s=NOW)


def test_readings_come_ordered_by_sensor_and_time(store: Store) -> None:
    """However they arrived, a sensor's readings stand together and in order."""
    put(store, "temperatures", (NOW + HOUR, "T2", 3.0), (NOW, "T1", 1.0), (NOW + HOUR, "T1", 2.0))
    put(store, "temperatures", (NOW, "T2", 4.0))
    with store.read() as view:
        found = readings(view)
    rows = list(zip(found.sensor.names(), found.at_s.tolist(), found.celsius.tolist(), strict=True))
    assert rows == sorted(rows, key=lambda row: (found.sensor.labels.index(row[0]), row[1]))
    assert sorted(rows) == [
        ("T1", NOW, 1.0),
        ("T1", NOW + HOUR, 2.0),
        ("T2", NOW, 4.0),
        ("T2", NOW + HOUR, 3.0),
    ]


def test_readings_can_be_had_from_a_time_on_and_of_some_sensors(store: Store) -> None:
    """Earlier readings and other sensors are left out, the first one at that very time is not."""
    put(
        store,
        "temperatures",
        *[(NOW + hour * HOUR, name, 20.0) for hour in range(3) for name in ("T1", "T2")],
    )
    with store.read() as view:
        late = readings(view, since_s=NOW + HOUR)
        one = readings(view, sensors=["T2", "T9"])
    assert (len(late.at_s), late.at_s.min()) == (4, NOW + HOUR)
    assert set(one.sensor.names()) == {"T2"}
    assert one.at_s.tolist() == [NOW, NOW + HOUR, NOW + 2 * HOUR]


def test_outlook_rows_come_ordered_by_location_and_time(store: Store) -> None:
    """However they arrived, a location's temperatures stand together and in order."""
    put(store, "outlook", (NOW + HOUR, "B", 3.0), (NOW, "B", 2.0), (NOW, "A", 1.0))
    with store.read() as view:
        found = outlook(view)
    assert found.location.names().tolist() == ["A", "B", "B"]
    assert (found.at_s.tolist(), found.celsius.tolist()) == ([NOW, NOW, NOW + HOUR], [1.0, 2.0, 3.0])


def test_times_keep_their_milliseconds(store: Store) -> None:
    """A time comes back as it was told, to the millisecond."""
    put(store, "temperatures", (1_752_000_000.123, "T1", 20.0))
    with store.read() as view:
        assert readings(view).at_s.tolist() == [1_752_000_000.123]


def test_the_feed_of_presses_rules_where_it_names_a_coil(store: Store) -> None:
    """A coil's own pressing counts only for coils that no press plan names; the plan received last counts."""
    put(store, "coils", coil("C1", press_at=NOW + DAY), coil("C2", press_at=NOW + DAY), coil("C3"))
    put(store, "presses", ("C1", NOW + 5 * DAY), ("C9", NOW))
    put(store, "presses", ("C1", NOW + 3 * DAY))
    put(store, "coils", coil("C1", press_at=NOW + 2 * DAY), now_s=NOW + DAY)
    press_s = read(store).press_s
    assert press_s[:2].tolist() == [NOW + 3 * DAY, NOW + DAY]
    assert np.isnan(press_s[2])


def test_a_told_move_replaces_one_that_was_seen_at_the_same_time(store: Store) -> None:
    """A snapshot's guess gives way to what the feed of moves tells, whichever came first."""
    put(store, "coils", coil(location="BAY-1"))
    put(store, "coils", coil(location="BAY-2", located_since=NOW))
    put(store, "moves", ("C1", NOW, "YARD"))
    assert stays(read(store))[-1] == (NOW, "YARD")
    put(store, "coils", coil(location="BAY-3", located_since=ROLLED + DAY))
    put(store, "moves", ("C1", ROLLED + DAY, "BAY-4"))
    put(store, "coils", coil(location="BAY-5", located_since=NOW))
    assert stays(read(store))[-1] == (NOW, "YARD")


def test_moves_of_coils_that_no_feed_has_shown_wait_for_them(store: Store) -> None:
    """A move that is told before its coil counts once the coil is there."""
    put(store, "moves", ("C1", ROLLED, "BAY-2"), ("C1", NOW, "BAY-1"))
    assert len(read(store).move_s) == 0
    put(store, "coils", coil())
    assert stays(read(store)) == [(ROLLED, "BAY-2"), (NOW, "BAY-1")]


def test_the_latest_test_of_a_coil_as_stored_stands_in_the_inventory(store: Store) -> None:
    """Accelerated tests, earlier tests and tests before temper rolling do not count; the worst direction does."""
    put(store, "coils", coil("C1"), coil("C2"))
    put(
        store,
        "lab",
        lab("C1", ROLLED - DAY, 3.0),
        lab("C1", ROLLED + DAY, 0.9),
        lab("C1", ROLLED + 2 * DAY, 0.1),
        lab("C1", ROLLED + 2 * DAY, 0.2, direction="T", aged_h=0.0),
        lab("C1", ROLLED + 3 * DAY, 2.0, aged_h=8.0),
        lab("C2", NOW + 5 * DAY, 2.0),
        lab("C9", ROLLED + DAY, 2.0),
    )
    coils = read(store, at_s=NOW)
    assert (coils.lab_ype_pct[0], coils.lab_tested_s[0]) == (0.2, ROLLED + 2 * DAY)
    assert np.isnan([coils.lab_ype_pct[1], coils.lab_tested_s[1]]).all()


def test_lab_tests_are_told_apart_by_how_the_specimen_was_aged_and_cut(store: Store) -> None:
    """One coil and time can have several tests; what was not given is a value of its own."""
    tests = [lab("C1", NOW, 0.1, aged_h, direction) for aged_h in (None, 0.0, 2.0) for direction in "LT"]
    assert put(store, "lab", *tests) == Put(6, 0, 0)
    assert put(store, "lab", *tests) == Put(0, 0, 6)


def test_a_source_is_known_by_the_content_last_read(store: Store) -> None:
    """Reading a file again replaces what was noted of it."""
    first = SourceRecord("coils:c*.csv", "c1.csv", "aa", NOW, 10, 1)
    again = SourceRecord("coils:c*.csv", "c1.csv", "bb", NOW + HOUR, 12, 0)
    other = SourceRecord("coils:c*.csv", "c2.csv", "cc", NOW, 3, 0)
    with store.write() as tx:
        for record in (first, other, again):
            put_source(tx, record)
    with store.read() as view:
        assert source_records(view) == [again, other]
        assert sources(view) == {("coils:c*.csv", "c1.csv"): "bb", ("coils:c*.csv", "c2.csv"): "cc"}


def reject(line: int, raw: str = "C1;-5") -> Reject:
    return Reject("coils", "coils.csv", line, "MASS", "mass_kg must be above 0", raw, "COIL;MASS")


def test_rejects_are_kept_as_they_came_and_told_once(store: Store) -> None:
    """A row that fails again in the same file is not kept twice; its text is kept to the letter."""
    hostile = reject(3, raw='C"2\x1b[31m;\u202e-5\x00\n')
    with store.write() as tx:
        assert put_rejects(tx, "coils:c.csv", [reject(2), hostile], NOW) == 2
        assert put_rejects(tx, "coils:c.csv", [reject(2), hostile], NOW + DAY) == 0
    with store.read() as view:
        kept = open_rejects(view)
        assert open_reject_counts(view) == {"coils:c.csv": 2}
    assert [each.reject for each in kept] == [reject(2), hostile]
    assert {(each.feed, each.received_s, each.resubmitted_s) for each in kept} == {("coils:c.csv", NOW, None)}


def test_a_resubmitted_reject_is_no_longer_open(store: Store) -> None:
    """Once mended and taken in, a row is neither listed nor counted, and marking it again does nothing."""
    with store.write() as tx:
        put_rejects(tx, "coils:c.csv", [reject(2, "a"), reject(3, "b")], NOW)
        put_rejects(tx, "moves:m.csv", [reject(2, "c")], NOW)
    with store.read() as view:
        first = open_rejects(view, limit=1)[0].reject_id
    with store.write() as tx:
        assert mark_resubmitted(tx, [first], NOW + DAY) == 1
        assert mark_resubmitted(tx, [first], NOW + DAY) == 0
    with store.read() as view:
        assert open_reject_counts(view) == {"coils:c.csv": 1, "moves:m.csv": 1}
        assert [each.reject.raw for each in open_rejects(view, feed="coils:c.csv")] == ["b"]
