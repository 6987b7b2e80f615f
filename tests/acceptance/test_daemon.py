"""The daemon as it runs at a plant: real processes, a real receiver, real signals."""

from __future__ import annotations

import os
import pwd
import signal
from socket import create_server
from time import monotonic

from agewatch.plant.records import MessageState
from tests.acceptance.daemons import (
    COILS,
    Receiver,
    ServiceManager,
    Works,
    all_held,
    free_port,
    get,
    held,
    terminate,
)
from tests.processes import LONG_S, agewatch

END_WITHIN_S = 10.0


def test_from_files_to_a_receiver(works: Works, receiver: Receiver) -> None:
    """The daemon reads, assesses, and tells the receiver in a message that verifies; its pages say how it is."""
    port = free_port()
    works.change("http_port = 0", f"http_port = {port}")
    process = works.start_ready()
    receiver.wait_for(all_held)
    assert held(receiver.messages) == dict.fromkeys(COILS, 1)
    assert all(message.verified for message in receiver.messages)
    assert get(port, "/livez")[0] == 200
    assert get(port, "/readyz") == (200, '{"ok": true, "troubles": []}\n')
    assert f'agewatch_coils{{verdict="hold"}} {len(COILS)}.0\n' in get(port, "/metrics")[1]
    assert terminate(process, END_WITHIN_S) == 0


def test_ends_in_time_while_a_receiver_hangs(works: Works) -> None:
    """SIGTERM ends it with status 0 in less than 10 s, though a receiver keeps an attempt waiting for longer."""
    with create_server(("127.0.0.1", 0)) as silent:
        works.change('secret_file = "secret"', 'secret_file = "secret"\nread_timeout = "60 s"')
        works.change(
            works.config.read_text().split('url = "')[1].split('"')[0],
            f"http://127.0.0.1:{silent.getsockname()[1]}/",
        )
        process = works.start_ready()
        silent.settimeout(LONG_S)
        connection, _ = silent.accept()
        with connection:
            began_s = monotonic()
            assert terminate(process, LONG_S) == 0
            assert monotonic() - began_s < END_WITHIN_S
    assert not (works.folder / "agewatch.sock").exists()
    assert {message.state for message in works.outbox()} == {MessageState.WAITING}
    with works.database() as database:
        assert database.execute("PRAGMA integrity_check").fetchone() == ("ok",)


def test_ends_in_time_in_its_first_round(works: Works) -> None:
    """SIGTERM before it is ready ends it just as cleanly."""
    process = works.start()
    while not (works.folder / "agewatch.sock").exists():
        assert process.poll() is None
    assert terminate(process, END_WITHIN_S) == 0


def test_killed_and_started_again(works: Works, receiver: Receiver) -> None:
    """After SIGKILL at the first message every coil is told of under one id: none is lost, none doubled."""
    works.change('path = "coils*.csv"', 'path = "coils*.csv"\nevery = "2 min"')
    process = works.start_ready()
    receiver.wait_for(lambda messages: len(messages) > 0)
    process.kill()
    assert process.wait(LONG_S) == -signal.SIGKILL
    again = works.start_ready()
    receiver.wait_for(all_held)
    assert terminate(again, END_WITHIN_S) == 0
    assert held(receiver.messages) == dict.fromkeys(COILS, 1)
    sent = {message.message_id for message in works.outbox()}
    assert {message.id for message in receiver.messages} <= sent


def test_killed_while_the_receiver_is_away(works: Works, receiver: Receiver) -> None:
    """What waits for a receiver that is away outlasts SIGKILL, and arrives under the ids that it had."""
    receiver.end()
    process = works.start_ready()
    waiting = {message.message_id for message in works.outbox()}
    process.kill()
    process.wait(LONG_S)
    receiver.come_back()
    again = works.start_ready()
    assert waiting
    receiver.wait_for(lambda messages: waiting <= {message.id for message in messages})
    assert terminate(again, END_WITHIN_S) == 0
    assert held(receiver.messages) == dict.fromkeys(COILS, 1)


def test_acknowledge_by_the_socket(works: Works) -> None:
    """An acknowledgement is kept under the name of the user who connected, whatever the request claims."""
    process = works.start_ready()
    request = {"action": "acknowledge", "kind": "returned-in-store", "subject": COILS[0]}
    reply = works.ask({**request, "reason": "seen", "actor": "user:mallory"})
    assert reply == {"ok": True, "said": f"returned-in-store of {COILS[0]} is acknowledged"}
    assert not works.ask(request)["ok"]
    assert terminate(process, END_WITHIN_S) == 0
    me = f"user:{pwd.getpwuid(os.getuid()).pw_name}"
    told = [(row.kind, row.subject, row.after) for row in works.journal() if row.actor == me]
    assert told == [("request-refused", "acknowledge", ""), ("returned-in-store", COILS[0], "acknowledged")]


def test_second_daemon_is_refused(works: Works, receiver: Receiver) -> None:
    """A second daemon on the same store ends with status 3 and says who has it; the first goes on."""
    process = works.start_ready()
    second = agewatch("run", "--config", str(works.config))
    assert second.returncode == 3
    assert f"another agewatch daemon (pid {process.pid})" in second.stderr.splitlines()[-1]
    receiver.wait_for(all_held)
    assert process.poll() is None
    assert terminate(process, END_WITHIN_S) == 0


def test_store_that_cannot_be_written_ends_it(works: Works) -> None:
    """When neither a turn nor the alarm about it can be kept, the daemon ends with status 3 and says why."""
    process = works.start_ready()
    with works.database() as database:
        for table in ("assessment", "alarm"):
            database.execute(
                f"CREATE TRIGGER no_{table} BEFORE INSERT ON {table} BEGIN SELECT RAISE(ABORT, 'worn out'); END"
            )
    assert process.wait(LONG_S) == 3
    assert any("worn out" in line["said"] for line in works.log())


def test_service_manager_hears_of_it(works: Works) -> None:
    """The service manager is told ready, then alive again and again, then stopping."""
    with ServiceManager(works.folder / "manager.sock") as manager:
        process = works.start(NOTIFY_SOCKET=str(manager.path), WATCHDOG_USEC="1000000")
        assert manager.next() == b"READY=1"
        assert [manager.next(), manager.next()] == [b"WATCHDOG=1", b"WATCHDOG=1"]
        assert terminate(process, END_WITHIN_S) == 0
        said = {manager.next()}
        while b"STOPPING=1" not in said:
            said.add(manager.next())
        assert said <= {b"WATCHDOG=1", b"STOPPING=1"}
