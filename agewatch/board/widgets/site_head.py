"""The head of every screen: which plant, what time, how fresh, how many alarms, and is the tool itself well."""

from __future__ import annotations

from collections.abc import Sequence

from rich.cells import cell_len
from textual import events
from textual.strip import Strip
from textual.widget import Widget

from agewatch.board.data import Site, Snapshot
from agewatch.board.look import Span
from agewatch.board.times import plant_time, time_of_day
from agewatch.board.vitals import ages, alarm_counts, troubles
from agewatch.board.widgets.columns import fitting
from agewatch.board.widgets.paragraphs import Line, Paragraph, wrapped
from agewatch.board.widgets.toned import Ground

TABS = (("store", "1 Store"), ("alarms", "2 Alarms"))
"""Name of each screen and how its tab reads."""
_TABS_FROM = 60
"""Width from which the tabs and the date have room."""
_WORDS_FROM = 100
"""Width from which the alarm counts are written out."""
_STATE_FROM = 15
"""Height of the screen from which the line of ages and alarms has room."""
_MOST_TROUBLE = 3
"""Lines that troubles take at most: the list below is needed in trouble, too."""


class SiteHead(Widget):
    """Shows what holds on every screen; `here` is the screen that it stands on. A click on a tab goes there."""

    def __init__(self, site: Site, here: str) -> None:
        super().__init__(id="head")
        self._site = site
        self._here = here
        self._told: tuple[Snapshot | None, str | None, float] | None = None
        self._lines: list[Line] = []

    def show(self, snapshot: Snapshot | None, unread: str | None, now_s: float) -> None:
        """Bring every line up to `now_s`."""
        self._told = (snapshot, unread, now_s)
        self._write()

    def on_resize(self, _event: events.Resize) -> None:
        self._write()

    async def on_click(self, event: events.Click) -> None:
        column = event.x - (self.size.width - _size(self._right()))
        for name, title in TABS if event.y == 0 and self.size.width >= _TABS_FROM else ():
            if 0 <= column < _size([_tab(title, "")]):
                await self.app.switch_mode(name)
            column -= _size([_tab(title, "")])

    def render_line(self, y: int) -> Strip:
        spans = self._lines[y] if y < len(self._lines) else ()
        return Ground(self.rich_style).strip(spans, self.size.width)

    def _write(self) -> None:
        width = self.size.width
        if self._told is None or not width:
            return
        snapshot, unread, now_s = self._told
        self._lines = [_both_sides([Span(self._site.name, "strong")], self._right(), width)]
        if self.app.size.height >= _STATE_FROM:
            counts = alarm_counts(snapshot, short=width < _WORDS_FROM)
            self._lines.append(_both_sides(ages(snapshot, self._site, now_s), counts, width))
        wrong = troubles(snapshot, unread, self._site, now_s)
        if wrong:
            spans = (Span(" ! ", "trouble"), Span(" " + "  ".join(wrong), "strong"))
            self._lines += wrapped([Paragraph(spans)], width)[:_MOST_TROUBLE]
        if self.size.height != len(self._lines):
            self.styles.height = len(self._lines)
        self.refresh()

    def _right(self) -> list[Span]:
        now_s = self._told[2] if self._told is not None else 0.0
        if self.size.width < _TABS_FROM:
            return [Span(time_of_day(now_s, self._site.zone), "strong")]
        tabs = [_tab(title, "here" if name == self._here else "quiet") for name, title in TABS]
        return [*tabs, Span(f"  {plant_time(now_s, self._site.zone)}", "strong")]


def _tab(title: str, tone: str) -> Span:
    return Span(f" {title} ", tone or "plain")


def _size(spans: Sequence[Span]) -> int:
    return sum(cell_len(span.text) for span in spans)


def _both_sides(left: Sequence[Span], right: Sequence[Span], width: int) -> Line:
    """`right` at the right edge, and of `left` what fits before it."""
    room = width - _size(right) - 1
    if room < 1:
        return tuple(fitting(tuple(right), width, right=True))
    return (*fitting(tuple(left), room, right=False), Span(" "), *right)
