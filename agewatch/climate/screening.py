"""Screening: marks readings that are not believed. Nothing is deleted; each mark names its test."""

from __future__ import annotations

from enum import IntFlag

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Marks = NDArray[np.uint16]


class Mark(IntFlag):
    """Why a reading is not believed."""

    GOOD = 0
    RANGE = 1
    """Outside what the air of a store can be."""
    DUPLICATE = 2
    """A second reading of the same moment."""
    ORDER = 4
    """Earlier than the reading before it."""


def screen(at_s: Floats, celsius: Floats, *, lowest_c: float, highest_c: float) -> Marks:
    """Marks of one sensor's readings, in the order in which they came, (n,).

    NaN counts as outside the range. Of two readings of one moment the later one is marked.
    """
    marks = np.zeros(len(at_s), dtype=np.uint16)
    marks[~((celsius >= lowest_c) & (celsius <= highest_c))] |= np.uint16(Mark.RANGE)
    if len(at_s) > 1:
        latest_s = np.maximum.accumulate(at_s)[:-1]
        marks[1:][at_s[1:] < latest_s] |= np.uint16(Mark.ORDER)
        order = np.argsort(at_s, kind="stable")
        marks[order[1:][np.diff(at_s[order]) == 0]] |= np.uint16(Mark.DUPLICATE)
    return marks


def believed(marks: Marks) -> NDArray[np.bool_]:
    """Readings that count: none of the tests failed but that of order, which sorting mends."""
    return np.asarray((marks & ~np.uint16(Mark.ORDER)) == 0)
