"""The gateway over a real store on disk and a real control socket."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from threading import Thread

import numpy as np
import pytest

from agewatch.alarms import AlarmState
from agewatch.board.data import Pulse, Replay
from agewatch.board.gateway import GatewayToStore, site_of
from agewatch.daemon.control import ControlSocket, Reply, Request
from agewatch.errors import ControlError, StoreError
from agewatch.plant.assess import assess
from agewatch.plant.assessment import Assessment
from agewatch.plant.records import JournalRow
from agewatch.plant.settings_file import LoadedSettings, load_settings
from agewatch.plant.tables import COILS
from agewatch.store import Store, open_store, queries, writes
from tests.board.plant import ALARMS, DAY_S, NOW_S

SETTINGS = """
[site]
name = "Invented press shop"
timezone = "Europe/Prague"
[store]
url = "sqlite:///plant.db"
[location.BAY-1]
sensors = ["T1"]
[location.BAY-2]
sensors = ["T2"]
[grade.DC04]
rp02_mpa = 175.0
rm_mpa = 300.0
n_value = 0.21
rise_saturation_spread = 0.0
[grade.DC04.channel.carbon]
tau_days = 120.0
tau_spread = 0.0
[part.hood]
ype_limit_pct = 0.2
exposed = true
[daemon]
control_socket = "s"
"""


@pytest.fixture
def loaded(tmp_path: Path) -> LoadedSettings:
    (tmp_path / "plant.toml").write_text(SETTINGS, encoding="utf-8")
    return load_settings(tmp_path / "plant.toml")


@pytest.fixture
def store(loaded: LoadedSettings) -> Iterator[Store]:
    """The daemon's side: three coils, one of a grade that nobody knows, and forty days of readings."""
    with open_store(loaded.settings.store.url, loaded.folder) as opened:
        with opened.write() as tx:
            writes.put_rows(tx, "coils", [_coil("C1"), _coil("C2", location="BAY-2"), _coil("C3", grade="X9")],
                            feed="coils", now_s=NOW_S)  # fmt: skip
            hours_s = np.arange(NOW_S - 40 * DAY_S, NOW_S, 3600.0)
            readings = [
                (float(at_s), name, c) for name, c in (("T1", 21.0), ("T2", 33.0)) for at_s in hours_s
            ]
            writes.put_rows(tx, "temperatures", readings, feed="temperatures", now_s=NOW_S)
        yield opened


def _coil(coil_id: str, **given: str) -> tuple[object, ...]:
    values: dict[str, object] = {
        "coil_id": coil_id, "grade": "DC04", "temper_rolled_at": NOW_S - 20 * DAY_S,
        "location": "BAY-1", "part": "hood", "press_at": NOW_S + 9 * DAY_S,
    } | given  # fmt: skip
    return tuple(values.get(name) for name in COILS.column_names)


def _assess(store: Store, loaded: LoadedSettings, at_s: float = NOW_S) -> Assessment:
    with store.write() as tx:
        made = assess(
            queries.inventory(tx, at_s),
            queries.readings(tx),
            queries.outlook(tx),
            loaded.settings,
            loaded.digest,
            at_s,
        )
        writes.put_assessment(tx, made)
    return made


def _tick(store: Store, at_s: float) -> None:
    with store.write() as tx:
        writes.put_status(tx, "tick", {"at_s": at_s, "reading_s": at_s - 600.0}, at_s)


def test_before_the_daemon_has_made_the_store_that_is_said_and_later_it_is_there(
    loaded: LoadedSettings,
) -> None:
    """The board may be started first."""
    gateway = GatewayToStore(loaded)
    with pytest.raises(StoreError, match="none is there"):
        gateway.snapshot()
    with open_store(loaded.settings.store.url, loaded.folder):
        seen = gateway.snapshot()
    assert (seen.assessment, seen.alarms, seen.pulse) == (None, (), Pulse())
    gateway.close()


def test_a_snapshot_is_the_very_same_while_nothing_changes(store: Store, loaded: LoadedSettings) -> None:
    """Not to be read, packed out and drawn again at every look; what did not change stays the same object."""
    made = _assess(store, loaded)
    _tick(store, NOW_S)
    gateway = GatewayToStore(loaded)
    first = gateway.snapshot()
    assert first.assessment is not None
    assert first.assessment.coil_id.tolist() == made.coil_id.tolist()
    assert first.pulse == Pulse(NOW_S, NOW_S - 600.0, None)
    assert gateway.snapshot() is first
    _tick(store, NOW_S + 60.0)
    ticked = gateway.snapshot()
    assert ticked is not first
    assert (ticked.assessment is first.assessment, ticked.alarms is first.alarms) == (True, True)
    _assess(store, loaded, NOW_S + 60.0)
    assert gateway.snapshot().assessment is not first.assessment
    gateway.close()


