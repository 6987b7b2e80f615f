"""A picture in text: a grid of cells, each with a finer grid of 2 × 4 braille dots, drawn with numpy."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

_BRAILLE = 0x2800
_DOT_BITS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]], dtype=np.int32)
"""Bit of each dot of a cell, by (row, column), as the Unicode block of braille patterns has them."""


class Plot:
    """Dots, grounds and text on `height` × `width` cells. What is drawn later lies above.

    Dots are counted from the top left; a point off the grid is not drawn.
    """

    def __init__(self, width: int, height: int) -> None:
        self.width = width
        self.height = height
        self._bits = np.zeros((height, width), dtype=np.int32)
        self._text = np.full((height, width), "", dtype="<U1")
        self._tone = np.full((height, width), "plain", dtype="<U12")
        self._ground = np.full((height, width), "", dtype="<U12")

    @property
    def dot_columns(self) -> int:
        return 2 * self.width

    @property
    def dot_rows(self) -> int:
        return 4 * self.height

    def dots(self, mask: NDArray[np.bool_], tone: str) -> None:
        """Set the dots of `mask`, shape (dot_rows, dot_columns)."""
        cells = mask.reshape(self.height, 4, self.width, 2).transpose(0, 2, 1, 3)
        bits = (cells * _DOT_BITS).sum(axis=(2, 3))
        self._bits |= bits
        self._tone[bits > 0] = tone

    def curve(self, dot_row: Floats, tone: str, *, every: int = 1) -> None:
        """A line through `dot_row` (dot_columns,), one value for each dot column; NaN breaks it.

        With `every` above 1 only every so many dot columns are drawn: a light line.
        """
        rows = np.arange(self.dot_rows)[:, np.newaxis]
        here = np.rint(dot_row)
        before = np.where(np.isnan(np.roll(here, 1)), here, np.roll(here, 1))
        before[0] = here[0]
        halfway = np.rint((before + here) / 2)
        low, high = np.minimum(halfway, here), np.maximum(halfway, here)
        mask = (rows >= low) & (rows <= high)
        mask[:, np.arange(self.dot_columns) % every != 0] = False
        self.dots(mask, tone)

    def band(self, top: Floats, bottom: Floats, ground: str) -> None:
        """Colour the ground of the cells between two curves of dot rows (dot_columns,)."""
        high = np.fmin.reduceat(top, np.arange(0, self.dot_columns, 2)) // 4
        low = np.fmax.reduceat(bottom, np.arange(0, self.dot_columns, 2)) // 4
        rows = np.arange(self.height)[:, np.newaxis]
        self._ground[(rows >= high) & (rows <= low)] = ground

    def text(self, column: int, row: int, text: str, tone: str) -> None:
        """Write single-cell characters over the dots; what falls outside is cut."""
        if not 0 <= row < self.height:
            return
        text = text[max(0, -column) :][: max(0, self.width - max(0, column))]
        column = max(0, column)
        for place, character in enumerate(text, start=column):
            self._text[row, place] = character
            self._tone[row, place] = tone

    def lines(self) -> list[list[tuple[str, str, str]]]:
        """The picture, line by line, as runs of (text, tone, ground)."""
        dots = np.where(self._bits > 0, self._bits + _BRAILLE, ord(" ")).astype(np.uint32)
        drawn = dots.view("<U1").reshape(self.height, self.width)
        shown = np.where(self._text != "", self._text, drawn)
        return [_runs(*row) for row in zip(shown, self._tone, self._ground, strict=True)]


def _runs(
    characters: NDArray[np.str_], tones: NDArray[np.str_], grounds: NDArray[np.str_]
) -> list[tuple[str, str, str]]:
    breaks = np.flatnonzero((tones[1:] != tones[:-1]) | (grounds[1:] != grounds[:-1])) + 1
    starts = [0, *breaks.tolist()]
    ends = [*breaks.tolist(), len(characters)]
    return [
        ("".join(characters[start:end]), str(tones[start]), str(grounds[start]))
        for start, end in zip(starts, ends, strict=True)
    ]
