"""What the alarms look at in one turn: coils, sensors, locations, feeds, rejects and receivers."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence

import numpy as np

from agewatch.alarms import Alarm, AlarmKey, AlarmKind, Condition, unmentioned
from agewatch.alarms.rules import CoilColumns, coil_conditions
from agewatch.alarms.system_rules import (
    Feed,
    Receiver,
    Sensor,
    failing_deliveries,
    high_rejects,
    silent_sensors,
    stale_feeds,
    system_condition,
    uncovered_locations,
)
from agewatch.daemon.status import feed_status
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Readings
from agewatch.plant.records import EndpointState
from agewatch.plant.settings import Settings
from agewatch.plant.verdicts import NO_PART
from agewatch.store import View, queries

FAILING_AFTER_S = 600.0
"""A receiver that takes nothing for this long [plant s] is alarmed; a restart of it is not."""
STORE = "store"
"""Subject of the store's own alarm."""

_DAY_S = 86_400.0
_WATCHED = (
    AlarmKind.SENSOR_SILENT,
    AlarmKind.LOCATION_UNCOVERED,
    AlarmKind.FEED_STALE,
    AlarmKind.REJECTS_HIGH,
    AlarmKind.DELIVERY_FAILING,
)
"""Kinds whose subjects are all named by the settings."""

Alarms = Mapping[AlarmKey, Alarm]


def conditions(
    view: View, assessment: Assessment, readings: Readings, settings: Settings, alarms: Alarms
) -> list[Condition]:
    """Every condition at the time of `assessment`; `view` is the transaction that will keep what follows."""
    at_s = assessment.at_s
    coils = coil_conditions(
        coil_columns(assessment, settings), alarms, at_s, settings.outlook.pull_horizon_days * _DAY_S
    )
    sensors = sensors_of(readings, settings, at_s)
    silent_after_s = settings.alarm.sensor_silent_after.total_seconds()
    watched = [
        *silent_sensors(sensors, at_s, silent_after_s),
        *uncovered_locations(sensors, coils_at(assessment, settings), at_s, silent_after_s),
        *stale_feeds(_feeds(view, settings), at_s),
        *high_rejects(_open_rejects(view, settings), alarms, at_s, settings.alarm.rejects_limit),
        *failing_deliveries(_receivers(view, settings), at_s, FAILING_AFTER_S),
    ]
    mentioned = {condition.key for condition in watched}
    gone = unmentioned(alarms, _WATCHED, mentioned, at_s, "it is no longer in the settings")
    return [*coils, *watched, *gone, *_store_is_well(alarms, at_s)]


def coil_columns(assessment: Assessment, settings: Settings) -> CoilColumns:
    """What the rules want to know of each coil."""
    parts = [*settings.part.values(), NO_PART]
    part = assessment.part.recode(tuple(settings.part))
    return CoilColumns(
        coil_id=assessment.coil_id,
        grade=assessment.grade.names(),
        part=assessment.part.names(),
        location=assessment.location.names(),
        press_s=assessment.press_s,
        return_p10_s=assessment.return_p10_s,
        return_p50_s=assessment.return_p50_s,
        return_risk=assessment.return_risk,
        held=assessment.verdict == Verdict.HOLD,
        unassessed=assessment.verdict == Verdict.UNASSESSED,
        reason=assessment.reason.names(),
        starting_point=assessment.starting_point,
        pull_risk=np.array([each.pull_risk for each in parts])[part],
        lead_time_s=np.array([each.lead_time.total_seconds() for each in parts])[part],
    )


def sensors_of(readings: Readings, settings: Settings, at_s: float) -> list[Sensor]:
    """Every sensor of the settings with its latest reading not after `at_s`."""
    past = readings.at_s <= at_s
    latest = np.full(len(readings.sensor.labels), -np.inf)
    np.maximum.at(latest, readings.sensor.codes[past], readings.at_s[past])
    known = dict(zip(readings.sensor.labels, latest.tolist(), strict=True))
    return [
        Sensor(sensor, place, at if (at := known.get(sensor, -np.inf)) > -np.inf else None)
        for place, location in settings.location.items()
        for sensor in location.sensors
    ]


def coils_at(assessment: Assessment, settings: Settings) -> dict[str, int]:
    """How many coils lie at each location of the settings."""
    names = tuple(settings.location)
    codes = assessment.location.recode(names)
    counts = np.bincount(codes[codes >= 0], minlength=len(names))
    return dict(zip(names, counts.tolist(), strict=True))


def _feeds(view: View, settings: Settings) -> Iterable[Feed]:
    for feed in settings.feed:
        status = feed_status(view, feed.name)
        stale_after = feed.stale_after
        yield Feed(
            feed.name,
            status.last_new_s,
            None if stale_after is None else stale_after.total_seconds(),
            status.trouble,
        )


def _open_rejects(view: View, settings: Settings) -> dict[str, int]:
    counts = queries.open_reject_counts(view)
    return {feed.name: counts.get(feed.name, 0) for feed in settings.feed}


def _receivers(view: View, settings: Settings) -> Sequence[Receiver]:
    states = {state.name: state for state in queries.endpoints(view)}
    set_aside = queries.set_aside_counts(view)
    receivers = []
    for endpoint in settings.endpoint:
        known = states.get(endpoint.name, EndpointState(endpoint.name, None, "", None, ""))
        receivers.append(
            Receiver(
                name=endpoint.name,
                failing_since_s=known.failing_since_s,
                disabled=known.disabled_s is not None and known.disabled_url == endpoint.url,
                set_aside=set_aside.get(endpoint.name, 0),
                last_error=known.last_error,
            )
        )
    return receivers


def _store_is_well(alarms: Alarms, at_s: float) -> Collection[Condition]:
    """That this turn can be kept is the sign that the store can be written again."""
    alarm = alarms.get((AlarmKind.STORE_TROUBLE, STORE))
    if alarm is None or not alarm.unsettled:
        return ()
    reason = "the store is written again"
    return (system_condition(AlarmKind.STORE_TROUBLE, STORE, at_s, active=False, reason=reason),)
