"""The table by itself: keys, mouse, refresh, and that it never formats what is not seen."""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable, Sequence

from textual.app import App, ComposeResult
from textual.pilot import Pilot

from agewatch.board.look import Span
from agewatch.board.palette import NIGHT
from agewatch.board.widgets.columns import Cell, Column, Placed
from agewatch.board.widgets.line_table import LineTable


class Numbers:
    """Lines that count how often they are formatted."""

    columns = (Column("number", "number", 8, 0), Column("double", "double", 8, 1, right=True))
    sorted_by = ("number", False)

    def __init__(self, numbers: Sequence[int]) -> None:
        self.numbers = numbers
        self.formatted: list[int] = []

    def __len__(self) -> int:
        return len(self.numbers)

    def key(self, row: int) -> str:
        return str(self.numbers[row])

    def row_of(self, key: str) -> int | None:
        return self.numbers.index(int(key)) if int(key) in self.numbers else None

    def cells(self, row: int, placed: Sequence[Placed]) -> list[Cell]:
        self.formatted.append(row)
        return [
            (Span(str(self.numbers[row] * (2 if place.column.name == "double" else 1))),) for place in placed
        ]


class TableApp(App[None]):
    """Nothing but the table; keeps what it told."""

    CSS = "LineTable { height: 1fr; overflow-x: hidden; overflow-y: scroll; }"

    def __init__(self, numbers: Sequence[int]) -> None:
        super().__init__()
        self.register_theme(NIGHT)
        self.theme = NIGHT.name
        self.lines = Numbers(numbers)
        self.table = LineTable(id="numbers")
        self.told: list[object] = []

    def compose(self) -> ComposeResult:
        yield self.table

    def on_mount(self) -> None:
        self.table.show(self.lines)
        self.table.focus()

    def on_line_table_chosen(self, message: LineTable.Chosen) -> None:
        self.told.append(("chosen", message.key))

    def on_line_table_opened(self, _: LineTable.Opened) -> None:
        self.told.append("opened")

    def on_line_table_sort_asked(self, message: LineTable.SortAsked) -> None:
        self.told.append(("sort", message.column))


def _drive(numbers: Sequence[int], task: Callable[[Pilot[None], TableApp], Awaitable[None]]) -> None:
    async def run() -> None:
        app = TableApp(numbers)
        async with app.run_test(size=(40, 11)) as pilot:
            await task(pilot, app)

    asyncio.run(run())


def test_keys_move_by_line_page_and_edge() -> None:
    """The chosen line follows the keys, stays inside the list, and stays in view."""

    async def move(pilot: Pilot[None], app: TableApp) -> None:
        rows = []
        for key in ("up", "down", "pagedown", "pagedown", "end", "down", "pageup", "home"):
            await pilot.press(key)
            rows.append(app.table.row)
            assert app.table.row in app.table.rows_in_view
        assert rows == [0, 1, 10, 19, 99, 99, 90, 0]
        assert app.told[-1] == ("chosen", "0")

    _drive(range(100), move)


def test_the_mouse_chooses_opens_sorts_and_scrolls() -> None:
    """A click chooses, a second one opens, one on the header asks for an order, the wheel moves the view alone."""

    async def point(pilot: Pilot[None], app: TableApp) -> None:
        await pilot.click(app.table, offset=(3, 5))
        assert app.table.row == 4
        await pilot.click(app.table, offset=(3, 2), times=2)
        assert (app.table.row, app.told[-1]) == (1, "opened")
        await pilot.click(app.table, offset=(13, 0))
        assert app.told[-1] == ("sort", "double")
        app.table.scroll_relative(y=30, animate=False, force=True)
        await pilot.pause()
        assert (app.table.row, app.table.rows_in_view) == (1, range(30, 40))
        await pilot.press("down")
        assert app.table.row in app.table.rows_in_view

    _drive(range(100), point)


def test_only_lines_that_are_seen_are_formatted() -> None:
    """Going through a hundred thousand rows formats the few that pass the screen."""

    async def move(pilot: Pilot[None], app: TableApp) -> None:
        await pilot.press("end", "home", "pagedown", "down")
        await pilot.pause()
        assert len(set(app.lines.formatted)) < 60
        assert {0, 99_999} <= set(app.lines.formatted)

    _drive(range(100_000), move)


def test_other_lines_keep_the_chosen_object_and_its_place_on_the_screen() -> None:
    """Rows that come in above move the list, not what the reader looks at."""

    async def refresh(pilot: Pilot[None], app: TableApp) -> None:
        await pilot.press("pagedown", "pagedown", "up")
        line = app.table.row - app.table.rows_in_view.start
        app.table.show(Numbers([*range(1000, 1005), *range(100)]))
        await pilot.pause()
        assert (app.table.chosen, app.table.row) == ("17", 22)
        assert app.table.row - app.table.rows_in_view.start == line

    _drive(range(100), refresh)


def test_a_view_that_was_scrolled_away_stays_where_it_is() -> None:
    """Who looks elsewhere with the wheel is not brought back by a refresh."""

    async def refresh(pilot: Pilot[None], app: TableApp) -> None:
        app.table.scroll_to(y=50, animate=False, force=True)
        await pilot.pause()
        app.table.show(Numbers(range(100)))
        await pilot.pause()
        assert app.table.rows_in_view.start == 50
        assert app.table.chosen == "0"

    _drive(range(100), refresh)


def test_lines_grow_and_shrink_under_the_choice() -> None:
    """To nothing and back: the choice is told as it changes, and never points outside."""

    async def refresh(pilot: Pilot[None], app: TableApp) -> None:
        await pilot.press("end")
        app.table.show(Numbers(range(7)))
        await pilot.pause()
        assert (app.table.chosen, app.table.rows_in_view) == ("6", range(7))
        app.table.show(Numbers([]))
        app.table.say_nothing("Nothing here.")
        await pilot.press("down", "end", "pagedown")
        assert (app.table.chosen, list(app.table.rows_in_view)) == (None, [])
        app.table.show(Numbers(range(100)))
        await pilot.press("end")
        assert app.table.row == 99
        assert app.told[-3:] == [("chosen", None), ("chosen", "0"), ("chosen", "99")]

    _drive(range(100), refresh)


def test_an_order_that_was_asked_for_begins_at_its_first_line() -> None:
    """Sorting answers with the top of the list."""

    async def sort(pilot: Pilot[None], app: TableApp) -> None:
        await pilot.press("end")
        app.table.show(Numbers(range(99, -1, -1)), from_top=True)
        await pilot.pause()
        assert (app.table.chosen, app.table.rows_in_view.start) == ("99", 0)

    _drive(range(100), sort)
