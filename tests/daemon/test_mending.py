"""Rows that were rejected, mended and taken in."""

from __future__ import annotations

from agewatch.daemon.actions import answer
from agewatch.daemon.desk import Desk
from agewatch.store import queries
from tests.daemon.samples import COIL_HEAD, OLD, TinyPlant


def test_a_mended_row_of_a_tab_separated_file_keeps_its_empty_cells(plant: TinyPlant) -> None:
    """A row that ends in empty cells is read by its own header, as the file itself was."""
    bad = "C-NEW,DC04,yesterday,BAY-1,,\n"
    plant.write("coils.csv", (COIL_HEAD + OLD + bad).replace(",", "\t"))
    plant.read()
    (stored,) = plant.rejects()
    mended = stored.reject.raw.replace("yesterday", "2026-07-16T06:00:00Z")
    assert mended.endswith("BAY-1\t\t")
    desk = Desk(plant.store, plant.loaded.settings, plant.clock)
    reply = answer(desk, {"action": "resubmit", "mended": {str(stored.reject_id): mended}}, "user:novak")
    assert (reply.ok, reply.said) == (True, "1 taken in")
    assert plant.rejects() == []
    with plant.store.read() as view:
        assert "C-NEW" in queries.inventory(view, plant.clock.now_s()).coil_id
