"""What systemd is told of a service of Type=notify: ready, alive, stopping. Silent where nobody asks."""

from __future__ import annotations

import logging
import socket
from collections.abc import Mapping

READY = "READY=1"
ALIVE = "WATCHDOG=1"
STOPPING = "STOPPING=1"

_log = logging.getLogger(__name__)


class Notify:
    """Sends to the socket that $NOTIFY_SOCKET names."""

    def __init__(self, environment: Mapping[str, str]) -> None:
        address = environment.get("NOTIFY_SOCKET", "")
        self._address = "\0" + address[1:] if address.startswith("@") else address
        self.alive_every_s = int(environment.get("WATCHDOG_USEC", "0")) / 2e6
        """How often `ALIVE` is to be sent: half of what systemd waits for; 0: it does not wait."""

    def tell(self, state: str) -> None:
        """A service manager that cannot be reached is no reason to stop: it is logged."""
        if not self._address:
            return
        try:
            with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM | socket.SOCK_CLOEXEC) as sender:
                sender.sendto(state.encode("ascii"), self._address)
        except OSError as fault:
            _log.warning("the service manager could not be told %s: %s", state, fault)
