"""What the rows of one coils file must make sense of together: tensile values, and each coil once."""

from __future__ import annotations

from collections.abc import Sequence
from operator import itemgetter

from agewatch.plant.tables import COILS, Row

_COIL_ID, _RP02, _RM = (COILS.column_names.index(name) for name in ("coil_id", "rp02_mpa", "rm_mpa"))

Refused = dict[int, tuple[str, str] | None]
"""Place of a row -> the column at fault and the reason, or None when the row stands in the file already, alike."""


class Coils:
    """The coils of one file so far. `names` are the source's names of the columns."""

    def __init__(self, names: list[str]) -> None:
        self._names = names
        self._seen: dict[object, Row] = {}
        self._line: dict[object, int] = {}

    def refused(self, rows: Sequence[Row], lines: Sequence[int]) -> Refused:
        """Which of some rows will not do; `lines` are theirs, counted from 1. The others count as seen."""
        refused: Refused = {}
        for place, (rp02_mpa, rm_mpa) in enumerate(map(itemgetter(_RP02, _RM), rows)):
            if rp02_mpa is not None and rm_mpa is not None and rm_mpa <= rp02_mpa:
                reason = f"{rm_mpa:g} is not above {self._names[_RP02]}, {rp02_mpa:g}; allowed is more"
                refused[place] = (self._names[_RM], reason)
        coil_ids = list(map(itemgetter(_COIL_ID), rows))
        arrived = dict(zip(coil_ids, rows, strict=True))
        if not refused and len(arrived) == len(rows) and self._seen.keys().isdisjoint(arrived):
            self._seen |= arrived
            self._line.update(zip(coil_ids, lines, strict=True))
        else:
            self._one_by_one(rows, lines, refused)
        return refused

    def _one_by_one(self, rows: Sequence[Row], lines: Sequence[int], refused: Refused) -> None:
        for place, (row, line) in enumerate(zip(rows, lines, strict=True)):
            if place in refused:
                continue
            coil_id = row[_COIL_ID]
            first, first_line = self._seen.setdefault(coil_id, row), self._line.setdefault(coil_id, line)
            if first is row:
                continue
            reason = (
                f"{coil_id} stands in line {first_line} with other values; allowed is one row for each coil"
            )
            refused[place] = None if first == row else (self._names[_COIL_ID], reason)
