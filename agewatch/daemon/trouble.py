"""What happens when the store fails: it is alarmed in the store itself, and if that fails too the daemon ends."""

from __future__ import annotations

import logging

from agewatch.alarms import Alarm, AlarmKind, advance_all
from agewatch.alarms.system_rules import system_condition
from agewatch.clock import Clock
from agewatch.daemon.conditions import STORE
from agewatch.daemon.cycle import record, timing_of
from agewatch.errors import StoreError
from agewatch.plant.settings import Settings
from agewatch.store import Store, queries

_log = logging.getLogger(__name__)


class StoreTrouble:
    """Told of every failure of the store. A later turn of the cycle that can be kept clears the alarm."""

    def __init__(self, store: Store, settings: Settings, clock: Clock) -> None:
        self._store = store
        self._settings = settings
        self._clock = clock
        self.fatal: StoreError | None = None
        """The failure that could not even be recorded."""

    def told(self, error: StoreError) -> None:
        try:
            self._record(error)
        except StoreError as second:
            self.fatal = self.fatal or second
            _log.error("the daemon ends, for nothing can be kept any more: %s", second)

    def _record(self, error: StoreError) -> None:
        now_s = self._clock.now_s()
        seen = system_condition(AlarmKind.STORE_TROUBLE, STORE, now_s, active=True, reason=str(error))
        with self._store.write() as tx:
            before: dict[tuple[AlarmKind, str], Alarm] = {alarm.key: alarm for alarm in queries.alarms(tx)}
            changed, effects = advance_all(before, [seen], timing_of(self._settings.alarm))
            record(tx, changed, effects, self._settings, now_s)
