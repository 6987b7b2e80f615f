"""Coils: what snapshots change, what they tell of the past, and what they leave alone."""

from __future__ import annotations

from itertools import count, groupby

import numpy as np
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import select

from agewatch.clock import rfc3339
from agewatch.plant.records import Put
from agewatch.store import Store, schema
from tests.contract.rows import DAY, NOW, ROLLED, coil, journal_of, put, read, stays

_unused = count()


def test_the_same_snapshot_twice_changes_nothing(store: Store) -> None:
    """Rows that stand there already count as the same, and leave no journal row."""
    rows = [
        coil("C1", wrapped=True, mass_kg=20_000.0, press_at=NOW),
        coil("C2", part="hood", status="shipped"),
    ]
    assert put(store, "coils", *rows) == Put(2, 0, 0)
    assert put(store, "coils", *rows, now_s=NOW + 2 * DAY) == Put(0, 0, 2)
    assert journal_of(store, "C1") == journal_of(store, "C2") == []


def test_every_column_comes_back_as_it_was_told(store: Store) -> None:
    """Numbers, names, flags and times of the feed stand in the inventory; what was not given is NaN or no name."""
    full = coil(
        part="hood",
        press_at=NOW + 5.25,
        temper_elongation_pct=1.1,
        width_mm=1500.5,
        mass_kg=20_000.0,
        bore_mm=508.0,
        coil_temp_c=61.5,
        wrapped=True,
        rp02_mpa=175.0,
        rm_mpa=300.0,
        n_value=0.21,
        c_pct=0.03,
        n_pct=0.004,
        s_pct=0.01,
        ti_pct=0.0,
        nb_pct=0.002,
        al_pct=0.04,
    )
    put(store, "coils", full, coil("C2"))
    coils = read(store)
    assert [coils.grade.name(0), coils.location.name(0), coils.part.name(0)] == ["DC04", "BAY-1", "hood"]
    assert (coils.temper_rolled_s[0], coils.press_s[0]) == (ROLLED, NOW + 5.25)
    assert (coils.width_mm[0], coils.mass_kg[0], coils.bore_mm[0]) == (1500.5, 20_000.0, 508.0)
    assert (coils.temper_elongation_pct[0], coils.coil_temp_c[0]) == (1.1, 61.5)
    assert (coils.rp02_mpa[0], coils.rm_mpa[0], coils.n_value[0]) == (175.0, 300.0, 0.21)
    assert (coils.c_pct[0], coils.n_pct[0], coils.s_pct[0]) == (0.03, 0.004, 0.01)
    assert (coils.ti_pct[0], coils.nb_pct[0], coils.al_pct[0]) == (0.0, 0.002, 0.04)
    assert coils.wrapped.tolist() == [True, False]
    assert coils.part.name(1) is None
    absent = (coils.press_s, coils.width_mm, coils.coil_temp_c, coils.al_pct, coils.lab_ype_pct)
    assert np.isnan([column[1] for column in absent]).all()


def test_only_stored_coils_stand_in_the_inventory_in_order(store: Store) -> None:
    """Pressed, shipped and scrapped coils are left out; the rest come ordered by their id."""
    gone = [coil(f"G-{status}", status=status) for status in ("pressed", "shipped", "scrapped")]
    put(store, "coils", coil("C10"), *gone, coil("C2"), coil("C1", status="stored"))
    assert read(store).coil_id.tolist() == ["C1", "C10", "C2"]


def test_an_empty_store_has_an_empty_inventory(store: Store) -> None:
    """No coils are no error."""
    coils = read(store)
    assert (len(coils), len(coils.move_s), coils.location.labels) == (0, 0, ())


def test_a_row_told_in_other_words_changes_nothing(store: Store) -> None:
    """A status that is told where it was taken for granted, or the other way round, is the same."""
    put(store, "coils", coil())
    assert put(store, "coils", coil(status="stored")) == Put(0, 0, 1)
    assert put(store, "coils", coil()) == Put(0, 0, 1)
    assert journal_of(store, "C1") == []


