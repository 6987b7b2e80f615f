"""Bodies of messages: CloudEvents 1.0 in structured JSON, split below the size that Standard Webhooks allows.

A message's id is a digest of all that makes it what it is: endpoint, cause, and the whole content without the
id. One id can therefore never stand for two bodies, and the same work done again after a crash gives the same
id. The cause (a key that the store gives once, such as a place in its journal) keeps apart two occurrences
that would otherwise read alike.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from urllib.parse import quote

from agewatch.clock import rfc3339
from agewatch.messages.inert import inert

CONTENT_TYPE = "application/cloudevents+json; charset=utf-8"
BODY_LIMIT = 20_000
"""Every body is shorter than this many bytes."""

_ID_DIGITS = 32
_NO_ID = "msg_" + "-" * _ID_DIGITS
_TEXT_LIMIT = 1000
_CUT_TEXT = 80
_LONGEST_ESCAPE = 12
"""Longer texts than any plant writes are cut, so that one entry always fits."""


class MessageType(StrEnum):
    """What a message says; the order is that in which one turn sends them."""

    COIL_RELEASED = "agewatch.coil.released"
    PULL_WITHDRAWN = "agewatch.pull.withdrawn"
    PULL_CHANGED = "agewatch.pull.changed"
    PULL_REQUESTED = "agewatch.pull.requested"
    COIL_HELD = "agewatch.coil.held"
    ALARM_CLEARED = "agewatch.alarm.cleared"
    ALARM_RAISED = "agewatch.alarm.raised"
    HEARTBEAT = "agewatch.heartbeat"

    @property
    def lists(self) -> str:
        """Name of the list in the body's data."""
        return "alarms" if self in (MessageType.ALARM_CLEARED, MessageType.ALARM_RAISED) else "coils"


Entry = Mapping[str, object]


@dataclass(frozen=True, slots=True)
class News:
    """What is to be told of one location, before it is split: `entries` are coils or alarms."""

    type: MessageType
    site: str
    location: str
    at_s: float
    entries: Sequence[Entry]
    caution: str = ""


@dataclass(frozen=True, slots=True)
class Body:
    """One body and its id."""

    message_id: str
    text: str
    """ASCII: JSON with every other character escaped."""


def bodies(news: News, endpoint: str, cause: str) -> list[Body]:
    """The bodies that tell `news` to one endpoint, in order, each shorter than `BODY_LIMIT` bytes."""
    chunks = _chunks(news)
    return [
        _body(news, _listing(news, chunk, part, len(chunks)), endpoint, cause)
        for part, chunk in enumerate(chunks, start=1)
    ]


def heartbeat_body(site: str, at_s: float, values: Mapping[str, object], endpoint: str, cause: str) -> Body:
    """A sign of life; `values` tells how the daemon is."""
    news = News(MessageType.HEARTBEAT, site, "", at_s, ())
    return _body(news, {"site": _bounded(site), **_bounded_entry(values)}, endpoint, cause)


def _body(news: News, data: Entry, endpoint: str, cause: str) -> Body:
    content = _json(_document(news, data))
    digest = hashlib.sha256(_json([endpoint, cause, content]).encode("ascii")).hexdigest()
    message_id = f"msg_{digest[:_ID_DIGITS]}"
    return Body(message_id, content.replace(_NO_ID, message_id, 1))


def _document(news: News, data: Entry) -> Entry:
    """The event, with `_NO_ID` before all text of the plant where its id will stand."""
    subject = {"subject": _bounded(inert(news.location))} if news.location else {}
    return {
        "specversion": "1.0",
        "id": _NO_ID,
        "source": f"/agewatch/{quote(_bounded(news.site), safe='', errors='replace')}",
        "type": news.type,
        **subject,
        "time": rfc3339(news.at_s),
        "datacontenttype": "application/json",
        "data": data,
    }


def _listing(news: News, entries: Sequence[Entry], part: int, parts: int) -> Entry:
    caution = {"caution": news.caution} if news.caution else {}
    return {
        "site": _bounded(news.site),
        "location": _bounded(news.location),
        "part": part,
        "parts": parts,
        news.type.lists: entries,
        **caution,
    }


def _chunks(news: News) -> list[list[Entry]]:
    """The entries in as few lists as fit, in order."""
    widest = _listing(news, (), len(news.entries), len(news.entries))
    envelope = len(_json(_document(news, widest)))
    chunks: list[list[Entry]] = []
    size = BODY_LIMIT
    for entry in map(_bounded_entry, news.entries):
        length = len(_json(entry)) + len(",")
        if size + length >= BODY_LIMIT:
            chunks.append([])
            size = envelope
        chunks[-1].append(entry)
        size += length
    return chunks


def _bounded_entry(entry: Entry) -> Entry:
    return {name: _bounded(value) if isinstance(value, str) else value for name, value in entry.items()}


def _bounded(text: str) -> str:
    fits = len(text) * _LONGEST_ESCAPE <= _TEXT_LIMIT or len(_json(text)) <= _TEXT_LIMIT
    return text if fits else text[:_CUT_TEXT] + "…"


_json = json.JSONEncoder(ensure_ascii=True, allow_nan=False, separators=(",", ":")).encode
