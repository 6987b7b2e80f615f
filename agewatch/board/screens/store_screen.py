"""The Store screen: every coil by urgency, and beside it what the chosen one needs."""

from __future__ import annotations

from textual import on, work
from textual.app import ComposeResult, SystemCommand
from textual.binding import Binding
from textual.containers import Container, Vertical
from textual.content import Content
from textual.message import Message
from textual.widgets import Static
from textual.worker import Worker, WorkerState

from agewatch.board.alarm_list import of_coil
from agewatch.board.coil_list import MOST_FIRST, SORTABLE, CoilList
from agewatch.board.coil_row import CoilRow
from agewatch.board.data import Snapshot
from agewatch.board.look import STARTING_POINT_LEGEND
from agewatch.board.present import Present
from agewatch.board.screens.dialogs import Ask
from agewatch.board.screens.list_screen import ListScreen
from agewatch.board.widgets.coil_panel import CoilPanel
from agewatch.board.widgets.coil_table import CoilLines, coil_columns
from agewatch.board.widgets.columns import Column
from agewatch.board.widgets.line_table import LineTable
from agewatch.board.widgets.verdict_counts import VerdictCount, VerdictCounts
from agewatch.errors import AgeWatchError
from agewatch.plant.assessment import Verdict
from agewatch.plant.trace import CoilTrace

_PATIENCE_S = 0.15
"""How long a curve may take before its place says that it is being read; sooner would only flicker."""