def test_a_value_that_changes_there_and_back_is_taken_in_each_time(store: Store) -> None:
    """What was told before last is news again."""
    for mass_kg, expected in ((1.0, Put(1, 0, 0)), (2.0, Put(0, 1, 0)), (1.0, Put(0, 1, 0))):
        assert put(store, "coils", coil(mass_kg=mass_kg)) == expected
        assert read(store).mass_kg.tolist() == [mass_kg]


def test_a_coil_that_leaves_its_feed_stays(store: Store) -> None:
    """A snapshot without a coil does not delete it."""
    put(store, "coils", coil("C1"), coil("C2"))
    put(store, "coils", coil("C2"), now_s=NOW + DAY)
    assert read(store).coil_id.tolist() == ["C1", "C2"]


def test_a_coil_keeps_when_it_was_seen_first_and_last(store: Store) -> None:
    """The last sight is noted to the hour, so that a snapshot in which nothing changed need not be written."""
    hour = 3600.0
    for at_s in (NOW, NOW + 0.9 * hour, NOW + 1.5 * hour, NOW + 2.4 * hour):
        put(store, "coils", coil(), now_s=at_s)
    with store.read() as view:
        (seen,) = view.connection.execute(select(schema.coil.c.first_seen_ms, schema.coil.c.last_seen_ms))
    assert (seen.first_seen_ms / 1000.0, seen.last_seen_ms / 1000.0) == (NOW, NOW + 1.5 * hour)


def test_of_two_rows_of_one_coil_the_later_counts(store: Store) -> None:
    """A coil that is told twice in one go counts once, as told last."""
    assert put(store, "coils", coil(part="door"), coil(part="hood")) == Put(1, 0, 0)
    assert read(store).part.name(0) == "hood"


def test_a_status_that_is_not_told_stays(store: Store) -> None:
    """A snapshot without a status leaves a coil pressed that was told to be."""
    put(store, "coils", coil(status="pressed"))
    assert put(store, "coils", coil()) == Put(0, 0, 1)
    assert len(read(store)) == 0


def test_a_change_of_status_is_journalled(store: Store) -> None:
    """The journal says from what to what, when, and which feed told it."""
    put(store, "coils", coil())
    put(store, "coils", coil(status="pressed"), now_s=NOW + DAY)
    (row,) = journal_of(store, "C1")
    assert (row.topic, row.kind, row.before, row.after) == ("coil", "status", "stored", "pressed")
    assert (row.at_s, row.actor, row.reason) == (NOW + DAY, "agewatch", "told by feed coils:coils.csv")


def test_temper_rolling_a_coil_again_restarts_its_clock_and_is_journalled(store: Store) -> None:
    """A later temper rolling is taken over; the journal keeps both times."""
    put(store, "coils", coil())
    assert put(store, "coils", coil(temper_rolled_at=ROLLED + DAY)) == Put(0, 1, 0)
    assert read(store).temper_rolled_s.tolist() == [ROLLED + DAY]
    (row,) = journal_of(store, "C1")
    assert (row.kind, row.before, row.after) == ("re-tempered", rfc3339(ROLLED), rfc3339(ROLLED + DAY))


def test_an_earlier_temper_rolling_is_journalled_as_a_correction(store: Store) -> None:
    """Nobody can make a coil older without a trace."""
    put(store, "coils", coil())
    put(store, "coils", coil(temper_rolled_at=ROLLED - DAY))
    assert [row.kind for row in journal_of(store, "C1")] == ["temper-rolling-corrected"]


def test_a_snapshot_that_shows_a_coil_elsewhere_is_a_move_at_its_own_time(store: Store) -> None:
    """Without `located_since` the coil came when the snapshot was read, and stood at its old place before."""
    put(store, "coils", coil(location="BAY-1"))
    put(store, "coils", coil(location="YARD"), now_s=NOW)
    assert stays(read(store)) == [(ROLLED, "BAY-1"), (NOW, "YARD")]
    (row,) = journal_of(store, "C1")
    assert (row.kind, row.before, row.after) == ("moved", "BAY-1", "YARD")


def test_a_snapshot_that_says_since_when_is_a_move_at_that_time(store: Store) -> None:
    """A new `located_since` tells when the coil came; the earlier stay keeps its own beginning."""
    put(store, "coils", coil(location="BAY-1", located_since=ROLLED + DAY))
    put(store, "coils", coil(location="YARD", located_since=ROLLED + 3 * DAY))
    assert stays(read(store)) == [(ROLLED, "BAY-1"), (ROLLED + DAY, "BAY-1"), (ROLLED + 3 * DAY, "YARD")]


