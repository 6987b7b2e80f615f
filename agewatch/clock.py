"""The clock: the one place that asks what time it is. Everything else is handed a `Clock`."""

from __future__ import annotations

import time
from datetime import UTC, datetime
from typing import Protocol


class Clock(Protocol):
    """Plant time. `rate` is plant seconds per real second (1 for the system clock)."""

    @property
    def rate(self) -> float: ...

    def now_s(self) -> float:
        """Plant time, seconds since 1970-01-01T00:00:00Z."""
        ...


class SystemClock:
    """The computer's own clock."""

    rate = 1.0

    def now_s(self) -> float:
        return time.time()  # noqa: TID251 - this module is the clock


class ReplayClock:
    """Plant time that starts at `start_s` and runs `rate` times as fast as real time.

    origin_s: what this computer's monotonic clock showed at `start_s`; None: it starts now. Two processes with
    the same three numbers show the same time.
    """

    def __init__(self, start_s: float, rate: float, origin_s: float | None = None) -> None:
        self.rate = rate
        self.start_s = start_s
        self.origin_s = time.monotonic() if origin_s is None else origin_s

    def now_s(self) -> float:
        return self.start_s + self.rate * (time.monotonic() - self.origin_s)


class StoppedClock:
    """Plant time that moves only when it is told to: for `assess --at` and for tests."""

    rate = 1.0

    def __init__(self, at_s: float) -> None:
        self._at_s = at_s

    def now_s(self) -> float:
        return self._at_s

    def move_to(self, at_s: float) -> None:
        self._at_s = at_s


def rfc3339(at_s: float) -> str:
    """`at_s` (seconds since 1970, UTC) as RFC 3339 with milliseconds and `Z`."""
    seconds, milliseconds = divmod(round(at_s * 1000), 1000)
    return f"{datetime.fromtimestamp(seconds, UTC):%Y-%m-%dT%H:%M:%S}.{milliseconds:03d}Z"
