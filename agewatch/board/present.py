"""What the board knows at present: the one state that the app renews and its screens show."""

from __future__ import annotations

from dataclasses import dataclass

from agewatch.board.data import BoardData, Site, Snapshot
from agewatch.clock import Clock, ReplayClock


@dataclass(slots=True)
class Present:
    """Written by the app's own loop only; `unread` says why the last try to read failed, None when it did not."""

    data: BoardData
    clock: Clock
    site: Site
    snapshot: Snapshot | None = None
    unread: str | None = None

    def now_s(self) -> float:
        """Plant time: the daemon's own where it replays the past, however late it was started."""
        replay = self.snapshot.pulse.replay if self.snapshot is not None else None
        if replay is None:
            return self.clock.now_s()
        return ReplayClock(replay.start_s, replay.rate, replay.origin_s).now_s()
