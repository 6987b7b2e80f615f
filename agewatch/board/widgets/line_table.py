"""A table of any length that formats and renders only the lines that are seen."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from textual import events
from textual.binding import Binding
from textual.cache import LRUCache
from textual.geometry import Size
from textual.message import Message
from textual.scroll_view import ScrollView
from textual.strip import Strip

from agewatch.board.look import Span
from agewatch.board.widgets.columns import GAP, Cell, Column, Placed, fitted, fitting
from agewatch.board.widgets.toned import Ground

_GUTTER = 1
"""Cells before the first column: the pointer of the chosen line."""
_BETWEEN = Span(" " * GAP)
_HEADER = 1
"""Lines above the rows that stay when they scroll."""


class Lines(Protocol):
    """What a table shows. Rows are numbered from 0 in the order shown."""

    @property
    def columns(self) -> Sequence[Column]: ...

    @property
    def sorted_by(self) -> tuple[str, bool]:
        """Name of the column that gives the order, and whether it runs downwards."""
        ...

    def __len__(self) -> int: ...

    def key(self, row: int) -> str:
        """What identifies the row's object from one refresh to the next."""
        ...

    def row_of(self, key: str) -> int | None:
        """Where the object stands now, if it is shown at all."""
        ...

    def cells(self, row: int, placed: Sequence[Placed]) -> list[Cell]:
        """The row's cells for the columns that are placed."""
        ...


class NoLines:
    """Lines of a table that has nothing to show yet."""

    columns: tuple[Column, ...] = ()
    sorted_by = ("", False)

    def __len__(self) -> int:
        return 0

    def key(self, row: int) -> str:
        raise IndexError(row)

    def row_of(self, key: str) -> int | None:  # noqa: ARG002 - the protocol's
        return None

    def cells(self, row: int, placed: Sequence[Placed]) -> list[Cell]:  # noqa: ARG002 - the protocol's
        raise IndexError(row)


