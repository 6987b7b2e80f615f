"""From feeds to the store: what is new in their files, what could not be used, and what cannot be read."""

from __future__ import annotations

import logging
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from agewatch.clock import Clock, ReplayClock
from agewatch.daemon.status import FeedStatus, feed_status, put_feed_status
from agewatch.intake import SourceRead, read_feed
from agewatch.plant.records import Put, SourceRecord
from agewatch.plant.settings import Feed
from agewatch.store import Store, queries, writes

_log = logging.getLogger(__name__)

NOTHING = Put(0, 0, 0)
_REPLAYED_S = 365 * 86_400.0


@dataclass(frozen=True, slots=True)
class FeedReading:
    """What one look at a feed brought."""

    feed: str
    files: int
    put: Put
    rejects: int
    """Rows that could not be used and are now kept."""
    trouble: str
    """Why it, or a file of it, cannot be read; "" when all could."""


def past_until_s(clock: Clock) -> float:
    """Up to when files may tell of what has happened (s): now, or while the past is replayed a year on.

    Rows that are still to come for the plant are taken in then, and count when their time has come.
    """
    return clock.now_s() + (_REPLAYED_S if isinstance(clock, ReplayClock) else 0.0)


def read_feeds(
    store: Store, feeds: Iterable[Feed], folder: Path, clock: Clock, until_s: float
) -> list[FeedReading]:
    """Look at every feed once, as `take_in` does. One that cannot be read stops none of the others."""
    return [take_in(store, feed, folder, clock, until_s) for feed in feeds]


def take_in(store: Store, feed: Feed, folder: Path, clock: Clock, until_s: float) -> FeedReading:
    """Look at one feed: each new or changed file is one transaction with its rows, rejects and record.

    A file that cannot be read is left untouched and tried again at the next look. A row is rejected that
    tells of something as done that lies after `until_s` (s). Raises StoreError.
    """
    with store.read() as view:
        known = {path: mark for (name, path), mark in queries.sources(view).items() if name == feed.name}
    files, put, rejects, troubles = 0, NOTHING, 0, []
    for source in read_feed(feed, folder, now_s=until_s, known=known):
        files += source.error is None
        if source.error is not None:
            troubles.append(source.error.removeprefix(f"feed {feed.name}: "))
        elif not source.unchanged:
            more, kept = _keep(store, feed, source, clock.now_s())
            put = Put(put.new + more.new, put.changed + more.changed, put.same + more.same)
            rejects += kept
    reading = FeedReading(feed.name, files, put, rejects, "; ".join(troubles))
    _remember(store, reading, clock.now_s())
    return reading


def _keep(store: Store, feed: Feed, source: SourceRead, now_s: float) -> tuple[Put, int]:
    record = SourceRecord(
        feed.name, source.path, source.fingerprint, now_s, len(source.rows), len(source.rejects)
    )
    with store.write() as tx:
        put = writes.put_rows(tx, feed.table, source.rows, feed=feed.name, now_s=now_s)
        kept = writes.put_rejects(tx, feed.name, source.rejects, now_s)
        writes.put_source(tx, record)
    return put, kept


def _remember(store: Store, reading: FeedReading, now_s: float) -> None:
    """Keep what the feed's alarm rests on, when it is not what is kept already."""
    with store.read() as view:
        before = feed_status(view, reading.feed)
    news = bool(reading.put.new or reading.put.changed)
    after = FeedStatus(now_s if news else before.last_new_s, reading.trouble)
    if after != before:
        with store.write() as tx:
            put_feed_status(tx, reading.feed, after, now_s)
    if after.trouble and after.trouble != before.trouble:
        _log.warning("feed %s cannot be read: %s", reading.feed, after.trouble)
    if before.trouble and not after.trouble:
        _log.info("feed %s can be read again", reading.feed)
    if news or reading.rejects:
        put = reading.put
        _log.info(
            "feed %s: %d new, %d changed, %d rejected", reading.feed, put.new, put.changed, reading.rejects
        )
