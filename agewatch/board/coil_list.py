"""Which coils stand in the list, and in which order: filter and sort over the columns of an assessment."""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from agewatch.board.order import URGENCY, Order
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Coded, Floats

Rows = NDArray[np.intp]
"""Row numbers of an assessment."""

_URGENCY = {Verdict.HOLD: 0, Verdict.PULL: 0, Verdict.WATCH: 1, Verdict.UNASSESSED: 2, Verdict.CLEAR: 3}
_URGENCY_OF_VERDICT = np.array([_URGENCY[verdict] for verdict in Verdict], dtype=np.int8)
_LEAST_URGENT_FIRST = (Verdict.CLEAR, Verdict.UNASSESSED, Verdict.WATCH, Verdict.PULL, Verdict.HOLD)
_VERDICT_RANK = np.array([_LEAST_URGENT_FIRST.index(verdict) for verdict in Verdict], dtype=np.float64)

SORTABLE = {
    URGENCY: "urgency",
    "verdict": "verdict",
    "coil": "coil",
    "grade": "grade",
    "part": "part",
    "location": "location",
    "equivalent_age": "equivalent age",
    "return": "P50 return",
    "press": "pressing",
    "slack": "slack",
    "risk": "risk",
}
"""What the list can be ordered by, and how that is called."""
MOST_FIRST = frozenset({"verdict", "equivalent_age", "risk"})
"""Columns whose large values are the urgent ones."""


class CoilList:
    """The coils of one assessment. Every answer is an array of its row numbers."""

    def __init__(self, assessment: Assessment) -> None:
        self.assessment = assessment
        self._found: dict[str, NDArray[np.bool_]] = {}

    def arranged(self, order: Order, words: str) -> Rows:
        """The rows that match all `words`, in `order`; like values stand by urgency, missing ones last."""
        ranked = self._by_urgency
        if order.by != URGENCY:
            values = self._values(order.by)[ranked]
            ranked = ranked[np.argsort(-values if order.descending else values, kind="stable")]
        kept = self.matching(words)
        return ranked if kept is None else ranked[kept[ranked]]

    def matching(self, words: str) -> NDArray[np.bool_] | None:
        """Whether each row has every one of the words, in any of its names; None when no word was given."""
        wanted = words.casefold().split()
        if not wanted:
            return None
        kept = np.ones(len(self.assessment), dtype=np.bool_)
        for word in wanted:
            if word not in self._found:
                self._found[word] = self._has(word)
            kept &= self._found[word]
        self._found = {word: self._found[word] for word in wanted}  # the next key changes one of them
        return kept

    def row_of(self, coil_id: str) -> int | None:
        """The row of a coil."""
        return self._row_of.get(coil_id)

    def first_like(self, text: str, rows: Rows) -> int | None:
        """Place in `rows` of the coil named `text`, else of the first whose number begins with it or has it inside."""
        wanted = text.strip().casefold()
        if not wanted:
            return None
        names = [self._folded_ids[row] for row in rows]
        for fits in (str.__eq__, str.startswith, str.__contains__):
            for place, name in enumerate(names):
                if fits(name, wanted):
                    return place
        return None

    def counts(self) -> dict[Verdict, int]:
        """How many coils have each verdict."""
        counted = np.bincount(self.assessment.verdict, minlength=len(Verdict))
        return {verdict: int(counted[verdict]) for verdict in Verdict}

    @cached_property
    def _by_urgency(self) -> Rows:
        columns = self.assessment
        return np.lexsort((columns.return_p10_s, columns.slack_h, _URGENCY_OF_VERDICT[columns.verdict]))

    @cached_property
    def _folded_ids(self) -> list[str]:
        return [coil_id.casefold() for coil_id in self.assessment.coil_id]

    @cached_property
    def _row_of(self) -> dict[str, int]:
        return {coil_id: row for row, coil_id in enumerate(self.assessment.coil_id)}

    def _has(self, word: str) -> NDArray[np.bool_]:
        columns = self.assessment
        found = np.fromiter((word in name for name in self._folded_ids), dtype=np.bool_, count=len(columns))
        for names in (columns.grade, columns.part, columns.location):
            found |= np.array([*(word in label.casefold() for label in names.labels), False])[names.codes]
        found |= np.array([word in verdict.word for verdict in Verdict])[columns.verdict]
        return found

    def _values(self, by: str) -> Floats:
        columns = self.assessment
        numbers = {
            "equivalent_age": columns.equivalent_age_days,
            "return": columns.return_p50_s,
            "press": columns.press_s,
            "slack": columns.slack_h,
            "risk": columns.return_risk,
        }
        if by in numbers:
            return numbers[by]
        names = {"grade": columns.grade, "part": columns.part, "location": columns.location}
        if by in names:
            return _alphabetic(names[by])
        if by == "verdict":
            return _VERDICT_RANK[columns.verdict]
        return np.arange(len(columns), dtype=np.float64)  # the rows are ordered by coil


def _alphabetic(names: Coded) -> Floats:
    """Each row's place in the alphabet of its labels; NaN where it has no name."""
    place = np.full(len(names.labels) + 1, np.nan)
    order = sorted(range(len(names.labels)), key=lambda code: names.labels[code].casefold())
    place[order] = np.arange(len(order))
    return place[names.codes]
