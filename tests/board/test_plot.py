"""Braille dots, round steps and dates of the charts' own drawing."""

from __future__ import annotations

import math
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from agewatch.board.widgets.axes import Field, draw_foot, round_step
from agewatch.board.widgets.plot import Plot


def _text(plot: Plot) -> list[str]:
    return ["".join(run[0] for run in line) for line in plot.lines()]


def test_each_dot_has_its_place_in_the_braille_cell() -> None:
    """Dot numbers and code points as in the Unicode standard, block 2800 (from memory of its chart)."""
    plot = Plot(1, 1)
    seen = []
    for row, column in ((0, 0), (1, 0), (2, 0), (0, 1), (1, 1), (2, 1), (3, 0), (3, 1)):
        mask = np.zeros((4, 2), dtype=np.bool_)
        mask[row, column] = True
        plot = Plot(1, 1)
        plot.dots(mask, "plain")
        seen.append(ord(_text(plot)[0]) - 0x2800)
    assert seen == [1 << bit for bit in range(8)]


@given(st.lists(st.floats(-20, 40) | st.just(math.nan), min_size=20, max_size=20))
def test_a_curve_has_a_dot_at_every_value_on_the_grid_and_no_gap_between(rows: list[float]) -> None:
    """Neighbouring columns touch, however steep the curve; values off the grid and NaN draw nothing of their own."""
    plot = Plot(10, 5)
    plot.curve(np.array(rows), "strong")
    drawn = np.unpackbits(_bits(plot)[..., np.newaxis], axis=-1, bitorder="little")
    for column, row in enumerate(rows):
        if not math.isnan(row) and 0 <= np.rint(row) < plot.dot_rows:
            line, dot = divmod(int(np.rint(row)), 4)
            bit = [[0, 3], [1, 4], [2, 5], [6, 7]][dot][column % 2]
            assert drawn[line, column // 2, bit]


def _bits(plot: Plot) -> np.ndarray[tuple[int, ...], np.dtype[np.uint8]]:
    return np.array(
        [[(ord(c) - 0x2800 if c != " " else 0) for c in line] for line in _text(plot)], dtype=np.uint8
    )


def test_text_lies_over_dots_and_is_cut_at_the_edges() -> None:
    """Labels stay readable, and one that does not fit breaks nothing."""
    plot = Plot(4, 2)
    plot.dots(np.ones((8, 8), dtype=np.bool_), "quiet")
    plot.text(-1, 0, "abc", "plain")
    plot.text(3, 1, "xyz", "plain")
    plot.text(0, 5, "off", "plain")
    assert _text(plot) == ["bc⣿⣿", "⣿⣿⣿x"]


@given(st.floats(1e-6, 1e6), st.integers(1, 20))
def test_steps_are_round_and_few(reach: float, most: int) -> None:
    """1, 2 or 5 times a power of ten, and no more of them than asked for."""
    step = round_step(reach, most)
    mantissa = step / 10.0 ** math.floor(math.log10(step) + 1e-9)
    assert min(abs(mantissa - good) for good in (1, 2, 5, 10)) < 1e-6
    assert reach / step <= most * (1 + 1e-6)


def _foot(start: datetime, days: float, width: int) -> str:
    plot = Plot(width + 6, 4)
    field = Field(plot, 6, 0, width, 2, start.timestamp(), start.timestamp() + 86400 * days, 0.0, 1.0)
    draw_foot(field, ZoneInfo("Europe/Prague"))
    return _text(plot)[3]


def test_dates_stand_at_midnights_of_the_site_across_a_change_of_the_clocks() -> None:
    """In the week in which Prague loses an hour every date is still there once."""
    prague = ZoneInfo("Europe/Prague")
    dates = _foot(datetime(2025, 3, 28, 12, tzinfo=prague), 5.0, 60)
    assert [date for date in ("29 Mar", "30 Mar", "31 Mar", "1 Apr", "2 Apr") if date in dates] == [
        "29 Mar", "30 Mar", "31 Mar", "1 Apr", "2 Apr",
    ]  # fmt: skip


def test_a_short_time_is_marked_in_hours() -> None:
    """Within a day the hours are what tells."""
    foot = _foot(datetime(2025, 7, 18, 5, tzinfo=ZoneInfo("Europe/Prague")), 0.4, 40)
    assert "06:00" in foot
    assert "09:00" in foot


@given(st.floats(0.05, 400), st.integers(20, 150))
def test_dates_never_run_into_each_other(days: float, width: int) -> None:
    """Whatever the span and the room, labels are apart."""
    foot = _foot(datetime(2025, 7, 18, 5, tzinfo=ZoneInfo("Europe/Prague")), days, width)
    words = foot.split()
    assert all(len(word) <= 5 for word in words)