class StoreScreen(ListScreen):
    """All coils of the newest assessment."""

    NAME = "store"
    SORTABLE = SORTABLE
    MOST_FIRST = MOST_FIRST
    HINT = "coil, grade, part, location or verdict: all words must match"
    BINDINGS = [
        Binding("enter", "panel", "Coil", tooltip="Show or hide what the chosen coil needs"),
        Binding("g", "go", "Go to coil", tooltip="Jump to a coil by its number"),
        Binding("a", "acknowledge", "Acknowledge", tooltip="Acknowledge the alarms of the chosen coil"),
    ]

    class TraceRead(Message):
        """The curves of a coil have come, or `trouble` says why not."""

        def __init__(self, coil_id: str, trace: CoilTrace | None, trouble: str | None) -> None:
            super().__init__()
            self.coil_id = coil_id
            self.trace = trace
            self.trouble = trouble

    def __init__(self, present: Present) -> None:
        super().__init__(present)
        self._counts = VerdictCounts()
        self._panel = CoilPanel(present.site.zone)
        self._coils: CoilList | None = None
        self._columns: tuple[Column, ...] = ()
        self._traced: tuple[str, CoilList] | None = None
        self._tracing = False

    def compose_body(self) -> ComposeResult:
        with Container(id="body"):
            with Vertical(id="list"):
                yield self._counts
                yield self.find_bar
                yield self.table
                yield Static(Content(STARTING_POINT_LEGEND), id="legend")
            yield self._panel

    def on_mount(self) -> None:
        self.table.say_nothing("No assessment yet.")

    def on_resize(self) -> None:
        self.call_after_refresh(
            self._show_coil
        )  # whether the panel stands beside the list depends on the size

    def show_snapshot(self, snapshot: Snapshot) -> None:
        assessment = snapshot.assessment
        if assessment is not None and (self._coils is None or assessment is not self._coils.assessment):
            self._coils = CoilList(assessment)
            self._columns = coil_columns(self._coils)
            self._counts.show(self._coils.counts())
            self.set_class(not assessment.starting_point.any(), "all-fitted")
            self.list_again()
        self._show_coil()

    def show_minute(self) -> None:
        super().show_minute()
        self._show_words()

    def list_again(self, *, from_top: bool = False) -> None:
        if self._coils is None:
            return
        now_s, zone = self.present.now_s, self.present.site.zone
        lines = CoilLines(self._coils, self._columns, self.order, self.words, now_s, zone)
        self.table.say_nothing(
            "No coil has all these words: Escape shows all." if self.narrowed else "No coil is in store."
        )
        self.table.show(lines, from_top=from_top)
        self.say_count(len(lines), len(self._coils.assessment), "coils")

    def show_coil(self, coil_id: str) -> None:
        """Choose a coil, whatever words kept it out of the list."""
        if self.table.lines.row_of(coil_id) is None:
            self.find_bar.set_words("")
            self.words = ""
            self.list_again()
        row = self.table.lines.row_of(coil_id)
        if row is None:
            self.tell(f"Coil {coil_id} is not in store any more.", wrong=True)
            return
        self.table.choose(row)
        self.table.focus()
        self._open_panel(True)

    def commands(self) -> list[SystemCommand]:
        return [
            SystemCommand("Go to coil", "Jump to a coil by its number", self.action_go),
            SystemCommand("All coils", "Forget the words typed under find", self.action_back),
            *(
                SystemCommand(
                    f"Only {verdict.word}", "Narrow the list down", lambda word=verdict.word: self._only(word)
                )
                for verdict in Verdict
            ),
            *super().commands(),
        ]

    def action_panel(self) -> None:
        self._open_panel(not self._panel.display)

    @work
    async def action_go(self) -> None:
        text = await self.app.push_screen_wait(Ask("Go to coil"))
        if text is not None:
            self._go_to(text)

    def action_acknowledge(self) -> None:
        coil, snapshot = self._coil(), self.present.snapshot
        if coil is None or snapshot is None:
            return
        waiting = [alarm for alarm in of_coil(snapshot.alarms, coil.coil_id) if alarm.needs_acknowledging]
        if waiting:
            self.acknowledge(waiting)
        else:
            self.tell(f"No alarm of coil {coil.coil_id} waits to be acknowledged.")

    def action_back(self) -> None:
        if self._panel.display and not self.has_class("-wide"):
            self._open_panel(False)
        else:
            super().action_back()

    @on(VerdictCount.Clicked)
    def _only_verdict(self, message: VerdictCount.Clicked) -> None:
        self._only(message.verdict.word)

    @on(LineTable.Chosen)
    def _show_coil(self) -> None:
        self._show_words()
        self._want_trace()

    @on(LineTable.Opened)
    def _opened(self) -> None:
        self.action_panel()

    @on(TraceRead)
    def _take_trace(self, message: TraceRead) -> None:
        self._tracing = False
        coil = self._coil()
        if coil is not None and coil.coil_id == message.coil_id:
            if message.trouble is not None:
                self._panel.say(f"The curve cannot be read: {message.trouble}")
            else:
                self._panel.show_trace(coil, message.trace)
        self._want_trace()

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        super().on_worker_state_changed(event)
        if event.worker.group == "trace" and event.state is WorkerState.ERROR:
            self._tracing = False
            self._panel.say("The curve cannot be drawn.")

    def _coil(self) -> CoilRow | None:
        lines = self.table.lines
        return lines.coil(self.table.row) if isinstance(lines, CoilLines) and len(lines) else None

    def _only(self, word: str) -> None:
        self.find_bar.set_words("" if self.words.strip() == word else word)

    def _go_to(self, text: str) -> None:
        lines = self.table.lines
        row = lines.coils.first_like(text, lines.rows) if isinstance(lines, CoilLines) else None
        if row is not None:
            self.table.choose(row)
            self.table.focus()
        else:
            where = " among those found; Escape shows all" if self.narrowed else ""
            self.tell(f"No coil has a number like {text}{where}.", wrong=True)

    def _open_panel(self, wanted: bool) -> None:
        self.set_class(wanted, "panel-open")
        self.set_class(not wanted, "panel-closed")
        self.call_after_refresh(self._show_coil)
        if not wanted:
            self.call_after_refresh(self.table.focus)  # on a very short screen the list was hidden meanwhile

    def _show_words(self) -> None:
        if self._panel.display:
            coil = self._coil()
            alarms = self.present.snapshot.alarms if self.present.snapshot is not None else ()
            of_this = of_coil(alarms, coil.coil_id) if coil is not None else []
            self._panel.show_coil(coil, of_this, self.present.now_s())

    def _want_trace(self) -> None:
        """Have the curves of the chosen coil read, one coil at a time: while a key is held down most are skipped."""
        coil = self._coil()
        if coil is None or self._coils is None or not self._panel.display:
            return
        coil_before, coils_before = self._traced or ("", None)
        if coil.coil_id == coil_before and self._coils is coils_before:
            return
        if not self._tracing:
            self._traced = (coil.coil_id, self._coils)
            self._tracing = True
            self._read_trace(coil.coil_id)
            if coil.coil_id != coil_before:
                self.set_timer(_PATIENCE_S, self._say_reading)

    def _say_reading(self) -> None:
        """The curve of another coil must not stand beside these words for long."""
        if self._tracing:
            self._panel.say("Reading the curve …")

    @work(thread=True, group="trace", exit_on_error=False)
    def _read_trace(self, coil_id: str) -> None:
        trace, trouble = None, None
        try:
            trace = self.present.data.trace(coil_id)
        except AgeWatchError as error:
            trouble = str(error)
        self.post_message(self.TraceRead(coil_id, trace, trouble))
