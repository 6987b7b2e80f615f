"""A screen that is one long list: find, order, and what depends on the minute."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Collection, Mapping
from typing import ClassVar

from textual import on, work
from textual.app import SystemCommand
from textual.binding import Binding

from agewatch.board.order import Order
from agewatch.board.present import Present
from agewatch.board.screens.board_screen import BoardScreen
from agewatch.board.screens.dialogs import Choose
from agewatch.board.widgets.find_bar import FindBar
from agewatch.board.widgets.line_table import LineTable


class ListScreen(BoardScreen):
    """Holds the words and the order that its list follows; a subclass composes `find_bar` and `table`."""

    HINT = ""
    """What can be typed to narrow the list down."""

    SORTABLE: ClassVar[Mapping[str, str]] = {}
    """What the list can be ordered by, and how that reads."""
    MOST_FIRST: ClassVar[Collection[str]] = ()
    BINDINGS = [
        Binding("f", "find", "Find", tooltip="Type words that narrow the list down"),
        Binding("o", "order", "Order", tooltip="Choose what the list is ordered by"),
        Binding("escape", "back", "Back", show=False),
    ]

    def __init__(self, present: Present) -> None:
        super().__init__(present)
        self.table = LineTable(id=f"{self.NAME}-table")
        self.find_bar = FindBar(self.HINT)
        self.words = ""
        self.order = Order()
        self._minute = 0.0

    @abstractmethod
    def list_again(self, *, from_top: bool = False) -> None:
        """Show the list by the present words and order; `from_top`: its first lines are what was asked for."""

    @property
    def narrowed(self) -> bool:
        """Whether words keep part of the list out."""
        return bool(self.words.strip())

    def on_mount(self) -> None:
        self.table.focus()

    def tick(self) -> None:
        super().tick()
        minute = self.present.now_s() // 60
        if minute != self._minute:
            self._minute = minute
            self.show_minute()

    def show_minute(self) -> None:
        """Another minute has begun: relative times read differently."""
        self.table.reformat()

    def order_by(self, by: str) -> None:
        self.order = self.order.chosen(by, self.MOST_FIRST)
        self.list_again(from_top=True)

    def say_count(self, shown: int, total: int, noun: str) -> None:
        of = f"{shown:,} of {total:,}" if self.narrowed else f"{total:,}"
        self.find_bar.say_count(f"{of} {noun} by {self.SORTABLE[self.order.by]}")

    def commands(self) -> list[SystemCommand]:
        return [
            SystemCommand(f"Order by {words}", "Order the list", lambda by=by: self.order_by(by))
            for by, words in self.SORTABLE.items()
        ]

    def action_find(self) -> None:
        self.find_bar.take_keys()

    @work
    async def action_order(self) -> None:
        by = await self.app.push_screen_wait(Choose("Order the list by", self.SORTABLE, self.order.by))
        if by is not None:
            self.order_by(by)

    def action_back(self) -> None:
        self.find_bar.set_words("")

    @on(FindBar.Changed)
    def _find_words(self, message: FindBar.Changed) -> None:
        self.words = message.words
        self.list_again(from_top=self.narrowed)
        if not self.narrowed:
            self.table.choose(self.table.row)  # the whole list again, at the chosen line

    @on(FindBar.Left)
    def _leave_find(self) -> None:
        self.table.focus()

    @on(LineTable.SortAsked)
    def _sort(self, message: LineTable.SortAsked) -> None:
        self.order_by(message.column)
