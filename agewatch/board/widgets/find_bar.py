"""The line in which words are typed that narrow a list down, with the count of what is left."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import Horizontal
from textual.content import Content
from textual.message import Message
from textual.widgets import Input, Static

from agewatch.board.look import Span
from agewatch.board.widgets.inert_input import InertInput
from agewatch.board.widgets.span_text import SpanLine


class FindBar(Horizontal):
    """Tells with every key which words are wanted. Enter or Down goes back to the list, Escape empties it."""

    BINDINGS = [
        Binding("down", "leave", "To the list", show=False),
        Binding("escape", "empty", "All again", show=False),
    ]

    class Changed(Message):
        """Other words are wanted."""

        def __init__(self, words: str) -> None:
            super().__init__()
            self.words = words

    class Left(Message):
        """The list is to have the keys again."""

    def __init__(self, hint: str) -> None:
        super().__init__(id="find")
        self._input = InertInput(placeholder=hint, compact=True, id="find-words")
        self._count = SpanLine(id="find-count")

    def compose(self) -> ComposeResult:
        yield Static(Content("find "), id="find-name")
        yield self._input
        yield self._count

    def take_keys(self) -> None:
        self._input.focus()

    def set_words(self, words: str) -> None:
        """As if they had been typed."""
        self._input.value = words

    def say_count(self, sentence: str) -> None:
        self._count.write([Span(sentence, "quiet")])

    def action_leave(self) -> None:
        self.post_message(self.Left())

    def action_empty(self) -> None:
        self.set_words("")
        self.post_message(self.Left())

    def on_input_changed(self, event: Input.Changed) -> None:
        event.stop()
        self.post_message(self.Changed(event.value))

    def on_input_submitted(self, event: Input.Submitted) -> None:
        event.stop()
        self.post_message(self.Left())
