"""Rows of the canonical tables, and the shortest way to put and read them."""

from __future__ import annotations

from agewatch.plant.inventory import Inventory
from agewatch.plant.records import JournalRow, Put
from agewatch.plant.tables import COILS, Row, Value
from agewatch.store import Store
from agewatch.store.queries import coil_journal, inventory
from agewatch.store.writes import put_rows

DAY = 86_400.0
ROLLED = 1_750_000_000.0
NOW = ROLLED + 30 * DAY


def coil(coil_id: str = "C1", **given: Value) -> Row:
    """A row of coils; what is not given and not required is None."""
    values: dict[str, Value] = {
        "coil_id": coil_id,
        "grade": "DC04",
        "temper_rolled_at": ROLLED,
        "location": "BAY-1",
    }
    return tuple((values | given).get(name) for name in COILS.column_names)


def lab(
    coil_id: str, tested_at: float, ype_pct: float, aged_h: float | None = None, direction: str = "L"
) -> Row:
    return coil_id, tested_at, ype_pct, None, None if aged_h is None else 100.0, aged_h, direction


def put(store: Store, table: str, *rows: Row, now_s: float = NOW) -> Put:
    with store.write() as tx:
        return put_rows(tx, table, rows, feed=f"{table}:{table}.csv", now_s=now_s)


def read(store: Store, at_s: float = NOW + DAY) -> Inventory:
    with store.read() as view:
        return inventory(view, at_s)


def journal_of(store: Store, coil_id: str) -> list[JournalRow]:
    with store.read() as view:
        return coil_journal(view, coil_id)


def stays(coils: Inventory, coil_id: str = "C1") -> list[tuple[float, str | None]]:
    """Arrivals of a coil in order of time."""
    row = list(coils.coil_id).index(coil_id)
    return [
        (float(coils.move_s[move]), coils.move_location.name(move))
        for move in range(len(coils.move_s))
        if coils.move_coil[move] == row
    ]
