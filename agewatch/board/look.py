"""What marks a verdict or a priority: a letter or digit and a word, and the tone that colours it.

A tone is a name for how text looks. Colour is kept for the abnormal and never stands alone.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from agewatch.alarms import Priority
from agewatch.plant.assessment import Verdict

TONES: Mapping[str, str] = {
    "plain": "",
    "quiet": "$quiet",
    "strong": "bold",
    "hold": "bold $on-act on $act-now",
    "pull": "bold $on-act on $act-soon",
    "watch": "bold $look",
    "unassessed": "bold $unknown",
    "high": "bold $on-act on $act-now",
    "medium": "bold $on-act on $act-soon",
    "low": "bold $look",
    "trouble": "bold $on-act on $act-now",
    "here": "bold on $chosen",
    "limit": "$limit",
    "mark": "bold $mark",
    "band": "on $band",
}
"""Each tone as a style of the screen library; the colours behind the names stand in palette.py."""
STARTING_POINT = "≈"
"""Stands before a date that rests on a grade which no test of this plant supports yet."""
STARTING_POINT_LEGEND = f"{STARTING_POINT} starting point: no test of this plant supports the grade yet"


class Span(NamedTuple):
    """A piece of text in one tone."""

    text: str
    tone: str = "plain"


VERDICT_LETTERS = {
    Verdict.HOLD: "H",
    Verdict.PULL: "P",
    Verdict.WATCH: "W",
    Verdict.UNASSESSED: "U",
    Verdict.CLEAR: "C",
}
PRIORITY_DIGITS = {Priority.HIGH: "1", Priority.MEDIUM: "2", Priority.LOW: "3"}


def verdict_tone(verdict: Verdict) -> str:
    return "quiet" if verdict is Verdict.CLEAR else verdict.word


def verdict_spans(verdict: Verdict) -> tuple[Span, Span]:
    """The verdict's badge and its word."""
    tone = verdict_tone(verdict)
    word_tone = "quiet" if verdict is Verdict.CLEAR else "plain"
    return Span(f" {VERDICT_LETTERS[verdict]} ", tone), Span(verdict.word, word_tone)


def priority_spans(priority: Priority) -> tuple[Span, Span]:
    """The priority's badge and its word."""
    word = priority.value
    return Span(f" {PRIORITY_DIGITS[priority]} ", word), Span(word, "plain")
