"""The order of a list on the screen."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

URGENCY = "urgency"
"""The order that every list begins with: what has to be done first stands first."""


@dataclass(frozen=True, slots=True)
class Order:
    """By which column, and which way."""

    by: str = URGENCY
    descending: bool = False

    def chosen(self, by: str, most_first: Collection[str] = ()) -> Order:
        """The order after `by` was asked for: its urgent end first, the other way round when asked again.

        `most_first`: columns whose large values are the urgent ones.
        """
        if by == self.by and by != URGENCY:
            return Order(by, not self.descending)
        return Order(by, by in most_first)
