"""Paragraphs of spans, wrapped to cells: with a name in front and the text hanging beside it."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple

from rich.cells import cell_len, chop_cells

from agewatch.board.inert import inert
from agewatch.board.look import Span

Line = tuple[Span, ...]

_WORDS = re.compile(r"\S+|\s+")
_WIDEST = 2
"""Cells of the widest character."""


class Paragraph(NamedTuple):
    """`name`, one of our own words, stands in front, in `indent` cells that stay empty on the lines that follow."""

    spans: Line
    name: str = ""
    indent: int = 0


def named(pairs: Iterable[tuple[str, str]], indent: int) -> list[Paragraph]:
    """A paragraph for each pair of name and text; pairs without a text are left out."""
    return [Paragraph((Span(text),), name, indent) for name, text in pairs if text]


def wrapped(paragraphs: Iterable[Paragraph], width: int) -> list[Line]:
    """The paragraphs as lines of at most `width` cells, made inert."""
    return [line for paragraph in paragraphs for line in _wrapped(paragraph, width)]


def _wrapped(paragraph: Paragraph, width: int) -> Iterator[Line]:
    spans, name, indent = paragraph
    cramped = indent > width // 2 or width - indent < _WIDEST
    if cramped or len(name) > indent:  # no room beside the name: it begins the text
        spans, name, indent = (Span(f"{name} " if name else "", "quiet"), *spans), "", 0
    first = Span(f"{name:<{indent}}", "quiet")
    for number, line in enumerate(_filled(spans, max(1, width - indent))):
        yield (first if number == 0 else Span(" " * indent), *line)


def _filled(spans: Sequence[Span], width: int) -> Iterator[Line]:
    line: list[Span] = []
    used = 0
    for word, tone in _pieces(spans, width):
        size = cell_len(word)
        if used + size > width and line:
            yield tuple(line)
            line, used = [], 0
            if word.isspace():
                continue
        line.append(Span(word, tone))
        used += size
    yield tuple(line)


def _pieces(spans: Sequence[Span], width: int) -> Iterator[tuple[str, str]]:
    """Words and the spaces between them; a word longer than a line comes in several pieces."""
    for span in spans:
        for word in _WORDS.findall(inert(span.text) if span.text else ""):
            for piece in chop_cells(word, width) if cell_len(word) > width else (word,):
                yield piece, span.tone
