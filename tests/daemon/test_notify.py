"""What the service manager is told."""

from __future__ import annotations

import socket
from pathlib import Path

import pytest

from agewatch.daemon.notify import READY, Notify


@pytest.mark.parametrize("abstract", [False, True], ids=["file", "abstract"])
def test_state_arrives(tmp_path: Path, abstract: bool) -> None:
    """A state is sent as one datagram to the socket that the environment names, in a file or abstract."""
    name = f"agewatch-test-{tmp_path.name}" if abstract else str(tmp_path / "notify.sock")
    with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM) as manager:
        manager.settimeout(10.0)
        manager.bind(f"\0{name}" if abstract else name)
        Notify({"NOTIFY_SOCKET": f"@{name}" if abstract else name}).tell(READY)
        assert manager.recv(100) == b"READY=1"


def test_silent_where_nobody_asks() -> None:
    """Without a service manager nothing is sent and nothing has to be told again."""
    notify = Notify({})
    notify.tell(READY)
    assert notify.alive_every_s == 0.0


def test_manager_that_is_gone_stops_nothing(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    """A service manager that cannot be reached is logged, and nothing else happens."""
    Notify({"NOTIFY_SOCKET": str(tmp_path / "gone.sock")}).tell(READY)
    assert "could not be told READY=1" in caplog.text


def test_alive_twice_as_often_as_is_waited_for() -> None:
    """The sign of life is due at half of the time that the service manager waits."""
    assert Notify({"WATCHDOG_USEC": "30000000"}).alive_every_s == 15.0
