"""The air of a location from its sensors, readings and outlook."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.climate.location_curve import LONGEST_PIECE_S, air_curve, middle_of_sensors

HOUR_S = 3600.0
GAP_S = 3 * HOUR_S


def hours(*values: float) -> np.ndarray:
    return HOUR_S * np.array(values, dtype=float)


def test_the_middle_of_three_ignores_a_liar() -> None:
    """However far one sensor of three is off, the curve stays between the other two."""
    at_s = hours(*range(24))
    good = [20.0 + np.sin(at_s / 7e3), 20.4 + np.sin(at_s / 7e3)]
    for lie_c in (-300.0, 19.0, 900.0):
        _, celsius = middle_of_sensors([(at_s, g) for g in good] + [(at_s, np.full(24, lie_c))], GAP_S)
        assert (celsius >= good[0]).all()
        assert (celsius <= good[1]).all()


def test_a_sensor_in_a_gap_says_nothing() -> None:
    """While one sensor is silent for longer than the gap, the other alone is the curve."""
    whole = (hours(*range(12)), np.full(12, 10.0))
    gappy = (hours(0, 1, 10, 11), np.full(4, 30.0))
    at_s, celsius = middle_of_sensors([whole, gappy], GAP_S)
    assert celsius[(at_s > HOUR_S) & (at_s < 10 * HOUR_S)] == pytest.approx(10.0)
    assert celsius[at_s <= HOUR_S] == pytest.approx(20.0)


def test_no_sensor_no_curve() -> None:
    """Without readings there is nothing to go by."""
    at_s, celsius = middle_of_sensors([], GAP_S)
    assert len(at_s) == len(celsius) == 0


def test_joins_the_outlook_by_a_straight_line() -> None:
    """From the last reading to the first outlook row after it; rows before that reading do not count."""
    curve = air_curve(
        hours(0, 1), np.array([10.0, 10.0]), hours(0.5, 3, 4), np.array([99.0, 20.0, 20.0]),
        from_s=0.0, until_s=4 * HOUR_S, gap_s=GAP_S,
    )  # fmt: skip
    assert np.interp(2 * HOUR_S, curve.at_s, curve.celsius) == pytest.approx(15.0)
    assert curve.celsius.max() == 20.0


def test_marks_what_does_not_rest_on_readings() -> None:
    """The time before the first reading, long gaps and the outlook are estimated; short gaps are not."""
    curve = air_curve(
        hours(5, 6, 8, 20), np.full(4, 15.0), hours(21, 30), np.full(2, 15.0),
        from_s=0.0, until_s=30 * HOUR_S, gap_s=GAP_S,
    )  # fmt: skip
    for hour, estimated in ((2, True), (5.5, False), (7, False), (14, True), (20.5, False), (25, True)):
        piece = np.searchsorted(curve.at_s, hour * HOUR_S, side="right") - 1
        assert curve.estimated[piece] == estimated, hour


@given(
    st.lists(st.floats(0.05, 9.0), min_size=1, max_size=12),
    st.floats(0.0, 3.0),
    st.floats(0.5, 20.0),
    st.randoms(use_true_random=False),
)
def test_covers_the_span_in_short_pieces_on_the_same_lines(
    steps_h: list[float], before_h: float, after_h: float, random: object
) -> None:
    """Pieces are at most an hour, times rise, and every reading inside the span lies on the curve."""
    read_s = HOUR_S * np.cumsum([before_h, *steps_h])
    read_c = np.array([random.uniform(-10, 40) for _ in read_s])  # type: ignore[attr-defined]
    until_s = read_s[-1] + after_h * HOUR_S
    curve = air_curve(read_s, read_c, np.empty(0), np.empty(0), from_s=0.0, until_s=until_s, gap_s=GAP_S)
    steps_s = np.diff(curve.at_s)
    assert curve.at_s[0] == 0.0
    assert curve.at_s[-1] == until_s
    assert (steps_s > 0).all()
    assert steps_s.max() <= LONGEST_PIECE_S * (1 + 1e-9)
    assert np.interp(read_s, curve.at_s, curve.celsius) == pytest.approx(read_c, abs=1e-6)
