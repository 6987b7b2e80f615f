"""A line to type in, whose text is inert however it came there."""

from __future__ import annotations

from textual.widgets import Input

from agewatch.board.inert import NOTHING_LEFT, inert


class InertInput(Input):
    """What is pasted may hold what a terminal acts upon: it is dropped before it is shown."""

    def validate_value(self, value: str) -> str:
        shown = inert(value)
        return "" if shown == NOTHING_LEFT else shown
