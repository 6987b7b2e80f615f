"""The trace of one coil."""

from __future__ import annotations

import numpy as np
import pytest

from agewatch.plant.trace import trace_coil
from tests.plant.builders import AT_S, DAY_S, NO_OUTLOOK, assessed, coils, readings, settings


def test_the_curves_meet_the_limit_at_the_assessed_dates() -> None:
    """The upper curve crosses the limit at the P10 return, the middle one at the P50, within a step of the trace."""
    row, by = {"location": "warm", "rolled": 20.0, "press": 40.0}, settings(tau_spread=0.6)
    found = assessed([row], by=by)
    trace = trace_coil(coils([row]), readings(), NO_OUTLOOK, by, AT_S)
    assert trace is not None
    step_s = float(np.diff(trace.at_s).max())
    for curve, date_s in (
        (trace.ype_p90_pct, found.return_p10_s[0]),
        (trace.ype_p50_pct, found.return_p50_s[0]),
    ):
        crossing_s = trace.at_s[np.argmax(curve >= trace.limit_pct)]
        assert crossing_s == pytest.approx(date_s, abs=1.5 * step_s)


def test_starts_at_temper_rolling_and_holds_now() -> None:
    """It covers the past from temper rolling on, the present and the pressing, and no curve ever falls."""
    row = {"location": "warm", "rolled": 20.0, "press": 40.0, "coil_temp_c": 55.0}
    trace = trace_coil(coils([row]), readings(), NO_OUTLOOK, settings(tau_spread=0.6), AT_S)
    assert trace is not None
    assert trace.at_s[0] == AT_S - 20 * DAY_S
    assert AT_S in trace.at_s
    assert trace.at_s[-1] > trace.press_s
    assert trace.coil_c[0] == pytest.approx(55.0, abs=0.01)
    assert trace.air_c == pytest.approx(np.full(len(trace.air_c), 35.0))
    for curve in (trace.ype_p10_pct, trace.ype_p50_pct, trace.ype_p90_pct):
        assert (np.diff(curve) >= -1e-9).all()
    assert (trace.ype_p10_pct <= trace.ype_p50_pct).all()
    assert (trace.ype_p50_pct <= trace.ype_p90_pct).all()


def test_a_coil_that_cannot_be_assessed_has_none() -> None:
    """There is nothing to draw."""
    assert trace_coil(coils([{"location": "dark"}]), readings(), NO_OUTLOOK, settings(), AT_S) is None
