"""An invented plant for the board: coils written out one by one, and data that the board takes for the real thing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from zoneinfo import ZoneInfo

import numpy as np

from agewatch.alarms import Acknowledged, Alarm, AlarmKind, AlarmState, Priority, Timing, advance
from agewatch.board.app import BoardApp
from agewatch.board.coil_row import CoilRow
from agewatch.board.data import Pulse, Site, Snapshot
from agewatch.clock import StoppedClock
from agewatch.errors import ControlError, StoreError
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Coded
from agewatch.plant.trace import CoilTrace

NOW_S = 1_752_816_605.0  # 2025-07-18T05:30:05Z, 07:30:05 in Prague
DAY_S = 86_400.0
NAN = float("nan")
SITE = Site("Invented press shop, hall 4", ZoneInfo("Europe/Prague"), 240.0, 3 * 3600.0)

REASONS = {
    Verdict.CLEAR: "the planned pressing comes before the return",
    Verdict.WATCH: "the risk of a return before the planned pressing is half of what asks for a pull",
    Verdict.PULL: "the plateau may return before the planned pressing",
    Verdict.HOLD: "the plateau has returned by the P50 estimate",
    Verdict.UNASSESSED: "grade X9 is not in the settings",
}
_NAMES = ("grade", "part", "location", "reason", "assumed")


def coil(
    coil_id: str,
    verdict: Verdict = Verdict.CLEAR,
    *,
    returns_d: float = 40.0,
    press_d: float = 10.0,
    grade: str = "DC04",
    part: str | None = "door-inner",
    location: str = "BAY-1",
    starting_point: bool = False,
) -> CoilRow:
    """A coil that returns (P50) and is pressed so many days from now; its band is two days early, four late."""
    assessed = verdict is not Verdict.UNASSESSED
    p50_s = NOW_S + DAY_S * returns_d if assessed else NAN
    press_s = NOW_S + DAY_S * press_d
    p10_s = p50_s - 2 * DAY_S
    slack_h = (p10_s - press_s) / 3600.0
    return CoilRow(
        coil_id=coil_id,
        grade=grade,
        part=part,
        location=location,
        verdict=verdict,
        reason=REASONS[verdict],
        age_days=41.5,
        equivalent_age_days=58.2 if assessed else NAN,
        coil_temp_c=27.4 if assessed else NAN,
        yield_rise_mpa=6.1 if assessed else NAN,
        ype_pct=0.11 if assessed else NAN,
        ype_limit_pct=0.2 if assessed else NAN,
        return_p10_s=p10_s,
        return_p50_s=p50_s,
        return_p90_s=p50_s + 4 * DAY_S,
        press_s=press_s,
        return_risk=float(np.clip(0.1 - slack_h / 240.0, 0.0, 1.0)),
        slack_h=slack_h,
        estimated_fraction=0.04 if assessed else NAN,
        assumed="n_value",
        starting_point=starting_point,
    )


COILS = (
    coil(
        "C1001", Verdict.HOLD, returns_d=-1.5, press_d=2.0, grade="BH220", part="hood-outer", location="BAY-3"
    ),
    coil(
        "C1002",
        Verdict.PULL,
        returns_d=2.7,
        press_d=1.9,
        part="hood-outer",
        location="YARD-N",
        starting_point=True,
    ),
    coil("C1003", Verdict.PULL, returns_d=4.0, press_d=NAN, part=None, location="BAY-2"),
    coil("C1004", Verdict.WATCH, returns_d=9.0, press_d=6.5, part="fender", location="BAY-2"),
    coil("C1005", Verdict.UNASSESSED, grade="X9", press_d=3.0, location="BAY-1"),
    *(
        coil(
            f"C{1100 + 7 * place}",
            returns_d=30.0 + place,
            press_d=5.0 + place % 9,
            grade=("DC01", "DC04", "DC05")[place % 3],
            part=("door-inner", "floor-pan")[place % 2],
            location=("BAY-1", "BAY-2", "BAY-3", "YARD-N")[place % 4],
            starting_point=place % 3 == 0,
        )
        for place in range(75)
    ),
)


def assessment_of(coils: Sequence[CoilRow] = COILS, at_s: float = NOW_S - 41.0) -> Assessment:
    """The coils as columns, ordered as an assessment is."""
    ordered = sorted(coils, key=lambda each: each.coil_id)
    columns: dict[str, object] = {}
    for column in fields(CoilRow):
        values = [getattr(each, column.name) for each in ordered]
        if column.name in _NAMES:
            columns[column.name] = Coded.of(values)
        elif column.name == "coil_id":
            columns[column.name] = np.array([*values, None], dtype=object)[:-1]
        elif column.name == "verdict":
            columns[column.name] = np.array(values, dtype=np.int8)
        else:
            columns[column.name] = np.array(values)
    return Assessment(at_s=at_s, model="agewatch-test", settings_digest="0" * 64, **columns)


def alarm(
    kind: AlarmKind,
    subject: str,
    priority: Priority,
    state: AlarmState = AlarmState.UNACKNOWLEDGED,
    *,
    location: str = "",
    raised_h_ago: float = 2.0,
) -> Alarm:
    raised_s = NOW_S - 3600.0 * raised_h_ago
    seen = state is AlarmState.ACKNOWLEDGED
    return Alarm(
        kind, subject, location, state, priority, True, raised_s, None, raised_s,
        raised_s + 600.0 if seen else None, "user:hana" if seen else None, {"reason": "as the rules saw it"},
    )  # fmt: skip


ALARMS = (
    alarm(AlarmKind.RETURNED_IN_STORE, "C1001", Priority.HIGH, location="BAY-3"),
    alarm(AlarmKind.RETURN_BEFORE_PRESS, "C1002", Priority.HIGH, location="YARD-N", raised_h_ago=1.0),
    alarm(
        AlarmKind.RETURN_BEFORE_PRESS, "C1003", Priority.MEDIUM, AlarmState.ACKNOWLEDGED,
        location="BAY-2", raised_h_ago=20.0,
    ),
    alarm(AlarmKind.SENSOR_SILENT, "T104", Priority.LOW, location="BAY-2", raised_h_ago=9.0),
    alarm(
        AlarmKind.UNASSESSABLE_COIL, "C1005", Priority.LOW, AlarmState.RETURNED_UNACKNOWLEDGED,
        location="BAY-1", raised_h_ago=30.0,
    ),
)  # fmt: skip


def trace_of(row: CoilRow, *, band: float = 0.3) -> CoilTrace | None:
    """A smooth curve that meets the limit at the coil's P50 return."""
    if row.verdict is Verdict.UNASSESSED:
        return None
    begin_s = NOW_S - DAY_S * row.age_days
    at_s = np.linspace(begin_s, NOW_S + 60 * DAY_S, 400)
    ype_pct = 0.2 * np.clip((at_s - begin_s) / (row.return_p50_s - begin_s), 0.0, 4.0) ** 1.3
    air_c = 24.0 + 5.0 * np.sin(2 * np.pi * at_s / DAY_S) + 3.0 * np.sin(at_s / (9 * DAY_S))
    coil_c = 24.0 + 0.8 * np.sin(2 * np.pi * at_s / DAY_S - 1.4) + 3.0 * np.sin(at_s / (9 * DAY_S) - 0.1)
    return CoilTrace(
        row.coil_id, at_s, air_c, coil_c, ype_pct * (1 - band), ype_pct, ype_pct * (1 + band),
        row.ype_limit_pct, NOW_S, row.press_s,
    )  # fmt: skip


