"""How many coils have each verdict; a click on one narrows the list to it."""

from __future__ import annotations

from collections.abc import Mapping

from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.message import Message
from textual.widgets import Static

from agewatch.board.look import Span, verdict_spans, verdict_tone
from agewatch.board.widgets.toned import written
from agewatch.plant.assessment import Verdict

ORDER = (Verdict.HOLD, Verdict.PULL, Verdict.WATCH, Verdict.UNASSESSED, Verdict.CLEAR)


class VerdictCount(Static):
    """One verdict and its count."""

    class Clicked(Message):
        """Only coils of this verdict are wanted."""

        def __init__(self, verdict: Verdict) -> None:
            super().__init__()
            self.verdict = verdict

    def __init__(self, verdict: Verdict) -> None:
        super().__init__()
        self.verdict = verdict

    def show(self, count: int) -> None:
        badge, word = verdict_spans(self.verdict)
        tone = verdict_tone(self.verdict) if count else "quiet"
        rest = "plain" if count and self.verdict is not Verdict.CLEAR else "quiet"
        self.update(written([Span(badge.text, tone), Span(f"{word.text} {count}", rest)]))

    def on_click(self) -> None:
        self.post_message(self.Clicked(self.verdict))


class VerdictCounts(Horizontal):
    """All verdicts, the urgent ones first."""

    def __init__(self) -> None:
        super().__init__(id="counts")
        self._counts = [VerdictCount(verdict) for verdict in ORDER]

    def compose(self) -> ComposeResult:
        yield from self._counts

    def show(self, counts: Mapping[Verdict, int]) -> None:
        for shown in self._counts:
            shown.show(counts[shown.verdict])
