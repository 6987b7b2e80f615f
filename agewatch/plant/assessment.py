"""An assessment: one evaluation of every stored coil at one time, as columns."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from agewatch.plant.inventory import Coded, Floats


class Verdict(IntEnum):
    """What the assessment says to do with a coil; the order is that of urgency."""

    CLEAR = 0
    WATCH = 1
    PULL = 2
    HOLD = 3
    UNASSESSED = 4

    @property
    def word(self) -> str:
        return self.name.lower()


@dataclass(frozen=True, slots=True)
class Assessment:
    """All columns have one row per stored coil, ordered by `coil_id`. NaN: none, or not known."""

    at_s: float
    model: str
    settings_digest: str
    coil_id: NDArray[np.object_]
    grade: Coded
    part: Coded
    location: Coded
    age_days: Floats
    equivalent_age_days: Floats
    """Days at 20 °C, of the grade's main channel."""
    coil_temp_c: Floats
    yield_rise_mpa: Floats
    ype_pct: Floats
    ype_limit_pct: Floats
    """NaN: the part bears any plateau."""
    return_p10_s: Floats
    """Seconds since 1970; NaN: no return inside the horizon."""
    return_p50_s: Floats
    return_p90_s: Floats
    press_s: Floats
    return_risk: Floats
    """Probability of a return before the planned pressing; NaN: none is planned."""
    slack_h: Floats
    """From the planned pressing to the P10 return; negative is late; NaN: either is missing."""
    verdict: NDArray[np.int8]
    reason: Coded
    """One sentence for the verdict."""
    estimated_fraction: Floats
    assumed: Coded
    """The values that the certificate lacks, for which the grade or the default coil stands in; code -1: none."""
    starting_point: NDArray[np.bool_]
    """The grade's numbers are not fitted to this plant's own tests."""

    def __len__(self) -> int:
        return len(self.coil_id)
