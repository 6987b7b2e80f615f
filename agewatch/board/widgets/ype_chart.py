"""The chart of a coil's yield-point elongation, past and to come, against the limit of its part."""

from __future__ import annotations

import math
from zoneinfo import ZoneInfo

import numpy as np

from agewatch.board.widgets.axes import Field, Floats, draw_foot, draw_upright_axis
from agewatch.board.widgets.chart import Chart
from agewatch.board.widgets.plot import Plot
from agewatch.plant.trace import CoilTrace

_DAY_S = 86400.0
_LEFT = 6
"""Cells left of the field: values such as `0.25` and the axis."""
_NAMES_APART = 6
"""Cells between two marks below which their words would touch: single letters then."""
_LINES_ABOVE = 1
_LINES_BELOW = 2


class YpeChart(Chart):
    """P50 line, P10–P90 band, limit, now and the planned pressing."""

    def draw(self, trace: CoilTrace, width: int, height: int) -> Plot:
        return ype_picture(trace, width, height, self._zone)


def ype_picture(trace: CoilTrace, width: int, height: int, zone: ZoneInfo) -> Plot:
    """The chart on `width` × `height` cells, from 30 × 8 up."""
    plot = Plot(width, height)
    from_s, to_s = shown_span(trace)
    top_pct = top_of_scale(trace, from_s, to_s)
    field = Field(
        plot,
        _LEFT,
        _LINES_ABOVE,
        width - _LEFT,
        height - _LINES_ABOVE - _LINES_BELOW,
        from_s,
        to_s,
        0.0,
        top_pct,
    )
    _draw_curves(field, trace)
    draw_upright_axis(field, "{:.2f}" if top_pct < 1 else "{:.1f}")
    draw_foot(field, zone)
    plot.text(0, 0, "YPE %", "quiet")
    draw_marks(field, trace)
    if not math.isnan(trace.limit_pct):
        _draw_limit_label(field, trace.limit_pct)
    return plot


def shown_span(trace: CoilTrace) -> tuple[float, float]:
    """From when to when a trace is worth showing: to a little beyond its pressing and its return."""
    first_s, last_s = float(trace.at_s[0]), float(trace.at_s[-1])
    events_s = [at_s for at_s in (trace.press_s, *_returns_s(trace)) if not math.isnan(at_s)]
    ahead_s = max(_DAY_S, *(at_s - trace.now_s for at_s in events_s)) if events_s else last_s - trace.now_s
    to_s = min(last_s, trace.now_s + 1.2 * ahead_s)
    past_s = max(3 * _DAY_S, to_s - trace.now_s, *(trace.now_s - at_s for at_s in events_s), 0.0)
    return max(first_s, trace.now_s - 1.1 * past_s), max(to_s, first_s + 1.0)


def _returns_s(trace: CoilTrace) -> list[float]:
    """When the high, the middle and the low curve reach the limit, as far as they do."""
    returns = (return_s(trace, curve) for curve in (trace.ype_p90_pct, trace.ype_p50_pct))
    return [at_s for at_s in returns if at_s is not None]


def return_s(trace: CoilTrace, curve_pct: Floats) -> float | None:
    """The time at which a curve first goes beyond the limit; None: not inside the trace, or there is no limit."""
    beyond = np.flatnonzero(curve_pct > trace.limit_pct)
    return float(trace.at_s[beyond[0]]) if len(beyond) else None


def top_of_scale(trace: CoilTrace, from_s: float, to_s: float) -> float:
    """Upper end of the scale, %: the limit stands at a third to two thirds of the height where there is one."""
    shown = (trace.at_s >= from_s) & (trace.at_s <= to_s)
    highest = float(np.nanmax(trace.ype_p90_pct[shown], initial=0.0))
    present = float(np.interp(trace.now_s, trace.at_s, trace.ype_p50_pct))
    if math.isnan(trace.limit_pct):
        return max(0.05, 1.1 * highest)
    return max(1.6 * trace.limit_pct, 1.15 * present, min(highest, 3.0 * trace.limit_pct))


def _draw_curves(field: Field, trace: CoilTrace) -> None:
    times_s = field.times_s
    low, middle, high = (
        field.row(np.interp(times_s, trace.at_s, curve, left=np.nan, right=np.nan))
        for curve in (trace.ype_p10_pct, trace.ype_p50_pct, trace.ype_p90_pct)
    )
    if np.nanmax(np.abs(low - high)) >= 1:
        field.plot.band(field.clipped(high), field.clipped(low), "band")
        field.plot.curve(field.inside(high), "quiet", every=3)
        field.plot.curve(field.inside(low), "quiet", every=3)
    if not math.isnan(trace.limit_pct):
        field.draw_level(trace.limit_pct, "limit", on=4, off=2)
    field.plot.curve(field.inside(middle), "strong")


def _draw_limit_label(field: Field, limit_pct: float) -> None:
    line = round(float(field.row(limit_pct))) // 4
    above = line - 1 if line > field.top else line + 1
    field.plot.text(field.left + 1, above, f"limit {limit_pct:.2g} %", "limit")


def draw_marks(field: Field, trace: CoilTrace, *, named: bool = True) -> None:
    """Upright lines at now and at the planned pressing, named on the line above the field."""
    now = round(field.column(trace.now_s)) // 2
    field.draw_upright(trace.now_s, "mark", on=1, off=1)
    pressed = field.from_s <= trace.press_s <= field.to_s
    press = round(field.column(trace.press_s)) // 2 if pressed else -99
    if pressed:
        field.draw_upright(trace.press_s, "mark", on=3, off=1)
    if named:
        close = abs(press - now) < _NAMES_APART
        _name_mark(field, now, "N" if close else "now")
        if pressed:
            _name_mark(field, press, "P" if close else "press")


def _name_mark(field: Field, column: int, name: str) -> None:
    start = min(column - len(name) // 2, field.plot.width - len(name))
    field.plot.text(start, field.top - 1, name, "mark")
