"""What every screen of the board has: head and foot, how news reaches it, and how it acknowledges."""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Sequence

from textual import work
from textual.app import ComposeResult, SystemCommand
from textual.message import Message
from textual.screen import Screen
from textual.widgets import Footer
from textual.worker import Worker, WorkerState

from agewatch.alarms import Alarm
from agewatch.board.data import Snapshot
from agewatch.board.inert import inert
from agewatch.board.present import Present
from agewatch.board.widgets.site_head import SiteHead
from agewatch.errors import AgeWatchError


class NewsWanted(Message):
    """The store has probably changed: read it now."""


class BoardScreen(Screen[None]):
    """A screen between head and foot. `NAME` is its mode in the app."""

    NAME = ""
    HORIZONTAL_BREAKPOINTS = [(0, "-narrow"), (60, "-plain"), (120, "-wide")]
    VERTICAL_BREAKPOINTS = [(0, "-flat"), (15, "-low"), (30, "-tall")]

    class Acknowledged(Message):
        """The daemon has answered: `count` alarms are acknowledged; `refused` is why no more, if so."""

        def __init__(self, count: int, refused: str | None) -> None:
            super().__init__()
            self.count = count
            self.refused = refused

    def __init__(self, present: Present) -> None:
        super().__init__()
        self.present = present
        self._head = SiteHead(present.site, self.NAME)

    def compose(self) -> ComposeResult:
        yield self._head
        yield from self.compose_body()
        yield Footer(compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        self.take_news()

    def on_screen_resume(self) -> None:
        self.take_news()

    def take_news(self) -> None:
        """Show what the present holds."""
        self.tick()
        if self.present.snapshot is not None:
            self.show_snapshot(self.present.snapshot)

    def tick(self) -> None:
        """Bring what depends on the time up to now."""
        present = self.present
        self._head.show(present.snapshot, present.unread, present.now_s())

    @abstractmethod
    def compose_body(self) -> ComposeResult:
        """The widgets between head and foot."""

    @abstractmethod
    def show_snapshot(self, snapshot: Snapshot) -> None:
        """Show what has come."""

    def commands(self) -> list[SystemCommand]:
        """What the command palette offers on this screen alone."""
        return []

    def tell(self, sentence: str, *, wrong: bool = False) -> None:
        """A sentence that goes away by itself."""
        self.notify(
            inert(sentence),
            severity="error" if wrong else "information",
            timeout=8.0 if wrong else 3.0,
            markup=False,
        )

    @work(thread=True, group="acknowledge", exit_on_error=False)
    def acknowledge(self, alarms: Sequence[Alarm]) -> None:
        """Acknowledge one after the other, up to the first that is refused."""
        refused = None
        count = 0
        for alarm in alarms:
            try:
                self.present.data.acknowledge(alarm.kind.value, alarm.subject)
            except AgeWatchError as error:
                refused = str(error)
                break
            count += 1
        self.post_message(self.Acknowledged(count, refused))

    def on_board_screen_acknowledged(self, message: Acknowledged) -> None:
        if message.refused is not None:
            self.tell(f"Not acknowledged: {message.refused}", wrong=True)
        if message.count:
            self.tell(f"{message.count} {'alarm' if message.count == 1 else 'alarms'} acknowledged.")
        self.post_message(NewsWanted())

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        """A fault of the board itself in a thread: said, not hidden, and the screen goes on."""
        if event.state is WorkerState.ERROR:
            self.tell(f"The board failed at: {event.worker.group}. {event.worker.error!r}", wrong=True)
