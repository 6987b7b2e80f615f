"""One reader for each column of a table: from the cells of many rows to values, or faults where there are none."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from typing import TYPE_CHECKING, Protocol

from agewatch.clock import rfc3339
from agewatch.intake.cells import Fault, Meaning, Understand, Understood, flag, shown, text
from agewatch.intake.numbers import number
from agewatch.intake.times import Moments, utc_s
from agewatch.plant.tables import Column, ColumnKind

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed

AHEAD_S = 300.0
"""How far a source's clock may be ahead of ours."""

EARLIEST_S, LATEST_S = utc_s(1980), utc_s(2100)
"""Times outside are what a source writes for "none" or "for ever"."""

_HAPPENED = {
    ("coils", "temper_rolled_at"),
    ("moves", "at"),
    ("temperatures", "at"),
    ("lab", "tested_at"),
}
"""Times that cannot lie in the future."""


class ColumnReader(Protocol):
    """Reads the cells of one column."""

    def column(self, cells: Sequence[str]) -> tuple[Sequence[Meaning], bool]:
        """The meaning of each cell, and whether any is at fault."""
        ...


def column_reader(column: Column, feed: Feed, moments: Moments, now_s: float) -> ColumnReader:
    """The reader for `column` in the dialect of `feed`."""
    if column.kind is ColumnKind.TIME:
        happened = (feed.table, column.name) in _HAPPENED
        return _TimeColumn(column, feed.empty, moments, now_s if happened else None)
    understand: Understand
    if column.kind is ColumnKind.NUMBER:
        understand = number(column, feed.decimal)
    else:
        understand = flag if column.kind is ColumnKind.FLAG else text(column)
    return Understood(column, feed.empty, understand)


class _TimeColumn:
    """Times between bounds; `now_s` is None where they may lie in the future."""

    def __init__(self, column: Column, empty: Collection[str], moments: Moments, now_s: float | None) -> None:
        self._required = column.required
        self._moments = moments
        self._now_s = now_s
        self._latest_s = LATEST_S if now_s is None else now_s + AHEAD_S
        self._each = Understood(column, empty, self._bounded)

    def column(self, cells: Sequence[str]) -> tuple[Sequence[Meaning], bool]:
        times = self._moments.ordinary(cells)
        if times is not None and self._all_will_do(times):
            return times, False
        return self._each.column(cells)

    def _all_will_do(self, times: list[float | None]) -> bool:
        told = [time_s for time_s in times if time_s is not None]
        if self._required and len(told) < len(times):
            return False
        return not told or (min(told) >= EARLIEST_S and max(told) <= self._latest_s)

    def _bounded(self, cell: str) -> Meaning:
        time_s = self._moments.moment(cell)
        if isinstance(time_s, Fault):
            return time_s
        if not EARLIEST_S <= time_s < LATEST_S:
            return Fault(f"{shown(cell)} is out of bounds; allowed are the years 1980 to 2099")
        if self._now_s is not None and time_s > self._latest_s:
            return Fault(f"{shown(cell)} lies in the future; allowed is up to now, {rfc3339(self._now_s)}")
        return time_s
