"""Temperatures to come, from the last weeks and the normals."""

from __future__ import annotations

import numpy as np
import pytest

from agewatch.climate.outlook import expected_air, normal_air_c

HOUR_S = 3600.0
DAY_S = 86_400.0
NORMALS_C = np.array([-1.0, 0, 4, 9, 14, 18, 20, 19, 14, 9, 4, 0])
NEW_YEAR_S = 1_767_225_600.0
"""2026-01-01T00:00:00Z."""


def readings(days: float, until_s: float = NEW_YEAR_S + 190 * DAY_S) -> tuple[np.ndarray, np.ndarray]:
    """Hourly, 22 °C with a swing of 4 K that peaks at 15:00 UTC."""
    at_s = np.arange(until_s - days * DAY_S, until_s, HOUR_S)
    return at_s, 22.0 + 4.0 * np.cos(2 * np.pi * (at_s % DAY_S / DAY_S - 15 / 24))


def test_goes_on_with_the_days_of_the_last_fortnight() -> None:
    """Without normals level and daily course stay as they were."""
    at_s, celsius = expected_air(*readings(30), None, NEW_YEAR_S + 220 * DAY_S)
    wanted = 22.0 + 4.0 * np.cos(2 * np.pi * (at_s % DAY_S / DAY_S - 15 / 24))
    assert celsius == pytest.approx(wanted, abs=0.02)


def test_only_the_last_fortnight_counts() -> None:
    """Older readings do not move the outlook."""
    read_s, read_c = readings(60)
    warmer_before = np.where(read_s < read_s[-1] - 15 * DAY_S, read_c + 10.0, read_c)
    until_s = NEW_YEAR_S + 200 * DAY_S
    assert (
        expected_air(read_s, warmer_before, None, until_s)[1]
        == expected_air(read_s, read_c, None, until_s)[1]
    ).all()


def test_follows_the_normals_from_where_the_readings_are() -> None:
    """The normals' course is shifted so that it meets the last weeks."""
    read_s, read_c = readings(30)
    at_s, celsius = expected_air(read_s, read_c, NORMALS_C, NEW_YEAR_S + 300 * DAY_S)
    days = celsius[: len(celsius) // 24 * 24].reshape(-1, 24).mean(axis=1)
    normal = normal_air_c(at_s, NORMALS_C)[: len(days) * 24].reshape(-1, 24).mean(axis=1)
    shift = days - normal
    assert shift == pytest.approx(np.full(len(shift), shift[0]), abs=0.05)
    assert days[0] == pytest.approx(22.0, abs=0.5)
    assert days[-1] < 14.0


def test_is_hourly_and_reaches_past_the_end() -> None:
    """Times are full hours after the last reading, without a hole."""
    read_s, read_c = readings(3)
    at_s, _ = expected_air(read_s, read_c, None, read_s[-1] + 5 * DAY_S)
    assert at_s[0] > read_s[-1]
    assert (np.diff(at_s) == HOUR_S).all()
    assert at_s[-1] >= read_s[-1] + 5 * DAY_S


def test_a_few_hours_give_a_level_and_no_course() -> None:
    """Until a whole day is known the outlook is flat."""
    read_s, read_c = readings(0.4)
    _, celsius = expected_air(read_s, read_c, None, read_s[-1] + 2 * DAY_S)
    assert np.ptp(celsius) == 0.0
    assert celsius[0] == pytest.approx(read_c.mean(), abs=0.5)


def test_one_reading_is_enough() -> None:
    """The outlook is that reading."""
    _, celsius = expected_air(np.array([NEW_YEAR_S + 100.0]), np.array([17.0]), None, NEW_YEAR_S + DAY_S)
    assert (celsius == 17.0).all()


def test_normals_stand_in_the_middle_of_their_months() -> None:
    """In the middle of July it is July's normal, at the turn of the year the mean of December's and January's."""
    mid_july_s = NEW_YEAR_S + 196 * DAY_S
    assert normal_air_c(np.array([mid_july_s]), NORMALS_C) == pytest.approx([20.0], abs=0.1)
    assert normal_air_c(np.array([NEW_YEAR_S]), NORMALS_C) == pytest.approx([-0.5], abs=0.1)
