"""What the text of a time means: RFC 3339, ISO 8601 or a feed's own pattern, in UTC or in the feed's zone."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from datetime import UTC, datetime, timedelta
from typing import Literal
from zoneinfo import ZoneInfo

from agewatch.intake.cells import Fault, shown

LocalTimes = Literal["refuse", "earlier", "later"]

_ALLOWED = "allowed is RFC 3339, for example 2026-05-01T06:30:00Z or 2026-05-01 08:30+02:00"
_MINUTE = re.compile(r"[Tt ](?:(?P<h>[01]\d|2[0-3]):(?P<min>[0-5]\d)|24:00)", re.ASCII)
_REST = re.compile(
    r"(?::(?P<s>(?:[0-5]\d|60)(?:[.,]\d+)?))?"
    r" ?(?P<offset>[Zz]|(?P<sign>[+-])(?P<oh>[01]\d|2[0-3])(?::?(?P<om>[0-5]\d))?)?",
    re.ASCII,
)
_OFFSET = re.compile(r"[Zz+-]")
_EPOCH = datetime(1970, 1, 1)
_DAY_S = 86_400.0
_REMEMBERED = 100_000


class _Remembered(dict[str, float]):
    """Parts of times met so far, in seconds."""

    def __init__(self, seconds: Callable[[str], float]) -> None:
        super().__init__()
        self._seconds = seconds

    def __missing__(self, part: str) -> float:
        if len(self) >= _REMEMBERED:
            self.clear()
        seconds = self[part] = self._seconds(part)
        return seconds


class Moments:
    """Reads the times of one feed: seconds since 1970 in UTC out of text.

    `zone` is that of times without an offset; `local_times` says what a local time stands for that occurs twice or
    never when the clocks change; `pattern` is a strptime pattern, "" for RFC 3339.
    """

    def __init__(self, zone: str, local_times: LocalTimes, pattern: str) -> None:
        self._zone = ZoneInfo(zone)
        self._local_times = local_times
        self._pattern = pattern
        self._date_pattern = _date_pattern(pattern)
        self._days = _Remembered(self._day_s)
        self._local_days = _Remembered(self._local_midnight_s)
        self._minutes = _Remembered(_minute_s)
        self._rests = _Remembered(lambda part: _rest_s(part, with_offset=True))
        self._local_rests = _Remembered(lambda part: _rest_s(part, with_offset=False))

    def moment(self, cell: str) -> float | Fault:
        """One time."""
        aware = _OFFSET.search(cell, 16) is not None
        rests = self._rests if aware else self._local_rests
        try:
            wall_s = self._days[cell[:10]] + self._minutes[cell[10:16]] + rests[cell[16:]]
        except ValueError:
            return self._by_pattern(cell) if self._pattern else Fault(f"{shown(cell)} is no time; {_ALLOWED}")
        return wall_s if aware else self._placed(wall_s, cell)

    def ordinary(self, cells: Sequence[str]) -> list[float | None] | None:
        """The times of a whole column if all are written alike and plainly, else None; "" becomes None.

        Day, minute and rest are looked up, so that times that are all different cost little all the same.
        """
        aware = _OFFSET.search(next(filter(None, cells), ""), 16) is not None
        days = self._days if aware else self._local_days
        rests = self._rests if aware else self._local_rests
        minutes = self._minutes
        try:
            return [
                days[cell[:10]] + minutes[cell[10:16]] + rests[cell[16:]] if cell else None for cell in cells
            ]
        except ValueError:
            return None

    def _by_pattern(self, cell: str) -> float | Fault:
        try:
            wall = datetime.strptime(cell, self._pattern)
        except (ValueError, OverflowError):
            return Fault(f"{shown(cell)} is no time; allowed is the feed's time_format, {self._pattern}")
        if wall.tzinfo is not None:
            return wall.timestamp()
        return self._placed((wall - _EPOCH).total_seconds(), cell)

    def _placed(self, wall_s: float, cell: str) -> float | Fault:
        """The moment at which the zone's clocks show `wall_s` (seconds since 1970 as the clocks count them)."""
        before, after = self._candidates(wall_s)
        if before == after:
            return before
        if self._local_times != "refuse":
            return min(before, after) if self._local_times == "earlier" else max(before, after)
        what = "occurs twice" if before < after else "never occurs"
        return Fault(
            f"{shown(cell)} {what} in {self._zone.key}, where the clocks change then; give it with its offset, or "
            'settle such times by local_times = "earlier" or "later" in the feed'
        )

    def _candidates(self, wall_s: float) -> tuple[float, float]:
        """`wall_s` by the offset before and by the offset after a change of the clocks; equal where none is near."""
        try:
            wall = _EPOCH + timedelta(seconds=wall_s)
            offsets = [wall.replace(tzinfo=self._zone, fold=fold).utcoffset() for fold in (0, 1)]
        except OverflowError:
            return wall_s, wall_s
        before, after = (wall_s - (offset or timedelta(0)).total_seconds() for offset in offsets)
        return before, after

    def _day_s(self, part: str) -> float:
        """Start of a calendar day, as if in UTC; ValueError where there is none."""
        if self._date_pattern is None or len(part) != 10 or not part.isascii():
            raise ValueError(part)
        return (datetime.strptime(part, self._date_pattern) - _EPOCH).total_seconds()

    def _local_midnight_s(self, part: str) -> float:
        """Start of a local day all of which has one offset; other days are a ValueError."""
        start_s = self._days[part]
        starts = self._candidates(start_s)
        ends = self._candidates(start_s + _DAY_S)
        if len({*starts, *(end_s - _DAY_S for end_s in ends)}) > 1:
            raise ValueError(part)
        return starts[0]


def _date_pattern(pattern: str) -> str | None:
    """The date of a pattern whose times are ten characters of date, then a clock as RFC 3339 has it; else None."""
    date_pattern, clock_pattern = pattern[:8], pattern[8:]
    if not pattern:
        return "%Y-%m-%d"
    dated = sorted(re.findall("%.", date_pattern)) == ["%Y", "%d", "%m"]
    clocked = clock_pattern in (" %H:%M", " %H:%M:%S", "T%H:%M", "T%H:%M:%S")
    return date_pattern if dated and clocked else None


def _minute_s(part: str) -> float:
    """Seconds from midnight to a minute such as T06:30; ValueError where there is none."""
    clock = _MINUTE.fullmatch(part)
    if clock is None:
        raise ValueError(part)
    return int(clock["h"]) * 3600.0 + int(clock["min"]) * 60.0 if clock["h"] else _DAY_S


def _rest_s(part: str, *, with_offset: bool) -> float:
    """Seconds of the minute (60 where one leaps) less the offset, such as :15+02:00; ValueError if it is neither."""
    rest = _REST.fullmatch(part)
    if rest is None or (rest["offset"] is not None) != with_offset:
        raise ValueError(part)
    seconds = float((rest["s"] or "0").replace(",", "."))
    if rest["sign"] is None:
        return seconds
    offset_s = int(rest["oh"]) * 3600.0 + int(rest["om"] or "0") * 60.0
    return seconds + offset_s if rest["sign"] == "-" else seconds - offset_s


def utc_s(year: int) -> float:
    """Start of a year in UTC, seconds since 1970."""
    return datetime(year, 1, 1, tzinfo=UTC).timestamp()
