"""Alarms as lines of a table."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from zoneinfo import ZoneInfo

from agewatch.alarms import RATIONALISATION, Alarm
from agewatch.board.alarm_list import STATE_WORDS, arranged
from agewatch.board.look import Span, priority_spans
from agewatch.board.order import Order
from agewatch.board.times import day_time, relative
from agewatch.board.widgets.columns import Cell, Column, Placed, widest

_TIME = len("28 Sep 07:30")
_TITLE = len("Yield point returns before pre")
"""Cells of a title that tell each kind from all others."""
_MOST_CELLS = 32


def alarm_key(alarm: Alarm) -> str:
    """What tells one alarm from all others in a table."""
    return f"{alarm.kind}\n{alarm.subject}"


class AlarmLines:
    """Lines for the alarms that match `words`, in `order`."""

    def __init__(
        self,
        alarms: Sequence[Alarm],
        order: Order,
        words: str,
        now_s: Callable[[], float],
        zone: ZoneInfo,
    ) -> None:
        self.sorted_by = (order.by, order.descending)
        self.alarms = arranged(alarms, order, words)
        self.columns = _columns(self.alarms)
        self._row_of = {alarm_key(alarm): row for row, alarm in enumerate(self.alarms)}
        self._now_s = now_s
        self._zone = zone

    def __len__(self) -> int:
        return len(self.alarms)

    def key(self, row: int) -> str:
        return alarm_key(self.alarms[row])

    def row_of(self, key: str) -> int | None:
        return self._row_of.get(key)

    def cells(self, row: int, placed: Sequence[Placed]) -> list[Cell]:
        alarm = self.alarms[row]
        return [
            self._since(alarm, place.width)
            if place.column.name == "since"
            else _cell(alarm, place.column.name)
            for place in placed
        ]

    def _since(self, alarm: Alarm, width: int) -> Cell:
        if alarm.raised_s is None:
            return (Span("–", "quiet"),)
        absolute = Span(f"{day_time(alarm.raised_s, self._zone):>{_TIME}}")
        if width <= _TIME:
            return (absolute,)
        return (absolute, Span(f"  {relative(alarm.raised_s, self._now_s())}", "quiet"))


def _cell(alarm: Alarm, column: str) -> Cell:
    tone = "strong" if alarm.needs_acknowledging else "plain"
    match column:
        case "priority":
            return priority_spans(alarm.priority)
        case "state":
            return (Span(STATE_WORDS[alarm.state], tone),)
        case "what":
            return (Span(RATIONALISATION[alarm.kind].title, tone),)
        case "subject":
            return (Span(alarm.subject, tone),)
        case "location":
            return (Span(alarm.location or "–"),)
        case _:
            return (Span(alarm.acknowledged_by or "–", "quiet"),)


def _columns(alarms: Sequence[Alarm]) -> tuple[Column, ...]:
    longest = widest([RATIONALISATION[alarm.kind].title for alarm in alarms], 20, _MOST_CELLS + 8)
    return (
        Column("priority", "priority", len(" 2 medium"), 0),
        Column("state", "state", len("● unacknowledged"), 2, wide=len("○ returned to normal")),
        Column("what", "what", min(_TITLE, longest), 3, wide=longest),
        Column("subject", "about", widest([alarm.subject for alarm in alarms], 8, _MOST_CELLS), 1),
        Column("location", "location", widest([alarm.location for alarm in alarms], 8, 20), 5),
        Column("since", "raised", _TIME, 4, wide=_TIME + len("  99 d 23 h ago")),
        Column("by", "acknowledged by", len("acknowledged by"), 6),
    )
