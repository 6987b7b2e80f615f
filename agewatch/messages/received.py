"""What a receiver makes of one message: its signature checked, its content read, one line to show. Pure."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from agewatch.messages.inert import inert
from agewatch.messages.signing import ID_HEADER, SIGNATURE_HEADER, TIMESTAMP_HEADER, Verification, verify

_SHOWN_COILS = 4


@dataclass(frozen=True, slots=True)
class ReceivedMessage:
    """One message as it came. Whatever it says is to be believed only if it is `verified`."""

    id: str
    type: str
    subject: str
    """The location; "" where none applies."""
    time: str
    """The event's own time, as it is written there."""
    coils: tuple[str, ...]
    """The coils it lists, or the subjects of the alarms."""
    verified: bool
    reason: str
    """Why it is not verified."""
    duplicate: bool
    received_s: float


@dataclass(frozen=True, slots=True)
class Content:
    """What the body says; all "" where it is no event."""

    readable: bool
    type: str = ""
    subject: str = ""
    time: str = ""
    coils: tuple[str, ...] = ()


def check(headers: Mapping[str, str], body: bytes, secrets: Sequence[str], now_s: float) -> Verification:
    """Whether the three headers sign `body`; a header that is missing is named."""
    for name in (ID_HEADER, TIMESTAMP_HEADER, SIGNATURE_HEADER):
        if not headers.get(name):
            return Verification(False, f"{name} is missing")
    return verify(
        secrets,
        headers[ID_HEADER],
        headers[TIMESTAMP_HEADER],
        body,
        headers[SIGNATURE_HEADER],
        now_s=now_s,
    )


def read_content(body: bytes) -> Content:
    """The event in `body`; whatever the body holds, no error is raised."""
    try:
        event = json.loads(body)
    except (ValueError, RecursionError):
        return Content(readable=False)
    if not isinstance(event, dict) or event.get("specversion") != "1.0" or not event.get("type"):
        return Content(readable=False)
    data = event.get("data")
    listed = data.get("coils") or data.get("alarms") if isinstance(data, dict) else None
    entries = listed if isinstance(listed, list) else []
    return Content(
        readable=True,
        type=str(event["type"]),
        subject=str(event.get("subject", "")),
        time=str(event.get("time", "")),
        coils=tuple(
            str(entry.get("coil_id") or entry.get("subject")) for entry in entries if isinstance(entry, dict)
        ),
    )


def line(message: ReceivedMessage) -> str:
    """One line for a terminal; nothing that came over the wire can steer it."""
    shown = ", ".join(inert(coil, 40) for coil in message.coils[:_SHOWN_COILS])
    more = " …" if len(message.coils) > _SHOWN_COILS else ""
    count = f"{len(message.coils)} ({shown}{more})" if message.coils else "–"
    words = [
        inert(message.time, 40) or "–",
        inert(message.type, 60) or "no event",
        inert(message.subject, 60) or "–",
        count,
        "verified" if message.verified else f"NOT VERIFIED: {message.reason}",
    ]
    return "  ".join(words + ["again"] * message.duplicate)
