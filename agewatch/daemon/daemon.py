"""The daemon as one thing: its jobs, workers, pages and socket, begun and ended together."""

from __future__ import annotations

import logging
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from random import Random
from threading import Event, Thread
from time import monotonic

from agewatch import __version__
from agewatch.alarms import AGEWATCH, Cleared, Raised
from agewatch.clock import Clock, ReplayClock
from agewatch.daemon.actions import answer
from agewatch.daemon.control import ControlSocket, Reply, Request
from agewatch.daemon.cycle import Turn, take_turn
from agewatch.daemon.delivering import Deliverer, Receiver
from agewatch.daemon.desk import Desk
from agewatch.daemon.feeds import past_until_s, take_in
from agewatch.daemon.health import Health
from agewatch.daemon.housekeeping import HOUSEKEEPING_EVERY, keep_house
from agewatch.daemon.loops import Progress
from agewatch.daemon.metrics import Metrics
from agewatch.daemon.schedule import Schedule
from agewatch.daemon.status import Replay, put_replay
from agewatch.daemon.trouble import StoreTrouble
from agewatch.errors import StoreError
from agewatch.plant.assess import MODEL
from agewatch.plant.records import JournalRow
from agewatch.plant.settings import Feed
from agewatch.plant.settings_file import LoadedSettings
from agewatch.store import Store, writes

END_WITHIN_S = 8.0
"""Real seconds that the work under way is given at the end."""
SENT_WITHIN_S = 3.0
"""Of these, what an attempt to deliver is given: it would be made again anyway, under the same id."""
ASSESS = "assess"

