"""The inventory: whole pasts, slit coils among them, as known at a time."""

from __future__ import annotations

import numpy as np

from agewatch.plant.assess import assess
from agewatch.plant.inventory import OutlookRows, Readings
from agewatch.plant.settings import Settings
from agewatch.store import Store
from agewatch.store.queries import inventory, outlook, readings
from tests.contract.rows import DAY, NOW, ROLLED, coil, lab, put, read, stays


def test_moves_later_than_the_time_asked_for_are_left_out(store: Store) -> None:
    """The past looks as it was: a coil stands where its last move up to then brought it."""
    put(store, "coils", coil(location="C"))
    put(store, "moves", ("C1", ROLLED, "A"), ("C1", ROLLED + DAY, "B"), ("C1", ROLLED + 2 * DAY, "C"))
    then = read(store, at_s=ROLLED + 1.5 * DAY)
    assert stays(then) == [(ROLLED, "A"), (ROLLED + DAY, "B")]
    assert (then.location.name(0), then.located_since_s[0]) == ("B", ROLLED + DAY)


def test_moves_come_ordered_by_coil_and_time(store: Store) -> None:
    """However they arrived, a coil's moves stand together and in order."""
    put(store, "coils", coil("C2"), coil("C1"))
    put(store, "moves", ("C2", NOW, "A"), ("C1", NOW, "B"), ("C1", ROLLED, "A"), ("C2", ROLLED, "B"))
    coils = read(store)
    assert coils.move_coil.tolist() == [0, 0, 1, 1]
    assert coils.move_s.tolist() == [ROLLED, NOW, ROLLED, NOW]


def test_a_coil_without_moves_stands_where_its_row_says(store: Store) -> None:
    """Nothing is known of since when."""
    put(store, "coils", coil(location="BAY-1"))
    coils = read(store)
    assert (coils.location.name(0), len(coils.move_s)) == ("BAY-1", 0)
    assert np.isnan(coils.located_since_s[0])


def test_some_coils_can_be_had_alone(store: Store) -> None:
    """Asked for by id, a coil comes with all that belongs to it and nothing else."""
    put(store, "coils", coil("C1"), coil("C2", mass_kg=9000.0), coil("C3", status="pressed"))
    put(store, "moves", ("C1", NOW, "A"), ("C2", NOW, "B"))
    put(store, "lab", lab("C1", NOW, 0.1), lab("C2", NOW, 0.2))
    with store.read() as view:
        some = inventory(view, NOW + DAY, ["C2", "C3", "C9"])
    assert (some.coil_id.tolist(), some.mass_kg.tolist(), some.lab_ype_pct.tolist()) == (
        ["C2"],
        [9000.0],
        [0.2],
    )
    assert stays(some, "C2") == [(ROLLED, "BAY-1"), (NOW, "B")]


def test_a_slit_coil_has_its_parents_past(store: Store) -> None:
    """Up to the slit coil's own arrival it was where its parent was, whatever has become of the parent."""
    put(store, "coils", coil("P", location="B", status="scrapped"))
    put(store, "moves", ("P", ROLLED, "A"), ("P", ROLLED + 2 * DAY, "B"), ("P", ROLLED + 9 * DAY, "SCRAP"))
    put(store, "coils", coil("S", location="C", parent_id="P", located_since=ROLLED + 5 * DAY))
    assert stays(read(store), "S") == [(ROLLED, "A"), (ROLLED + 2 * DAY, "B"), (ROLLED + 5 * DAY, "C")]


def test_a_slit_coil_stood_where_its_parent_stood_that_never_moved(store: Store) -> None:
    """A parent without moves leaves its one location to the coils that are slit from it."""
    put(store, "coils", coil("P", location="A", status="pressed"))
    put(store, "coils", coil("S", location="C", parent_id="P", located_since=ROLLED + 5 * DAY))
    assert stays(read(store), "S") == [(ROLLED, "A"), (ROLLED + 5 * DAY, "C")]


def test_a_parents_own_arrival_is_inherited(store: Store) -> None:
    """A parent's `located_since` counts as the arrival it is."""
    put(store, "coils", coil("P", location="B", located_since=ROLLED + DAY, status="pressed"))
    put(store, "moves", ("P", ROLLED, "A"))
    put(store, "coils", coil("S", location="C", parent_id="P", located_since=ROLLED + 5 * DAY))
    assert [place for _, place in stays(read(store), "S")] == ["A", "B", "C"]


def test_a_slit_coils_own_moves_after_slitting_go_on(store: Store) -> None:
    """A slit coil that is seen elsewhere later keeps its inherited past and the time when it was slit."""
    put(store, "coils", coil("P", location="A", status="pressed"))
    put(store, "moves", ("P", ROLLED + 6 * DAY, "B"))
    put(store, "coils", coil("S", location="C", parent_id="P", located_since=ROLLED + 5 * DAY))
    put(store, "coils", coil("S", location="D", parent_id="P", located_since=ROLLED + 8 * DAY))
    assert stays(read(store), "S") == [(ROLLED, "A"), (ROLLED + 5 * DAY, "C"), (ROLLED + 8 * DAY, "D")]


def test_slitting_twice_goes_back_to_the_first_coil(store: Store) -> None:
    """Pasts are handed on over generations, though nobody in between is stored any more."""
    put(store, "coils", coil("P", location="A", status="pressed"))
    put(store, "coils", coil("Q", location="B", parent_id="P", located_since=ROLLED + DAY, status="pressed"))
    put(store, "coils", coil("S", location="C", parent_id="Q", located_since=ROLLED + 2 * DAY))
    assert [place for _, place in stays(read(store), "S")] == ["A", "B", "C"]


def test_a_parent_that_nobody_knows_leaves_a_slit_coil_to_itself(store: Store) -> None:
    """An unknown parent, or a coil that names itself, is no error; the coil was always where it is."""
    put(store, "coils", coil("S", location="C", parent_id="?", located_since=ROLLED + DAY))
    put(store, "coils", coil("T", location="C", parent_id="T", located_since=ROLLED + DAY))
    coils = read(store)
    assert {place for name in ("S", "T") for _, place in stays(coils, name)} == {"C"}


def test_what_is_read_can_be_assessed(store: Store) -> None:
    """Inventory, readings and outlook of the store are what an assessment takes; it has every stored coil."""
    settings = Settings.model_validate(
        {
            "site": {"name": "a plant"},
            "location": {"BAY-1": {"sensors": ["T1"]}},
            "grade": {
                "DC04": {
                    "rp02_mpa": 175.0,
                    "rm_mpa": 300.0,
                    "n_value": 0.21,
                    "channel": {"carbon": {"tau_days": 300.0}},
                }
            },
        }
    )
    put(store, "coils", coil("C1"), coil("C2", location="NOWHERE"))
    put(store, "temperatures", *[(ROLLED + hour * 3600.0, "T1", 25.0) for hour in range(30 * 24)])
    with store.read() as view:
        known: Readings = readings(view)
        ahead: OutlookRows = outlook(view)
        made = assess(inventory(view, NOW), known, ahead, settings, "digest", NOW)
    assert made.coil_id.tolist() == ["C1", "C2"]
    assert made.equivalent_age_days[0] > 30.0
    assert np.isnan(made.equivalent_age_days[1])
