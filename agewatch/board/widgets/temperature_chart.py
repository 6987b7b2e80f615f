"""The chart of the air and the coil temperature that a coil's aging rests on."""

from __future__ import annotations

from zoneinfo import ZoneInfo

import numpy as np

from agewatch.board.widgets.axes import Field, draw_foot, draw_upright_axis
from agewatch.board.widgets.chart import Chart
from agewatch.board.widgets.plot import Plot
from agewatch.board.widgets.ype_chart import draw_marks, shown_span
from agewatch.plant.trace import CoilTrace

_LEFT = 6
_LINES_ABOVE = 1
_LINES_BELOW = 2
_LEAST_REACH_C = 4.0
"""A scale never shows less than this from foot to top: still air is to look still."""


class TemperatureChart(Chart):
    """Coil as a full line, air as a dotted one, over the same time as the chart of YPE."""

    LEAST = (30, 6)

    def draw(self, trace: CoilTrace, width: int, height: int) -> Plot:
        return temperature_picture(trace, width, height, self._zone)


def temperature_picture(trace: CoilTrace, width: int, height: int, zone: ZoneInfo) -> Plot:
    """The chart on `width` × `height` cells, from 30 × 6 up."""
    plot = Plot(width, height)
    from_s, to_s = shown_span(trace)
    low_c, high_c = _scale(trace, from_s, to_s)
    rows = height - _LINES_ABOVE - _LINES_BELOW
    field = Field(plot, _LEFT, _LINES_ABOVE, width - _LEFT, rows, from_s, to_s, low_c, high_c)
    draw_marks(field, trace, named=False)
    for values_c, tone, every in ((trace.air_c, "quiet", 2), (trace.coil_c, "strong", 1)):
        values = np.interp(field.times_s, trace.at_s, values_c, left=np.nan, right=np.nan)
        plot.curve(field.inside(field.row(values)), tone, every=every)
    draw_upright_axis(field, "{:.0f}")
    draw_foot(field, zone)
    plot.text(0, 0, "°C", "quiet")
    plot.text(_LEFT, 0, "coil ━", "strong")
    plot.text(_LEFT + 8, 0, "air ┅", "quiet")
    return plot


def _scale(trace: CoilTrace, from_s: float, to_s: float) -> tuple[float, float]:
    shown = (trace.at_s >= from_s) & (trace.at_s <= to_s)
    both = np.concatenate([trace.air_c[shown], trace.coil_c[shown]])
    low, high = float(np.nanmin(both)), float(np.nanmax(both))
    spare = max(0.0, _LEAST_REACH_C - (high - low)) / 2
    return low - spare, high + spare
