"""Where a source keeps the columns of a table: its header, the feed's names for it, long and wide temperatures."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from agewatch.errors import FeedError
from agewatch.plant.nearest import did_you_mean
from agewatch.plant.tables import TABLES, Column

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed


@dataclass(frozen=True, slots=True)
class Layout:
    """Columns and their places in a record (None: the source has no such column).

    In a wide temperature file `columns` holds the time alone, and `sensors` the place of each sensor's readings.
    """

    columns: tuple[tuple[Column, int | None], ...]
    sensors: tuple[tuple[str, int], ...] = ()


def needed_names(feed: Feed) -> set[str]:
    """The names by which a header is known: those of the required columns that even a wide file has."""
    return {
        feed.columns.get(column.name, column.name)
        for column in TABLES[feed.table].columns
        if column.required and not (feed.table == "temperatures" and column.name in ("sensor", "celsius"))
    }


def lay_out(feed: Feed, source: str, header: list[str]) -> Layout:
    """Raises FeedError when the header lacks a column that is required or that the settings name, or has one twice."""
    wide = _is_wide(feed, header)
    columns = [column for column in TABLES[feed.table].columns if not wide or column.name == "at"]
    theirs = [feed.columns.get(column.name, column.name) for column in columns]
    lacking = [
        name
        for column, name in zip(columns, theirs, strict=True)
        if name not in header and (column.required or column.name in feed.columns)
    ]
    sensors = _sensors(feed, header) if wide else []
    lacking += [name for _, name in sensors if name not in header]
    if lacking:
        raise FeedError(feed.name, source, _lacks(lacking, header))
    if wide and not sensors:
        raise FeedError(
            feed.name, source, "has neither the columns sensor and celsius nor a column for each sensor"
        )
    _refuse_twice(feed, source, header, [*theirs, *(name for _, name in sensors)])
    _refuse_twice(feed, source, [sensor for sensor, _ in sensors], [sensor for sensor, _ in sensors])
    places = {name: place for place, name in enumerate(header)}
    return Layout(
        tuple((column, places.get(name)) for column, name in zip(columns, theirs, strict=True)),
        tuple((sensor, places[name]) for sensor, name in sensors),
    )


def _is_wide(feed: Feed, header: list[str]) -> bool:
    return feed.table == "temperatures" and not any(
        name in feed.columns or name in header for name in ("sensor", "celsius")
    )


def _sensors(feed: Feed, header: list[str]) -> list[tuple[str, str]]:
    """Each sensor and the source's name of its column: those that the settings name, then the others as they are."""
    named = [(sensor, name) for sensor, name in feed.columns.items() if sensor != "at"]
    taken = {feed.columns.get("at", "at"), "", *feed.ignore, *(name for _, name in named)}
    return named + [(name, name) for name in header if name not in taken]


def _refuse_twice(feed: Feed, source: str, names: list[str], read: Iterable[str]) -> None:
    count = Counter(names)
    twice = sorted({name for name in read if count[name] > 1})
    if twice:
        raise FeedError(feed.name, source, f"has the column {', '.join(twice)} more than once; give it once")


def _lacks(lacking: list[str], header: list[str]) -> str:
    missing = ", ".join(f'"{name}"{did_you_mean(name, header)}' for name in lacking)
    return (
        f"its header lacks {missing}; it has {', '.join(header)[:300]}; "
        'name the source\'s columns in the feed: columns = { canonical = "theirs" }'
    )
