"""Text in tones: for widgets that render lines of their own, and for static texts."""

from __future__ import annotations

from collections.abc import Iterable

from rich.cells import cell_len
from rich.segment import Segment
from rich.style import Style
from textual.content import Content
from textual.strip import Strip
from textual.style import Style as ContentStyle

from agewatch.board.inert import inert
from agewatch.board.look import TONES, Span


class Ground:
    """The style of a place, and every tone upon it. To be made anew when the theme changes."""

    def __init__(self, style: Style) -> None:
        self._style = style
        self._on: dict[tuple[str, str], Style] = {}

    def style(self, tone: str, under: str = "") -> Style:
        """`tone` on this ground; `under` is another tone that gives the background."""
        found = self._on.get((tone, under))
        if found is None:
            found = self._style
            for name in (tone, under) if under else (tone,):
                found += ContentStyle.parse(TONES[name]).rich_style
            self._on[tone, under] = found
        return found

    def strip(self, spans: Iterable[Span], width: int) -> Strip:
        """One line of spans that are inert and have no more than `width` cells; the rest is blank."""
        segments: list[Segment] = []
        text, tone, used = "", "plain", 0
        for span in spans:
            used += cell_len(span.text)
            if span.tone != tone and text:
                segments.append(Segment(text, self.style(tone)))
                text = ""
            text, tone = text + span.text, span.tone
        segments.append(Segment(text, self.style(tone)))
        if used < width:
            segments.append(Segment(" " * (width - used), self._style))
        return Strip(segments, max(used, width))


def written(spans: Iterable[Span]) -> Content:
    """The spans one after the other, made inert, as content for a static text. Never markup."""
    return Content.assemble(*((inert(span.text), TONES[span.tone]) for span in spans if span.text))
