"""From the columns of an assessment, as plain arrays, to the conditions of its coils."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from math import isnan

import numpy as np
from numpy.typing import NDArray

from agewatch.alarms.kinds import BY_RANK, COIL_KINDS, AlarmKind
from agewatch.alarms.lifecycle import Alarm, AlarmKey, Detail, Observed
from agewatch.alarms.turn import Condition, ended
from agewatch.alarms.urgency import Floats, Ranks, ranks

Names = NDArray[np.object_]
Flags = NDArray[np.bool_]

DEADBAND = 0.5
"""A standing pull ends below half the level that raised it, or beyond twice the horizon, as `watch` does."""


@dataclass(frozen=True, slots=True)
class CoilColumns:
    """One row per stored coil, every array of shape (n_coils,); times in seconds since 1970, NaN: none."""

    coil_id: Names
    grade: Names
    part: Names
    """None: none is planned."""
    location: Names
    press_s: Floats
    return_p10_s: Floats
    return_p50_s: Floats
    return_risk: Floats
    """0 to 1; NaN: no pressing is planned."""
    held: Flags
    """The plateau has returned."""
    unassessed: Flags
    reason: Names
    """One sentence."""
    starting_point: Flags
    pull_risk: Floats
    """Risk from which the coil's part asks for a pull, 0 to 1."""
    lead_time_s: Floats
    """What logistics needs to bring the coil forward [s]."""


@dataclass(frozen=True, slots=True)
class _Told:
    """What the unsettled alarms of one kind last told, beside the rows of their coils: arrays (n_coils,)."""

    alarms: Mapping[int, Alarm]
    stands: Flags
    settled: Flags
    """Stands, and its condition was there at the last look."""
    rank: Ranks
    press_s: Floats
    location: Names

    @classmethod
    def by(cls, alarms: Mapping[int, Alarm], coils: int, at_s: float) -> _Told:
        told = cls(
            alarms,
            np.zeros(coils, dtype=bool),
            np.zeros(coils, dtype=bool),
            np.full(coils, BY_RANK[-1].rank, dtype=np.int8),
            np.full(coils, np.nan),
            np.full(coils, None, dtype=object),
        )
        rows = [row for row, alarm in alarms.items() if alarm.standing]
        standing = [alarms[row] for row in rows]
        told.stands[rows] = True
        told.settled[rows] = [alarm.active and (alarm.active_since_s or 0.0) <= at_s for alarm in standing]
        told.rank[rows] = [alarm.priority.rank for alarm in standing]
        told.press_s[rows] = np.array([alarm.detail.get("press_s") for alarm in standing], dtype=float)
        told.location[rows] = [alarm.location for alarm in standing]
        return told


def coil_conditions(
    coils: CoilColumns, alarms: Mapping[AlarmKey, Alarm], at_s: float, pull_horizon_s: float
) -> list[Condition]:
    """Conditions of the coils whose alarm may change; all others never become objects.

    at_s: time of the assessment. pull_horizon_s: without a planned pressing, a P10 return inside it asks for
    a pull. What cannot be assessed keeps what stands: losing sight of a coil is no reason to call it sound.
    A coil that is not in `coils` has left the store.
    """
    unsettled = [alarm for alarm in alarms.values() if alarm.kind in COIL_KINDS and alarm.unsettled]
    row_of = _rows(coils.coil_id, {alarm.subject for alarm in unsettled})
    conditions: list[Condition] = []
    for kind in COIL_KINDS:
        own = {
            row_of[alarm.subject]: alarm
            for alarm in unsettled
            if alarm.kind == kind and alarm.subject in row_of
        }
        told = _Told.by(own, len(coils.coil_id), at_s)
        conditions.extend(_conditions(kind, coils, told, at_s, pull_horizon_s))
    conditions.extend(
        ended(alarm, at_s, "the coil is no longer in store")
        for alarm in unsettled
        if alarm.subject not in row_of
    )
    return conditions


def _rows(coil_id: Names, wanted: set[str]) -> dict[str, int]:
    """Row of each wanted coil that is there: by bisection, as coils are ordered; what it misses by scan."""
    coils = np.array(sorted(wanted), dtype=object)
    near = np.searchsorted(coil_id[:-1], coils)
    found = coil_id[near] == coils if len(coil_id) else np.zeros(len(coils), dtype=bool)
    row_of = dict(zip(coils[found].tolist(), near[found].tolist(), strict=True))
    if len(row_of) < len(wanted):
        row_of |= {coil: row for row, coil in enumerate(coil_id.tolist()) if coil in wanted}
    return row_of


