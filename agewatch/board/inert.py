"""Text from data made inert: the one gate that it passes before it may stand on the screen."""

from __future__ import annotations

import unicodedata
from functools import lru_cache

_DROPPED_CATEGORIES = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})
"""Controls (C0, C1), format characters (bidi, zero width), half surrogates, private and unassigned ones."""
_INVISIBLE_LETTERS = frozenset("\u034f\u115f\u1160\u17b4\u17b5\u3164\uffa0")
"""Combining joiner, fillers and inherent vowels: letters by category, nothing to the eye."""
_MOST_MARKS = 2
"""Combining marks kept on one letter; more would pile up over the lines above."""
NOTHING_LEFT = "\ufffd"


@lru_cache(maxsize=8192)
def inert(text: str) -> str:
    """`text` on one line, without anything that a terminal acts upon or that the eye cannot see.

    White space becomes a plain space. Text of which nothing is left becomes U+FFFD, so that it still shows.
    """
    if text.isascii() and text.isprintable():
        return text
    kept: list[str] = []
    marks = 0
    for character in unicodedata.normalize("NFC", text):
        marks = marks + 1 if unicodedata.combining(character) else 0
        if marks <= _MOST_MARKS:
            kept.append(_shown(character))
    return "".join(kept) or NOTHING_LEFT


def _shown(character: str) -> str:
    if character in "\t\n\r\v\f" or unicodedata.category(character) == "Zs":
        return " "
    if unicodedata.category(character) in _DROPPED_CATEGORIES or character in _INVISIBLE_LETTERS:
        return ""
    if "\ufe00" <= character <= "\ufe0f" or "\U000e0100" <= character <= "\U000e01ef":
        return ""  # variation selectors change a letter's width in some terminals only
    return character
