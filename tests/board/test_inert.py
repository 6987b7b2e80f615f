"""Nothing in a text from data can act on the terminal, or hide."""

from __future__ import annotations

import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.board.inert import NOTHING_LEFT, inert

_ACTING = {"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"}


@given(st.text(alphabet=st.characters(), max_size=60))
def test_no_character_that_acts_or_hides_is_left(text: str) -> None:
    """Controls, format characters, half surrogates and line ends are gone, whatever was given."""
    assert not {unicodedata.category(character) for character in inert(text)} & _ACTING


@given(st.text(alphabet=st.characters(), max_size=60))
def test_inert_text_stays_as_it_is(text: str) -> None:
    """Passing the gate twice is passing it once."""
    assert inert(inert(text)) == inert(text)


@given(st.text(alphabet=st.characters(), max_size=60))
def test_inert_text_can_be_written_as_utf_8(text: str) -> None:
    """A terminal gets bytes: no half surrogate is left to break the writing."""
    assert inert(text).encode("utf-8").decode("utf-8") == inert(text)


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("C-4711/b [red]", "C-4711/b [red]"),
        ("C1\x1b[31mred\x1b[0m", "C1[31mred[0m"),
        ("C1\x9b31m", "C131m"),
        ("abc\u202edef\u2069", "abcdef"),
        ("C\u200b1\u2060\ufeff2", "C12"),
        ("two\nlines\tand\u00a0more", "two lines and more"),
        ("鋼卷七", "鋼卷七"),
        ("e\u0301", "é"),
        ("a" + "\u0335" * 9, "a\u0335\u0335"),
        ("❤\ufe0f", "❤"),
        ("\ud800", NOTHING_LEFT),
        ("\u200b\u3164", NOTHING_LEFT),
        ("", ""),
    ],
)
def test_what_is_shown_of_hostile_names(text: str, shown: str) -> None:
    """Each kind of trick leaves its harmless letters, and a name of nothing else leaves a mark."""
    assert inert(text) == shown
