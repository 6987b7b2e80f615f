"""The outlook: temperatures to come at a location, from its last weeks and the normals of the months."""

from __future__ import annotations

import numpy as np

from agewatch.climate.screening import Floats

RECENT_S = 14 * 86400.0
"""The last weeks, which set the level and the daily profile."""
_HOUR_S = 3600.0
_DAY_S = 86400.0
_YEAR_S = 365.2425 * _DAY_S
_MID_MONTH_DAYS = np.array([15.5, 45, 74.5, 105, 135.5, 166, 196.5, 227.5, 258, 288.5, 319, 349.5])


def expected_air(
    read_s: Floats, read_c: Floats, monthly_normals_c: Floats | None, until_s: float
) -> tuple[Floats, Floats]:
    """Hourly times and °C from the last reading to past `until_s`.

    The daily profile is the mean course of the last fourteen days of readings. The level follows the monthly
    normals, shifted so that they meet those days; without normals it stays.

    Parameters
    ----------
    read_s, read_c
        Strictly rising times (at least one) and °C.
    monthly_normals_c
        Mean air of January … December, (12,), or None.
    """
    recent = read_s > read_s[-1] - RECENT_S
    hours_s, hours_c = _hourly(read_s[recent], read_c[recent])
    profile_c = _daily_profile(hours_s, hours_c)
    level_c = float(np.mean(hours_c))
    at_s = (np.floor(read_s[-1] / _HOUR_S) + 1) * _HOUR_S
    times_s = np.arange(at_s, until_s + 2 * _HOUR_S, _HOUR_S)
    season_c = np.zeros(len(times_s))
    if monthly_normals_c is not None:
        season_c = normal_air_c(times_s, monthly_normals_c) - np.mean(
            normal_air_c(hours_s, monthly_normals_c)
        )
    hour = (times_s % _DAY_S / _HOUR_S).astype(np.intp)
    return times_s, level_c + season_c + profile_c[hour]


def normal_air_c(at_s: Floats, monthly_normals_c: Floats) -> Floats:
    """The normals at any time: straight lines between the middles of the months, °C, (n,)."""
    day = at_s % _YEAR_S / _DAY_S
    return np.interp(day, _MID_MONTH_DAYS, monthly_normals_c, period=_YEAR_S / _DAY_S)


def _hourly(read_s: Floats, read_c: Floats) -> tuple[Floats, Floats]:
    """The readings at full hours, by straight line, so that every hour counts alike."""
    first, last = np.ceil(read_s[0] / _HOUR_S), np.floor(read_s[-1] / _HOUR_S)
    if last < first:
        return read_s, read_c
    times_s = np.arange(first, last + 1) * _HOUR_S
    return times_s, np.interp(times_s, read_s, read_c)


def _daily_profile(hours_s: Floats, hours_c: Floats) -> Floats:
    """Mean departure of each hour of the day (UTC) from the level, °C, (24,); flat until a day is known."""
    hour = (hours_s % _DAY_S / _HOUR_S).astype(np.intp)
    count = np.bincount(hour, minlength=24)
    if (count == 0).any():
        return np.zeros(24)
    mean_c = np.bincount(hour, hours_c, minlength=24) / count
    return np.asarray(mean_c - mean_c.mean())
