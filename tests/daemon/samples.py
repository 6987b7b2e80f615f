"""A tiny plant of CSV files, and a daemon's parts over it."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from agewatch.alarms import Alarm
from agewatch.clock import StoppedClock, rfc3339
from agewatch.daemon.cycle import Turn, take_turn
from agewatch.daemon.feeds import FeedReading, read_feeds
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.records import JournalRow, OutboxMessage, StoredReject
from agewatch.plant.settings_file import LoadedSettings, load_settings
from agewatch.store import Store, open_store, queries

NOW_S = 1_784_300_400.0
"""2026-07-17T15:00:00Z."""
HOUR_S = 3600.0
DAY_S = 86_400.0

PLANT = """
[site]
name = "Works Lhota"
[clock]
kind = "replay"
start = "2026-07-17T15:00:00Z"
rate = 600
[daemon]
http_port = 0
assess_every = "2 min"
control_socket = "agewatch.sock"
[alarm]
off_delay = "0 s"
rejects_limit = 3
[[feed]]
table = "coils"
path = "coils*.csv"
[[feed]]
table = "temperatures"
path = "temps.csv"
[location.BAY-1]
sensors = ["T1"]
[location.YARD]
sensors = ["T2"]
[grade.DC04]
rp02_mpa = 175.0
rm_mpa = 300.0
n_value = 0.21
rise_saturation_mpa = 45.0
rise_saturation_spread = 0.0
masking_mpa = 8.0
channel.carbon = { tau_days = 327.0, tau_spread = 0.0 }
[part.hood]
ype_limit_pct = 0.2
exposed = true
"""
ENDPOINT = """
[[endpoint]]
name = "logistics"
url = "http://127.0.0.1:9/in"
secret_env = "AGEWATCH_TEST_SECRET"
"""

COIL_HEAD = "coil_id,grade,temper_rolled_at,location,part,press_at\n"
FRESH = "C-FRESH,DC04,2026-07-10T06:00:00Z,BAY-1,hood,2026-07-20T06:00:00Z\n"
OLD = "C-OLD,DC04,2024-06-01T06:00:00Z,BAY-1,hood,2026-07-20T06:00:00Z\n"


def temperatures(*sensors: str, celsius: float = 30.0, days: int = 800, until_s: float = NOW_S) -> str:
    """A reading a day of each sensor, the last one at `until_s`."""
    rows = [
        f"{rfc3339(until_s - day * DAY_S)},{sensor},{celsius}"
        for day in reversed(range(days + 1))
        for sensor in sensors
    ]
    return "\n".join(["at,sensor,celsius", *rows, ""])


class TinyPlant:
    """Files, settings, a store and a clock that stands still until it is moved."""

    def __init__(self, folder: Path, *, endpoint: str = "") -> None:
        self.folder = folder
        self.write("plant.toml", PLANT + endpoint)
        self.write("coils.csv", COIL_HEAD + FRESH + OLD)
        self.write("temps.csv", temperatures("T1", "T2"))
        self.loaded: LoadedSettings = load_settings(folder / "plant.toml")
        self.store: Store = open_store(self.loaded.settings.store.url, folder)
        self.is_open = True
        self.clock = StoppedClock(NOW_S)

    def reopen(self) -> Store:
        """Open the store again after it was closed."""
        self.close()
        self.store = open_store(self.loaded.settings.store.url, self.folder)
        self.is_open = True
        return self.store

    def close(self) -> None:
        """Leave the store to others."""
        if self.is_open:
            self.store.close()
            self.is_open = False

    def write(self, name: str, content: str | bytes) -> Path:
        path = self.folder / name
        path.write_bytes(content.encode() if isinstance(content, str) else content)
        return path

    def read(self) -> Mapping[str, FeedReading]:
        """Look at every feed once; what came of it by table."""
        found = read_feeds(self.store, self.loaded.settings.feed, self.folder, self.clock, self.clock.now_s())
        return {reading.feed.partition(":")[0]: reading for reading in found}

    def turn(self) -> Turn:
        return take_turn(self.store, self.loaded.settings, self.loaded.digest, self.clock.now_s)

    def round(self, later_s: float = 0.0) -> Mapping[str, tuple[str, str]]:
        """Move the clock, read all, take a turn; verdict and reason of every coil."""
        self.clock.move_to(self.clock.now_s() + later_s)
        self.read()
        return verdicts(self.turn().assessment)

    def alarms(self) -> Mapping[tuple[str, str], Alarm]:
        """Standing alarms by kind and subject."""
        with self.store.read() as view:
            return {(alarm.kind, alarm.subject): alarm for alarm in queries.alarms(view) if alarm.standing}

    def rejects(self) -> list[StoredReject]:
        with self.store.read() as view:
            return queries.open_rejects(view)

    def journal(self) -> list[JournalRow]:
        """Oldest first."""
        with self.store.read() as view:
            return queries.journal(view)[::-1]

    def messages(self) -> list[OutboxMessage]:
        """Oldest first."""
        with self.store.read() as view:
            return queries.messages(view)[::-1]


def verdicts(assessment: Assessment) -> Mapping[str, tuple[str, str]]:
    """Verdict and reason of every coil."""
    words = [Verdict(code).word for code in assessment.verdict.tolist()]
    return dict(
        zip(assessment.coil_id, zip(words, assessment.reason.names().tolist(), strict=True), strict=True)
    )
