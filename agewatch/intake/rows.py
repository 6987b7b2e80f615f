"""From the text of a source to valid rows and rejects: every record is one or the other, or blank, or a repetition."""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import islice
from typing import TYPE_CHECKING

from agewatch.errors import FeedError
from agewatch.intake.layout import lay_out, needed_names
from agewatch.intake.shapes import Shape, shape_of
from agewatch.intake.sheet import Record, Sheet, open_sheet
from agewatch.plant.tables import Reject, Row

if TYPE_CHECKING:
    from agewatch.plant.settings import Feed

_AT_ONCE = 64
"""Records that are read together: few enough to stay in the processor's cache."""


@dataclass(slots=True)
class Parsed:
    """What a source says. A record is a line of the source, or several where a quoted cell holds line ends.

    In a wide temperature file one record makes many rows, and its good readings count even if others are at fault;
    elsewhere `records` is the sum of rows, rejects, blank records and repeats.
    """

    rows: list[Row] = field(default_factory=list)
    rejects: list[Reject] = field(default_factory=list)
    records: int = 0
    blank: int = 0
    repeats: int = 0
    """Coils that stand in the file once more, alike in every column."""


def parse_rows(feed: Feed, text: str, source: str, *, now_s: float) -> Parsed:
    """Read CSV text in the dialect of `feed`. `source` is what rejects name as their file.

    Raises FeedError when nothing can be read: no header, a column that lacks or stands twice, a last line cut short.
    """
    sheet = open_sheet(feed.name, source, text, feed.separator, needed_names(feed))
    try:
        layout = lay_out(feed, source, sheet.header)
    except FeedError:
        if sheet.cut_short and sheet.first == len(sheet.lines):
            raise _half_written(feed.name, source, sheet.first) from None
        raise
    reading = _Reading(feed, source, sheet, shape_of(feed, sheet.header, layout, now_s))
    records = sheet.records()
    while together := list(islice(records, _AT_ONCE)):
        reading.take(together)
    return reading.parsed


def _half_written(feed: str, source: str, line: int) -> FeedError:
    reason = f"is still being written (line {line} is cut short); it is left for the next reading"
    return FeedError(feed, source, reason)


class _Reading:
    """One source on its way from records to rows."""

    def __init__(self, feed: Feed, source: str, sheet: Sheet, shape: Shape) -> None:
        self.parsed = Parsed()
        self._feed = feed
        self._source = source
        self._sheet = sheet
        self._shape = shape

    def take(self, together: list[Record]) -> None:
        """Take in some records."""
        self.parsed.records += len(together)
        width = len(self._sheet.header)
        whole = [
            record
            for record in together
            if (len(record[2]) == width and record[2][0].strip()) or self._is_whole(record)
        ]
        if not whole:
            return
        cells = list(zip(*(record[2] for record in whole), strict=True))
        found = self._shape.read(cells, [record[0] + 1 for record in whole])
        self.parsed.rows += found.rows
        self.parsed.repeats += found.repeats
        for place in sorted(found.faults):
            self._reject(whole[place], found.faults[place])

    def _is_whole(self, record: Record) -> bool:
        """Whether the record has a cell for each column. If not, it is settled here."""
        first, after, cells = record
        width = len(self._sheet.header)
        blank = not any(map(str.strip, cells))
        if not blank and not any(map(str.strip, cells[width:])) and len(cells) >= width:
            del cells[width:]
            return True
        fault = (
            self._sheet.fault(first)
            if not cells
            else f"has {len(cells)} cells; allowed are {width}, as in the header"
        )
        if not fault or (cells and blank):
            self.parsed.blank += 1
            return False
        if self._sheet.cut_short and after == len(self._sheet.lines) and len(cells) < width:
            raise _half_written(self._feed.name, self._source, after)
        self._reject(record, [("", fault)])
        return False

    def _reject(self, record: Record, faults: list[tuple[str, str]]) -> None:
        first, after, _ = record
        (column, reason), *others = faults
        reason += "".join(f"; also {name}: {further}" for name, further in others)
        raw, header = self._sheet.raw(first, after), self._sheet.header_text
        self.parsed.rejects.append(
            Reject(self._feed.table, self._source, first + 1, column, reason, raw, header)
        )
