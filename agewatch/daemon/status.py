"""What the daemon leaves in the store for others to see how it is: typed, one JSON value for each key."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

from agewatch.store import Transaction, View, queries, writes

_TICK = "tick"
_REPLAY = "clock"


@dataclass(frozen=True, slots=True)
class FeedStatus:
    """What is known of a feed; times in plant time."""

    last_new_s: float | None = None
    trouble: str = ""
    """Why it cannot be read; "" when it can."""


@dataclass(frozen=True, slots=True)
class Tick:
    """The last turn of the cycle, plant time."""

    at_s: float
    reading_s: float | None
    """Of the newest temperature; None: there is none."""


@dataclass(frozen=True, slots=True)
class Replay:
    """What another process on this computer needs to show the plant time of a daemon that replays the past."""

    start_s: float
    rate: float
    origin_s: float
    """The computer's monotonic clock at `start_s`."""


def feed_status(view: View, feed: str) -> FeedStatus:
    value: Any = queries.status(view).get(_feed_key(feed))
    return FeedStatus() if value is None else FeedStatus(**value)


def put_feed_status(tx: Transaction, feed: str, status: FeedStatus, now_s: float) -> None:
    writes.put_status(tx, _feed_key(feed), asdict(status), now_s)


def last_tick(view: View) -> Tick | None:
    """The last turn; None: there was none yet."""
    value: Any = queries.status(view).get(_TICK)
    return None if value is None else Tick(**value)


def put_tick(tx: Transaction, tick: Tick) -> None:
    writes.put_status(tx, _TICK, asdict(tick), tick.at_s)


def put_replay(tx: Transaction, replay: Replay | None, now_s: float) -> None:
    """None: the daemon goes by the computer's own clock."""
    writes.put_status(tx, _REPLAY, None if replay is None else asdict(replay), now_s)


def _feed_key(feed: str) -> str:
    return f"feed {feed}"
