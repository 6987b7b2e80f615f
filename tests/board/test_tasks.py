"""The supervisor's tasks, done with the keys and the mouse."""

from __future__ import annotations

from dataclasses import replace

from textual.command import CommandList
from textual.pilot import Pilot
from textual.widgets import Input

from agewatch.alarms import AlarmState
from agewatch.board.data import Pulse
from agewatch.board.screens.list_screen import ListScreen
from agewatch.board.widgets.line_table import LineTable
from agewatch.plant.assessment import Verdict
from tests.board.driving import drive, listed, press, said, screen_text, settled, type_words, until
from tests.board.plant import ALARMS, COILS, NOW_S, FakePlant, board, coil, plant


def test_the_most_urgent_coil_is_chosen_and_explained_as_soon_as_the_board_is_there() -> None:
    """Without a key pressed, the coil to act on first is chosen, with why, where and what to do beside it."""
    app = board(plant())

    async def look(pilot: Pilot[None]) -> None:
        text = screen_text(app)
        assert listed(app).table.chosen == "C1001"
        assert "Hold: do not press" in text
        assert "The plateau has returned by the P50" in text
        assert "Lifting and moving follow site rules" not in text  # further down: the panel scrolls

    drive(app, look)


def test_coils_to_act_on_stand_before_all_others() -> None:
    """Hold and pull come first by slack, one without pressing after them; then watch, unassessed, clear."""
    app = board(plant())

    async def look(pilot: Pilot[None]) -> None:
        lines = listed(app).table.lines
        assert [lines.key(row) for row in range(5)] == ["C1001", "C1002", "C1003", "C1004", "C1005"]

    drive(app, look)


def test_words_typed_narrow_the_list_down_with_every_key() -> None:
    """All words must match, in whatever names they stand; the count says how many are left."""
    app = board(plant())

    async def find(pilot: Pilot[None]) -> None:
        await press(pilot, "f")
        await type_words(pilot, "bay-2 pull")
        assert [listed(app).table.lines.key(row) for row in range(len(listed(app).table.lines))] == ["C1003"]
        assert "1 of 80 coils" in screen_text(app)
        await press(pilot, "enter")
        assert listed(app).table.has_focus

    drive(app, find)


def test_a_search_ends_at_the_coil_that_it_found() -> None:
    """Words that no coil has are said to find none; Escape shows all again with the found coil chosen, in view."""
    app = board(plant())

    async def find(pilot: Pilot[None]) -> None:
        await press(pilot, "f")
        await type_words(pilot, "zzz")
        assert "No coil has all these words: Escape shows all." in screen_text(app)
        assert "No coil is chosen." in screen_text(app)
        await press(pilot, "enter", "a", "down", "end", "escape", "f")
        await type_words(pilot, "c1611")
        await press(pilot, "escape")
        table = listed(app).table
        assert len(table.lines) == len(COILS)
        assert table.chosen == "C1611"
        assert table.row in table.rows_in_view

    drive(app, find)


def test_a_column_is_sorted_by_key_or_click_and_turned_round_by_asking_again() -> None:
    """The dialog puts the chosen column in order, a second time turns it round; a click on a header does the same."""
    app = board(plant())

    async def order(pilot: Pilot[None]) -> None:
        await press(pilot, "o", "down", "down", "enter")
        assert listed(app).table.chosen == "C1001"
        assert listed(app).table.lines.key(79) == "C1618"
        await press(pilot, "o", "enter")
        assert listed(app).table.chosen == "C1618"
        assert "by coil" in screen_text(app)
        header = screen_text(app).splitlines()[4]
        await pilot.click(listed(app).table, offset=(header.index("location") + 2, 0))
        await settled(pilot)
        assert listed(app).order.by == "location"
        assert listed(app).table.chosen == "C1005"  # the most urgent of BAY-1

    drive(app, order)


def test_the_side_panel_opens_below_a_narrow_list_and_escape_closes_it() -> None:
    """On 80 columns the list has the screen; Enter shows the chosen coil under it, Escape gives the lines back."""
    app = board(plant())

    async def open_it(pilot: Pilot[None]) -> None:
        assert "Pull forward" not in screen_text(app)
        await press(pilot, "down", "enter")
        text = screen_text(app)
        assert "Pull forward: press before" in text
        assert "limit 0.2 %" in text
        assert "now" in text
        await press(pilot, "escape")
        assert "Pull forward" not in screen_text(app)

    drive(app, open_it, size=(80, 24))


def test_the_panel_follows_the_chosen_coil() -> None:
    """Moving through the list changes words and curve; a coil that cannot be assessed says why it has none."""
    app = board(plant())

    async def move(pilot: Pilot[None]) -> None:
        await press(pilot, "down", "down", "down", "down")
        text = screen_text(app)
        assert "Not assessed: how long it keeps is not known" in text
        assert "No curve: grade X9 is not in the settings." in text
        await press(pilot, "up")
        assert "Watch: nothing to move yet" in screen_text(app)
        assert "limit 0.2 %" in screen_text(app)

    drive(app, move)


