"""Bad input, one kind at a time: each has its plain reason, the rest goes on, and nothing is lost."""

from __future__ import annotations

import pytest

from agewatch.clock import ReplayClock
from agewatch.daemon.feeds import past_until_s, take_in
from agewatch.daemon.status import last_tick
from agewatch.plant.tables import Reject
from tests.daemon.samples import COIL_HEAD, DAY_S, FRESH, HOUR_S, OLD, TinyPlant, temperatures


def only_reject(plant: TinyPlant) -> Reject:
    """The one row that could not be used."""
    (stored,) = plant.rejects()
    return stored.reject


def test_good_files_are_taken_in_once(plant: TinyPlant) -> None:
    """The first look takes all rows in; the second finds the same files and changes nothing."""
    first, second = plant.read(), plant.read()
    assert (first["coils"].put.new, first["coils"].files) == (2, 1)
    assert first["temperatures"].put.new == 2 * 801
    assert {reading.trouble for reading in first.values()} == {""}
    assert (second["coils"].put.new, second["coils"].put.changed, second["coils"].files) == (0, 0, 1)


def test_unknown_grade(plant: TinyPlant) -> None:
    """A coil of a grade that the settings lack is unassessed, says so, and is alarmed; others are assessed."""
    plant.write("coils.csv", COIL_HEAD + FRESH.replace("DC04", "DC99") + OLD)
    found = plant.round()
    assert found["C-FRESH"] == ("unassessed", "grade DC99 is not in the settings")
    assert found["C-OLD"][0] == "hold"
    assert ("unassessable-coil", "C-FRESH") in plant.alarms()


def test_unknown_location(plant: TinyPlant) -> None:
    """A coil at a location that the settings lack is unassessed, says so, and is alarmed."""
    plant.write("coils.csv", COIL_HEAD + FRESH.replace("BAY-1", "ROOF") + OLD)
    found = plant.round()
    assert found["C-FRESH"] == ("unassessed", "location ROOF is not in the settings")
    assert found["C-OLD"][0] == "hold"
    assert ("unassessable-coil", "C-FRESH") in plant.alarms()


def test_missing_file(plant: TinyPlant) -> None:
    """A file that is not there is alarmed; other feeds are read, and the alarm ends when the file comes."""
    (plant.folder / "temps.csv").unlink()
    found = plant.round()
    assert found["C-OLD"] == ("unassessed", "location BAY-1 has no temperature")
    alarm = plant.alarms()["feed-stale", "temperatures:temps.csv"]
    assert "temps.csv: No such file or directory" in str(alarm.detail["reason"])
    plant.write("temps.csv", temperatures("T1", "T2"))
    assert plant.round()["C-OLD"][0] == "hold"
    assert ("feed-stale", "temperatures:temps.csv") not in plant.alarms()


def test_pattern_that_matches_nothing(plant: TinyPlant) -> None:
    """A pattern without any file is alarmed, and says where it looked."""
    (plant.folder / "coils.csv").unlink()
    assert plant.round() == {}
    alarm = plant.alarms()["feed-stale", "coils:coils*.csv"]
    assert "no file matches" in str(alarm.detail["reason"])


@pytest.mark.parametrize(
    ("content", "reason"),
    [(b"coil_id,grade\xff\xfe\n", "is not utf-8"), (b"\0\0\0\0", ""), (b"colour\nred\n", "")],
)
def test_unreadable_file(plant: TinyPlant, content: bytes, reason: str) -> None:
    """A file that makes no sense is left as it is and alarmed; what was known before stays known."""
    plant.round()
    path = plant.write("coils.csv", content)
    found = plant.round(HOUR_S)
    assert found["C-OLD"][0] == "hold"
    assert found["C-FRESH"][0] == "clear"
    alarm = plant.alarms()["feed-stale", "coils:coils*.csv"]
    assert "coils.csv: " in str(alarm.detail["reason"])
    assert reason in str(alarm.detail["reason"])
    assert path.read_bytes() == content


def test_one_unreadable_file_of_several(plant: TinyPlant) -> None:
    """A file that cannot be read does not keep its neighbour of the same feed from being read."""
    plant.write("coils-2.csv", b"colour\nred\n")
    plant.write("coils-3.csv", COIL_HEAD + FRESH.replace("C-FRESH", "C-THIRD"))
    assert set(plant.round()) == {"C-FRESH", "C-OLD", "C-THIRD"}
    assert "coils-2.csv" in str(plant.alarms()["feed-stale", "coils:coils*.csv"].detail["reason"])


