"""Putting coils: what a feed's snapshot changes, and what the change tells of the coil's past."""

from __future__ import annotations

import hashlib
import marshal
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import bindparam, delete, select, update

from agewatch.clock import rfc3339
from agewatch.plant.records import JournalRow, Put
from agewatch.plant.tables import COILS, CoilStatus, Row
from agewatch.store.access import Transaction
from agewatch.store.bulk import batches, insert_unknown, one_of, put_keyed, replace
from agewatch.store.schema import coil, move
from agewatch.store.values import to_ms, to_s
from agewatch.store.writes_records import append_journal

SEEN = "coils"
"""Origin of a move that was seen in a snapshot."""

_AT_ONCE = 2000
_SEEN_RESOLUTION_MS = 3_600_000  # coil by coil, noting every sight would rewrite the table at every snapshot
_NAMES = tuple(column.name for column in coil.columns)
_FED = len(COILS.columns)  # so many of the store's columns come from the feed, in its order
_STATUS = _NAMES.index("status")


@dataclass(frozen=True, slots=True)
class Stand:
    """Where a coil is, by its feed. Times in ms."""

    location: str
    located_since_ms: int | None
    temper_rolled_ms: int
    parent_id: str | None


def put_coils(tx: Transaction, rows: Sequence[Row], *, feed: str, now_s: float) -> Put:
    """Take in coils; a status that is not given is "stored" at first sight, and stays as it is later."""
    told = {row[0]: row for row in rows}
    puts = [_put_some(tx, some, feed, now_s) for some in batches([*told.values()], _AT_ONCE)]
    return Put(sum(put.new for put in puts), sum(put.changed for put in puts), sum(put.same for put in puts))


def _put_some(tx: Transaction, told: Sequence[Row], feed: str, now_s: float) -> Put:
    """Sort out the rows that tell nothing new by their digests alone, and take in the others."""
    now_ms = to_ms(now_s)
    digests = {str(row[0]): _digest(row) for row in told}
    known = select(coil.c.coil_id, coil.c.told_digest, coil.c.last_seen_ms).where(
        one_of(coil.c.coil_id, digests)
    )
    same = {row[0]: row[2] for row in tx.fetch(known) if digests[row[0]] == row[1]}
    unnoted = [coil_id for coil_id, seen_ms in same.items() if now_ms - seen_ms >= _SEEN_RESOLUTION_MS]
    if unnoted:
        tx.connection.execute(update(coil).where(one_of(coil.c.coil_id, unnoted)).values(last_seen_ms=now_ms))
    put = _take_in(tx, [row for row in told if row[0] not in same], digests, feed, now_s)
    return Put(put.new, put.changed, put.same + len(same))


def _take_in(
    tx: Transaction, told: Sequence[Row], digests: Mapping[str, bytes], feed: str, now_s: float
) -> Put:
    now_ms = to_ms(now_s)
    standing = select(coil).where(one_of(coil.c.coil_id, [str(row[0]) for row in told]))
    stands = {row[0]: row for row in tx.fetch(standing)}
    new, changes, same = [], [], []
    for row in told:
        noted = now_ms, digests[str(row[0])]
        before = stands.get(row[0])
        if before is None:
            new.append((*_stored(row, CoilStatus.STORED), now_ms, *noted))
            continue
        after = _stored(row, before[_STATUS])
        if before[:_FED] == after:
            same.append((*after, before[_FED], *noted))
        else:
            changes.append((before, (*after, before[_FED], *noted)))
    insert_unknown(tx, coil, _NAMES, new)
    replace(tx, coil, [*same, *(after for _, after in changes)])
    _record(tx, changes, feed, now_s)
    return Put(len(new), len(changes), len(same))


def _digest(row: Row) -> bytes:
    """Of everything that a row tells. Version 2 writes equal rows alike, whichever objects they consist of."""
    return hashlib.blake2b(marshal.dumps(row, 2), digest_size=8).digest()


