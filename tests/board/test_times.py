"""Times in words."""

from __future__ import annotations

from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.board.times import plant_time, relative, slack, span, weekday_time
from tests.board.plant import NOW_S

PRAGUE = ZoneInfo("Europe/Prague")


def test_times_are_those_of_the_site() -> None:
    """Half past five in UTC is half past seven in Prague in July."""
    assert weekday_time(NOW_S, PRAGUE) == "Fri 18 Jul 07:30"
    assert plant_time(NOW_S, PRAGUE) == "Fri 18 Jul 2025 07:30:05 CEST"


@pytest.mark.parametrize(
    ("seconds", "words"),
    [
        (0, "0 s"),
        (59.4, "59 s"),
        (61, "1 min"),
        (3600, "1 h"),
        (5 * 3600 + 600, "5 h 10 min"),
        (26 * 3600, "1 d 2 h"),
        (12.9 * 86400, "12 d"),
        (-7200, "2 h"),
    ],
)
def test_a_span_takes_at_most_two_units(seconds: float, words: str) -> None:
    """Long spans are told in days, short ones to the minute."""
    assert span(seconds) == words


@given(st.floats(-1e9, 1e9))
def test_a_relative_time_says_which_way(ahead_s: float) -> None:
    """What is to come is "in", what was is "ago", and what is now is "now"."""
    words = relative(NOW_S + ahead_s, NOW_S)
    assert words.startswith("in ") == (NOW_S + ahead_s - NOW_S >= 30)
    assert words.endswith(" ago") == (NOW_S + ahead_s - NOW_S <= -30)


@pytest.mark.parametrize(
    ("slack_h", "words"),
    [
        (31.2, "31 h"),
        (-6.0, "late 6 h"),
        (0.4, "24 min"),
        (-0.75, "late 45 min"),
        (96.0, "4 d"),
        (-900.0, "late 38 d"),
    ],
)
def test_negative_slack_is_late(slack_h: float, words: str) -> None:
    """One unit, so that a column of them can be compared."""
    assert slack(slack_h) == words


def test_an_hour_that_the_clocks_skip_is_told_by_the_zone() -> None:
    """30 March 2025, 01:30 UTC: in Prague it is half past three, for half past two was not."""
    assert weekday_time(1_743_298_200.0, PRAGUE) == "Sun 30 Mar 03:30"
