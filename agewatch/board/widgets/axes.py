"""Axes of the board's charts: round values upwards, days and hours of the site along the foot."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

from agewatch.board.times import day
from agewatch.board.widgets.plot import Plot

Floats = NDArray[np.float64]

_HOUR_S = 3600.0
_DAY_S = 86400.0
_DATE_STEPS_H = (1, 3, 6, 12, 24, 48, 168, 336, 672)


@dataclass(frozen=True, slots=True)
class Field:
    """The part of a plot that the curves have, in cells, and the values that its edges stand for."""

    plot: Plot
    left: int
    top: int
    width: int
    height: int
    from_s: float
    to_s: float
    low: float
    high: float

    @property
    def times_s(self) -> Floats:
        """The time of each dot column of the plot; NaN left and right of the field."""
        times = np.full(self.plot.dot_columns, np.nan)
        inside = slice(2 * self.left, 2 * (self.left + self.width))
        times[inside] = np.linspace(self.from_s, self.to_s, 2 * self.width)
        return times

    def column(self, at_s: float) -> float:
        """Dot column of a time."""
        share = (at_s - self.from_s) / (self.to_s - self.from_s)
        return 2 * self.left + share * (2 * self.width - 1)

    def row(self, value: Floats | float) -> Floats:
        """Dot row of a value; values beyond the edges have rows beyond the field."""
        share = (self.high - np.asarray(value)) / (self.high - self.low)
        return np.asarray(4 * self.top + share * (4 * self.height - 1))

    def inside(self, dot_row: Floats) -> Floats:
        """`dot_row` with NaN where it is outside of the field."""
        first, last = 4 * self.top, 4 * (self.top + self.height) - 1
        return np.where((np.rint(dot_row) >= first) & (np.rint(dot_row) <= last), dot_row, np.nan)

    def draw_level(self, value: float, tone: str, *, on: int, off: int) -> None:
        """A dashed line across the field, `on` dots long and `off` apart."""
        plot, row = self.plot, round(float(self.row(value)))
        mask = np.zeros((plot.dot_rows, plot.dot_columns), dtype=np.bool_)
        if 4 * self.top <= row < 4 * (self.top + self.height):
            mask[row] = (np.arange(plot.dot_columns) % (on + off) < on) & ~np.isnan(self.times_s)
        plot.dots(mask, tone)

    def draw_upright(self, at_s: float, tone: str, *, on: int, off: int) -> None:
        """A dashed line up the field at a time inside of it."""
        mask = np.zeros((self.plot.dot_rows, self.plot.dot_columns), dtype=np.bool_)
        rows = np.arange(4 * self.top, 4 * (self.top + self.height))
        mask[rows[rows % (on + off) < on], round(self.column(at_s))] = True
        self.plot.dots(mask, tone)

    def clipped(self, dot_row: Floats) -> Floats:
        """`dot_row` held inside of the field."""
        return np.clip(dot_row, 4 * self.top, 4 * (self.top + self.height) - 1)


def round_step(reach: float, most: int) -> float:
    """The smallest of 1, 2, 5 × 10^k that divides `reach` into at most `most` steps."""
    rough = reach / max(1, most)
    power = 10.0 ** math.floor(math.log10(rough))
    return next(power * factor for factor in (1, 2, 5, 10) if power * factor >= rough * (1 - 1e-9))


def draw_upright_axis(field: Field, form: str) -> None:
    """Round values left of the field, on every second line at most, and the line that they stand on."""
    for line in range(field.top, field.top + field.height):
        field.plot.text(field.left - 1, line, "│", "quiet")
    for value in _round_values(field.low, field.high, max(1, field.height // 2)):
        line = round(float(field.row(value))) // 4
        label = form.format(value)
        field.plot.text(field.left - 1 - len(label), line, label, "quiet")
        field.plot.text(field.left - 1, line, "┤", "quiet")


def _round_values(low: float, high: float, most: int) -> list[float]:
    """Round values from `low` to `high`: at least one, and no more steps than `most` where that leaves one."""
    while True:
        step = round_step(high - low, most)
        first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
        if first <= last:
            return [step * number for number in range(first, last + 1)]
        most += 1


def draw_foot(field: Field, zone: ZoneInfo) -> None:
    """The line below the field with its dates, as many as have room."""
    line = field.top + field.height
    field.plot.text(field.left - 1, line, "└" + "─" * field.width, "quiet")
    free_from = 0
    for at_s, label in _dates(field, zone):
        column = int(field.column(at_s)) // 2
        start = min(max(free_from, column - len(label) // 2), field.plot.width - len(label))
        if start < free_from or start > column or start + len(label) <= column:
            continue
        field.plot.text(column, line, "┬", "quiet")
        field.plot.text(start, line + 1, label, "quiet")
        free_from = start + len(label) + 1


def _dates(field: Field, zone: ZoneInfo) -> Iterator[tuple[float, str]]:
    """Times to write below the field: midnights of the site, or round hours when the field is short."""
    most = max(1, field.width // 8)
    reach_h = (field.to_s - field.from_s) / _HOUR_S
    step_h = next((step for step in _DATE_STEPS_H if reach_h / step <= most), _DATE_STEPS_H[-1])
    local = datetime.fromtimestamp(field.from_s, zone).replace(
        hour=0, minute=0, second=0, microsecond=0, tzinfo=None
    )
    while True:
        at_s = local.replace(tzinfo=zone).timestamp()  # wall time first: a day may have 23 or 25 hours
        if at_s > field.to_s:
            return
        if at_s >= field.from_s:
            yield at_s, day(at_s, zone) if local.hour == 0 else f"{local:%H:%M}"
        local += timedelta(hours=step_h)
