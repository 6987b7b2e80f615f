"""Which readings are not believed."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from agewatch.climate.screening import Mark, believed, screen


def marks(at_s: list[float], celsius: list[float]) -> list[int]:
    return screen(np.array(at_s), np.array(celsius), lowest_c=-40.0, highest_c=65.0).tolist()


def test_marks_what_no_store_s_air_can_be() -> None:
    """Below or above the range, or no number at all; the limits themselves are believed."""
    found = marks([0, 1, 2, 3, 4, 5], [-40.1, -40.0, 20.0, 65.0, 850.0, np.nan])
    assert found == [Mark.RANGE, 0, 0, 0, Mark.RANGE, Mark.RANGE]


def test_marks_a_second_reading_of_one_moment() -> None:
    """The first stands."""
    assert marks([0, 1, 1, 2], [20.0, 21.0, 22.0, 23.0]) == [0, 0, Mark.DUPLICATE, 0]


def test_marks_a_reading_that_came_late_and_believes_it() -> None:
    """Sorting mends the order."""
    found = screen(np.array([0.0, 2.0, 1.0]), np.full(3, 20.0), lowest_c=-40.0, highest_c=65.0)
    assert found.tolist() == [0, 0, Mark.ORDER]
    assert believed(found).all()


@given(st.lists(st.tuples(st.integers(0, 50), st.floats(allow_nan=True, allow_infinity=True)), max_size=30))
def test_what_is_believed_is_in_range_and_once(rows: list[tuple[int, float]]) -> None:
    """Whatever comes, believed readings are finite, inside the range, and one a moment among all readings of it."""
    at_s = np.array([float(row[0]) for row in rows])
    celsius = np.array([row[1] for row in rows])
    keep = believed(screen(at_s, celsius, lowest_c=-40.0, highest_c=65.0))
    assert ((celsius[keep] >= -40.0) & (celsius[keep] <= 65.0)).all()
    assert len(np.unique(at_s[keep])) == keep.sum()
