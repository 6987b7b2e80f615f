"""The two shapes of a source: long, a record for each row; and wide, a record with a reading for each sensor."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from itertools import repeat
from typing import TYPE_CHECKING, Protocol, cast

from agewatch.intake.cells import Fault, Meaning
from agewatch.intake.coils import Coils
from agewatch.intake.columns import ColumnReader, column_reader
from agewatch.intake.layout import Layout
from agewatch.intake.times import Moments
from agewatch.plant.tables import TEMPERATURES, Row

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed

Faults = dict[int, list[tuple[str, str]]]
"""Place of a record among those read together -> its faults: the source's name of the column, and the reason."""

Cells = Sequence[Sequence[str]]
"""Cells of the records read together, by column of the source."""


@dataclass(slots=True)
class Yield:
    """What some records came to."""

    rows: list[Row] = field(default_factory=list)
    faults: Faults = field(default_factory=dict)
    repeats: int = 0


class Shape(Protocol):
    """Turns the cells of records into rows."""

    def read(self, cells: Cells, lines: Sequence[int], /) -> Yield:
        """`lines` are those at which the records begin, counted from 1."""
        ...


def shape_of(feed: Feed, header: list[str], layout: Layout, now_s: float) -> Shape:
    """The shape that `layout` found, with readers in the dialect of `feed`."""
    moments = Moments(feed.timezone, feed.local_times, feed.time_format)
    readers = [column_reader(column, feed, moments, now_s) for column, _ in layout.columns]
    if not layout.sensors:
        places = [place for _, place in layout.columns]
        names = [feed.columns.get(column.name, column.name) for column, _ in layout.columns]
        return _Long(places, names, readers, Coils(names) if feed.table == "coils" else None)
    celsius = replace(TEMPERATURES.columns[2], required=False)
    sensors = [
        (sensor, place, column_reader(celsius, feed, moments, now_s)) for sensor, place in layout.sensors
    ]
    at = cast("int", layout.columns[0][1])  # a layout has a place for every required column
    return _Wide(header, at, readers[0], sensors)


class _Long:
    def __init__(
        self, places: list[int | None], names: list[str], readers: list[ColumnReader], coils: Coils | None
    ) -> None:
        self._places = places
        self._names = names
        self._readers = readers
        self._coils = coils

    def read(self, cells: Cells, lines: Sequence[int]) -> Yield:
        found = Yield()
        columns: list[Sequence[Meaning]] = []
        for place, name, reader in zip(self._places, self._names, self._readers, strict=True):
            if place is None:
                columns.append([None] * len(lines))
                continue
            meanings, faulty = reader.column(cells[place])
            columns.append(meanings)
            if faulty:
                _note(found.faults, name, meanings)
        rows = cast("list[Row]", list(zip(*columns, strict=True)))
        places: Sequence[int] = range(len(rows))
        if found.faults:
            places = [place for place in places if place not in found.faults]
            rows = [rows[place] for place in places]
        if self._coils is not None:
            refused = self._coils.refused(rows, [lines[place] for place in places])
            for place, fault in refused.items():
                if fault is not None:
                    found.faults[places[place]] = [fault]
            found.repeats = sum(fault is None for fault in refused.values())
            rows = [row for place, row in enumerate(rows) if place not in refused]
        found.rows = rows
        return found


class _Wide:
    def __init__(
        self,
        header: list[str],
        at: int,
        at_reader: ColumnReader,
        sensors: list[tuple[str, int, ColumnReader]],
    ) -> None:
        self._header = header
        self._at = at
        self._at_reader = at_reader
        self._sensors = sensors

    def read(self, cells: Cells, _lines: Sequence[int], /) -> Yield:
        found = Yield()
        times, faulty = self._at_reader.column(cells[self._at])
        if faulty:
            _note(found.faults, self._header[self._at], times)
            times = [None if isinstance(time_s, Fault) else time_s for time_s in times]
        for sensor, place, reader in self._sensors:
            readings, faulty = reader.column(cells[place])
            if faulty:
                _note(found.faults, self._header[place], readings)
                readings = [None if isinstance(celsius, Fault) else celsius for celsius in readings]
            told = zip(times, repeat(sensor), readings, strict=False)
            found.rows += cast(
                "list[Row]", [row for row in told if row[0] is not None and row[2] is not None]
            )
        return found


def _note(faults: Faults, name: str, meanings: Sequence[Meaning]) -> None:
    for place, meaning in enumerate(meanings):
        if isinstance(meaning, Fault):
            faults.setdefault(place, []).append((name, meaning.reason))
