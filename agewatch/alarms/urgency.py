"""How urgent a coil is: the time left to act against the lead time that logistics needs."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ranks = NDArray[np.int8]

HIGH_LEAD_TIMES = 1.0
"""Less than one lead time is left: an ordinary transport comes too late, somebody has to act out of turn."""
MEDIUM_LEAD_TIMES = 3.0
"""Less than three: it has to be in the next orders to the crane, and one of them may still go wrong."""
EASING = 1.25
"""A priority falls only with a quarter more time left than its limit: an estimate that wavers stays quiet."""


def ranks(left_s: Floats, lead_time_s: Floats, standing: Ranks) -> Ranks:
    """Ranks of priority (0 high, 1 medium, 2 low), shape (n_coils,).

    left_s: time left to act [s]; negative is late, NaN is no date to meet. lead_time_s: what logistics
    needs [s], not negative. standing: rank now standing, 2 where none does; it rises at once and falls
    with `EASING`.
    """
    now = _ranks(left_s, lead_time_s)
    return np.clip(standing, _ranks(left_s / EASING, lead_time_s), now).astype(np.int8)


def _ranks(left_s: Floats, lead_time_s: Floats) -> Ranks:
    return np.where(
        left_s < HIGH_LEAD_TIMES * lead_time_s, 0, np.where(left_s < MEDIUM_LEAD_TIMES * lead_time_s, 1, 2)
    ).astype(np.int8)
