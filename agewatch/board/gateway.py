"""The board's way to the store, which it only reads, and to the daemon, which alone acts."""

from __future__ import annotations

from threading import Lock
from typing import Any
from zoneinfo import ZoneInfo

from agewatch.board.control import ask_daemon
from agewatch.board.data import Pulse, Replay, Site, Snapshot
from agewatch.climate.outlook import RECENT_S
from agewatch.errors import StoreError
from agewatch.plant.assess import first_leg_s
from agewatch.plant.inventory import OutlookRows
from agewatch.plant.settings import Settings
from agewatch.plant.settings_file import LoadedSettings
from agewatch.plant.trace import CoilTrace, trace_coil
from agewatch.store import Reader, View, open_reader, queries

_DAY_S = 86_400.0
_TURNS_MISSED = 3
_PATIENCE_S = 60.0
"""Real time on top of the missed turns before the daemon counts as silent."""


def site_of(settings: Settings) -> Site:
    """The plant as the board has to know it."""
    rate = settings.clock.rate if settings.clock.kind == "replay" else 1.0
    turn_s = settings.daemon.assess_every.total_seconds()
    return Site(
        name=settings.site.name,
        zone=ZoneInfo(settings.site.timezone),
        silent_after_s=_TURNS_MISSED * turn_s + rate * _PATIENCE_S,
        readings_old_after_s=settings.alarm.sensor_silent_after.total_seconds(),
    )


class GatewayToStore:
    """`BoardData` over a plant's store and its daemon's socket. Usable from several threads.

    The store is opened at the first call that needs it, and again after one that failed, so that the board may
    be there before the daemon has made the store.
    """

    def __init__(self, loaded: LoadedSettings) -> None:
        self._loaded = loaded
        self._opening = Lock()
        self._reader: Reader | None = None
        self._assessment_id: int | None = None
        self._journal_seq = -1
        self._snapshot: Snapshot | None = None
        self._outlook: tuple[int | None, OutlookRows] | None = None

    def snapshot(self) -> Snapshot:
        """The newest state; the same parts come again as the same objects. Raises StoreError."""
        reader = self._opened()
        try:
            with reader.read() as view:
                self._snapshot = self._renewed(view)
        except StoreError:
            self.close()
            raise
        return self._snapshot

    def trace(self, coil_id: str) -> CoilTrace | None:
        """Temperatures and YPE of a coil as the latest assessment sees it. Raises StoreError.

        None: there is no assessment, the coil has left the store, or it cannot be assessed.
        """
        seen = self._snapshot
        if seen is None or seen.assessment is None:
            return None
        at_s, settings = seen.assessment.at_s, self._loaded.settings
        with self._opened().read() as view:
            coil = queries.inventory(view, at_s, [coil_id])
            if not len(coil):
                return None
            places = {*coil.location.labels, *coil.move_location.labels}
            sensors = [
                sensor
                for place in places
                if place in settings.location
                for sensor in settings.location[place].sensors
            ]
            # The outlook rests on the last weeks, whenever the coil came.
            since_s = min(first_leg_s(coil, at_s), at_s - RECENT_S) - _DAY_S
            readings = queries.readings(view, since_s, sensors)
            outlook = self._outlook_of(view)
        return trace_coil(coil, readings, outlook, settings, at_s)

    def acknowledge(self, kind: str, subject: str) -> None:
        """Acknowledge an alarm. Raises ControlError with a plain sentence when that is not done."""
        socket = self._loaded.folder / self._loaded.settings.daemon.control_socket
        ask_daemon(socket, {"action": "acknowledge", "kind": kind, "subject": subject, "reason": ""})

    def close(self) -> None:
        with self._opening:
            if self._reader is not None:
                self._reader.close()
                self._reader = None

    def _opened(self) -> Reader:
        with self._opening:
            if self._reader is None:
                self._reader = open_reader(self._loaded.settings.store.url, self._loaded.folder)
            return self._reader

    def _renewed(self, view: View) -> Snapshot:
        assessment_id, journal_seq = queries.latest_assessment_id(view), queries.last_journal_seq(view)
        pulse = _pulse(queries.status(view))
        before = self._snapshot
        same_assessment = before is not None and assessment_id == self._assessment_id
        same_alarms = before is not None and journal_seq == self._journal_seq
        if before is not None and same_assessment and same_alarms and pulse == before.pulse:
            return before
        self._assessment_id, self._journal_seq = assessment_id, journal_seq
        return Snapshot(
            before.assessment if before is not None and same_assessment else queries.latest_assessment(view),
            before.alarms if before is not None and same_alarms else tuple(queries.shown_alarms(view)),
            pulse,
        )

    def _outlook_of(self, view: View) -> OutlookRows:
        """The outlook of the latest assessment: the same for every coil, so it is read once."""
        held = self._outlook
        if held is None or held[0] != self._assessment_id:
            held = self._outlook = (self._assessment_id, queries.outlook(view))
        return held[1]


def _pulse(status: dict[str, Any]) -> Pulse:
    tick, replay = status.get("tick") or {}, status.get("clock")
    return Pulse(
        tick.get("at_s"),
        tick.get("reading_s"),
        None if replay is None else Replay(replay["start_s"], replay["rate"], replay["origin_s"]),
    )