def test_half_written_file(plant: TinyPlant) -> None:
    """A file whose last row is cut short is left alone, whole, and taken in once it is complete."""
    text = COIL_HEAD + OLD + FRESH
    plant.write("coils.csv", text[:-30])
    reading = plant.read()["coils"]
    assert reading.put.new == 0
    assert "still being written" in reading.trouble
    assert plant.rejects() == []
    plant.write("coils.csv", text)
    assert plant.read()["coils"].put.new == 2


def test_negative_mass(plant: TinyPlant) -> None:
    """A coil with a negative mass is kept as a reject with its line, column and raw text; others are taken in."""
    head = COIL_HEAD.strip() + ",mass_kg\n"
    plant.write("coils.csv", head + OLD.strip() + ",15000\n" + FRESH.strip() + ",-15000\n")
    assert set(plant.round()) == {"C-OLD"}
    reject = only_reject(plant)
    assert (reject.source, reject.line, reject.column) == ("coils.csv", 3, "mass_kg")
    assert reject.raw == FRESH.strip() + ",-15000"
    assert "-15000" in reject.reason


def test_date_in_the_future(plant: TinyPlant) -> None:
    """A coil that is said to be temper rolled in the future is kept as a reject."""
    plant.write("coils.csv", COIL_HEAD + OLD + FRESH.replace("2026-07-10", "2026-07-19"))
    assert set(plant.round()) == {"C-OLD"}
    reject = only_reject(plant)
    assert reject.column == "temper_rolled_at"
    assert "lies in the future" in reject.reason


def test_duplicate_coil(plant: TinyPlant) -> None:
    """A coil that stands twice in a file with other values is taken in once; the second row is a reject."""
    plant.write("coils.csv", COIL_HEAD + OLD + FRESH + OLD.replace("BAY-1", "YARD"))
    assert set(plant.round()) == {"C-OLD", "C-FRESH"}
    reject = only_reject(plant)
    assert (reject.line, reject.column) == (4, "coil_id")


def test_empty_table(plant: TinyPlant) -> None:
    """A coil list with no coil in it is no fault, and takes away no coil that was known."""
    plant.round()
    plant.write("coils.csv", COIL_HEAD)
    assert set(plant.round(HOUR_S)) == {"C-FRESH", "C-OLD"}
    assert ("feed-stale", "coils:coils*.csv") not in plant.alarms()


def test_empty_store(plant: TinyPlant) -> None:
    """With no coil at all a turn is still taken, and assesses none."""
    plant.write("coils.csv", COIL_HEAD)
    assert plant.round() == {}


def test_many_rejects_are_alarmed(plant: TinyPlant) -> None:
    """From the limit on, the open rejects of a feed are alarmed."""
    bad = [FRESH.replace("C-FRESH", f"C-{n}").replace("2026-07-10", "10.7.2026") for n in range(3)]
    plant.write("coils.csv", COIL_HEAD + OLD + "".join(bad[:2]))
    plant.round()
    assert ("rejects-high", "coils:coils*.csv") not in plant.alarms()
    plant.write("coils.csv", COIL_HEAD + OLD + "".join(bad))
    plant.round(HOUR_S)
    alarm = plant.alarms()["rejects-high", "coils:coils*.csv"]
    assert alarm.detail["open_rejects"] == 3
    assert len(plant.rejects()) == 3


def test_rows_to_come_of_a_replayed_past(plant: TinyPlant) -> None:
    """Where the past is replayed, readings that are still to come are taken in and count when their time has come."""
    clock = ReplayClock(plant.clock.now_s(), 1.0)
    plant.write("temps.csv", temperatures("T1", "T2", until_s=plant.clock.now_s() + 30 * DAY_S))
    for feed in plant.loaded.settings.feed:
        take_in(plant.store, feed, plant.folder, plant.clock, past_until_s(clock))
    assert plant.rejects() == []
    plant.turn()
    with plant.store.read() as view:
        tick = last_tick(view)
    assert tick is not None
    assert tick.reading_s == plant.clock.now_s()


def test_now_is_the_end_of_the_past(plant: TinyPlant) -> None:
    """With a clock that is not replayed nothing after now has happened."""
    assert past_until_s(plant.clock) == plant.clock.now_s()
