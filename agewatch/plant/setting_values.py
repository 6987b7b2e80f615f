"""The kinds of value that settings hold, each with what is allowed: durations, time zones, numbers, encodings."""

from __future__ import annotations

import codecs
import re
from datetime import datetime, timedelta
from typing import Annotated
from urllib.parse import urlsplit
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from pydantic import AfterValidator, BeforeValidator, Field

from agewatch.plant.nearest import unknown

MESSAGE_TYPES = (
    "agewatch.pull.requested",
    "agewatch.pull.changed",
    "agewatch.pull.withdrawn",
    "agewatch.coil.held",
    "agewatch.coil.released",
    "agewatch.alarm.raised",
    "agewatch.alarm.cleared",
    "agewatch.heartbeat",
)
"""What an endpoint may take."""

_DURATION = re.compile(r"\s*(\d+(?:\.\d+)?)\s*(s|min|h|d)\s*", re.ASCII)
_UNIT_S = {"s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0}
_LONGEST = timedelta(days=36_525)
_A_TIME = datetime(2026, 11, 22, 13, 14, 15)


def _duration(value: object) -> object:
    if isinstance(value, timedelta):
        return value
    match = _DURATION.fullmatch(value) if isinstance(value, str) else None
    if match is None:
        raise ValueError('allowed is a number and a unit in quotes: "30 s", "5 min", "24 h" or "14 d"')
    seconds = float(match[1]) * _UNIT_S[match[2]]
    if seconds > _LONGEST.total_seconds():
        raise ValueError("allowed is at most 100 years")
    return timedelta(seconds=seconds)


def _longer_than_nothing(value: timedelta) -> timedelta:
    if value <= timedelta(0):
        raise ValueError("allowed is more than 0 s")
    return value


def _zone(value: object) -> object:
    if not isinstance(value, str):
        raise ValueError('allowed is the name of a time zone in quotes, for example "Europe/Prague" or "UTC"')
    try:
        ZoneInfo(value)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        raise ValueError(
            f'no time zone is named "{value}"; allowed is a name such as "Europe/Prague" or "UTC"'
        ) from None
    return value


def _time(value: object) -> object:
    if not isinstance(value, str):
        return value
    try:
        return datetime.fromisoformat(value)
    except ValueError:
        raise ValueError("allowed is an RFC 3339 time, for example 2026-05-01T00:00:00Z") from None


def _encoding(value: str) -> str:
    try:
        "a,b;c\n".encode(value).decode(value)
    except (LookupError, UnicodeError):
        raise ValueError(
            f'no text encoding is named "{value}"; allowed are names such as "utf-8", "cp1250" or "latin-1"'
        ) from None
    return codecs.lookup(value).name


def _time_format(value: str) -> str:
    if not value:
        return value
    if "%Z" in value:
        raise ValueError("%Z names no offset for sure; allowed is %z, or the feed's timezone")
    try:
        back = datetime.strptime(_A_TIME.strftime(value), value)
    except ValueError as fault:
        raise ValueError(f'{fault}; allowed is a strptime pattern such as "%d.%m.%Y %H:%M:%S"') from None
    if back.date() != _A_TIME.date():
        raise ValueError(
            'it leaves the day open; allowed is a pattern with day, month and year: "%d.%m.%Y %H:%M"'
        )
    return value


def _path(value: str) -> str:
    if "\0" in value:
        raise ValueError("holds a NUL; allowed is the path of a file, or a pattern with * and ?")
    return value


def _without_password(value: str) -> str:
    if urlsplit(value).password is not None:
        raise ValueError("a password never stands in the settings; leave it out")
    return value


def _store_url(value: str) -> str:
    if urlsplit(value).scheme not in ("sqlite", "postgresql", "postgresql+psycopg"):
        raise ValueError('allowed is "sqlite:///FILE" or "postgresql+psycopg://HOST/DATABASE"')
    return value


def _receiver_url(value: str) -> str:
    parts = urlsplit(value)
    loopback = parts.hostname in ("127.0.0.1", "localhost", "::1")
    if not parts.hostname or not (parts.scheme == "https" or (parts.scheme == "http" and loopback)):
        raise ValueError("allowed is https://HOST/PATH (http:// for loopback only)")
    return value


def _message_type(value: str) -> str:
    if value not in MESSAGE_TYPES:
        raise ValueError(unknown(value, MESSAGE_TYPES, "message type"))
    return value


Duration = Annotated[timedelta, BeforeValidator(_duration)]
Interval = Annotated[timedelta, BeforeValidator(_duration), AfterValidator(_longer_than_nothing)]
TimeZone = Annotated[str, BeforeValidator(_zone)]
Time = BeforeValidator(_time)
Encoding = Annotated[str, AfterValidator(_encoding)]
TimeFormat = Annotated[str, AfterValidator(_time_format)]
Path = Annotated[str, Field(min_length=1), AfterValidator(_path)]
Name = Annotated[str, Field(min_length=1, max_length=200)]
Number = Annotated[float, Field(allow_inf_nan=False)]
Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Share = Annotated[float, Field(ge=0, le=1, allow_inf_nan=False)]
StoreUrl = Annotated[str, AfterValidator(_store_url), AfterValidator(_without_password)]
ReceiverUrl = Annotated[str, AfterValidator(_receiver_url), AfterValidator(_without_password)]
MessageType = Annotated[str, AfterValidator(_message_type)]
