"""What the text of one cell means: text, a choice, a flag. Each distinct text of a column is understood once."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass

from agewatch.plant.tables import Column, Value

LONGEST_NAME = 200

_WHITE = " \t\r\n\u00a0"
_INVISIBLE = {"Cc", "Cf", "Cs", "Zl", "Zp"}
_FLAGS = {
    **dict.fromkeys(("true", "t", "yes", "y", "on", "1"), True),
    **dict.fromkeys(("false", "f", "no", "n", "off", "0"), False),
}
_REMEMBERED = 50_000


@dataclass(frozen=True, slots=True)
class Fault:
    """Why a cell cannot be used, and what is allowed there."""

    reason: str


Meaning = Value | Fault
Understand = Callable[[str], Meaning]
"""From a cell that is not empty, without white space around it, to what it means."""


class Understood(dict[str, Meaning]):
    """The cells of one column that were met so far, and what they mean; faults are not kept."""

    def __init__(self, column: Column, empty: Collection[str], understand: Understand) -> None:
        super().__init__()
        self._understand = understand
        self._empty = {"", *empty}
        self._nothing: Meaning = Fault(f"is empty; needed is a {column.kind}") if column.required else None
        self._faulty = False

    def __missing__(self, cell: str) -> Meaning:
        bare = cell.strip(_WHITE)
        meaning = self._nothing if bare in self._empty else self._understand(bare)
        if isinstance(meaning, Fault):
            self._faulty = True
            return meaning
        if len(self) >= _REMEMBERED:
            self.clear()
        self[cell] = meaning
        return meaning

    def column(self, cells: Sequence[str]) -> tuple[list[Meaning], bool]:
        """The meaning of each cell, and whether any is at fault."""
        self._faulty = False
        return list(map(self.__getitem__, cells)), self._faulty


def text(column: Column) -> Understand:
    """Names and other short text, or one of the column's choices (in any case of letters)."""
    if column.choices:
        return _choice(column.choices)

    def name(cell: str) -> Meaning:
        if len(cell) > LONGEST_NAME:
            return Fault(f"{shown(cell)} has {len(cell)} characters; allowed are {LONGEST_NAME}")
        if not cell.isprintable():
            for character in cell:
                if unicodedata.category(character) in _INVISIBLE:
                    return Fault(
                        f"{shown(cell)} holds the control character U+{ord(character):04X}; take it out"
                    )
        return cell

    return name


def _choice(choices: tuple[str, ...]) -> Understand:
    known = {choice.casefold(): str(choice) for choice in choices}  # plain text, also of an enumeration

    def choose(cell: str) -> Meaning:
        choice = known.get(cell.casefold())
        return (
            Fault(f"{shown(cell)} is not known; allowed are {', '.join(choices)}")
            if choice is None
            else choice
        )

    return choose


def flag(cell: str) -> Meaning:
    """True or false, in the words that exports use for them."""
    value = _FLAGS.get(cell.casefold())
    return (
        Fault(f"{shown(cell)} is no flag; allowed are true, yes, 1 and false, no, 0")
        if value is None
        else value
    )


def shown(cell: str) -> str:
    """A cell as a reason quotes it: short, with control characters spelt out."""
    return repr(cell if len(cell) <= 40 else cell[:39] + "…")
