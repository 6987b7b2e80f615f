"""Times and spans in the words of the board: short, in the site's zone, and relative to now."""

from __future__ import annotations

from datetime import datetime
from zoneinfo import ZoneInfo

_MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")
_DAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")
_MINUTE_S = 60.0
_HOUR_S = 3600.0
_DAY_S = 86400.0


def day(at_s: float, zone: ZoneInfo) -> str:
    """`18 Jul`."""
    at = datetime.fromtimestamp(at_s, zone)
    return f"{at.day} {_MONTHS[at.month - 1]}"


def day_time(at_s: float, zone: ZoneInfo) -> str:
    """`18 Jul 07:30`."""
    at = datetime.fromtimestamp(at_s, zone)
    return f"{at.day} {_MONTHS[at.month - 1]} {at:%H:%M}"


def weekday_time(at_s: float, zone: ZoneInfo) -> str:
    """`Fri 18 Jul 07:30`."""
    return f"{_DAYS[datetime.fromtimestamp(at_s, zone).weekday()]} {day_time(at_s, zone)}"


def plant_time(at_s: float, zone: ZoneInfo) -> str:
    """`Fri 18 Jul 2025 07:30:05 CEST`, for the head of the screen."""
    at = datetime.fromtimestamp(at_s, zone)
    return f"{_DAYS[at.weekday()]} {at.day} {_MONTHS[at.month - 1]} {at:%Y %H:%M:%S %Z}"


def time_of_day(at_s: float, zone: ZoneInfo) -> str:
    """`07:30:05`."""
    return f"{datetime.fromtimestamp(at_s, zone):%H:%M:%S}"


def span(seconds: float) -> str:
    """How long, to two units at most: `2 d 4 h`, `5 h 10 min`, `12 min`, `40 s`. The sign is dropped."""
    seconds = abs(seconds)
    if seconds < _MINUTE_S:
        return f"{seconds:.0f} s"
    if seconds < _HOUR_S:
        return f"{seconds // _MINUTE_S:.0f} min"
    if seconds < _DAY_S:
        return _two(seconds, _HOUR_S, "h", _MINUTE_S, "min")
    if seconds < 100 * _DAY_S:
        return _two(seconds, _DAY_S, "d", _HOUR_S, "h")
    return f"{seconds / _DAY_S:.0f} d"


def _two(seconds: float, large_s: float, large: str, small_s: float, small: str) -> str:
    whole, rest = divmod(seconds, large_s)
    parts = int(rest // small_s)
    return f"{whole:.0f} {large} {parts} {small}" if parts and whole < 10 else f"{whole:.0f} {large}"


def relative(at_s: float, now_s: float) -> str:
    """`in 2 d 4 h`, `6 h ago`, `now` within half a minute."""
    ahead_s = at_s - now_s
    if abs(ahead_s) < _MINUTE_S / 2:
        return "now"
    return f"in {span(ahead_s)}" if ahead_s > 0 else f"{span(ahead_s)} ago"


def slack(slack_h: float) -> str:
    """Slack in one unit, to be compared down a column: `40 min`, `31 h`, `5 d`; `late 6 h` where it is negative."""
    amount_h = abs(slack_h)
    if amount_h < 1:
        words = f"{60 * amount_h:.0f} min"
    else:
        words = f"{amount_h:.0f} h" if amount_h < 72 else f"{amount_h / 24:.0f} d"
    return f"late {words}" if slack_h < 0 else words