def _conditions(
    kind: AlarmKind, coils: CoilColumns, told: _Told, at_s: float, pull_horizon_s: float
) -> Iterator[Condition]:
    active = _active(kind, coils, told.stands, at_s, pull_horizon_s)
    unseen = coils.unassessed & told.stands & (kind != AlarmKind.UNASSESSABLE_COIL)
    chosen = active.copy()
    chosen[list(told.alarms)] = True
    rows = np.flatnonzero(chosen & ~unseen)
    deadline_s = _deadline_s(kind, coils, rows)
    rank = ranks(deadline_s - at_s, coils.lead_time_s[rows], told.rank[rows])
    news = ~(active[rows] & _as_told(coils, told, rows) & (rank == told.rank[rows]))
    rows, deadline_s, rank = rows[news], deadline_s[news], rank[news]
    for row, is_active, place, detail in zip(
        rows.tolist(), active[rows].tolist(), rank.tolist(), _details(coils, rows, deadline_s), strict=True
    ):
        seen = Observed(at_s, is_active, BY_RANK[place], coils.location[row] or "", detail)
        yield Condition(kind, coils.coil_id[row], seen)
    for row in np.flatnonzero(unseen).tolist():
        alarm = told.alarms[row]
        seen = Observed(at_s, True, alarm.priority, coils.location[row] or "", alarm.detail)
        yield Condition(kind, alarm.subject, seen)


def _as_told(coils: CoilColumns, told: _Told, rows: NDArray[np.intp]) -> Flags:
    """Where a settled alarm has told its place and pressing as they are: with its rank, all that it tells."""
    press_s, told_press_s = coils.press_s[rows], told.press_s[rows]
    same_press = (press_s == told_press_s) | (np.isnan(press_s) & np.isnan(told_press_s))
    same: Flags = told.settled[rows] & same_press
    same &= np.array(coils.location[rows] == told.location[rows], dtype=bool)
    return same


def _active(kind: AlarmKind, coils: CoilColumns, stands: Flags, at_s: float, pull_horizon_s: float) -> Flags:
    if kind == AlarmKind.UNASSESSABLE_COIL:
        return coils.unassessed
    if kind == AlarmKind.RETURNED_IN_STORE:
        return coils.held
    sound = ~(coils.held | coils.unassessed)
    return sound & (
        _pull_reached(coils, at_s, pull_horizon_s, 1.0)
        | (stands & _pull_reached(coils, at_s, pull_horizon_s, DEADBAND))
    )


def _pull_reached(coils: CoilColumns, at_s: float, pull_horizon_s: float, share: float) -> Flags:
    """Whether the risk is at `share` of its level or, with no pressing, P10 as near for the horizon."""
    return np.where(
        np.isfinite(coils.press_s),
        coils.return_risk >= share * coils.pull_risk,
        share * (coils.return_p10_s - at_s) <= pull_horizon_s,
    )


def _deadline_s(kind: AlarmKind, coils: CoilColumns, rows: NDArray[np.intp]) -> Floats:
    """What the action has to come before: the pressing, and for a pull also the P10 return [s since 1970]."""
    if kind == AlarmKind.RETURN_BEFORE_PRESS:
        return np.fmin(coils.press_s[rows], coils.return_p10_s[rows])
    return coils.press_s[rows]


def _details(coils: CoilColumns, rows: NDArray[np.intp], deadline_s: Floats) -> Iterator[Detail]:
    columns: dict[str, list[object]] = {
        "grade": coils.grade[rows].tolist(),
        "part": coils.part[rows].tolist(),
        "press_s": _or_none(coils.press_s[rows]),
        "return_p10_s": _or_none(coils.return_p10_s[rows]),
        "return_p50_s": _or_none(coils.return_p50_s[rows]),
        "return_risk": _or_none(coils.return_risk[rows]),
        "pull_risk": _or_none(coils.pull_risk[rows]),
        "pull_by_s": _or_none(deadline_s - coils.lead_time_s[rows]),
        "starting_point": coils.starting_point[rows].tolist(),
        "reason": coils.reason[rows].tolist(),
    }
    names = tuple(columns)
    for values in zip(*columns.values(), strict=True):
        yield dict(zip(names, values, strict=True))


def _or_none(values: Floats) -> list[object]:
    return [None if isnan(value) else value for value in values.tolist()]
