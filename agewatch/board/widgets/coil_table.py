"""The coils of an assessment as lines of a table."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from zoneinfo import ZoneInfo

import numpy as np

from agewatch.board.coil_list import CoilList, Rows
from agewatch.board.coil_row import CoilRow, known
from agewatch.board.look import STARTING_POINT, Span, verdict_spans
from agewatch.board.order import Order
from agewatch.board.times import day_time, relative, slack
from agewatch.board.widgets.columns import Cell, Column, Placed, widest
from agewatch.plant.assessment import Verdict

_TIME = len("28 Sep 07:30")
_TIME_AND_RELATIVE = _TIME + len("  in 23 h 59 min")
_MOST_CELLS = 24
"""No name takes more of a line than this; the side panel has it in full."""


class CoilLines:
    """Lines for `rows` of a coil list; formats a row only when it is asked for.

    `now_s` gives the time that relative times refer to, whenever a line is formatted.
    """

    def __init__(
        self,
        coils: CoilList,
        columns: tuple[Column, ...],
        order: Order,
        words: str,
        now_s: Callable[[], float],
        zone: ZoneInfo,
    ) -> None:
        self.coils = coils
        self.order = order
        self.words = words
        self.sorted_by = (order.by, order.descending)
        self.rows: Rows = coils.arranged(order, words)
        self._place = np.full(len(coils.assessment), -1, dtype=np.intp)
        self._place[self.rows] = np.arange(len(self.rows))
        self.columns = columns
        self._now_s = now_s
        self._zone = zone

    def __len__(self) -> int:
        return len(self.rows)

    def key(self, row: int) -> str:
        return str(self.coils.assessment.coil_id[self.rows[row]])

    def row_of(self, key: str) -> int | None:
        of_assessment = self.coils.row_of(key)
        place = -1 if of_assessment is None else int(self._place[of_assessment])
        return None if place < 0 else place

    def coil(self, row: int) -> CoilRow:
        """The coil that stands in a row."""
        return CoilRow.of(self.coils.assessment, int(self.rows[row]))

    def cells(self, row: int, placed: Sequence[Placed]) -> list[Cell]:
        coil = self.coil(row)
        return [self._cell(coil, place.column.name, place.width) for place in placed]

    def _cell(self, coil: CoilRow, column: str, width: int) -> Cell:
        match column:
            case "return":
                return self._return(coil, width)
            case "press":
                return self._press(coil, width)
            case _:
                return _PLAIN_CELLS[column](coil)

    def _return(self, coil: CoilRow, width: int) -> Cell:
        if not known(coil.return_p50_s):
            return (Span("–" if coil.verdict is Verdict.UNASSESSED else " not in sight", "quiet"),)
        mark = STARTING_POINT if coil.starting_point else " "
        return (Span(mark, "quiet"), *self._time(coil.return_p50_s, width - len(mark)))

    def _press(self, coil: CoilRow, width: int) -> Cell:
        return self._time(coil.press_s, width) if known(coil.press_s) else (Span("not planned", "quiet"),)

    def _time(self, at_s: float, width: int) -> Cell:
        absolute = Span(f"{day_time(at_s, self._zone):>{_TIME}}")
        if width <= _TIME:
            return (absolute,)
        return (absolute, Span(f"  {relative(at_s, self._now_s())}", "quiet"))


def _slack(coil: CoilRow) -> Cell:
    if not known(coil.slack_h):
        return _NONE
    return (Span(slack(coil.slack_h), "strong" if coil.slack_h < 0 else "plain"),)


def _name(name: str | None) -> Cell:
    return (Span(name),) if name else _NONE


def _number(value: float, form: str) -> Cell:
    return (Span(form.format(value)),) if known(value) else _NONE


_NONE: Cell = (Span("–", "quiet"),)
_PLAIN_CELLS: dict[str, Callable[[CoilRow], Cell]] = {
    "verdict": lambda coil: verdict_spans(coil.verdict),
    "coil": lambda coil: (Span(coil.coil_id, "strong"),),
    "grade": lambda coil: _name(coil.grade),
    "part": lambda coil: _name(coil.part),
    "location": lambda coil: _name(coil.location),
    "slack": _slack,
    "risk": lambda coil: _number(100 * coil.return_risk, "{:.0f} %"),
    "equivalent_age": lambda coil: _number(coil.equivalent_age_days, "{:.1f}"),
}


def coil_columns(coils: CoilList) -> tuple[Column, ...]:
    """The columns, as wide as the names of these coils need."""
    columns = coils.assessment
    return (
        Column("verdict", "verdict", len(" H hold "), 1, wide=len(" U unassessed")),
        Column("coil", "coil", widest(columns.coil_id, 6, _MOST_CELLS), 0),
        Column("location", "location", widest(columns.location.labels, 8, _MOST_CELLS), 2),
        Column("slack", "slack", len("late 199 d"), 3, right=True),
        Column("press", "pressing", _TIME, 5, wide=_TIME_AND_RELATIVE),
        Column("return", " P50 return", _TIME + 1, 4, wide=_TIME_AND_RELATIVE + 1),
        Column("risk", "risk", len("100 %"), 6, right=True),
        Column("grade", "grade", widest(columns.grade.labels, 5, _MOST_CELLS), 7),
        Column("part", "part", widest(columns.part.labels, 4, _MOST_CELLS), 8),
        Column("equivalent_age", "equiv. age d", len("equiv. age d"), 9, right=True),
    )
