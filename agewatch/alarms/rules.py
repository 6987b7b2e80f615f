"""From the columns of an assessment, as plain arrays, to the conditions of its coils."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass
from math import isnan

import numpy as np
from numpy.typing import NDArray

from agewatch.alarms.kinds import BY_RANK, COIL_KINDS, AlarmKind
from agewatch.alarms.lifecycle import Alarm, AlarmKey, Detail, Observed
from agewatch.alarms.turn import Condition, unmentioned
from agewatch.alarms.urgency import Floats, ranks

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
class _Standing:
    """The unsettled alarms of one kind beside the rows of their coils."""

    alarms: Mapping[int, Alarm]
    raised: Flags
    rank: NDArray[np.int8]

    @classmethod
    def of(cls, alarms: Mapping[int, Alarm], coils: int) -> _Standing:
        raised = np.zeros(coils, dtype=bool)
        rank = np.full(coils, BY_RANK[-1].rank, dtype=np.int8)
        rows = [row for row, alarm in alarms.items() if alarm.standing]
        raised[rows] = True
        rank[rows] = [alarms[row].priority.rank for row in rows]
        return cls(alarms, raised, rank)


def coil_conditions(
    coils: CoilColumns, alarms: Mapping[AlarmKey, Alarm], at_s: float, pull_horizon_s: float
) -> list[Condition]:
    """Conditions of every coil that is active or whose alarm is unsettled; other coils never become objects.

    at_s: time of the assessment. pull_horizon_s: without a planned pressing, a P10 return inside it asks for
    a pull. What cannot be assessed keeps what stands: losing sight of a coil is no reason to call it sound.
    A coil that is not in `coils` has left the store.
    """
    row_of = _rows(coils.coil_id, {subject for kind, subject in alarms if kind in COIL_KINDS})
    conditions: list[Condition] = []
    for kind in COIL_KINDS:
        standing = _Standing.of(
            {
                row_of[alarm.subject]: alarm
                for alarm in alarms.values()
                if alarm.kind is kind and alarm.unsettled and alarm.subject in row_of
            },
            len(coils.coil_id),
        )
        conditions.extend(_conditions(kind, coils, standing, at_s, pull_horizon_s))
    present = {(kind, coil) for kind in COIL_KINDS for coil in row_of}
    return conditions + unmentioned(alarms, COIL_KINDS, present, at_s, "the coil is no longer in store")


def _rows(coil_id: Names, wanted: Collection[str]) -> dict[str, int]:
    if not wanted:
        return {}
    return {coil: row for row, coil in enumerate(coil_id.tolist()) if coil in wanted}


def _conditions(
    kind: AlarmKind, coils: CoilColumns, standing: _Standing, at_s: float, pull_horizon_s: float
) -> Iterator[Condition]:
    active = _active(kind, coils, standing.raised, at_s, pull_horizon_s)
    unseen = coils.unassessed & standing.raised & (kind is not AlarmKind.UNASSESSABLE_COIL)
    chosen = active.copy()
    chosen[list(standing.alarms)] = True
    rows = np.flatnonzero(chosen & ~unseen)
    deadline_s = _deadline_s(kind, coils, rows)
    rank = ranks(deadline_s - at_s, coils.lead_time_s[rows], standing.rank[rows])
    for row, is_active, place, detail in zip(
        rows.tolist(), active[rows].tolist(), rank.tolist(), _details(coils, rows, deadline_s), strict=True
    ):
        seen = Observed(at_s, is_active, BY_RANK[place], coils.location[row] or "", detail)
        yield Condition(kind, coils.coil_id[row], seen)
    for row in np.flatnonzero(unseen).tolist():
        alarm = standing.alarms[row]
        seen = Observed(at_s, True, alarm.priority, coils.location[row] or "", alarm.detail)
        yield Condition(kind, alarm.subject, seen)


def _active(kind: AlarmKind, coils: CoilColumns, raised: Flags, at_s: float, pull_horizon_s: float) -> Flags:
    if kind is AlarmKind.UNASSESSABLE_COIL:
        return coils.unassessed
    if kind is AlarmKind.RETURNED_IN_STORE:
        return coils.held
    sound = ~(coils.held | coils.unassessed)
    return sound & (
        _pull_reached(coils, at_s, pull_horizon_s, 1.0)
        | (raised & _pull_reached(coils, at_s, pull_horizon_s, DEADBAND))
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
    if kind is AlarmKind.RETURN_BEFORE_PRESS:
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
