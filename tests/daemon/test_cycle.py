"""A turn of the cycle on a real store: verdicts, alarms, journal and messages, and all of it or nothing."""

from __future__ import annotations

import json
import sqlite3
from contextlib import closing

import pytest

from agewatch.alarms import AlarmKind, AlarmState
from agewatch.daemon.conditions import FAILING_AFTER_S
from agewatch.daemon.status import last_tick
from agewatch.errors import StoreError
from agewatch.plant.records import EndpointState
from agewatch.store import queries, writes
from tests.daemon.samples import COIL_HEAD, FRESH, HOUR_S, NOW_S, OLD, TinyPlant, temperatures


def test_old_coil_is_held_and_told_of(plant: TinyPlant) -> None:
    """A coil whose plateau has returned is held, alarmed, journalled and told of; a fresh one is clear."""
    found = plant.round()
    assert found["C-FRESH"][0] == "clear"
    assert found["C-OLD"][0] == "hold"
    assert set(plant.alarms()) == {("returned-in-store", "C-OLD")}
    (row,) = [row for row in plant.journal() if row.topic == "alarm"]
    assert (row.kind, row.subject, row.actor, row.after) == (
        "returned-in-store",
        "C-OLD",
        "agewatch",
        "unacknowledged",
    )
    (message,) = plant.messages()
    assert (message.type, message.location) == ("agewatch.coil.held", "BAY-1")
    assert json.loads(message.body)["data"]["coils"][0]["coil_id"] == "C-OLD"


def test_same_again_tells_nothing(plant: TinyPlant) -> None:
    """A second turn without news raises, journals and sends nothing, and renews assessment and tick."""
    plant.round()
    before = plant.journal(), plant.messages()
    plant.round(60.0)
    assert (plant.journal(), plant.messages()) == before
    with plant.store.read() as view:
        tick = last_tick(view)
        assessment = queries.latest_assessment(view)
    assert tick is not None
    assert assessment is not None
    assert (tick.at_s, tick.reading_s, assessment.at_s) == (NOW_S + 60.0, NOW_S, NOW_S + 60.0)


def test_pressed_coil_is_released(plant: TinyPlant) -> None:
    """When a held coil has left the store its alarm ends, and the receivers are told."""
    plant.round()
    plant.write("coils.csv", COIL_HEAD.strip() + ",status\n" + OLD.strip() + ",pressed\n")
    plant.round(HOUR_S)
    assert plant.alarms() == {}
    assert [message.type for message in plant.messages()] == ["agewatch.coil.held", "agewatch.coil.released"]


def test_turn_is_kept_whole_or_not_at_all(plant: TinyPlant) -> None:
    """Where the outbox cannot be written, neither assessment nor alarm nor journal of that turn is kept."""
    plant.read()
    with closing(sqlite3.connect(plant.store.path, isolation_level=None)) as other:
        other.execute("CREATE TRIGGER refuse BEFORE INSERT ON message BEGIN SELECT RAISE(ABORT, 'no'); END")
        with pytest.raises(StoreError):
            plant.turn()
        other.execute("DROP TRIGGER refuse")
    with plant.store.read() as view:
        assert queries.latest_assessment(view) is None
        assert queries.alarms(view) == []
        assert last_tick(view) is None
    assert [row for row in plant.journal() if row.topic == "alarm"] == []
    plant.turn()
    assert set(plant.alarms()) == {("returned-in-store", "C-OLD")}
    assert len(plant.messages()) == 1


def test_silent_sensor_and_uncovered_location(plant: TinyPlant) -> None:
    """A sensor without readings for too long is alarmed, and its location too while coils lie there."""
    plant.round()
    plant.round(4 * HOUR_S)
    told = {key for key in plant.alarms() if not key[1].startswith("C-")}
    assert told == {("sensor-silent", "T1"), ("sensor-silent", "T2"), ("location-uncovered", "BAY-1")}
    plant.write("temps.csv", temperatures("T1", "T2", until_s=NOW_S + 4 * HOUR_S))
    plant.round()
    assert set(plant.alarms()) == {("returned-in-store", "C-OLD")}


def test_reading_of_the_future_is_no_sign_of_life(plant: TinyPlant) -> None:
    """A silent sensor is not heard again by a reading that lies ahead of the clock."""
    plant.round()
    plant.write("temps.csv", temperatures("T1", "T2", until_s=NOW_S + 30 * HOUR_S))
    plant.round(4 * HOUR_S)
    assert ("sensor-silent", "T1") in plant.alarms()


def test_failing_delivery(plant: TinyPlant) -> None:
    """A receiver that takes nothing for long is alarmed; the alarm ends when it takes messages again."""
    plant.round()
    with plant.store.write() as tx:
        writes.put_endpoint(tx, EndpointState("logistics", None, "", NOW_S, "no connection"))
    plant.round(FAILING_AFTER_S - 1.0)
    assert ("delivery-failing", "logistics") not in plant.alarms()
    plant.round(1.0)
    assert "no connection" in str(plant.alarms()["delivery-failing", "logistics"].detail["reason"])
    with plant.store.write() as tx:
        writes.put_endpoint(tx, EndpointState("logistics", None, "", None, ""))
    plant.round(1.0)
    assert ("delivery-failing", "logistics") not in plant.alarms()


def test_message_set_aside_is_alarmed(plant: TinyPlant) -> None:
    """A message that was set aside is alarmed at once."""
    plant.round()
    with plant.store.write() as tx:
        writes.message_set_aside(tx, plant.messages()[0].message_id, "it answered 422")
    plant.round(1.0)
    assert ("delivery-failing", "logistics") in plant.alarms()


def test_no_more_in_the_settings(plant: TinyPlant) -> None:
    """Alarms of a sensor that was taken out of the settings end."""
    plant.round(4 * HOUR_S)
    assert ("sensor-silent", "T1") in plant.alarms()
    fewer = plant.loaded.settings.model_copy(update={"location": {}})
    object.__setattr__(plant.loaded, "settings", fewer)
    plant.round(1.0)
    gone = [row for row in plant.journal() if row.kind == AlarmKind.SENSOR_SILENT and row.subject == "T1"]
    assert gone[-1].after == AlarmState.RETURNED_UNACKNOWLEDGED
    assert gone[-1].reason == "it is no longer in the settings"


def test_unwatched_coil_keeps_its_alarm(plant: TinyPlant) -> None:
    """A held coil that can no longer be assessed stays alarmed: losing sight of it is no reason to call it sound."""
    plant.round()
    plant.write("coils.csv", COIL_HEAD + FRESH + OLD.replace("BAY-1", "ROOF"))
    found = plant.round(HOUR_S)
    assert found["C-OLD"] == ("unassessed", "location ROOF is not in the settings")
    assert {("returned-in-store", "C-OLD"), ("unassessable-coil", "C-OLD")} <= set(plant.alarms())
