"""Reading times by a strptime pattern; patterns of numbers alone by a regular expression, which is quicker."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import datetime

_NUMBERS = {
    "%Y": r"(?P<year>\d{4})",
    "%m": r"(?P<month>\d{1,2})",
    "%d": r"(?P<day>\d{1,2})",
    "%H": r"(?P<hour>\d{1,2})",
    "%M": r"(?P<minute>\d{1,2})",
    "%S": r"(?P<second>\d{1,2})",
}
_DIRECTIVE = re.compile(r"%.", re.DOTALL)


def pattern_reader(pattern: str) -> Callable[[str], datetime]:
    """A function that reads a time as `datetime.strptime` does. It raises ValueError."""
    directives = _DIRECTIVE.findall(pattern)
    literals = _DIRECTIVE.split(pattern)
    between = literals[1:-1]
    plain = set(directives) <= _NUMBERS.keys() and len(set(directives)) == len(directives)
    if not plain or not all(between) or any(any(map(str.isalnum, literal)) for literal in literals):
        return lambda text: datetime.strptime(text, pattern)
    expression = re.compile(_expression(literals, directives), re.ASCII)

    def read(text: str) -> datetime:
        match = expression.fullmatch(text)
        if match is None:
            return datetime.strptime(text, pattern)
        part = match.groupdict(default="0").get
        day = int(part("year", "1900")), int(part("month", "1")), int(part("day", "1"))
        return datetime(*day, int(part("hour", "0")), int(part("minute", "0")), int(part("second", "0")))

    return read


def _expression(literals: list[str], directives: list[str]) -> str:
    spaced = [re.sub(r"(?:\\?\s)+", r"\\s+", re.escape(literal)) for literal in literals]
    numbers = [_NUMBERS[directive] for directive in directives]
    return spaced[0] + "".join(number + literal for number, literal in zip(numbers, spaced[1:], strict=True))