def test_going_to_a_coil_by_its_number() -> None:
    """A number, or the beginning of one, jumps there; a number that nobody has is said."""
    app = board(plant())

    async def go(pilot: Pilot[None]) -> None:
        await press(pilot, "g")
        await type_words(pilot, "c13")
        await press(pilot, "enter")
        assert str(listed(app).table.chosen).startswith("C13")
        await press(pilot, "g")
        await type_words(pilot, "q99")
        await press(pilot, "enter")
        assert "No coil has a number like q99" in screen_text(app)

    drive(app, go)


def test_an_alarm_of_the_chosen_coil_is_acknowledged_from_the_store() -> None:
    """The daemon does it, the board says it was done and shows who did."""
    data = plant()
    app = board(data)

    async def acknowledge(pilot: Pilot[None]) -> None:
        assert "3 unacknowledged" not in screen_text(app)
        await press(pilot, "a")
        assert data.now.alarms[0].state is AlarmState.ACKNOWLEDGED
        text = screen_text(app)
        assert "1 alarm acknowledged." in text
        assert "acknowledged by user:petr" in text
        assert "3 unacknowledged" in text
        await press(pilot, "a")
        assert "No alarm of coil C1001 waits to be acknowledged." in screen_text(app)

    drive(app, acknowledge)


def test_an_acknowledgement_that_fails_is_said_and_changes_nothing() -> None:
    """Refused, or nobody there: the sentence is shown, the alarm stays as it was, the board goes on."""
    data = plant()
    app = board(data)

    async def acknowledge(pilot: Pilot[None]) -> None:
        await press(pilot, "2")
        for refusal in (
            "you may look, but not operate",
            "the daemon is not running: nobody listens at var/s",
        ):
            data.refusal = refusal
            await press(pilot, "a")
            assert said(app) == f"Not acknowledged: {refusal}"
            assert data.now.alarms == ALARMS
        await press(pilot, "down")
        assert listed(app).table.row == 1

    drive(app, acknowledge)


def test_the_alarms_in_view_are_acknowledged_together_after_a_question() -> None:
    """Not before it is confirmed, and none that has not been on the screen: what was not seen is not acknowledged."""
    many = [replace(ALARMS[1], subject=f"C{number}") for number in range(1000, 1100)]
    data = plant(alarms=many)
    app = board(data)

    async def acknowledge(pilot: Pilot[None]) -> None:
        await press(pilot, "2", "A")
        seen = len(app.screen_stack[0].query_one(LineTable).rows_in_view)
        assert f"Acknowledge the {seen} alarms on the screen" in screen_text(app)
        await press(pilot, "n")
        assert data.now.alarms == tuple(many)
        await press(pilot, "A", "y")
        assert sum(each.state is AlarmState.ACKNOWLEDGED for each in data.now.alarms) == seen < len(many)
        assert said(app) == f"{seen} alarms acknowledged."

    drive(app, acknowledge, size=(80, 24))


def test_alarms_are_acknowledged_one_after_the_other_without_moving() -> None:
    """The next one that waits comes under the hand: the choice does not follow the one that is dealt with."""
    data = plant()
    app = board(data)

    async def acknowledge(pilot: Pilot[None]) -> None:
        await press(pilot, "2")
        await press(pilot, "a")
        assert str(listed(app).table.chosen).endswith("C1001")
        await press(pilot, "a")
        assert [each.needs_acknowledging for each in data.now.alarms] == [False, False, False, True, True]
        assert listed(app).table.row == 0

    drive(app, acknowledge)


def test_an_alarm_says_what_to_do_and_leads_to_its_coil() -> None:
    """The record of its kind stands beside it; Enter shows the coil on the Store screen."""
    app = board(plant())

    async def follow(pilot: Pilot[None]) -> None:
        await press(pilot, "2")
        assert "Bring the coil forward" in screen_text(app)
        await press(pilot, "enter")
        assert listed(app).NAME == "store"
        assert listed(app).table.chosen == "C1002"
        assert "P  C1002" in screen_text(app)

    drive(app, follow)


def test_a_new_assessment_keeps_the_chosen_coil_where_it_stands() -> None:
    """The list is renewed under the reader: same coil, same line of the screen, though its row is another."""
    data = plant()
    app = board(data)

    async def refresh(pilot: Pilot[None]) -> None:
        table = listed(app).table
        await press(pilot, *["pagedown"] * 2)
        coil_id, line = table.chosen, table.row - table.scroll_offset.y
        row = table.row
        urgent = [coil(f"A{number}", Verdict.HOLD, returns_d=-1.0, press_d=5.0) for number in range(7)]
        data.brings([*COILS, *urgent])
        app.read()
        await settled(pilot)
        assert table.chosen == coil_id
        assert table.row == row + 7
        assert table.row - table.scroll_offset.y == line

    drive(app, refresh)


