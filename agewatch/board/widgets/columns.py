"""Columns of a line table: which fit a width, and how text is cut and padded to cells."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from rich.cells import cell_len, set_cell_size

from agewatch.board.inert import inert
from agewatch.board.look import Span

GAP = 2
"""Cells between two columns."""

Cell = tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class Column:
    """One column. Widths are terminal cells."""

    name: str
    title: str
    width: int
    rank: int
    """The smaller, the longer it stays when room gets short."""
    right: bool = False
    wide: int = 0
    """Width that shows more of it, taken when room is left; 0: no more to show."""


@dataclass(frozen=True, slots=True)
class Placed:
    """A column that is shown, with the width it got."""

    column: Column
    start: int
    width: int


def fitted(columns: Sequence[Column], room: int) -> tuple[Placed, ...]:
    """The columns that fit into `room` cells, in their own order; at least the first by rank."""
    by_rank = sorted(columns, key=lambda column: column.rank)
    widths: dict[str, int] = {}
    left = room
    for column in by_rank:
        needed = column.width + (GAP if widths else 0)
        if widths and needed > left:
            break
        widths[column.name] = min(column.width, max(1, left))
        left -= needed
    for column in by_rank:
        more = column.wide - column.width
        if column.name in widths and 0 < more <= left:
            widths[column.name] = column.wide
            left -= more
    return _placed(columns, widths)


def _placed(columns: Sequence[Column], widths: dict[str, int]) -> tuple[Placed, ...]:
    placed: list[Placed] = []
    start = 0
    for column in columns:
        if column.name in widths:
            placed.append(Placed(column, start, widths[column.name]))
            start += widths[column.name] + GAP
    return tuple(placed)


def widest(texts: Iterable[str], at_least: int, at_most: int) -> int:
    """Cells that the widest of `texts` takes, within bounds."""
    widths = (len(text) if text.isascii() else cell_len(inert(text)) for text in texts)
    return max(at_least, min(max(widths, default=0), at_most))


def fitting(cell: Cell, width: int, *, right: bool) -> list[Span]:
    """The cell's spans, made inert, cut (with …) and padded to exactly `width` ≥ 1 cells."""
    spans = [Span(inert(span.text), span.tone) for span in cell if span.text]
    spare = width - sum(cell_len(span.text) for span in spans)
    if spare < 0:
        return _cut(spans, width)
    padding = [Span(" " * spare)] if spare else []
    return [*padding, *spans] if right else [*spans, *padding]


def _cut(spans: list[Span], width: int) -> list[Span]:
    kept: list[Span] = []
    for span in spans:
        size = cell_len(span.text)
        if size >= width:
            kept.append(Span(set_cell_size(set_cell_size(span.text, width - 1) + "…", width), span.tone))
            break
        kept.append(span)
        width -= size
    return kept
