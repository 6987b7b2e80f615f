"""Signs of life for the receivers."""

from __future__ import annotations

from agewatch.daemon.housekeeping import keep_house
from agewatch.store import writes
from tests.daemon.samples import NOW_S, TinyPlant


def test_sign_of_life(plant: TinyPlant) -> None:
    """Each receiver gets a sign of life, and no second one while the first still waits."""
    settings = plant.loaded.settings
    assert keep_house(plant.store, settings, NOW_S) == 1
    assert keep_house(plant.store, settings, NOW_S + 300.0) == 0
    (message,) = plant.messages()
    assert (message.type, message.endpoint) == ("agewatch.heartbeat", "logistics")
    with plant.store.write() as tx:
        writes.message_delivered(tx, message.message_id, NOW_S + 301.0)
    assert keep_house(plant.store, settings, NOW_S + 600.0) == 1
    assert len({message.message_id for message in plant.messages()}) == 2