def test_a_located_since_left_as_it_was_tells_nothing_of_a_move(store: Store) -> None:
    """A feed that changes the place but not its time moves the coil when the snapshot was read."""
    put(store, "coils", coil(location="BAY-1", located_since=ROLLED))
    put(store, "coils", coil(location="YARD", located_since=ROLLED), now_s=NOW)
    assert stays(read(store)) == [(ROLLED, "BAY-1"), (NOW, "YARD")]


def test_first_sight_tells_no_move(store: Store) -> None:
    """A coil first seen where it arrived after temper rolling was there before too, unless moves say otherwise."""
    put(store, "coils", coil(location="YARD", located_since=ROLLED + DAY))
    assert {place for _, place in stays(read(store))} == {"YARD"}


def test_told_moves_before_located_since_are_kept(store: Store) -> None:
    """The arrival that the coil's own row tells closes the stay that a move had begun."""
    put(store, "coils", coil(location="YARD", located_since=ROLLED + 5 * DAY))
    put(store, "moves", ("C1", ROLLED + DAY, "BAY-2"))
    assert stays(read(store)) == [(ROLLED, "YARD"), (ROLLED + DAY, "BAY-2"), (ROLLED + 5 * DAY, "YARD")]


def test_a_told_move_rules_over_located_since_of_the_same_time(store: Store) -> None:
    """Where a move and the coil's own row disagree about one time, the move counts."""
    put(store, "coils", coil(location="YARD", located_since=ROLLED + DAY))
    put(store, "moves", ("C1", ROLLED + DAY, "BAY-2"))
    coils = read(store)
    assert stays(coils) == [(ROLLED, "YARD"), (ROLLED + DAY, "BAY-2")]
    assert (coils.location.name(0), coils.located_since_s[0]) == ("BAY-2", ROLLED + DAY)


def test_a_snapshot_refutes_what_was_seen_later_than_its_arrival(store: Store) -> None:
    """A coil that is told to have come before it was seen elsewhere was seen elsewhere wrongly."""
    put(store, "coils", coil(location="BAY-1"))
    put(store, "coils", coil(location="BAY-2"), now_s=ROLLED + 6 * DAY)
    put(store, "coils", coil(location="YARD", located_since=ROLLED + 5 * DAY), now_s=ROLLED + 7 * DAY)
    assert stays(read(store)) == [(ROLLED, "BAY-1"), (ROLLED + 5 * DAY, "YARD")]


def test_the_past_of_a_coil_does_not_move_along_with_it(store: Store) -> None:
    """After two snapshots without times every stay is where and when it was seen."""
    put(store, "coils", coil(location="A"))
    put(store, "coils", coil(location="B"), now_s=ROLLED + DAY)
    put(store, "coils", coil(location="C"), now_s=ROLLED + 2 * DAY)
    coils = read(store)
    assert stays(coils) == [(ROLLED, "A"), (ROLLED + DAY, "B"), (ROLLED + 2 * DAY, "C")]
    assert (coils.location.name(0), coils.located_since_s[0]) == ("C", ROLLED + 2 * DAY)


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(seen=st.lists(st.tuples(st.sampled_from("ABC"), st.booleans()), min_size=1, max_size=6))
def test_a_coil_stands_where_its_last_snapshot_saw_it(store: Store, seen: list[tuple[str, bool]]) -> None:
    """Whatever snapshots came, with a new time or without: its history passes the places that they showed."""
    name = f"C{next(_unused)}"
    for day, (place, timed) in enumerate(seen, start=1):
        since = ROLLED + day * DAY - 60.0 if timed else None
        put(store, "coils", coil(name, location=place, located_since=since), now_s=ROLLED + day * DAY)
    coils = read(store)
    assert coils.location.name(list(coils.coil_id).index(name)) == seen[-1][0]
    passed = [place for _, place in stays(coils, name)] or [seen[0][0]]
    assert [place for place, _ in groupby(passed)] == [
        place for place, _ in groupby(place for place, _ in seen)
    ]
