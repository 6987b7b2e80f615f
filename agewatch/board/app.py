"""The board: an app that reads at a steady pace in a thread and hands what it read to its screens."""

from __future__ import annotations

import gc
from collections.abc import Iterable, Iterator, Sequence

from textual import on, work
from textual.app import App, SystemCommand
from textual.binding import Binding
from textual.filter import ANSIToTruecolor, LineFilter
from textual.message import Message
from textual.screen import Screen
from textual.worker import Worker, WorkerState

from agewatch.board.data import BoardData, Site, Snapshot
from agewatch.board.inert import inert
from agewatch.board.palette import DAY, NIGHT
from agewatch.board.present import Present
from agewatch.board.screens.alarms_screen import AlarmsScreen, CoilWanted
from agewatch.board.screens.board_screen import BoardScreen, NewsWanted
from agewatch.board.screens.help_screen import HelpScreen
from agewatch.board.screens.store_screen import StoreScreen
from agewatch.clock import Clock
from agewatch.errors import AgeWatchError


class BoardApp(App[None]):
    """Shows the store to the people on shift. `refresh_every_s` is real time."""

    TITLE = "AgeWatch"
    CSS_PATH = "board.tcss"
    BINDINGS = [
        Binding("1", "switch_mode('store')", "Store", show=False, tooltip="All coils by urgency"),
        Binding("2", "switch_mode('alarms')", "Alarms", show=False, tooltip="Alarms, and acknowledging them"),
        Binding(
            "f1,question_mark", "help", "Help", key_display="F1", tooltip="Keys, words, marks and alarms"
        ),
        Binding("ctrl+n", "night_or_day", "Night or day", show=False, tooltip="Dark or light colours"),
        Binding(
            "ctrl+q",
            "quit",
            "Leave",
            show=False,
            priority=True,
            tooltip="Leave the board; the daemon goes on",
        ),
    ]

    class SnapshotRead(Message):
        """News from the store; `trouble` says why there are none."""

        def __init__(self, snapshot: Snapshot | None, trouble: str | None) -> None:
            super().__init__()
            self.snapshot = snapshot
            self.trouble = trouble

    def __init__(self, data: BoardData, clock: Clock, site: Site, *, refresh_every_s: float = 2.0) -> None:
        super().__init__()
        self.present = Present(data, clock, site)
        self._refresh_every_s = refresh_every_s
        self._reading = False
        self.animation_level = "none"
        for theme in (NIGHT, DAY):
            self.register_theme(theme)
        self.theme = NIGHT.name

    def on_mount(self) -> None:
        self.title = f"AgeWatch – {inert(self.present.site.name)}"
        self.add_mode(StoreScreen.NAME, lambda: StoreScreen(self.present))
        self.add_mode(AlarmsScreen.NAME, lambda: AlarmsScreen(self.present))
        self.switch_mode(StoreScreen.NAME)
        self.set_interval(self._refresh_every_s, self.read)
        self.set_interval(1.0, self._tick)
        self.read()

    def read(self) -> None:
        """Read the store now, unless that is being done already."""
        if not self._reading:
            self._reading = True
            self._read()

    def get_line_filters(self) -> Sequence[LineFilter]:
        """Without the one for the terminal's own colours, which the board never asks for: it costs every line."""
        return [each for each in super().get_line_filters() if not isinstance(each, ANSIToTruecolor)]

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        if isinstance(screen, BoardScreen):
            yield from screen.commands()
        yield SystemCommand("Store", "All coils by urgency", lambda: self.switch_mode(StoreScreen.NAME))
        yield SystemCommand(
            "Alarms", "Alarms, and acknowledging them", lambda: self.switch_mode(AlarmsScreen.NAME)
        )
        yield SystemCommand("Night or day", "Dark or light colours", self.action_night_or_day)
        yield SystemCommand("Help", "Keys, words, marks and alarms", self.action_help)
        yield SystemCommand("Leave", "Leave the board; the daemon goes on", self.exit)

    def action_help(self) -> None:
        if not isinstance(self.screen, HelpScreen):
            self.push_screen(HelpScreen(self._keys()))

    def action_night_or_day(self) -> None:
        self.theme = DAY.name if self.theme == NIGHT.name else NIGHT.name

    @on(NewsWanted)
    def _news_wanted(self) -> None:
        self.read()

    @on(SnapshotRead)
    def _take_snapshot(self, message: SnapshotRead) -> None:
        self._reading = False
        news = message.snapshot is not None and message.snapshot is not self.present.snapshot
        self.present.unread = message.trouble
        if news:
            first, self.present.snapshot = self.present.snapshot is None, message.snapshot
            if first and not self.is_headless:
                gc.freeze()  # what stands now stays: looking through it again and again stops the keys for 100 ms
        for screen in self._board_screens():
            if news:
                screen.take_news()
            else:
                screen.tick()

    @on(CoilWanted)
    async def _coil_wanted(self, message: CoilWanted) -> None:
        await self.switch_mode(StoreScreen.NAME)
        for screen in self._board_screens():
            if isinstance(screen, StoreScreen):
                screen.show_coil(message.coil_id)

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        if event.worker.group == "read" and event.state is WorkerState.ERROR:
            self.post_message(self.SnapshotRead(None, f"the board failed: {event.worker.error!r}"))

    @work(thread=True, group="read", exit_on_error=False)
    def _read(self) -> None:
        snapshot, trouble = None, None
        try:
            snapshot = self.present.data.snapshot()
        except AgeWatchError as error:
            trouble = str(error)
        self.post_message(self.SnapshotRead(snapshot, trouble))

    def _tick(self) -> None:
        for screen in self._board_screens():
            screen.tick()

    def _board_screens(self) -> Iterator[BoardScreen]:
        return (
            screen for screen in self.screen_stack if isinstance(screen, BoardScreen) and screen.is_mounted
        )

    def _keys(self) -> Iterator[tuple[str, str]]:
        seen = set()
        for binding in self.screen.active_bindings.values():
            if binding.binding.tooltip and binding.binding.action not in seen:
                seen.add(binding.binding.action)
                yield self.get_key_display(binding.binding), binding.binding.tooltip