@dataclass
class FakePlant:
    """`BoardData` in memory. Its alarms live by the real state machine; `unreadable` and `refusal` are raised."""

    now: Snapshot
    coils: Sequence[CoilRow] = COILS
    unreadable: str | None = None
    refusal: str | None = None

    def snapshot(self) -> Snapshot:
        if self.unreadable is not None:
            raise StoreError(self.unreadable)
        return self.now

    def trace(self, coil_id: str) -> CoilTrace | None:
        return next((trace_of(each) for each in self.coils if each.coil_id == coil_id), None)

    def acknowledge(self, kind: str, subject: str) -> None:
        if self.refusal is not None:
            raise ControlError(self.refusal)
        event = Acknowledged(NOW_S, "user:petr", "")
        moved = (
            advance(each, event, Timing())[0] if (each.kind, each.subject) == (kind, subject) else each
            for each in self.now.alarms
        )
        kept = tuple(each for each in moved if each.state is not AlarmState.NORMAL)
        self.now = replace(self.now, alarms=kept)

    def brings(self, coils: Sequence[CoilRow]) -> None:
        """A new assessment comes."""
        self.coils = coils
        self.now = replace(self.now, assessment=assessment_of(coils))


def plant(coils: Sequence[CoilRow] = COILS, alarms: Sequence[Alarm] = ALARMS) -> FakePlant:
    """A plant whose daemon is well."""
    return FakePlant(Snapshot(assessment_of(coils), tuple(alarms), Pulse(NOW_S - 3.0, NOW_S - 700.0)), coils)


def board(data: FakePlant) -> BoardApp:
    """The board on `data`, with time at a stop; it reads again only when it is asked to."""
    return BoardApp(data, StoppedClock(NOW_S), SITE, refresh_every_s=3600.0)
