"""Cells and paragraphs keep to their width, in cells of the terminal, not in characters."""

from __future__ import annotations

import re
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from agewatch.board.look import Span
from agewatch.board.widgets.columns import GAP, Column, fitted, fitting, widest
from agewatch.board.widgets.paragraphs import Paragraph, wrapped

texts = st.text(alphabet=st.characters() | st.sampled_from("鋼ÅÄ漢 a1\u0301\u200b\x1b"), max_size=10)
spans = st.lists(st.builds(Span, texts), max_size=3).map(tuple)


def _cells(line: tuple[Span, ...] | list[Span]) -> int:
    return sum(cell_len(span.text) for span in line)


@given(spans, st.integers(1, 40), st.booleans())
def test_a_cell_fills_its_width_exactly(cell: tuple[Span, ...], width: int, right: bool) -> None:
    """Wide, combining and hostile characters cannot push the next column out of its place."""
    assert _cells(fitting(cell, width, right=right)) == width


@pytest.mark.parametrize(
    ("text", "width", "right", "shown"),
    [
        ("C1001", 8, False, "C1001   "),
        ("C1001", 8, True, "   C1001"),
        ("C1001-very-long", 8, False, "C1001-v…"),
        ("鋼鋼鋼鋼", 5, False, "鋼鋼…"),
        ("鋼鋼鋼鋼", 4, False, "鋼 …"),
        ("ab", 1, False, "…"),
    ],
)
def test_what_is_too_long_ends_in_an_ellipsis(text: str, width: int, right: bool, shown: str) -> None:
    """A wide character that does not fit gives a blank, never half of itself."""
    assert "".join(span.text for span in fitting((Span(text),), width, right=right)) == shown


@given(
    st.lists(st.tuples(st.integers(1, 20), st.integers(0, 9), st.integers(0, 30)), min_size=1),
    st.integers(1, 120),
)
def test_columns_fit_their_room(shapes: list[tuple[int, int, int]], room: int) -> None:
    """The columns that are shown stand in their order, do not touch, and end inside of the room."""
    columns = [
        Column(str(place), "", width, rank, wide=wide) for place, (width, rank, wide) in enumerate(shapes)
    ]
    placed = fitted(columns, room)
    assert placed
    assert [int(each.column.name) for each in placed] == sorted(int(each.column.name) for each in placed)
    for each, following in pairwise(placed):
        assert each.start + each.width + GAP == following.start
    assert placed[-1].start + placed[-1].width <= room


def test_the_least_important_column_goes_first_and_spare_room_shows_more() -> None:
    """The rank decides what stays; what is left over widens the columns that have more to show."""
    columns = [Column("a", "", 5, 2), Column("b", "", 5, 0, wide=9), Column("c", "", 5, 1)]
    assert [each.column.name for each in fitted(columns, 12)] == ["b", "c"]
    assert [(each.column.name, each.width) for each in fitted(columns, 24)] == [("a", 5), ("b", 9), ("c", 5)]
    assert [each.width for each in fitted(columns, 3)] == [3]


def test_a_column_is_as_wide_as_its_widest_name_within_bounds() -> None:
    """Wide characters count double."""
    assert widest(["a", "abc"], 2, 9) == 3
    assert widest(["鋼鋼鋼"], 2, 9) == 6
    assert widest([], 2, 9) == 2
    assert widest(["x" * 40], 2, 9) == 9


names = st.sampled_from(["", "Do", "Equiv. age"])


@given(st.lists(st.builds(Paragraph, spans, names, st.integers(0, 12)), max_size=4), st.integers(2, 50))
def test_lines_keep_to_the_width(paragraphs: list[Paragraph], width: int) -> None:
    """Whatever the words are, no line is wider than its room."""
    assert all(_cells(line) <= width for line in wrapped(paragraphs, width))


@given(st.lists(st.text(alphabet="abcdefgh", min_size=1, max_size=9), min_size=1), st.integers(16, 50))
def test_wrapping_loses_no_word(words: list[str], width: int) -> None:
    """Read line after line, the words are those that were given."""
    lines = wrapped([Paragraph((Span(" ".join(words)),), "Why", 5)], width)
    text = " ".join("".join(span.text for span in line) for line in lines)
    assert re.split(r"\s+", text.strip()) == ["Why", *words]
