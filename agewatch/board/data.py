"""What the screens know of the outside: a snapshot to show, a coil's trace, one action. No reading happens here."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol
from zoneinfo import ZoneInfo

from agewatch.alarms import Alarm
from agewatch.plant.assessment import Assessment
from agewatch.plant.trace import CoilTrace


@dataclass(frozen=True, slots=True)
class Site:
    """The plant as the board has to know it."""

    name: str
    zone: ZoneInfo
    silent_after_s: float
    """Plant time without a sign of the daemon after which it counts as stopped."""
    readings_old_after_s: float
    """Age of the newest reading from which it is shown as abnormal."""


@dataclass(frozen=True, slots=True)
class Replay:
    """The plant time of a daemon that replays the past: what `ReplayClock` needs to show the same."""

    start_s: float
    rate: float
    origin_s: float


@dataclass(frozen=True, slots=True)
class Pulse:
    """When the daemon last did what it is there for, plant time; None: never, or not told."""

    tick_s: float | None = None
    reading_s: float | None = None
    replay: Replay | None = None
    """None: the daemon goes by the computer's own clock."""


@dataclass(frozen=True, slots=True)
class Snapshot:
    """All that the board shows at one time. The very same object comes again while nothing has changed."""

    assessment: Assessment | None
    alarms: tuple[Alarm, ...]
    """Those that are not in the state normal."""
    pulse: Pulse


class BoardData(Protocol):
    """Where the board reads and acts. Every call may block: the board makes them in threads."""

    def snapshot(self) -> Snapshot:
        """The newest state; raises StoreError when the store cannot be read."""
        ...

    def trace(self, coil_id: str) -> CoilTrace | None:
        """Temperatures and YPE of a coil over time; None when it cannot be assessed. Raises StoreError."""
        ...

    def acknowledge(self, kind: str, subject: str) -> None:
        """Acknowledge an alarm; raises ControlError with a plain sentence where it is not done."""
        ...