def test_alarms_come_anew_when_the_journal_has_grown(store: Store, loaded: LoadedSettings) -> None:
    """Those that people have to see; one that is only waiting out its delay is not among them."""
    gateway = GatewayToStore(loaded)
    assert gateway.snapshot().alarms == ()
    waiting = replace(ALARMS[3], state=AlarmState.NORMAL)
    with store.write() as tx:
        writes.put_alarms(tx, [ALARMS[0], waiting])
        writes.append_journal(
            tx, [JournalRow(NOW_S, "alarm", "returned-in-store", "C1001", "agewatch", "normal", "x", "", {})]
        )
    assert [each.key for each in gateway.snapshot().alarms] == [ALARMS[0].key]
    gateway.close()


def test_a_trace_agrees_with_the_assessment_that_the_board_shows(
    store: Store, loaded: LoadedSettings
) -> None:
    """At that time the middle curve has the coil's YPE within a line's width, the other its temperature."""
    made = _assess(store, loaded)
    gateway = GatewayToStore(loaded)
    gateway.snapshot()
    for row, coil_id in enumerate(("C1", "C2")):
        trace = gateway.trace(coil_id)
        assert trace is not None
        assert trace.now_s == NOW_S
        assert np.interp(NOW_S, trace.at_s, trace.ype_p50_pct) == pytest.approx(made.ype_pct[row], rel=0.05)
        assert np.interp(NOW_S, trace.at_s, trace.coil_c) == pytest.approx(made.coil_temp_c[row], abs=0.05)
    gateway.close()


def test_a_coil_without_a_curve_is_none_and_no_fault(store: Store, loaded: LoadedSettings) -> None:
    """No assessment yet, a grade that nobody knows, a coil that has left."""
    gateway = GatewayToStore(loaded)
    gateway.snapshot()
    assert gateway.trace("C1") is None
    _assess(store, loaded)
    gateway.snapshot()
    assert gateway.trace("C3") is None
    assert gateway.trace("gone") is None
    gateway.close()


def test_curves_and_snapshots_can_be_read_at_the_same_time(store: Store, loaded: LoadedSettings) -> None:
    """The board reads both from threads of their own."""
    _assess(store, loaded)
    gateway = GatewayToStore(loaded)
    gateway.snapshot()
    traces: list[object] = []
    threads = [Thread(target=lambda: traces.append(gateway.trace("C1"))) for _ in range(4)]
    threads += [Thread(target=gateway.snapshot) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(20.0)
    assert len(traces) == 4
    assert None not in traces
    gateway.close()


def test_the_time_of_a_replay_is_passed_on(store: Store, loaded: LoadedSettings) -> None:
    """A board beside a daemon that replays the past shows the daemon's time."""
    with store.write() as tx:
        writes.put_status(tx, "clock", {"start_s": 5.0, "rate": 600.0, "origin_s": 7.0}, NOW_S)
    gateway = GatewayToStore(loaded)
    assert gateway.snapshot().pulse.replay == Replay(5.0, 600.0, 7.0)
    gateway.close()


def test_acknowledging_goes_to_the_daemon_and_its_absence_is_said(loaded: LoadedSettings) -> None:
    """The board never writes: it asks."""
    heard: list[Request] = []

    def answer(request: Request, _actor: str) -> Reply:
        heard.append(request)
        return Reply(True, "done")

    gateway = GatewayToStore(loaded)
    with pytest.raises(ControlError, match="the daemon is not running"):
        gateway.acknowledge("sensor-silent", "T1")
    served = ControlSocket(loaded.folder / "s", answer, lambda _actor, reason: Reply(False, reason))
    served.start()
    try:
        gateway.acknowledge("sensor-silent", "T1")
    finally:
        served.stop()
    assert heard == [{"action": "acknowledge", "kind": "sensor-silent", "subject": "T1", "reason": ""}]


def test_the_site_allows_the_daemon_three_turns_and_a_minute(loaded: LoadedSettings) -> None:
    """In plant time: three turns of a minute, and a minute of real time on top."""
    site = site_of(loaded.settings)
    assert (site.name, site.zone.key) == ("Invented press shop", "Europe/Prague")
    assert site.silent_after_s == 240.0
