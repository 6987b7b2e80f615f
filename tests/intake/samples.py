"""Short ways to feeds and sources for the tests of the intake."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

from agewatch.intake import Parsed, SourceRead, parse_rows, read_feed
from agewatch.plant.settings import Feed

NOW_S = datetime(2026, 7, 1, tzinfo=UTC).timestamp()
COILS_HEAD = "coil_id,grade,temper_rolled_at,location"


def seconds(text: str) -> float:
    """Seconds since 1970 of a time with its offset, by the standard library."""
    return datetime.fromisoformat(text).timestamp()


def feed(table: str = "moves", path: str = "x.csv", **keys: object) -> Feed:
    return Feed.model_validate({"table": table, "path": path} | keys)


def parse(text: str, table: str = "moves", **keys: object) -> Parsed:
    return parse_rows(feed(table, **keys), text, "x.csv", now_s=NOW_S)


def read(folder: Path, table: str = "moves", path: str = "x.csv", **keys: object) -> list[SourceRead]:
    return list(read_feed(feed(table, path, **keys), folder, now_s=NOW_S, known={}))
