"""What `agewatch check` finds out about a plant: its feeds as they are, held against its settings."""

from __future__ import annotations

import os
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from agewatch.assemble import clock_of
from agewatch.daemon.feeds import past_until_s
from agewatch.errors import SettingsError
from agewatch.intake import read_feed
from agewatch.messages import signing_secret
from agewatch.plant.settings import Feed, Settings
from agewatch.plant.settings_file import LoadedSettings
from agewatch.plant.tables import COILS, TABLES, TEMPERATURES, ColumnKind, Reject, Row

_OF_COILS = ("grade", "part", "location")


@dataclass(slots=True)
class FeedFound:
    """What is there of one feed."""

    feed: str
    table: str
    files: int = 0
    rows: int = 0
    rejects: list[Reject] = field(default_factory=list)
    newest_s: float | None = None
    """The latest time in the table's first column of times."""
    troubles: list[str] = field(default_factory=list)
    """Why the feed, or a file of it, cannot be read."""


@dataclass(frozen=True, slots=True)
class PlantFound:
    """What is there of the whole plant."""

    feeds: Sequence[FeedFound]
    sensors: Mapping[str, Mapping[str, bool]]
    """For each location its sensors, and whether a reading of theirs was found."""
    unknown: Mapping[str, Mapping[str, int]]
    """Names that the settings lack, with the number of rows: "grade", "part", "location", "sensor"."""

    @property
    def readable(self) -> bool:
        return not any(feed.troubles for feed in self.feeds)

    @property
    def is_whole(self) -> bool:
        """Nothing is rejected, unseen or unknown."""
        silent = any(not seen for sensors in self.sensors.values() for seen in sensors.values())
        return not (silent or any(self.unknown.values()) or any(feed.rejects for feed in self.feeds))


def check_secrets(loaded: LoadedSettings) -> list[str]:
    """A line for each endpoint whose signing secret is not where the settings say."""
    problems: list[str] = []
    for endpoint in loaded.settings.endpoint:
        try:
            signing_secret(endpoint, loaded.folder, os.environ)
        except SettingsError as error:
            problems += error.problems
    return problems


def look_at(loaded: LoadedSettings) -> PlantFound:
    """Read every feed whole, and keep none of it."""
    names: dict[str, Counter[str]] = {kind: Counter() for kind in (*_OF_COILS, "sensor")}
    feeds = [_look_at_feed(feed, loaded, names) for feed in loaded.settings.feed]
    known = _known_names(loaded.settings)
    return PlantFound(
        feeds,
        {
            place: {sensor: names["sensor"][sensor] > 0 for sensor in location.sensors}
            for place, location in loaded.settings.location.items()
        },
        {
            kind: {name: count for name, count in sorted(counts.items()) if name not in known[kind]}
            for kind, counts in names.items()
        },
    )


def _look_at_feed(feed: Feed, loaded: LoadedSettings, names: Mapping[str, Counter[str]]) -> FeedFound:
    found = FeedFound(feed.name, feed.table)
    until_s = past_until_s(clock_of(loaded.settings))
    for source in read_feed(feed, loaded.folder, now_s=until_s, known={}):
        if source.error is not None:
            found.troubles.append(source.error.removeprefix(f"feed {feed.name}: "))
            continue
        found.files += 1
        found.rows += len(source.rows)
        found.rejects += source.rejects
        found.newest_s = max((*_times(feed.table, source.rows), found.newest_s or 0.0)) or None
        for kind, column in _named_columns(feed.table):
            names[kind].update(str(row[column]) for row in source.rows if row[column])
    return found


def _times(table: str, rows: Sequence[Row]) -> Iterator[float]:
    place = next(place for place, each in enumerate(TABLES[table].columns) if each.kind is ColumnKind.TIME)
    return (at_s for row in rows if isinstance(at_s := row[place], float))


def _named_columns(table: str) -> Iterator[tuple[str, int]]:
    """What a table's columns name, and where they stand."""
    columns = TABLES[table].column_names
    if table == COILS.name:
        wanted: tuple[str, ...] = _OF_COILS
    elif table == TEMPERATURES.name:
        wanted = ("sensor",)
    else:
        wanted = ("location",)
    return ((name, columns.index(name)) for name in wanted if name in columns)


def _known_names(settings: Settings) -> dict[str, set[str]]:
    return {
        "grade": set(settings.grade),
        "part": set(settings.part),
        "location": set(settings.location),
        "sensor": {sensor for location in settings.location.values() for sensor in location.sensors},
    }
