"""Text in spans without a layout of its own: what it says can change with every key at no cost."""

from __future__ import annotations

from collections.abc import Sequence

from textual import events
from textual.geometry import Size
from textual.scroll_view import ScrollView
from textual.strip import Strip
from textual.widget import Widget

from agewatch.board.look import Span
from agewatch.board.widgets.columns import fitting
from agewatch.board.widgets.paragraphs import Line, Paragraph, wrapped
from agewatch.board.widgets.toned import Ground


class SpanLine(Widget):
    """One line, at the right edge of its room."""

    def __init__(self, *, id: str) -> None:  # noqa: A002 - Textual's own word
        super().__init__(id=id)
        self._spans: tuple[Span, ...] = ()

    def write(self, spans: Sequence[Span]) -> None:
        self._spans = tuple(spans)
        self.refresh()

    def render_line(self, y: int) -> Strip:
        width = self.size.width
        spans = fitting(self._spans, width, right=True) if y == 0 and width else []
        return Ground(self.rich_style).strip(spans, width)


class SpanText(ScrollView):
    """Paragraphs that scroll."""

    def __init__(self, paragraphs: Sequence[Paragraph] = (), *, id: str) -> None:  # noqa: A002 - Textual's own word
        super().__init__(id=id)
        self._paragraphs = tuple(paragraphs)
        self._lines: list[Line] = []
        self._strips: list[Strip] = []

    def write(self, paragraphs: Sequence[Paragraph], *, from_top: bool) -> None:
        """Show other paragraphs, from their beginning or from where the reader is."""
        if self._paragraphs != tuple(paragraphs):
            self._paragraphs = tuple(paragraphs)
            self._wrap()
        if from_top:
            self.scroll_to(y=0, animate=False, force=True)

    def on_resize(self, _event: events.Resize) -> None:
        self._wrap()

    def notify_style_update(self) -> None:
        self._strips = []
        super().notify_style_update()

    def render_line(self, y: int) -> Strip:
        if not self._strips:
            ground = Ground(self.rich_style)
            self._strips = [ground.strip(line, self._width) for line in (*self._lines, ())]
        return self._strips[min(self.scroll_offset.y + y, len(self._lines))]

    @property
    def _width(self) -> int:
        return self.scrollable_content_region.width

    def _wrap(self) -> None:
        self._lines = wrapped(self._paragraphs, self._width) if self._width else []
        self._strips = []
        self.virtual_size = Size(0, len(self._lines))
        self.refresh()
