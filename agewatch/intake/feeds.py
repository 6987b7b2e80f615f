"""Reading a feed: its files, one after the other, each either read, unchanged, or left where it is."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from agewatch.errors import FeedError
from agewatch.intake.files import matches, read_whole
from agewatch.intake.rows import parse_rows
from agewatch.plant.tables import Reject, Row

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed


@dataclass(slots=True)
class SourceRead:
    """What reading one file came to."""

    feed: str
    path: str
    """As the feed's pattern spells it, relative to the settings' folder."""
    fingerprint: str = ""
    """SHA-256 (hex) of the content; "" when it could not be read."""
    rows: list[Row] = field(default_factory=list)
    rejects: list[Reject] = field(default_factory=list)
    error: str | None = None
    """Why nothing was read, in one line; the file is left for the next reading."""
    unchanged: bool = False
    """The content is the one that was read last: nothing was parsed."""


def read_feed(feed: Feed, folder: Path, *, now_s: float, known: Mapping[str, str]) -> Iterator[SourceRead]:
    """Read the files of `feed`, in the order of their names.

    `folder` is that of the settings; `known` holds, by path, the fingerprints of the contents last read.
    """
    try:
        paths = matches(feed.name, feed.path, folder)
    except FeedError as fault:
        yield SourceRead(feed.name, feed.path, error=str(fault))
        return
    for path in paths:
        try:
            yield _read(feed, path, folder, now_s, known.get(path))
        except FeedError as fault:
            yield SourceRead(feed.name, path, error=str(fault))


def _read(feed: Feed, path: str, folder: Path, now_s: float, known: str | None) -> SourceRead:
    content = read_whole(feed.name, path, folder)
    fingerprint = hashlib.sha256(content).hexdigest()
    if fingerprint == known:
        return SourceRead(feed.name, path, fingerprint, unchanged=True)
    parsed = parse_rows(feed, _decoded(feed, path, content), path, now_s=now_s)
    return SourceRead(feed.name, path, fingerprint, parsed.rows, parsed.rejects)


def _decoded(feed: Feed, path: str, content: bytes) -> str:
    try:
        return content.decode(feed.encoding)
    except UnicodeDecodeError as fault:
        line = content.count(b"\n", 0, fault.start) + 1
        reason = (
            f"byte {fault.start + 1} (in line {line}) is not {feed.encoding}; save the file as {feed.encoding}, or "
            'name its encoding in the feed, for example encoding = "cp1250"'
        )
        raise FeedError(feed.name, path, reason) from None
