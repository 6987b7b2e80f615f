"""What the daemon does when its store fails."""

from __future__ import annotations

import sqlite3
from contextlib import closing

from agewatch.daemon.trouble import StoreTrouble
from agewatch.errors import StoreError
from tests.daemon.samples import TinyPlant

TROUBLE = ("store-trouble", "store")


def test_failure_is_alarmed_until_a_turn_is_kept(plant: TinyPlant) -> None:
    """A failure that can be recorded is alarmed and told of; the next turn that is kept ends the alarm."""
    plant.round()
    trouble = StoreTrouble(plant.store, plant.loaded.settings, plant.clock)
    trouble.told(StoreError("store agewatch.db: the disk is full"))
    assert trouble.fatal is None
    assert plant.alarms()[TROUBLE].detail["reason"] == "store agewatch.db: the disk is full"
    assert plant.messages()[-1].type == "agewatch.alarm.raised"
    plant.round(60.0)
    assert TROUBLE not in plant.alarms()
    assert plant.messages()[-1].type == "agewatch.alarm.cleared"


def test_failure_that_cannot_be_recorded_is_fatal(plant: TinyPlant) -> None:
    """Where not even the alarm can be kept, the daemon learns that it has to end, and why."""
    plant.round()
    trouble = StoreTrouble(plant.store, plant.loaded.settings, plant.clock)
    with closing(sqlite3.connect(plant.store.path, isolation_level=None)) as other:
        other.execute("CREATE TRIGGER refuse BEFORE INSERT ON alarm BEGIN SELECT RAISE(ABORT, 'no'); END")
        trouble.told(StoreError("store agewatch.db: the disk is full"))
        other.execute("DROP TRIGGER refuse")
    assert isinstance(trouble.fatal, StoreError)
