"""The help: keys, marks, words, and what each kind of alarm means and asks for."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from textual.app import ComposeResult
from textual.binding import Binding
from textual.screen import ModalScreen

from agewatch.alarms import RATIONALISATION, AlarmState
from agewatch.board.alarm_list import STATE_WORDS
from agewatch.board.guidance import CAUTION
from agewatch.board.look import STARTING_POINT_LEGEND, Span, verdict_spans
from agewatch.board.widgets.paragraphs import Paragraph, named
from agewatch.board.widgets.span_text import SpanText
from agewatch.board.widgets.verdict_counts import ORDER
from agewatch.plant.assessment import Verdict

_VERDICTS = {
    Verdict.HOLD: "the plateau has returned by the P50 estimate, or a test says so: do not press",
    Verdict.PULL: "the plateau may return before the planned pressing: bring the coil forward",
    Verdict.WATCH: "half way to a pull: nothing to move yet",
    Verdict.UNASSESSED: "the board cannot tell, and says why: go by the shelf life",
    Verdict.CLEAR: "nothing to do",
}
_WORDS = (
    ("YPE", "yield-point elongation: the plateau that shows as stretcher strain on a pressed panel"),
    ("equivalent age", "days at 20 °C that would have aged the coil as much"),
    ("P10 / P50 / P90", "the date by which the plateau is back in 10, 50 or 90 of 100 such coils"),
    ("slack", "from the planned pressing to the P10 return; late: the return may come first"),
    ("risk", "how probable a return before the planned pressing is"),
    ("outlook", "the temperatures to come that the dates rest on"),
    ("estimated", "the share of the aging that rests on filled-in temperatures"),
)
_CHART = (
    ("full line", "YPE by the P50 estimate"),
    ("band", "P10 to P90, with dotted edges"),
    ("dashed line", "what the part bears"),
    ("upright lines", "now (N) and the planned pressing (P)"),
)


_STATES = (
    (STATE_WORDS[AlarmState.UNACKNOWLEDGED], "there, and nobody has said that it is seen"),
    (STATE_WORDS[AlarmState.ACKNOWLEDGED], "there, and seen"),
    (STATE_WORDS[AlarmState.RETURNED_UNACKNOWLEDGED], "gone by itself before anybody said that it is seen"),
)
_URGENCY = (
    ("first", "hold and pull, the least slack first; without a planned pressing by P10"),
    ("then", "watch, unassessed, clear, each in the same way"),
)


class HelpScreen(ModalScreen[None]):
    """Scrolls; Escape, F1 or ? closes it."""

    BINDINGS = [Binding("escape,f1,question_mark", "dismiss(None)", "Close")]

    def __init__(self, keys: Iterable[tuple[str, str]]) -> None:
        super().__init__()
        self._text = SpanText(list(_help(keys)), id="help")

    def compose(self) -> ComposeResult:
        yield self._text

    def on_mount(self) -> None:
        self._text.focus()


def _help(keys: Iterable[tuple[str, str]]) -> Iterator[Paragraph]:
    yield from _part("Keys", keys)
    yield from _part("Order of urgency", _URGENCY)
    yield from _heading("Verdicts")
    for verdict in ORDER:
        badge, word = verdict_spans(verdict)
        yield Paragraph((badge, Span(f"{word.text:<12}", word.tone), Span(_VERDICTS[verdict])))
    yield from _part("Words", _WORDS)
    yield from _part("The chart", _CHART)
    yield Paragraph((Span(STARTING_POINT_LEGEND),))
    yield Paragraph((Span(CAUTION),))
    yield from _part("States of an alarm", _STATES)
    for record in RATIONALISATION.values():
        yield from _part(
            f"Alarm: {record.title}",
            (
                ("Do", record.action),
                ("By when", record.time_to_respond),
                ("Cause", record.cause),
                ("If left", record.consequence),
            ),
        )


def _part(heading: str, pairs: Iterable[tuple[str, str]]) -> Iterator[Paragraph]:
    listed = list(pairs)
    yield from _heading(heading)
    yield from named(listed, 2 + max(len(name) for name, _ in listed))


def _heading(words: str) -> Iterator[Paragraph]:
    yield Paragraph(())
    yield Paragraph((Span(words, "strong"),))
