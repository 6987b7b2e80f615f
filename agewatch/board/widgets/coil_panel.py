"""The side panel: what the chosen coil needs, why, and the curves and values that say so."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from zoneinfo import ZoneInfo

from textual import events
from textual.app import ComposeResult
from textual.containers import Container, Vertical

from agewatch.alarms import RATIONALISATION, Alarm
from agewatch.board.alarm_list import STATE_WORDS
from agewatch.board.coil_row import CoilRow
from agewatch.board.guidance import guidance
from agewatch.board.look import Span, verdict_spans
from agewatch.board.times import day_time
from agewatch.board.widgets.paragraphs import Paragraph, named
from agewatch.board.widgets.span_text import SpanText
from agewatch.board.widgets.temperature_chart import TemperatureChart
from agewatch.board.widgets.ype_chart import YpeChart
from agewatch.plant.assessment import Verdict
from agewatch.plant.trace import CoilTrace

_LINES_FOR_BOTH = 15
"""Height from which the temperatures have a chart of their own."""
_NAME = 5
_FACT_NAME = 11


class Charts(Vertical):
    """The chart of YPE, and below it, where there is room, that of the temperatures."""

    def on_resize(self, event: events.Resize) -> None:
        self.query_one(TemperatureChart).display = event.size.height >= _LINES_FOR_BOTH


class CoilPanel(Container):
    """Shows one coil; told again whenever coil, trace, alarms or time change."""

    def __init__(self, zone: ZoneInfo) -> None:
        super().__init__(id="panel")
        self._zone = zone
        self._coil_id: str | None = None
        self._words = SpanText(id="panel-words")
        self._ype = YpeChart(zone, id="ype")
        self._temperature = TemperatureChart(zone, id="temperature")

    def compose(self) -> ComposeResult:
        yield self._words
        with Charts(id="panel-charts"):
            yield self._ype
            yield self._temperature

    def show_coil(self, coil: CoilRow | None, alarms: Sequence[Alarm], now_s: float) -> None:
        """Write the words for `coil`; None: no coil is chosen."""
        coil_id = None if coil is None else coil.coil_id
        if coil is None:
            self.say("")
            words = [Paragraph((Span("No coil is chosen.", "quiet"),))]
        else:
            words = list(self._paragraphs(coil, alarms, now_s))
        self._words.write(words, from_top=coil_id != self._coil_id)
        self._coil_id = coil_id

    def show_trace(self, coil: CoilRow, trace: CoilTrace | None) -> None:
        """Draw the curves, or say why there are none."""
        if trace is not None:
            self._ype.show(trace)
            self._temperature.show(trace)
            return
        assessed = coil.verdict is not Verdict.UNASSESSED
        self.say("No curve is known for this coil." if assessed else f"No curve: {coil.reason}.")

    def say(self, sentence: str) -> None:
        """Show a sentence where the curves stand."""
        self._ype.say(sentence)
        self._temperature.say("")

    def _paragraphs(self, coil: CoilRow, alarms: Sequence[Alarm], now_s: float) -> Iterator[Paragraph]:
        said = guidance(coil, now_s, self._zone)
        yield Paragraph((*verdict_spans(coil.verdict)[:1], Span(f" {coil.coil_id}", "strong")))
        yield Paragraph((Span(said.headline, "strong"),))
        yield Paragraph((Span(said.why),), "Why", _NAME)
        yield Paragraph((Span(said.to_do),), "Do", _NAME)
        for alarm in alarms:
            yield Paragraph(self._alarm(alarm), "Alarm", _NAME + 1)
        yield from named(said.facts, _FACT_NAME)
        for caution in said.cautions:
            yield Paragraph((Span(caution, "quiet"),))

    def _alarm(self, alarm: Alarm) -> tuple[Span, ...]:
        by = f" by {alarm.acknowledged_by}" if alarm.acknowledged_by else ""
        since = f", raised {day_time(alarm.raised_s, self._zone)}" if alarm.raised_s is not None else ""
        return (
            Span(f"{STATE_WORDS[alarm.state]}{by}", "strong" if alarm.needs_acknowledging else "plain"),
            Span(f", {alarm.priority}{since}: {RATIONALISATION[alarm.kind].title}"),
        )
