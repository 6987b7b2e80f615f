"""The Alarms screen: what stands or waits to be acknowledged, and what the chosen alarm asks for."""

from __future__ import annotations

from textual import on, work
from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Container, Vertical
from textual.message import Message

from agewatch.alarms import COIL_KINDS, Alarm, AlarmKey
from agewatch.board.alarm_list import SORTABLE
from agewatch.board.data import Snapshot
from agewatch.board.present import Present
from agewatch.board.screens.dialogs import Confirm
from agewatch.board.screens.list_screen import ListScreen
from agewatch.board.widgets.alarm_panel import AlarmPanel
from agewatch.board.widgets.alarm_table import AlarmLines
from agewatch.board.widgets.line_table import LineTable


class CoilWanted(Message):
    """A coil is to be shown on the Store screen."""

    def __init__(self, coil_id: str) -> None:
        super().__init__()
        self.coil_id = coil_id


class AlarmsScreen(ListScreen):
    """All alarms that are not in the state normal."""

    NAME = "alarms"
    SORTABLE = SORTABLE
    HINT = "alarm, coil, sensor, location, priority or state: all words must match"
    BINDINGS = [
        Binding("a", "acknowledge", "Acknowledge", tooltip="Acknowledge the chosen alarm"),
        Binding(
            "A",
            "acknowledge_seen",
            "All on screen",
            tooltip="Acknowledge every alarm that stands on the screen now",
        ),
        Binding("enter", "coil", "Show coil", tooltip="Go to the alarm's coil on the Store screen"),
    ]

    def __init__(self, present: Present) -> None:
        super().__init__(present)
        self._panel = AlarmPanel(present.site.zone)
        self._alarms: tuple[Alarm, ...] | None = None
        self._acknowledging: AlarmKey | None = None

    def compose_body(self) -> ComposeResult:
        with Container(id="body"):
            with Vertical(id="list"):
                yield self.find_bar
                yield self.table
            yield self._panel

    def show_snapshot(self, snapshot: Snapshot) -> None:
        if snapshot.alarms is not self._alarms:
            self._alarms = snapshot.alarms
            self.list_again()

    def show_minute(self) -> None:
        super().show_minute()
        self._show_alarm()

    def list_again(self, *, from_top: bool = False) -> None:
        alarms, present = self._alarms, self.present
        if alarms is None:
            return
        lines = AlarmLines(alarms, self.order, self.words, present.now_s, present.site.zone)
        self.table.say_nothing(
            "No alarm has all these words: Escape shows all."
            if self.narrowed
            else "No alarm stands, and none waits to be acknowledged."
        )
        self.table.show(lines, from_top=from_top, by_row=self._is_dealt_with(self._alarm()))
        self.say_count(len(lines), len(alarms), "alarms")
        self._show_alarm()

    def action_acknowledge(self) -> None:
        alarm = self._alarm()
        if alarm is None:
            return
        if alarm.needs_acknowledging:
            self._acknowledging = alarm.key
            self.acknowledge([alarm])
        else:
            self.tell("This alarm is acknowledged already.")

    @work
    async def action_acknowledge_seen(self) -> None:
        lines = self.table.lines
        if not isinstance(lines, AlarmLines):
            return
        seen = [lines.alarms[row] for row in self.table.rows_in_view]
        waiting = [alarm for alarm in seen if alarm.needs_acknowledging]
        if not waiting:
            self.tell("No alarm on the screen waits to be acknowledged.")
            return
        these = "the 1 alarm" if len(waiting) == 1 else f"the {len(waiting)} alarms"
        question = f"Acknowledge {these} on the screen that nobody has acknowledged yet?"
        if await self.app.push_screen_wait(Confirm(question, "Acknowledge")):
            self.acknowledge(waiting)

    def action_coil(self) -> None:
        alarm = self._alarm()
        if alarm is not None and alarm.kind in COIL_KINDS:
            self.post_message(CoilWanted(alarm.subject))
        elif alarm is not None:
            self.tell("This alarm is not about a coil.")

    @on(LineTable.Chosen)
    def _show_alarm(self) -> None:
        self._panel.show(self._alarm(), self.present.now_s())

    @on(LineTable.Opened)
    def _opened(self) -> None:
        self.action_coil()

    def _alarm(self) -> Alarm | None:
        lines = self.table.lines
        return lines.alarms[self.table.row] if isinstance(lines, AlarmLines) and len(lines) else None

    def _is_dealt_with(self, chosen: Alarm | None) -> bool:
        """Whether the chosen alarm is the one that was to be acknowledged, and waits no more."""
        waiting = {alarm.key for alarm in self._alarms or () if alarm.needs_acknowledging}
        return chosen is not None and chosen.key == self._acknowledging and chosen.key not in waiting