class LineTable(ScrollView, can_focus=True, inherit_bindings=False):
    """Shows `Lines` under a header that stays, with one chosen line."""

    COMPONENT_CLASSES = {"line-table--header", "line-table--chosen", "line-table--chosen-away"}
    BINDINGS = [
        Binding("up", "move(-1)", "Up", show=False),
        Binding("down", "move(1)", "Down", show=False),
        Binding("pageup", "page(-1)", "Page up", show=False),
        Binding("pagedown", "page(1)", "Page down", show=False),
        Binding("home", "edge(0)", "First", show=False),
        Binding("end", "edge(1)", "Last", show=False),
    ]

    class Chosen(Message):
        """Another object is chosen; `key` is None when nothing is left."""

        def __init__(self, table: LineTable, key: str | None) -> None:
            super().__init__()
            self.table = table
            self.key = key

        @property
        def control(self) -> LineTable:
            return self.table

    class Opened(Message):
        """The chosen object is to be shown in full."""

        def __init__(self, table: LineTable) -> None:
            super().__init__()
            self.table = table

        @property
        def control(self) -> LineTable:
            return self.table

    class SortAsked(Message):
        """The order by a column is wanted."""

        def __init__(self, table: LineTable, column: str) -> None:
            super().__init__()
            self.table = table
            self.column = column

        @property
        def control(self) -> LineTable:
            return self.table

    def __init__(self, *, id: str) -> None:  # noqa: A002 - Textual's own word
        super().__init__(id=id)
        self._lines: Lines = NoLines()
        self._nothing = ""
        self._row = 0
        self._placed: tuple[Placed, ...] = ()
        self._grounds: dict[str, Ground] = {}
        self._strips: LRUCache[tuple[int, bool], Strip] = LRUCache(512)

    @property
    def lines(self) -> Lines:
        return self._lines

    @property
    def row(self) -> int:
        """Number of the chosen row."""
        return self._row

    @property
    def chosen(self) -> str | None:
        """Key of the chosen row, if there is any row."""
        return self._lines.key(self._row) if len(self._lines) else None

    @property
    def rows_in_view(self) -> range:
        """The rows that stand on the screen now."""
        first = self.scroll_offset.y
        return range(first, min(len(self._lines), first + self._room))

    def show(self, lines: Lines, *, from_top: bool = False, by_row: bool = False) -> None:
        """Show other lines, or the same anew.

        The chosen object stays chosen and stays where it is on the screen. With `from_top` the first line is
        chosen instead: an order or a filter was asked for, and its first lines are the answer. With `by_row` the
        choice stays on its line: what stood there has been dealt with, and the next one follows.
        """
        before, place, at_top = self.chosen, self._row - self.scroll_offset.y, self.scroll_offset.y == 0
        self._lines = lines
        kept = lines.row_of(before) if before is not None and not (from_top or by_row) else None
        self._row = kept if kept is not None else (0 if from_top else max(0, min(self._row, len(lines) - 1)))
        self._lay_out()
        if from_top:
            self.scroll_to(y=0, animate=False, force=True)
        elif kept is not None and 0 <= place < self._room:
            keeps_top = at_top and kept < self._room  # what has become most urgent shows above it
            self.scroll_to(y=0 if keeps_top else kept - place, animate=False, force=True)
        if self.chosen != before:
            self.post_message(self.Chosen(self, self.chosen))

    def say_nothing(self, sentence: str) -> None:
        """What stands in place of the rows when there are none."""
        self._nothing = sentence
        self.refresh()

    def choose(self, row: int) -> None:
        """Choose a row and bring it into view."""
        if not len(self._lines):
            return
        row = max(0, min(row, len(self._lines) - 1))
        before, self._row = self._row, row
        top = self.scroll_offset.y
        if row < top:
            self.scroll_to(y=row, animate=False, force=True)
        elif row >= top + self._room:
            self.scroll_to(y=row - self._room + 1, animate=False, force=True)
        if row != before:
            self.refresh_line(before + _HEADER)
            self.refresh_line(row + _HEADER)
            self.post_message(self.Chosen(self, self.chosen))

    def reformat(self) -> None:
        """Format the lines in view anew: what they say depends on the time."""
        self._strips.clear()
        self.refresh()

    def action_move(self, by: int) -> None:
        self.choose(self._row + by)

    def action_page(self, direction: int) -> None:
        self.choose(self._row + direction * max(1, self._room - 1))

    def action_edge(self, end: int) -> None:
        self.choose(len(self._lines) - 1 if end else 0)

    def on_resize(self, _event: events.Resize) -> None:
        in_view = self._row - self.scroll_offset.y
        self._lay_out()
        if in_view >= 0:
            self.choose(self._row)

    def on_click(self, event: events.Click) -> None:
        event.stop()
        if event.y < _HEADER:
            self._click_header(event.x - _GUTTER)
            return
        row = self.scroll_offset.y + event.y - _HEADER
        if row < len(self._lines):
            self.choose(row)
            if event.chain == 2:
                self.post_message(self.Opened(self))

    def notify_style_update(self) -> None:
        self._strips.clear()
        self._grounds.clear()
        super().notify_style_update()

    def on_focus(self) -> None:
        self._strips.clear()

    def on_blur(self) -> None:
        self._strips.clear()

    def render_line(self, y: int) -> Strip:
        """The header, or the row that stands on screen line `y`."""
        if y < _HEADER:
            return self._header()
        row = self.scroll_offset.y + y - _HEADER
        if row >= len(self._lines):
            said = self._nothing if row == 0 else ""
            return self._ground("").strip(
                fitting((Span(said, "quiet"),), self._width, right=False), self._width
            )
        at = (row, row == self._row)
        strip = self._strips.get(at)
        if strip is None:
            strip = self._strips[at] = self._rendered(*at)
        return strip

    @property
    def _width(self) -> int:
        """Cells of a line beside the scroll bar."""
        return self.scrollable_content_region.width

    @property
    def _room(self) -> int:
        return max(1, self.size.height - _HEADER)

    def _lay_out(self) -> None:
        self._strips.clear()
        self._placed = fitted(self._lines.columns, self._width - _GUTTER)
        self.virtual_size = Size(0, len(self._lines) + _HEADER)
        self.refresh()

    def _click_header(self, x: int) -> None:
        for place in self._placed:
            if place.start <= x < place.start + place.width + GAP:
                self.post_message(self.SortAsked(self, place.column.name))

    def _header(self) -> Strip:
        by, descending = self._lines.sorted_by
        titles: list[Cell] = []
        for place in self._placed:
            arrow = ("↓" if descending else "↑") if place.column.name == by else ""
            titles.append((Span(place.column.title + arrow),))
        return self._line(titles, " ", "line-table--header")

    def _rendered(self, row: int, chosen: bool) -> Strip:
        cells = self._lines.cells(row, self._placed)
        if not chosen:
            return self._line(cells, " ", "")
        return self._line(cells, "▸", "line-table--chosen" if self.has_focus else "line-table--chosen-away")

    def _line(self, cells: Sequence[Cell], gutter: str, place: str) -> Strip:
        spans = [Span(gutter)]
        for placed, cell in zip(self._placed, cells, strict=True):
            spans.extend(fitting(cell, placed.width, right=placed.column.right))
            spans.append(_BETWEEN)
        return self._ground(place).strip(spans[:-1], self._width)

    def _ground(self, place: str) -> Ground:
        ground = self._grounds.get(place)
        if ground is None:
            style = self.get_component_rich_style(place) if place else self.rich_style
            ground = self._grounds[place] = Ground(style)
        return ground
