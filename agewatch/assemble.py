"""The only place that constructs the parts and connects them."""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from random import Random
from tempfile import TemporaryDirectory
from typing import TYPE_CHECKING

from agewatch.board.control import ask_daemon
from agewatch.clock import Clock, ReplayClock, StoppedClock, SystemClock, rfc3339
from agewatch.daemon.actions import answer
from agewatch.daemon.control import Reply, Request, is_listening
from agewatch.daemon.cycle import assess_store
from agewatch.daemon.daemon import Daemon, Surroundings
from agewatch.daemon.delivering import Receiver
from agewatch.daemon.desk import Desk
from agewatch.daemon.feeds import FeedReading, past_until_s, read_feeds
from agewatch.daemon.peers import own_actor
from agewatch.daemon.status import last_tick
from agewatch.errors import ControlError
from agewatch.messages import signing_secret
from agewatch.plant.assessment import Assessment
from agewatch.plant.settings import Settings
from agewatch.plant.settings_file import LoadedSettings, load_settings
from agewatch.store import Store, View, open_store, sqlite_version, writes

if TYPE_CHECKING:
    from agewatch.board.app import BoardApp
    from agewatch.messages.sink import Show, Sink

Ask = Callable[[Request], Reply]
"""Puts one request."""

_log = logging.getLogger(__name__)


@dataclass(frozen=True, slots=True)
class AssessedOnce:
    """An assessment, and what the feeds brought for it."""

    readings: Sequence[FeedReading]
    assessment: Assessment


def open_plant(config: Path) -> LoadedSettings:
    """The settings of a plant. Raises SettingsError with every fault that they have."""
    return load_settings(config)


def clock_of(settings: Settings, not_before_s: float = 0.0) -> Clock:
    """Plant time. `not_before_s`: where an earlier replay on the same store ended; a new one goes on from there."""
    if settings.clock.start is None or settings.clock.kind == "system":
        return SystemClock()
    return ReplayClock(max(settings.clock.start.timestamp(), not_before_s), settings.clock.rate)


def assess_once(loaded: LoadedSettings, at_s: float | None, *, in_store: bool) -> AssessedOnce:
    """Read every feed and assess once at `at_s` (s; None: now), in a scratch store or in the plant's own.

    Raises StoreError.
    """
    settings = loaded.settings
    if in_store:
        with open_store(settings.store.url, loaded.folder) as store:
            return _assess_in(store, loaded, _now_s(settings, store), keep=True)
    at_s = clock_of(settings).now_s() if at_s is None else at_s
    with (
        TemporaryDirectory(prefix="agewatch-") as scratch,
        open_store("sqlite:///scratch.db", Path(scratch)) as store,
    ):
        return _assess_in(store, loaded, at_s, keep=False)


def build_daemon(loaded: LoadedSettings, environment: Mapping[str, str]) -> Daemon:
    """The daemon with its store, open for writing, and its receivers, each with its secret.

    Raises StoreError where another daemon has the store, SettingsError where a secret is missing.
    """
    settings, folder = loaded.settings, loaded.folder
    receivers = [
        Receiver(endpoint, signing_secret(endpoint, folder, environment), folder)
        for endpoint in settings.endpoint
    ]
    store = open_store(settings.store.url, folder)
    try:
        with store.read() as view:
            clock = clock_of(settings, not_before_s=_last_s(view))
        chance = Random()  # noqa: S311 - spreads retries, keeps no secret
        daemon = Daemon(loaded, store, Surroundings(clock, SystemClock(), chance, receivers))
    except BaseException:
        store.close()
        raise
    _log.info("%s: store %s (SQLite %s)", settings.site.name, store.path, sqlite_version())
    _log.info("settings %s; plant time %s", loaded.digest[:12], rfc3339(clock.now_s()))
    return daemon


@contextmanager
def open_desk(loaded: LoadedSettings) -> Iterator[Ask]:
    """Where requests can be put: to the running daemon, or to the store itself where none runs.

    Raises ControlError and StoreError.
    """
    settings, folder = loaded.settings, loaded.folder
    socket_path = folder / settings.daemon.control_socket
    if is_listening(socket_path):
        yield lambda request: _asked(socket_path, request)
        return
    with open_store(settings.store.url, folder) as store:
        desk = Desk(store, settings, StoppedClock(_now_s(settings, store)))
        yield lambda request: answer(desk, request, own_actor())


def build_board(loaded: LoadedSettings) -> BoardApp:
    """The supervisor's screen over the plant's store and daemon, neither of which has to be there yet."""
    from agewatch.board.app import BoardApp  # noqa: PLC0415 - the daemon does without the screen library
    from agewatch.board.gateway import GatewayToStore, site_of  # noqa: PLC0415

    return BoardApp(GatewayToStore(loaded), clock_of(loaded.settings), site_of(loaded.settings))


def build_sink(secrets: Sequence[str], port: int, show: Show) -> Sink:
    """A receiver for trials on loopback, bound at once; port 0 takes a free one."""
    from agewatch.messages.sink import Sink  # noqa: PLC0415 - only who receives needs a server

    return Sink(secrets, SystemClock(), show, port=port)


def _asked(socket_path: Path, request: Request) -> Reply:
    try:
        return Reply(True, ask_daemon(socket_path, request))
    except ControlError as error:
        return Reply(False, str(error))


def _assess_in(store: Store, loaded: LoadedSettings, at_s: float, *, keep: bool) -> AssessedOnce:
    until_s = max(at_s, past_until_s(clock_of(loaded.settings)))
    readings = read_feeds(store, loaded.settings.feed, loaded.folder, StoppedClock(at_s), until_s)
    with store.read() as view:
        assessment, _ = assess_store(view, loaded.settings, loaded.digest, at_s)
    if keep:
        with store.write() as tx:
            writes.put_assessment(tx, assessment)
    return AssessedOnce(readings, assessment)


def _now_s(settings: Settings, store: Store) -> float:
    with store.read() as view:
        return clock_of(settings, not_before_s=_last_s(view)).now_s()


def _last_s(view: View) -> float:
    tick = last_tick(view)
    return 0.0 if tick is None else tick.at_s
