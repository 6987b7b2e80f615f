"""From the text of a CSV file to its records: lines, separator, header, and records that know their lines."""

from __future__ import annotations

import csv
import re
from collections.abc import Collection, Iterator
from contextlib import suppress
from dataclasses import dataclass

from agewatch.errors import FeedError

SEPARATORS = (",", ";", "\t")

_SEPARATOR_LINE = re.compile(r"sep=([^\w\s\"]|\t)\r?\n?")

Record = tuple[int, int, list[str]]
"""First line, line after the last (counted from 0), and the cells: none when the line is blank or its quotes do not
pair."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """A CSV text whose header has been read."""

    lines: list[str]
    """Each with its line end."""
    separator: str
    header: list[str]
    header_text: str
    first: int
    """Line after the header, counted from 0."""

    def records(self) -> Iterator[Record]:
        """Every record below the header, blank ones too."""
        return _records(self.lines, self.first, self.separator, len(self.header))

    def raw(self, first: int, after: int) -> str:
        """Lines as they stand in the file, without the last one's end."""
        return _raw(self.lines, first, after)

    def fault(self, first: int) -> str:
        """What is wrong with the record without cells in line `first`; "" when the line is blank."""
        line = self.lines[first].rstrip("\r\n")
        if not line.strip():
            return ""
        if '"' in line:
            return 'its quotes do not pair; allowed inside a quoted cell is a quote written twice ("")'
        if "\r" in line:
            return "holds a line end inside a cell; allowed is one in quotes"
        return f"holds a cell that is too long; allowed are {csv.field_size_limit()} characters"

    @property
    def cut_short(self) -> bool:
        """The last line has no end: it may be half written."""
        return not self.lines[-1].endswith("\n")


def open_sheet(feed: str, source: str, text: str, separator: str, needed: Collection[str]) -> Sheet:
    """The sheet in `text`. `separator` "auto" takes the one by which the header has the `needed` names, else the one
    by which it has the most. Raises FeedError when there is no header."""
    lines = _lines(text.removeprefix("\ufeff"))
    declared = _SEPARATOR_LINE.fullmatch(lines[0]) if lines else None
    if declared and separator == "auto":
        separator = declared[1]
    start = 1 if declared else 0
    while start < len(lines) and not lines[start].strip():
        start += 1
    begin = 0 if declared else start
    if start == len(lines):
        raise FeedError(feed, source, "is empty: not even a header stands in it; write the header at least")
    choices = SEPARATORS if separator == "auto" else (separator,)
    headers = {choice: _header(lines, start, choice) for choice in choices}
    separator = max(
        choices, key=lambda choice: (set(needed) <= set(headers[choice][0]), len(headers[choice][0]))
    )
    names, after = headers[separator]
    return Sheet(lines, separator, names, _raw(lines, begin, after), after)


def _header(lines: list[str], start: int, separator: str) -> tuple[list[str], int]:
    """The names in the header, and the line after it."""
    _, after, cells = next(_records(lines, start, separator, 0))
    return [cell.strip() for cell in cells], after


def _lines(text: str) -> list[str]:
    end = "\r" if "\r" in text and "\n" not in text else "\n"
    *whole, rest = text.split(end)
    lines = [line + "\n" for line in whole]
    return [*lines, rest] if rest else lines


def _raw(lines: list[str], first: int, after: int) -> str:
    return "".join(lines[first:after]).removesuffix("\n").removesuffix("\r")


def _records(lines: list[str], start: int, separator: str, width: int) -> Iterator[Record]:
    """Records from line `start` on. Where the quotes of one do not pair, its first line alone is at fault: what
    follows is read afresh from the next line, so that a stray quote swallows nothing."""
    while start < len(lines):
        for record in _paired(lines, start, separator, width):
            yield record
            start = record[1]
        if start < len(lines):
            yield start, start + 1, []
            start += 1


def _paired(lines: list[str], start: int, separator: str, width: int) -> Iterator[Record]:
    """Records from line `start` up to the first that is none."""
    base = start
    reader = csv.reader(map(lines.__getitem__, range(start, len(lines))), delimiter=separator, strict=True)
    with suppress(csv.Error):  # the caller sees at which line it ended
        for cells in reader:
            after = base + reader.line_num
            if after - start > 1 and width and _swallows(cells, lines[start + 1 : after], separator, width):
                return
            yield start, after, cells
            start = after


def _swallows(cells: list[str], further: list[str], separator: str, width: int) -> bool:
    """Whether a record of several lines looks like several records that stray quotes made one of."""
    if len(cells) != width:
        return any(line.count(separator) >= width - 1 for line in further)
    return any(
        _are_records(place, cell.split("\n"), separator, width)
        for place, cell in enumerate(cells)
        if "\n" in cell
    )


def _are_records(place: int, parts: list[str], separator: str, width: int) -> bool:
    """Whether the lines of a cell in column `place` hold the rest of one record, others whole, and the start of one."""
    start, *between, end = parts
    return (
        start.count(separator) >= width - 1 - place
        and end.count(separator) >= place
        and all(line.count(separator) >= width - 1 for line in between if line.strip())
    )
