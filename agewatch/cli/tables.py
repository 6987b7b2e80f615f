"""Tables for people and for spreadsheets. Text from files is made harmless for both."""

from __future__ import annotations

import csv
import io
from collections.abc import Collection, Iterable, Iterator, Sequence

from agewatch.messages.inert import inert

_CELL_LIMIT = 100
_STARTS_A_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\0", "'")
"""The last one so that nothing is disarmed that `armed` would not know again."""


def text_table(
    heading: Sequence[str], rows: Iterable[Sequence[str]], right: Collection[int] = ()
) -> Iterator[str]:
    """Columns two blanks apart, as wide as their widest cell; those numbered in `right` end flush."""
    lines = [tuple(heading), *(tuple(inert(cell, _CELL_LIMIT) for cell in row) for row in rows)]
    widths = [max(map(len, column)) for column in zip(*lines, strict=True)]
    for line in lines:
        cells = (
            cell.rjust(width) if place in right else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(line, widths, strict=True))
        )
        yield "  ".join(cells).rstrip()


def csv_line(cells: Iterable[object]) -> str:
    """One line of CSV (RFC 4180) without its end; None is empty, a flag is `true` or `false`."""
    line = io.StringIO()
    csv.writer(line, lineterminator="").writerow([_cell(cell) for cell in cells])
    return line.getvalue()


def disarmed(text: str) -> str:
    """Text that no spreadsheet takes for a formula (CWE-1236); `armed` gives it back."""
    return f"'{text}" if text.startswith(_STARTS_A_FORMULA) else text


def armed(text: str) -> str:
    """What `disarmed` was given."""
    return text[1:] if text.startswith("'") else text


def _cell(cell: object) -> object:
    if isinstance(cell, bool):
        return "true" if cell else "false"
    return disarmed(inert(cell, len(cell))) if isinstance(cell, str) else cell