_log = logging.getLogger(__name__)


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What the daemon is given from outside."""

    clock: Clock
    world: Clock
    """The time that receivers go by."""
    chance: Random
    receivers: Sequence[Receiver]


class Daemon:
    """Begins with `start`, which returns at once, and ends with `stop`."""

    def __init__(self, loaded: LoadedSettings, store: Store, around: Surroundings) -> None:
        """Bind socket and port at once. Raises ControlError and SettingsError where they are taken."""
        self._settings, self._folder, self._digest = loaded.settings, loaded.folder, loaded.digest
        self._store = store
        self._clock = around.clock
        self._trouble = StoreTrouble(store, self._settings, self._clock)
        self._metrics = Metrics(self.progress)
        self._stopping = Event()
        self._assessed = Event()
        self._schedule = Schedule(self._clock, self._failed)
        self._first_round = Thread(target=self._begin, name="first round", daemon=True)
        self._deliverers = [self._deliverer(receiver, around) for receiver in around.receivers]
        self._desk = Desk(store, self._settings, self._clock)
        self._add_jobs()
        daemon = self._settings.daemon
        pages = (self.stuck, self.unready, self._metrics.registry)
        self._health = Health(daemon.http_port, *pages) if daemon.http_port else None
        self._control = ControlSocket(self._folder / daemon.control_socket, self._answer, self._refuse)

    @property
    def fatal(self) -> StoreError | None:
        """Why the daemon cannot go on; None: it can."""
        return self._trouble.fatal

    @property
    def ready(self) -> bool:
        """Every feed was looked at, and the store was assessed."""
        return self._assessed.is_set()

    def start(self) -> None:
        """Begin: all feeds once, one assessment, then everything at its pace."""
        self._note_start()
        self._control.start()
        if self._health is not None:
            self._health.start()
        self._first_round.start()

    def stop(self) -> None:
        """End: begin nothing more, let what is under way finish, and close the store."""
        until_s, sent_until_s = monotonic() + END_WITHIN_S, monotonic() + SENT_WITHIN_S
        self._stopping.set()
        for deliverer in self._deliverers:
            deliverer.stop()
        self._control.stop()
        if self._first_round.is_alive():
            self._first_round.join(until_s - monotonic())
        left = [*self._schedule.stop(until_s - monotonic())]
        left += [each.loop.name for each in self._deliverers if not each.wait(sent_until_s - monotonic())]
        if self._health is not None:
            self._health.stop()
        if left or self._first_round.is_alive():
            _log.warning("ended without waiting any longer for: %s", ", ".join(left) or "the first round")
        else:
            self._store.close()

    def progress(self) -> list[Progress]:
        """Of every loop."""
        return [*self._schedule.progress(), *(each.loop.progress() for each in self._deliverers)]

    def stuck(self) -> list[str]:
        """Loops that show no progress any more."""
        return [
            f"{loop.name} has given no sign for {loop.quiet_s:.0f} s"
            for loop in self.progress()
            if loop.stuck
        ]

    def unready(self) -> list[str]:
        """Why the daemon's figures are not to be relied on at present."""
        if not self.ready:
            return ["the first assessment is still to come"]
        failing = [f"{loop.name}: {loop.last_error}" for loop in self.progress() if loop.last_error]
        return failing + self.stuck()

    def _add_jobs(self) -> None:
        for feed in self._settings.feed:
            self._schedule.add(f"read {feed.name}", feed.every, partial(self._read, feed))
        self._schedule.add(ASSESS, self._settings.daemon.assess_every, self._take_turn)
        self._schedule.add("keep house", HOUSEKEEPING_EVERY, self._keep_house)

    def _begin(self) -> None:
        for name in self._schedule.names():
            if self._stopping.is_set():
                return
            self._schedule.do_now(name)
        if self._stopping.is_set():
            return
        self._schedule.start()
        for deliverer in self._deliverers:
            deliverer.start()

    def _read(self, feed: Feed) -> None:
        reading = take_in(self._store, feed, self._folder, self._clock, past_until_s(self._clock))
        self._metrics.took_in(feed.name, reading.put, reading.rejects)
        self._metrics.looked_at(feed.name, readable=not reading.trouble)

    def _take_turn(self) -> None:
        began_s = monotonic()
        turn = take_turn(self._store, self._settings, self._digest, self._clock.now_s)
        took_s = monotonic() - began_s
        self._metrics.assessed(turn.assessment, turn.alarms, took_s)
        self._assessed.set()
        if turn.messages:
            self._wake()
        _tell(turn, took_s)

    def _keep_house(self) -> None:
        if keep_house(self._store, self._settings, self._clock.now_s()):
            self._wake()

    def _wake(self) -> None:
        for deliverer in self._deliverers:
            deliverer.wake()

    def _answer(self, request: Request, actor: str) -> Reply:
        return self._replied(lambda: answer(self._desk, request, actor))

    def _refuse(self, actor: str, reason: str) -> Reply:
        return self._replied(lambda: self._desk.refuse({}, actor, reason))

    def _replied(self, work: Callable[[], Reply]) -> Reply:
        try:
            return work()
        except StoreError as error:
            self._failed("request", error, again=False)
            return Reply(False, str(error))

    def _failed(self, loop: str, error: Exception, again: bool) -> None:
        level = logging.DEBUG if again else logging.ERROR  # a fault that stays is told once
        _log.log(level, "%s failed: %s: %s", loop, type(error).__name__, error, exc_info=error)
        if isinstance(error, StoreError):
            self._trouble.told(error)

    def _deliverer(self, receiver: Receiver, around: Surroundings) -> Deliverer:
        return Deliverer(
            self._store,
            receiver,
            around.clock,
            around.world,
            around.chance.random,
            self._failed,
            self._metrics.attempted,
        )

    def _note_start(self) -> None:
        clock, now_s = self._clock, self._clock.now_s()
        replay = Replay(clock.start_s, clock.rate, clock.origin_s) if isinstance(clock, ReplayClock) else None
        detail = {"version": __version__, "model": MODEL, "settings_digest": self._digest}
        row = JournalRow(now_s, "daemon", "started", self._settings.site.name, AGEWATCH, "", "", "", detail)
        with self._store.write() as tx:
            put_replay(tx, replay, now_s)
            writes.append_journal(tx, [row])


def _tell(turn: Turn, took_s: float) -> None:
    """One line for a turn that brought news."""
    if turn.effects:
        raised, cleared = (sum(isinstance(each, kind) for each in turn.effects) for kind in (Raised, Cleared))
        _log.info(
            "assessed %d coils in %.2f s: %d alarms raised, %d cleared, %d messages",
            len(turn.assessment),
            took_s,
            raised,
            cleared,
            turn.messages,
        )
