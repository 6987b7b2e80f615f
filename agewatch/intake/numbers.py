"""What the text of a number means: decimal point or comma, grouped thousands, signs before or behind."""

from __future__ import annotations

import re
import sys

from agewatch.intake.cells import Fault, Meaning, Understand, shown
from agewatch.plant.tables import Column

_SPACES = " \u00a0\u2009\u202f'\u2019"
_MINUS = str.maketrans("\u2212", "-")


def number(column: Column, decimal: str) -> Understand:
    """Numbers with the decimal mark `decimal`, inside the column's bounds.

    Thousands may be grouped by spaces or apostrophes, or by the other mark where that cannot be mistaken for a
    decimal mark (1,234 may be either: it is refused).
    """
    other = "," if decimal == "." else "."
    mark, group = re.escape(decimal), re.escape(other)
    plain = re.compile(rf"[+-]?(?:\d+(?:{mark}\d*)?|{mark}\d+)(?:[eE][+-]?\d+)?", re.ASCII)
    unusual = re.compile(
        rf"(?P<before>[+-]?)(?P<digits>\d{{1,3}}(?:[{_SPACES}]\d{{3}})+(?:{mark}\d*)?"
        rf"|\d{{1,3}}(?:(?:{group}\d{{3}})+{mark}\d*|(?:{group}\d{{3}}){{2,}})"
        rf"|\d+(?:{mark}\d*)?)(?P<behind>[+-]?)",
        re.ASCII,
    )
    ambiguous = re.compile(rf"[+-]?\d{{1,3}}{group}\d{{3}}[+-]?", re.ASCII)
    to_float = str.maketrans(decimal, ".", _SPACES + other)
    bounds = _bounds(column)

    def read(cell: str) -> Meaning:
        bare = cell
        if not plain.fullmatch(cell):
            match = unusual.fullmatch(cell.translate(_MINUS))
            if match is None or (match["before"] and match["behind"]):
                what = "may mean thousands or a fraction" if ambiguous.fullmatch(cell) else "is no number"
                return Fault(
                    f"{shown(cell)} {what}; allowed is {bounds}, with the decimal mark {shown(decimal)}"
                )
            bare = match["before"] + match["behind"] + match["digits"]
        value = float(bare.translate(to_float))
        if not _inside(column, value):
            return Fault(f"{shown(cell)} is out of bounds; allowed is {bounds}")
        return value

    return read


def _inside(column: Column, value: float) -> bool:
    return (
        (column.low is None or value >= column.low)
        and (column.above is None or value > column.above)
        and value <= (sys.float_info.max if column.high is None else column.high)
    )


def _bounds(column: Column) -> str:
    limits = [
        f"{word} {limit:.12g}"
        for word, limit in (("above", column.above), ("from", column.low), ("to", column.high))
        if limit is not None
    ]
    return " ".join(["a number", *limits])
