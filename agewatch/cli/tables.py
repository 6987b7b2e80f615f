"""Tables for people and for spreadsheets. Text from files is made harmless for both."""

from __future__ import annotations

import csv
import io
from collections.abc import Collection, Iterable, Iterator, Sequence

from agewatch.messages.inert import inert

_CELL_LIMIT = 100
_STARTS_A_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\0")


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


def _cell(cell: object) -> object:
    if isinstance(cell, bool):
        return "true" if cell else "false"
    if not isinstance(cell, str):
        return cell
    formula = cell.startswith(_STARTS_A_FORMULA)  # a spreadsheet would take it for one (CWE-1236)
    return "'" * formula + inert(cell, len(cell))