def _stored(row: Row, status: str) -> tuple[Any, ...]:
    """A row of the feed as it stands in the store."""
    given: tuple[Any, ...] = row
    return (
        *given[:2],
        to_ms(given[2]),
        given[3],
        to_ms(given[4]),
        *given[5:8],
        given[8] or status,
        to_ms(given[9]),
        *given[10:],
    )


def _record(
    tx: Transaction, changes: list[tuple[tuple[Any, ...], tuple[Any, ...]]], feed: str, now_s: float
) -> None:
    """Journal what happened to coils, and keep where they stood before."""
    named = [
        (dict(zip(_NAMES, old, strict=True)), dict(zip(_NAMES, new, strict=True))) for old, new in changes
    ]
    append_journal(tx, [row for old, new in named for row in _journalled(old, new, feed, now_s)])
    moved = [(old, new) for old, new in named if old["location"] != new["location"]]
    if not moved:
        return
    known: dict[str, dict[int, str]] = {old["coil_id"]: {} for old, _ in moved}
    for coil_id, at_ms, origin in tx.fetch(
        select(move.c.coil_id, move.c.at_ms, move.c.origin).where(one_of(move.c.coil_id, known))
    ):
        known[coil_id][at_ms] = origin
    seen, refuted = [], []
    for old, new in moved:
        coil_id = new["coil_id"]
        places, wrong = seen_moves(_stand(old), _stand(new), known[coil_id], to_ms(now_s))
        seen += [(coil_id, at_ms, place, SEEN) for at_ms, place in places.items()]
        refuted += [{"of": coil_id, "at": at_ms} for at_ms in wrong]
    put_keyed(tx, move, seen)
    if refuted:
        one = (move.c.coil_id == bindparam("of"), move.c.at_ms == bindparam("at"))
        tx.connection.execute(delete(move).where(*one), refuted)


def seen_moves(
    before: Stand, after: Stand, known: Mapping[int, str], now_ms: int
) -> tuple[dict[int, str], list[int]]:
    """The moves that a snapshot tells by showing a coil elsewhere, and the times of those that it refutes.

    Parameters
    ----------
    known
        Origin of each move of the coil, by time. What was told is left as it is.

    Returns
    -------
    The places that the coil came to, by time: where it stood until now, which nothing else would tell any
    more, and where it stands. Whatever was seen later than its arrival there is refuted.
    """
    stays = after.located_since_ms in (None, before.located_since_ms)
    arrived_ms = now_ms if after.located_since_ms is None or stays else after.located_since_ms
    seen = {}
    if before.located_since_ms is not None:
        seen[before.located_since_ms] = before.location
    slit = (
        before.parent_id is not None and before.located_since_ms is not None
    )  # then its parent's past is its own
    if not slit and min((*known, *seen), default=arrived_ms) > before.temper_rolled_ms:
        seen[before.temper_rolled_ms] = before.location
    seen = {at_ms: place for at_ms, place in seen.items() if at_ms < arrived_ms and at_ms not in known}
    if known.get(arrived_ms, SEEN) == SEEN:
        seen[arrived_ms] = after.location
    return seen, [at_ms for at_ms, origin in known.items() if origin == SEEN and at_ms > arrived_ms]


def _stand(row: Mapping[str, Any]) -> Stand:
    return Stand(row["location"], row["located_since_ms"], row["temper_rolled_ms"], row["parent_id"])


def _journalled(
    old: Mapping[str, Any], new: Mapping[str, Any], feed: str, now_s: float
) -> Iterator[JournalRow]:
    def row(kind: str, before: str, after: str) -> JournalRow:
        return JournalRow(
            now_s, "coil", kind, new["coil_id"], "agewatch", before, after, f"told by feed {feed}", {}
        )

    rolled_ms = old["temper_rolled_ms"], new["temper_rolled_ms"]
    if rolled_ms[0] != rolled_ms[1]:
        kind = "re-tempered" if rolled_ms[1] > rolled_ms[0] else "temper-rolling-corrected"
        yield row(kind, *(rfc3339(to_s(at_ms)) for at_ms in rolled_ms))
    if old["status"] != new["status"]:
        yield row("status", old["status"], new["status"])
    if old["location"] != new["location"]:
        yield row("moved", old["location"], new["location"])
