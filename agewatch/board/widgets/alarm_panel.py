"""What the chosen alarm is about, and the record of its kind: cause, consequence, action, time to respond."""

from __future__ import annotations

from zoneinfo import ZoneInfo

from agewatch.alarms import RATIONALISATION, Alarm
from agewatch.board.alarm_list import STATE_WORDS
from agewatch.board.look import Span, priority_spans
from agewatch.board.times import relative, weekday_time
from agewatch.board.widgets.paragraphs import Paragraph, named
from agewatch.board.widgets.span_text import SpanText

_NAME = 9


class AlarmPanel(SpanText):
    """Shows one alarm."""

    def __init__(self, zone: ZoneInfo) -> None:
        super().__init__(id="alarm-panel")
        self._zone = zone
        self._key: tuple[str, str] | None = None

    def show(self, alarm: Alarm | None, now_s: float) -> None:
        """None: no alarm is chosen."""
        key = None if alarm is None else alarm.key
        self.write([] if alarm is None else self._words(alarm, now_s), from_top=key != self._key)
        self._key = key

    def _words(self, alarm: Alarm, now_s: float) -> list[Paragraph]:
        record = RATIONALISATION[alarm.kind]
        title = (*priority_spans(alarm.priority)[:1], Span(f" {record.title}: {alarm.subject}", "strong"))
        pairs = (
            ("State", self._state(alarm, now_s)),
            ("Why", str(alarm.detail.get("reason", ""))),
            ("Do", record.action),
            ("Location", alarm.location),
            ("By when", record.time_to_respond),
            ("Cause", record.cause),
            ("If left", record.consequence),
            *(("", caution) for caution in record.cautions),
        )
        return [Paragraph(title), *named(pairs, _NAME)]

    def _state(self, alarm: Alarm, now_s: float) -> str:
        words = STATE_WORDS[alarm.state]
        if alarm.acknowledged_by:
            words += f" by {alarm.acknowledged_by}"
        if alarm.raised_s is not None:
            raised = f"{weekday_time(alarm.raised_s, self._zone)} ({relative(alarm.raised_s, now_s)})"
            words += f", raised {raised}"
        return words
