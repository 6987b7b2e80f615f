"""What feeds told: temperatures, the files they came from, and rows that failed."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np
from sqlalchemy import func, select

from agewatch.plant.inventory import Coded, OutlookRows, Readings
from agewatch.plant.records import SourceRecord, StoredReject
from agewatch.plant.tables import Reject
from agewatch.store import schema
from agewatch.store.access import View
from agewatch.store.bulk import one_of, read_columns
from agewatch.store.values import to_ms, to_s


def readings(view: View, since_s: float | None = None, sensors: Collection[str] | None = None) -> Readings:
    """All readings, or those at and after `since_s` (s), or those of some sensors."""
    names = select(schema.sensor.c.name, schema.sensor.c.sensor_id).order_by(schema.sensor.c.sensor_id)
    chosen = select(schema.reading.c.sensor_id, schema.reading.c.at_ms, schema.reading.c.celsius)
    if sensors is not None:
        names = names.where(one_of(schema.sensor.c.name, sensors))
        chosen = chosen.where(schema.reading.c.sensor_id.in_(select(names.subquery().c.sensor_id)))
    if since_s is not None:
        chosen = chosen.where(schema.reading.c.at_ms >= to_ms(since_s))
    labels = view.fetch(names)
    ids = np.array([sensor_id for _, sensor_id in labels])
    _, (sensor_id, at_ms, celsius) = read_columns(
        view, chosen.order_by(schema.reading.c.sensor_id, schema.reading.c.at_ms), texts=0
    )
    codes = np.searchsorted(ids, sensor_id).astype(np.int32)
    return Readings(Coded(codes, tuple(name for name, _ in labels)), at_ms / 1000.0, celsius)


def outlook(view: View) -> OutlookRows:
    """Every supplied temperature to come."""
    (places,), (at_ms, celsius) = read_columns(
        view,
        select(schema.outlook.c.location, schema.outlook.c.at_ms, schema.outlook.c.celsius).order_by(
            schema.outlook.c.location, schema.outlook.c.at_ms
        ),
        texts=1,
    )
    return OutlookRows(Coded.of(places), at_ms / 1000.0, celsius)


def source_records(view: View) -> list[SourceRecord]:
    """Every file that was read, as it was last read."""
    return [
        SourceRecord(feed, path, fingerprint, to_s(read_ms), rows, rejects)
        for feed, path, fingerprint, read_ms, rows, rejects in view.fetch(
            select(schema.source).order_by(schema.source.c.feed, schema.source.c.path)
        )
    ]


def sources(view: View) -> dict[tuple[str, str], str]:
    """Fingerprint of every file as last read, by feed and path."""
    return {(record.feed, record.path): record.fingerprint for record in source_records(view)}


def open_rejects(view: View, feed: str | None = None, limit: int | None = None) -> list[StoredReject]:
    """Rows that could not be used and still wait to be mended, oldest first."""
    chosen = (
        select(schema.reject)
        .where(schema.reject.c.resubmitted_ms.is_(None))
        .order_by(schema.reject.c.reject_id)
        .limit(limit)
    )
    if feed is not None:
        chosen = chosen.where(schema.reject.c.feed == feed)
    return [
        StoredReject(
            row.reject_id,
            row.feed,
            to_s(row.received_ms),
            to_s(row.resubmitted_ms),
            Reject(row.table, row.source, row.line, row.column, row.reason, row.raw, row.header),
        )
        for row in view.connection.execute(chosen)
    ]


def open_reject_counts(view: View) -> dict[str, int]:
    """How many rejects of each feed still wait."""
    counts = (
        select(schema.reject.c.feed, func.count())
        .where(schema.reject.c.resubmitted_ms.is_(None))
        .group_by(schema.reject.c.feed)
    )
    return dict(view.fetch(counts))
