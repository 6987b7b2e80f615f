"""Conditions of what AgeWatch depends on: sensors, locations, feeds, endpoints. Every subject gets one."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from agewatch.alarms.kinds import AlarmKind
from agewatch.alarms.lifecycle import Alarm, AlarmKey, Observed
from agewatch.alarms.rationalisation import RATIONALISATION
from agewatch.alarms.turn import Condition

REJECTS_DEADBAND = 0.5
"""Standing, it ends below half of the limit, lest one mended row end what the next bad row brings back."""


@dataclass(frozen=True, slots=True)
class Sensor:
    """A sensor, its location, and its latest reading not in the future [s since 1970]; None: never one."""

    name: str
    location: str
    last_reading_s: float | None


@dataclass(frozen=True, slots=True)
class Feed:
    """A feed: when it last brought news, how long it may be quiet, and why it cannot be read ("": it can)."""

    name: str
    last_new_s: float | None
    stale_after_s: float | None
    trouble: str = ""


@dataclass(frozen=True, slots=True)
class Receiver:
    """An endpoint: since when no message gets through, whether it is gone for good, messages set aside."""

    name: str
    failing_since_s: float | None
    disabled: bool
    set_aside: int
    last_error: str = ""


def system_condition(
    kind: AlarmKind,
    subject: str,
    at_s: float,
    *,
    active: bool,
    reason: str,
    location: str = "",
    **values: object,
) -> Condition:
    """A condition of a kind with a priority of its own (clock-step and store-trouble are given this way)."""
    detail = {"reason": reason, **values}
    return Condition(kind, subject, Observed(at_s, active, RATIONALISATION[kind].priority, location, detail))


def silent_sensors(sensors: Iterable[Sensor], at_s: float, silent_after_s: float) -> list[Condition]:
    """sensor-silent for every sensor: active when its last reading is more than `silent_after_s` ago."""
    return [
        system_condition(
            AlarmKind.SENSOR_SILENT,
            sensor.name,
            at_s,
            active=_silent(sensor.last_reading_s, at_s, silent_after_s),
            reason=_since("last reading", sensor.last_reading_s, at_s),
            location=sensor.location,
            last_reading_s=sensor.last_reading_s,
        )
        for sensor in sensors
    ]


def uncovered_locations(
    sensors: Iterable[Sensor], coils: Mapping[str, int], at_s: float, silent_after_s: float
) -> list[Condition]:
    """location-uncovered for every location in `coils` (location → stored coils).

    Active when coils lie there and every sensor of the location is silent, or it has none.
    """
    latest: dict[str, float] = {}
    for sensor in sensors:
        if sensor.last_reading_s is not None:
            known = latest.get(sensor.location, sensor.last_reading_s)
            latest[sensor.location] = max(known, sensor.last_reading_s)
    return [
        system_condition(
            AlarmKind.LOCATION_UNCOVERED,
            location,
            at_s,
            active=count > 0 and _silent(latest.get(location), at_s, silent_after_s),
            reason=_since("last temperature", latest.get(location), at_s),
            location=location,
            last_reading_s=latest.get(location),
            coils=count,
        )
        for location, count in coils.items()
    ]


def stale_feeds(feeds: Iterable[Feed], at_s: float) -> list[Condition]:
    """feed-stale for every feed: active when it cannot be read, or has been quiet for longer than it may."""
    return [
        system_condition(
            AlarmKind.FEED_STALE,
            feed.name,
            at_s,
            active=bool(feed.trouble)
            or (feed.stale_after_s is not None and _silent(feed.last_new_s, at_s, feed.stale_after_s)),
            reason=feed.trouble or _since("last news", feed.last_new_s, at_s),
            last_new_s=feed.last_new_s,
        )
        for feed in feeds
    ]


def high_rejects(
    open_rejects: Mapping[str, int], alarms: Mapping[AlarmKey, Alarm], at_s: float, limit: int
) -> list[Condition]:
    """rejects-high for every feed in `open_rejects` (feed → open rejects): active from `limit` on."""
    conditions = []
    for feed, count in open_rejects.items():
        standing = alarms.get((AlarmKind.REJECTS_HIGH, feed))
        share = REJECTS_DEADBAND if standing is not None and standing.standing else 1.0
        conditions.append(
            system_condition(
                AlarmKind.REJECTS_HIGH,
                feed,
                at_s,
                active=count > 0 and count >= share * limit,
                reason=f"{count} rows of this feed are rejected and not yet mended; the limit is {limit}",
                open_rejects=count,
            )
        )
    return conditions


def failing_deliveries(endpoints: Iterable[Receiver], at_s: float, failing_after_s: float) -> list[Condition]:
    """delivery-failing for every endpoint.

    Active when it is disabled, when messages to it are set aside, or when none has got through for
    `failing_after_s`.
    """
    return [
        system_condition(
            AlarmKind.DELIVERY_FAILING,
            endpoint.name,
            at_s,
            active=endpoint.disabled
            or endpoint.set_aside > 0
            or (endpoint.failing_since_s is not None and at_s - endpoint.failing_since_s >= failing_after_s),
            reason=_delivery_reason(endpoint),
            failing_since_s=endpoint.failing_since_s,
            set_aside=endpoint.set_aside,
        )
        for endpoint in endpoints
    ]


def _silent(last_s: float | None, at_s: float, after_s: float) -> bool:
    return last_s is None or at_s - last_s > after_s


def _since(what: str, last_s: float | None, at_s: float) -> str:
    if last_s is None:
        return f"{what}: never"
    return f"{what}: {max(0.0, at_s - last_s) / 3600:.1f} h ago"


def _delivery_reason(endpoint: Receiver) -> str:
    if endpoint.disabled:
        return "the receiver has said that it is gone for good (410); nothing is sent to it any more"
    if endpoint.set_aside:
        return f"{endpoint.set_aside} messages are set aside; last answer: {endpoint.last_error or 'none'}"
    if endpoint.failing_since_s is not None:
        return f"messages do not get through: {endpoint.last_error or 'no answer'}"
    return "messages get through"
