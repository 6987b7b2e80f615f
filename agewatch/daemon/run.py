"""The daemon as a process: it answers to the service manager and to signals, and ends cleanly."""

from __future__ import annotations

import logging
from time import monotonic

from agewatch.daemon.daemon import Daemon
from agewatch.daemon.notify import ALIVE, READY, STOPPING, Notify
from agewatch.daemon.signals import EndingSignals

LOOK_EVERY_S = 0.25

_log = logging.getLogger(__name__)


def run(daemon: Daemon, notify: Notify, signals: EndingSignals) -> None:
    """Run until a signal asks for the end, or until the store fails for good; then StoreError is raised."""
    daemon.start()
    try:
        _serve(daemon, notify, signals)
    finally:
        notify.tell(STOPPING)
        daemon.stop()
    _log.info("ended")
    if daemon.fatal is not None:
        raise daemon.fatal


def _serve(daemon: Daemon, notify: Notify, signals: EndingSignals) -> None:
    told_ready, told_alive_s = False, monotonic()
    while daemon.fatal is None and not signals.wait(LOOK_EVERY_S):
        if daemon.ready and not told_ready:
            notify.tell(READY)
            told_ready = True
            _log.info("ready")
        due = notify.alive_every_s and monotonic() - told_alive_s >= notify.alive_every_s - LOOK_EVERY_S
        if told_ready and due:
            told_alive_s = monotonic()
            if stuck := daemon.stuck():
                _log.error("not well: %s", "; ".join(stuck))
            else:
                notify.tell(ALIVE)
