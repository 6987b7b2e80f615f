"""What can be alarmed, and how urgent it can be: names only, no rule."""

from __future__ import annotations

from collections.abc import Iterable
from enum import StrEnum


class AlarmKind(StrEnum):
    """One kind for each thing that a person has to act on; rationalisation.py tells how."""

    RETURN_BEFORE_PRESS = "return-before-press"
    RETURNED_IN_STORE = "returned-in-store"
    UNASSESSABLE_COIL = "unassessable-coil"
    SENSOR_SILENT = "sensor-silent"
    SENSOR_SUSPECT = "sensor-suspect"
    LOCATION_UNCOVERED = "location-uncovered"
    FEED_STALE = "feed-stale"
    REJECTS_HIGH = "rejects-high"
    DELIVERY_FAILING = "delivery-failing"
    CLOCK_STEP = "clock-step"
    STORE_TROUBLE = "store-trouble"


COIL_KINDS = (AlarmKind.RETURN_BEFORE_PRESS, AlarmKind.RETURNED_IN_STORE, AlarmKind.UNASSESSABLE_COIL)
"""The kinds whose subject is a coil."""


class Priority(StrEnum):
    """How soon somebody has to act."""

    HIGH = "high"
    MEDIUM = "medium"
    LOW = "low"

    @property
    def rank(self) -> int:
        """0 for high, 1 for medium, 2 for low: sorts the most urgent first."""
        return BY_RANK.index(self)


BY_RANK = (Priority.HIGH, Priority.MEDIUM, Priority.LOW)


def highest(priorities: Iterable[Priority]) -> Priority:
    """The most urgent of at least one priority."""
    return min(priorities, key=lambda priority: priority.rank)
