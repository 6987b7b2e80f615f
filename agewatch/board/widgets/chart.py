"""A widget that shows one plot, or a sentence in its place."""

from __future__ import annotations

import textwrap
from abc import abstractmethod
from zoneinfo import ZoneInfo

from rich.segment import Segment
from textual import events
from textual.strip import Strip
from textual.widget import Widget

from agewatch.board.inert import inert
from agewatch.board.widgets.plot import Plot
from agewatch.board.widgets.toned import Ground
from agewatch.plant.trace import CoilTrace

PictureRuns = list[list[tuple[str, str, str]]]


class Chart(Widget):
    """Draws a coil's trace whenever it, or the room for it, changes; below `LEAST` cells it says so instead."""

    LEAST = (30, 8)
    TOO_SMALL = "There is no room for the chart here."

    def __init__(self, zone: ZoneInfo, *, id: str) -> None:  # noqa: A002 - Textual's own word
        super().__init__(id=id)
        self._zone = zone
        self._trace: CoilTrace | None = None
        self._sentence = ""
        self._strips: list[Strip] = []

    def show(self, trace: CoilTrace) -> None:
        """Draw `trace` from now on."""
        self._trace, self._sentence = trace, ""
        self._redraw()

    def say(self, sentence: str) -> None:
        """Show a sentence in place of a chart."""
        self._trace, self._sentence = None, sentence
        self._redraw()

    @abstractmethod
    def draw(self, trace: CoilTrace, width: int, height: int) -> Plot:
        """The picture of `trace` on `width` × `height` cells."""

    def on_resize(self, _event: events.Resize) -> None:
        self._redraw()

    def notify_style_update(self) -> None:
        self._strips = []
        super().notify_style_update()

    def render_line(self, y: int) -> Strip:
        if not self._strips:
            ground = Ground(self.rich_style)
            self._strips = [_strip(runs, self.size.width, ground) for runs in (*self._drawn(), [])]
        return self._strips[min(y, len(self._strips) - 1)]

    def _redraw(self) -> None:
        self._strips = []
        self.refresh()

    def _drawn(self) -> PictureRuns:
        width, height = self.size
        if self._trace is None:
            return _as_lines(inert(self._sentence), width)
        if width < self.LEAST[0] or height < self.LEAST[1]:
            return _as_lines(self.TOO_SMALL, width)
        return self.draw(self._trace, width, height).lines()


def _strip(runs: list[tuple[str, str, str]], width: int, ground: Ground) -> Strip:
    if not runs:
        return ground.strip((), width)
    segments = [Segment(text, ground.style(name, under)) for text, name, under in runs]
    return Strip(segments).adjust_cell_length(width, ground.style("plain"))


def _as_lines(sentence: str, width: int) -> PictureRuns:
    return [[(line, "quiet", "")] for line in textwrap.wrap(sentence, max(1, width))]
