"""Text that came over the wire, made harmless to show: one line, nothing hidden, nothing that steers."""

from __future__ import annotations

import unicodedata

_SHOWN = frozenset(("L", "M", "N", "P", "S"))


def inert(text: str, limit: int = 200) -> str:
    """`text` with every control, format, surrogate and line character spelled out, cut after `limit`."""
    shown = "".join(_spelled(character) for character in text[: limit + 1])
    return shown if len(shown) <= limit else shown[:limit] + "…"


def _spelled(character: str) -> str:
    if character == " " or unicodedata.category(character)[0] in _SHOWN:
        return character
    code = ord(character)
    return f"\\x{code:02x}" if code < 0x100 else f"\\u{code:04x}"
