"""Putting what feeds told: rows of the canonical tables, the files they came from, and rows that failed."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterable, Sequence
from typing import Any

from sqlalchemy import select, update

from agewatch.plant.records import Put, SourceRecord
from agewatch.plant.tables import Reject, Row
from agewatch.store.access import Transaction
from agewatch.store.bulk import insert_unknown, one_of, put_keyed
from agewatch.store.schema import lab_test, move, outlook, press_plan, reading, reject, sensor, source
from agewatch.store.values import to_ms
from agewatch.store.writes_coils import put_coils

TOLD = "moves"
"""Origin of a move that a feed of moves told; it rules over one that was seen in a snapshot."""


def put_rows(tx: Transaction, table: str, rows: Sequence[Row], *, feed: str, now_s: float) -> Put:
    """Take in valid rows of a canonical table (agewatch/plant/tables.py). The same rows twice change nothing.

    A coil that is not among the rows stays as it is. A change of a coil's place, status or temper rolling is
    journalled.
    """
    now_ms = to_ms(now_s)
    told: Iterable[tuple[Any, ...]] = rows
    match table:
        case "coils":
            return put_coils(tx, rows, feed=feed, now_s=now_s)
        case "moves":
            return put_keyed(tx, move, [(coil, to_ms(at), place, TOLD) for coil, at, place in told])
        case "presses":
            presses = [(coil, to_ms(at), now_ms) for coil, at in told]
            return put_keyed(tx, press_plan, presses, differing_in=("press_ms",))
        case "temperatures":
            ids = _sensor_ids(tx, {name for _, name, _ in told})
            return put_keyed(tx, reading, [(ids[name], to_ms(at), celsius) for at, name, celsius in told])
        case "outlook":
            return put_keyed(tx, outlook, [(place, to_ms(at), celsius) for at, place, celsius in told])
        case "lab":
            return _put_lab(tx, told)
        case _:
            raise ValueError(f"{table} is no canonical table")


def put_source(tx: Transaction, record: SourceRecord) -> None:
    row = (
        record.feed,
        record.path,
        record.fingerprint,
        to_ms(record.read_s),
        record.rows,
        record.rejects,
    )
    put_keyed(tx, source, [row])


def put_rejects(tx: Transaction, feed: str, rejects: Iterable[Reject], now_s: float) -> int:
    """Keep rows that cannot be used; how many were not known yet."""
    columns = ("digest", "table", "feed", "source", "line", "column", "reason", "raw", "header")
    rows = [
        (_digest(row), row.table, feed, row.source, row.line, row.column, row.reason, row.raw, row.header)
        for row in rejects
    ]
    received_ms = to_ms(now_s)
    return insert_unknown(tx, reject, (*columns, "received_ms"), [(*row, received_ms) for row in rows])


def mark_resubmitted(tx: Transaction, reject_ids: Collection[int], now_s: float) -> int:
    """Note that rejects, mended, have been taken in; how many of them were still open."""
    still_open = reject.c.resubmitted_ms.is_(None)
    return tx.connection.execute(
        update(reject)
        .where(one_of(reject.c.reject_id, reject_ids), still_open)
        .values(resubmitted_ms=to_ms(now_s))
    ).rowcount


def _digest(row: Reject) -> str:
    text = "\x1f".join((row.table, row.source, row.raw, row.reason))
    return hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()


def _sensor_ids(tx: Transaction, names: Collection[str]) -> dict[str, int]:
    insert_unknown(tx, sensor, ("name",), [(name,) for name in sorted(names)])
    return {name: sensor_id for sensor_id, name in tx.fetch(select(sensor.c.sensor_id, sensor.c.name))}


def _put_lab(tx: Transaction, rows: Iterable[tuple[Any, ...]]) -> Put:
    """A test is known by coil, time, and how the specimen was aged and cut; a corrected value replaces."""
    told = {}
    for coil_id, tested_s, ype_pct, rp02_mpa, aged_c, aged_h, direction in rows:
        told[coil_id, to_ms(tested_s), aged_c, aged_h, direction] = (ype_pct, rp02_mpa)
    key = (
        lab_test.c.coil_id,
        lab_test.c.tested_ms,
        lab_test.c.aged_c,
        lab_test.c.aged_h,
        lab_test.c.direction,
    )
    known = select(lab_test.c.lab_test_id, lab_test.c.ype_pct, lab_test.c.rp02_mpa, *key).where(
        one_of(lab_test.c.coil_id, {each[0] for each in told})
    )
    stands = {row[3:]: row[:3] for row in tx.fetch(known)}
    new = [(*at, *found) for at, found in told.items() if at not in stands]
    changed = [
        {"ype_pct": found[0], "rp02_mpa": found[1], "id": stands[at][0]}
        for at, found in told.items()
        if at in stands and stands[at][1:] != found
    ]
    insert_unknown(tx, lab_test, (*(column.name for column in key), "ype_pct", "rp02_mpa"), new)
    for values in changed:
        row = lab_test.c.lab_test_id == values.pop("id")
        tx.connection.execute(update(lab_test).where(row).values(values))
    return Put(len(new), len(changed), len(told) - len(new) - len(changed))
