"""Settings of which each is right by itself, and which cannot hold together."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from agewatch.plant.nearest import did_you_mean

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed, Location, Settings

Key = tuple[str | int, ...]
"""Where a setting stands: names of tables and keys, and places in arrays (counted from 0)."""

Contradiction = tuple[Key, str]
"""The key to look at first, and what is wrong with it."""


class ContradictionError(ValueError):
    """Several contradictions at once; keys are relative to the table that raised it."""

    def __init__(self, found: list[Contradiction]) -> None:
        super().__init__("; ".join(text for _, text in found))
        self.found = found


def contradictions(settings: Settings) -> list[Contradiction]:
    """Everything in `settings` that cannot hold together."""
    return [
        *_sensors_of_two_locations(settings.location),
        *_feeds_given_twice(settings.feed),
        *_columns_of_unknown_sensors(settings),
        *_endpoints_of_one_name(settings),
        *_horizons(settings),
    ]


def _sensors_of_two_locations(locations: dict[str, Location]) -> Iterator[Contradiction]:
    owner: dict[str, str] = {}
    for place, location in locations.items():
        for at, sensor in enumerate(location.sensors):
            if sensor in owner:
                yield (
                    ("location", place, "sensors", at),
                    f"sensor {sensor} already stands under location {owner[sensor]}; a sensor belongs to one location",
                )
            owner.setdefault(sensor, place)


def _feeds_given_twice(feeds: list[Feed]) -> Iterator[Contradiction]:
    seen: set[str] = set()
    for at, feed in enumerate(feeds):
        if feed.name in seen:
            yield ("feed", at, "path"), f"another feed reads {feed.table} from {feed.path}; give it once"
        seen.add(feed.name)


def _columns_of_unknown_sensors(settings: Settings) -> Iterator[Contradiction]:
    """A wide temperature file's columns are sensors: of some location, and not next to the long file's columns."""
    known = {sensor for location in settings.location.values() for sensor in location.sensors}
    for at, feed in enumerate(settings.feed):
        if feed.table != "temperatures":
            continue
        sensors = [name for name in feed.columns if name not in ("at", "sensor", "celsius")]
        long = [name for name in ("sensor", "celsius") if name in feed.columns]
        for sensor in sensors:
            key = ("feed", at, "columns", sensor)
            if long:
                yield (
                    key,
                    f"the file is either long (columns.{long[0]}) or wide (a column for each sensor), not both",
                )
            elif sensor not in known:
                yield key, f"no location has a sensor {sensor}{did_you_mean(sensor, known)}"


def _endpoints_of_one_name(settings: Settings) -> Iterator[Contradiction]:
    seen: set[str] = set()
    for at, endpoint in enumerate(settings.endpoint):
        if endpoint.name in seen:
            yield (
                ("endpoint", at, "name"),
                f"another endpoint is named {endpoint.name}; each needs its own name",
            )
        seen.add(endpoint.name)


def _horizons(settings: Settings) -> Iterator[Contradiction]:
    outlook = settings.outlook
    if "pull_horizon_days" in outlook.model_fields_set and outlook.pull_horizon_days > outlook.horizon_days:
        yield (
            ("outlook", "pull_horizon_days"),
            f"allowed is at most horizon_days, {outlook.horizon_days:g}",
        )
    if settings.screening.lowest_c >= settings.screening.highest_c:
        yield ("screening", "lowest_c"), f"allowed is less than highest_c, {settings.screening.highest_c:g}"
