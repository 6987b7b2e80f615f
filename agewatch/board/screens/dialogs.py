"""Small questions over a screen: yes or no, one of several, a line of text. Each returns its answer, or None."""

from __future__ import annotations

from collections.abc import Mapping

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.content import Content
from textual.screen import ModalScreen
from textual.widgets import Button, Input, OptionList, Static
from textual.widgets.option_list import Option

from agewatch.board.inert import inert
from agewatch.board.widgets.inert_input import InertInput

_CANCEL: BindingType = Binding("escape", "dismiss(None)", "Cancel")


class Confirm(ModalScreen[bool | None]):
    """Yes or no; no is what Enter says before anything was chosen."""

    BINDINGS = [_CANCEL, ("y", "dismiss(True)", "Yes"), ("n", "dismiss(None)", "No")]

    def __init__(self, question: str, yes: str) -> None:
        super().__init__()
        self._question = question
        self._yes = yes

    def compose(self) -> ComposeResult:
        with Vertical(classes="dialog"):
            yield Static(Content(inert(self._question)))
            with Horizontal(classes="dialog-buttons"):
                yield Button(Content("No (n)"), id="no", compact=True)
                yield Button(Content(f"{self._yes} (y)"), id="yes", compact=True)

    def on_button_pressed(self, event: Button.Pressed) -> None:
        self.dismiss(True if event.button.id == "yes" else None)


class Choose(ModalScreen[str | None]):
    """One of several: `choices` maps what is returned to what is read."""

    BINDINGS = [_CANCEL]

    def __init__(self, question: str, choices: Mapping[str, str], chosen: str) -> None:
        super().__init__()
        self._question = question
        self._choices = choices
        self._chosen = chosen

    def compose(self) -> ComposeResult:
        with Vertical(classes="dialog"):
            yield Static(Content(inert(self._question)))
            yield OptionList(*(Option(Content(words), id=name) for name, words in self._choices.items()))

    def on_mount(self) -> None:
        self.query_one(OptionList).highlighted = list(self._choices).index(self._chosen)

    def on_option_list_option_selected(self, event: OptionList.OptionSelected) -> None:
        self.dismiss(event.option_id)


class Ask(ModalScreen[str | None]):
    """A line of text."""

    BINDINGS = [_CANCEL]

    def __init__(self, question: str) -> None:
        super().__init__()
        self._question = question

    def compose(self) -> ComposeResult:
        with Vertical(classes="dialog"):
            yield Static(Content(inert(self._question)))
            yield InertInput(compact=True)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        self.dismiss(event.value.strip() or None)
