"""The trace of one coil: how its plateau came and will come, and the temperatures behind it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from agewatch.aging.assess import now, return_quantiles_s
from agewatch.aging.course import course
from agewatch.aging.kinetics import DAY_S, ZERO_C_K
from agewatch.plant.air import plant_air
from agewatch.plant.assess import first_leg_s, prepare
from agewatch.plant.inventory import Floats, Inventory, OutlookRows, Readings
from agewatch.plant.settings import Settings
from agewatch.plant.verdicts import unassessable

_POINTS = 241
_LEAST_AHEAD_S = 14 * DAY_S


@dataclass(frozen=True, slots=True)
class CoilTrace:
    """One coil over time; arrays (n,), from temper rolling to past its return or pressing."""

    coil_id: str
    at_s: Floats
    air_c: Floats
    coil_c: Floats
    ype_p10_pct: Floats
    ype_p50_pct: Floats
    ype_p90_pct: Floats
    """Exceeded with a probability of one in ten: where it meets the limit is the P10 return."""
    limit_pct: float
    """NaN: the part bears any plateau."""
    now_s: float
    press_s: float
    """NaN: none is planned."""


def trace_coil(
    inventory: Inventory, readings: Readings, outlook: OutlookRows, settings: Settings, at_s: float
) -> CoilTrace | None:
    """Trace the only coil of `inventory`; None when it cannot be assessed.

    Readings and outlook rows of locations where it never stood may be left out.
    """
    air = plant_air(readings, outlook, settings, from_s=first_leg_s(inventory, at_s), at_s=at_s)
    if air is None or unassessable(inventory, settings, air.covered, at_s).codes[0] >= 0:
        return None
    stock = prepare(inventory, air, settings, at_s).stock
    state = now(stock)
    returns_s = return_quantiles_s(stock, state)[:, 0]
    ahead_s = np.nanmax([*returns_s, inventory.press_s[0], at_s + _LEAST_AHEAD_S])
    begin_s = float(inventory.temper_rolled_s[0])
    end_s = min(float(ahead_s) + 0.1 * (float(ahead_s) - begin_s), stock.horizon_s)
    times_s = np.unique(np.append(np.linspace(begin_s, end_s, _POINTS), at_s))
    followed = course(stock, state, 0, times_s)
    return CoilTrace(
        str(inventory.coil_id[0]),
        times_s,
        followed.air_k - ZERO_C_K,
        followed.coil_k - ZERO_C_K,
        followed.ype_pct[0],
        followed.ype_pct[1],
        followed.ype_pct[2],
        float(stock.limit_pct[0]),
        at_s,
        float(inventory.press_s[0]),
    )