def test_a_list_left_at_its_top_shows_what_becomes_most_urgent() -> None:
    """The new first coil is not hidden above the chosen one; a chosen coil that leaves gives way to its neighbour."""
    data = plant()
    app = board(data)

    async def refresh(pilot: Pilot[None]) -> None:
        table = listed(app).table
        urgent = coil("C0007", Verdict.HOLD, returns_d=-9.0, press_d=1.0)
        data.brings([*COILS, urgent])
        app.read()
        await settled(pilot)
        assert table.rows_in_view.start == 0
        assert table.lines.key(0) == "C0007"
        assert table.chosen == "C1001"
        data.brings([urgent, *(each for each in COILS if each.coil_id != "C1001")])
        app.read()
        await settled(pilot)
        assert table.chosen == "C1002"
        assert "P  C1002" in screen_text(app)

    drive(app, refresh)


def test_an_empty_store_is_said() -> None:
    """No coil is no fault."""
    app = board(plant(coils=(), alarms=()))

    async def look(pilot: Pilot[None]) -> None:
        assert "No coil is in store." in screen_text(app)
        await press(pilot, "enter", "end", "a", "2")
        assert "No alarm stands, and none waits to be acknowledged." in screen_text(app)

    drive(app, look)


def test_whatever_is_wrong_with_the_tool_is_said_until_it_is_well_again() -> None:
    """No assessment yet, a silent daemon, a store that cannot be read: a sentence each, over what was known last."""
    data = plant(alarms=())
    well = data.now
    data.now = replace(well, assessment=None)
    app = board(data)

    async def look(pilot: Pilot[None]) -> None:
        assert "There is no assessment yet: the daemon is still at its first round." in screen_text(app)
        assert "assessed never" in screen_text(app)
        data.now = replace(well, pulse=Pulse(NOW_S - 720.0, NOW_S - 700.0))
        app.read()
        await settled(pilot)
        for key in ("1", "2"):
            await press(pilot, key)
            assert "The daemon has been silent for 12 min" in screen_text(app)
        await press(pilot, "1")
        data.unreadable = "store plant.db: it is locked; wait, or end the program that holds it"
        app.read()
        await settled(pilot)
        assert "The store cannot be read: store plant.db: it is locked" in screen_text(app)
        assert "C1001" in screen_text(app)
        data.unreadable, data.now = None, well
        app.read()
        await settled(pilot)
        assert " ! " not in screen_text(app)

    drive(app, look)


def test_a_fault_of_the_board_itself_is_said_and_the_board_goes_on() -> None:
    """An error that nobody foresaw in a reading thread ends neither the screen nor the reading."""

    class Broken(FakePlant):
        def trace(self, coil_id: str) -> None:
            raise ValueError("a fault that nobody foresaw")

    whole = plant()
    app = board(Broken(whole.now))

    async def look(pilot: Pilot[None]) -> None:
        assert "a fault that nobody foresaw" in said(app)
        assert "The curve cannot be drawn." in screen_text(app)
        await press(pilot, "down")
        assert listed(app).table.chosen == "C1002"

    drive(app, look)


def test_the_board_survives_a_small_terminal() -> None:
    """Next to nothing with everything open, it goes on; verdict and number are the last to go; then it is whole."""
    app = board(plant())

    async def resize(pilot: Pilot[None]) -> None:
        for size in ((1, 1), (200, 6)):
            await pilot.resize_terminal(*size)
            await press(pilot, "enter", "2", "1")
        await pilot.resize_terminal(20, 5)
        await press(pilot, "escape", "home")
        assert "H hold   C1001" in screen_text(app)
        await pilot.resize_terminal(120, 40)
        await press(pilot, "escape", "home")
        assert listed(app).table.chosen == "C1001"

    drive(app, resize)


def test_help_explains_every_kind_of_alarm() -> None:
    """F1 shows keys, marks and words, and under them the record of each kind."""
    app = board(plant())

    async def look(pilot: Pilot[None]) -> None:
        await press(pilot, "f1")
        assert "Acknowledge the alarms of the chosen coil" in screen_text(app)
        await press(pilot, "end")
        assert "Alarm: The store cannot be written or is damaged" in screen_text(app)
        await press(pilot, "escape")
        assert listed(app).table.has_focus

    drive(app, look)


def test_the_command_palette_knows_the_tasks_of_the_screen() -> None:
    """Who does not know the keys can type what is wanted."""
    app = board(plant())

    async def look(pilot: Pilot[None]) -> None:
        await press(pilot, "ctrl+p")
        await type_words(pilot, "only watch")
        await until(pilot, lambda: app.screen.query_one(CommandList).option_count == 1)
        await press(pilot, "down", "enter")
        await until(pilot, lambda: isinstance(app.screen, ListScreen))
        await until(pilot, lambda: len(listed(app).table.lines) == 1)
        assert listed(app).table.chosen == "C1004"

    drive(app, look)


def test_keys_meant_for_the_find_line_do_not_act_on_the_list() -> None:
    """Letters typed there are words, not commands."""
    data = plant()
    app = board(data)

    async def look(pilot: Pilot[None]) -> None:
        await press(pilot, "f", "a", "2", "o")
        assert app.screen.query_one(Input).value == "a2o"
        assert data.now.alarms == ALARMS

    drive(app, look)
