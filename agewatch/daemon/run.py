"""The daemon as a process: it answers to the service manager and to signals, and ends cleanly."""

from __future__ import annotations

import logging
import signal
from time import monotonic

from agewatch.daemon.daemon import Daemon
from agewatch.daemon.notify import ALIVE, READY, STOPPING, Notify

LOOK_EVERY_S = 0.5
SIGNALS = frozenset({signal.SIGTERM, signal.SIGINT})

_log = logging.getLogger(__name__)


def run(daemon: Daemon, notify: Notify) -> None:
    """Run until a signal asks for the end, or until the store fails for good; then StoreError is raised.

    Signals are waited for, not handled: no handler ever runs in the middle of something else.
    """
    signal.pthread_sigmask(signal.SIG_BLOCK, SIGNALS)
    daemon.start()
    _serve(daemon, notify)
    notify.tell(STOPPING)
    daemon.stop()
    _log.info("ended")
    if daemon.fatal is not None:
        raise daemon.fatal


def _serve(daemon: Daemon, notify: Notify) -> None:
    told_ready, told_alive_s = False, monotonic()
    while daemon.fatal is None:
        if signal.sigtimedwait(SIGNALS, LOOK_EVERY_S) is not None:
            return
        if daemon.ready and not told_ready:
            notify.tell(READY)
            told_ready = True
            _log.info("ready")
        if notify.alive_every_s and monotonic() - told_alive_s >= notify.alive_every_s - LOOK_EVERY_S:
            stuck = daemon.stuck()
            if stuck:
                _log.error("not well: %s", "; ".join(stuck))
            else:
                notify.tell(ALIVE)
                told_alive_s = monotonic()
