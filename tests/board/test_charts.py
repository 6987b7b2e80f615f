"""The charts of a coil: what they show, also without colour, and when they say a sentence instead."""

from __future__ import annotations

import asyncio
import re
from dataclasses import replace
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from textual.app import App, ComposeResult

from agewatch.board.palette import NIGHT
from agewatch.board.widgets.plot import Plot
from agewatch.board.widgets.temperature_chart import temperature_picture
from agewatch.board.widgets.ype_chart import YpeChart, return_s, shown_span, top_of_scale, ype_picture
from agewatch.plant.assessment import Verdict
from agewatch.plant.trace import CoilTrace
from tests.board.driving import screen_text
from tests.board.plant import DAY_S, NAN, NOW_S, coil, trace_of

PRAGUE = ZoneInfo("Europe/Prague")


def _trace(*, returns_d: float = 12.0, press_d: float = 8.0, band: float = 0.3) -> CoilTrace:
    trace = trace_of(coil("C1", Verdict.PULL, returns_d=returns_d, press_d=press_d), band=band)
    assert trace is not None
    return trace


def _text(plot: Plot) -> list[str]:
    return ["".join(run[0] for run in line) for line in plot.lines()]


def _tones(plot: Plot) -> set[str]:
    return {tone for line in plot.lines() for text, tone, _ in line if text.strip()}


def test_the_chart_names_limit_now_and_pressing_and_has_both_axes() -> None:
    """Everything that the supervisor reads off stands in letters."""
    text = _text(ype_picture(_trace(), 70, 18, PRAGUE))
    assert "now" in text[0]
    assert "press" in text[0]
    assert "YPE %" in text[0]
    assert any("limit 0.2 %" in line for line in text)
    assert any(line.startswith(" 0.20") for line in text)
    assert re.search(r"\d{1,2} (Jul|Aug)", text[-1])


def test_marks_that_come_close_are_named_by_one_letter() -> None:
    """N and P, where the words would run into each other."""
    head = _text(ype_picture(_trace(press_d=0.4), 40, 12, PRAGUE))[0]
    assert "N" in head
    assert "P" in head.replace("YPE", "")
    assert "now" not in head


def test_the_band_is_drawn_as_ground_and_as_light_edges() -> None:
    """Taken all colour away, the edges of P10 and P90 are still there as dots."""
    lines = ype_picture(_trace(), 70, 18, PRAGUE).lines()
    assert any(ground == "band" for line in lines for _, _, ground in line)
    edges = [text for line in lines for text, tone, _ in line if tone == "quiet" and re.search("[⠁-⣿]", text)]
    assert len("".join(edges).replace(" ", "")) > 10


def test_without_spread_there_is_no_band() -> None:
    """A deterministic coil has one line."""
    assert not any(
        ground for line in ype_picture(_trace(band=0.0), 70, 18, PRAGUE).lines() for _, _, ground in line
    )


def test_a_part_that_bears_any_plateau_has_no_limit_line() -> None:
    """The curve is drawn to its own scale."""
    trace = replace(_trace(), limit_pct=NAN)
    plot = ype_picture(trace, 70, 18, PRAGUE)
    assert "limit" not in "".join(_text(plot))
    assert "limit" not in _tones(plot)
    assert return_s(trace, trace.ype_p50_pct) is None


def test_the_line_meets_the_limit_at_the_return() -> None:
    """Where the middle line passes the limit on the chart is the P50 return of the trace."""
    trace = _trace(returns_d=12.0)
    returned_s = return_s(trace, trace.ype_p50_pct)
    assert returned_s is not None
    assert abs(returned_s - (NOW_S + 12 * DAY_S)) < 0.3 * DAY_S  # the trace's own step


@given(st.floats(-40, 55), st.floats(-5, 55) | st.just(NAN), st.floats(0, 0.9))
def test_the_span_shown_holds_now_and_the_pressing(returns_d: float, press_d: float, band: float) -> None:
    """Neither now nor a pressing inside the trace ever falls off the chart."""
    trace = _trace(returns_d=returns_d, press_d=press_d, band=band)
    from_s, to_s = shown_span(trace)
    assert trace.at_s[0] <= from_s < trace.now_s < to_s <= trace.at_s[-1]
    assert np.isnan(trace.press_s) or from_s <= trace.press_s <= to_s


@given(st.floats(-40, 55), st.floats(0, 0.9))
def test_the_limit_always_has_room_on_the_scale(returns_d: float, band: float) -> None:
    """However far the plateau is back, limit and present value are on the chart."""
    trace = _trace(returns_d=returns_d, band=band)
    top_pct = top_of_scale(trace, *shown_span(trace))
    assert top_pct >= 1.5 * trace.limit_pct
    assert top_pct >= np.interp(trace.now_s, trace.at_s, trace.ype_p50_pct)


@given(st.integers(30, 160), st.integers(8, 50), st.floats(-40, 55), st.floats(-5, 55) | st.just(NAN))
def test_every_size_from_the_least_up_is_filled(
    width: int, height: int, returns_d: float, press_d: float
) -> None:
    """Both charts have exactly the cells that they were given."""
    trace = _trace(returns_d=returns_d, press_d=press_d)
    for picture in (ype_picture, temperature_picture):
        text = _text(picture(trace, width, height, PRAGUE))
        assert [len(line) for line in text] == [width] * height


@pytest.mark.parametrize("swing_c", [0.0, 0.01, 60.0])
def test_temperatures_have_a_scale_even_when_the_air_stands_still(swing_c: float) -> None:
    """A constant is a level line, not a fault; the coil and the air are named."""
    trace = _trace()
    air_c = 22.0 + swing_c * np.sin(trace.at_s / 9e4)
    text = _text(
        temperature_picture(replace(trace, air_c=air_c, coil_c=np.full_like(air_c, 22.0)), 40, 8, PRAGUE)
    )
    assert "coil" in text[0]
    assert "air" in text[0]
    assert any(line[:5].strip() for line in text[1:-2])


class _ChartApp(App[None]):
    """Nothing but the chart."""

    def __init__(self) -> None:
        super().__init__()
        self.register_theme(NIGHT)
        self.theme = NIGHT.name
        self.chart = YpeChart(PRAGUE, id="ype")

    def compose(self) -> ComposeResult:
        yield self.chart


def test_a_chart_without_room_or_without_a_curve_says_so() -> None:
    """A sentence stands where the picture would, and the picture comes when there is room."""

    async def run() -> None:
        app = _ChartApp()
        async with app.run_test(size=(29, 7)) as pilot:
            app.chart.show(_trace())
            await pilot.pause()
            assert "There is no room for the" in screen_text(app)
            await pilot.resize_terminal(30, 8)
            await pilot.pause()
            assert "limit 0.2 %" in screen_text(app)
            app.chart.say("No curve: the grade [red]\x1b does not age.")
            await pilot.pause()
            assert "No curve: the grade [red] does" in screen_text(app)

    asyncio.run(run())
