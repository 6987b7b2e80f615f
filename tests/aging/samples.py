"""Invented air and journeys for the tests of the model, all from a seed."""

from __future__ import annotations

import numpy as np

from agewatch.aging.curves import AirCurves
from agewatch.aging.journey import Legs
from agewatch.aging.kinetics import DAY_S, HOUR_S, Floats

BEGIN_S = 1_770_000_000.0
CARBON_J_MOL = 84.1e3
NITROGEN_J_MOL = 76.1e3


def curves_of(*tables: tuple[Floats, Floats]) -> AirCurves:
    """Curves from times (s) and °C per location; shorter ones go on with their last temperature."""
    most = max(len(times) for times, _ in tables)
    knot_s, air_k = np.empty((len(tables), most)), np.empty((len(tables), most))
    for row, (times, celsius) in enumerate(tables):
        own = len(times)
        knot_s[row, :own], air_k[row, :own] = times, celsius + 273.15
        knot_s[row, own:] = times[-1] + np.arange(1, most - own + 1)
        air_k[row, own:] = celsius[-1] + 273.15
    return AirCurves(knot_s, air_k, np.zeros(knot_s.shape, dtype=np.bool_))


def weather(rng: np.random.Generator, days: float, *, irregular: bool) -> tuple[Floats, Floats]:
    """A season's level, its days and nights, and rough weather on them; knots an hour apart, or at random below."""
    count = int(days * 24) + 1
    at_s = BEGIN_S + HOUR_S * np.arange(count, dtype=np.float64)
    if irregular:
        inner = BEGIN_S + days * DAY_S * rng.random(int(1.2 * count))
        at_s = np.unique(np.concatenate([at_s, inner]))
    hours = (at_s - BEGIN_S) / HOUR_S
    daily_c = rng.uniform(1, 8) * np.sin(2 * np.pi * (hours / 24 + rng.random()))
    rough_c = np.cumsum(rng.normal(0, 0.4, len(at_s)) * np.sqrt(np.diff(hours, prepend=-1.0)))
    return at_s, rng.uniform(0, 28) + daily_c + np.clip(rough_c, -12, 12)


def journeys(
    rng: np.random.Generator, coils: int, locations: int, days: float, *, most_legs: int = 6
) -> tuple[Legs, Floats]:
    """Legs of coils, and the temperatures (K) at which the coils left the line: warm, hot, cold or as the air.

    Some coils start with the curve, some leave where they have just come, some come back to where they were.
    """
    count = rng.integers(1, most_legs + 1, coils)
    coil = np.repeat(np.arange(coils), count)
    from_s = np.where(rng.random(coils) < 0.2, 0.0, rng.random(coils) * 0.6 * days * DAY_S)
    into_s = rng.random(len(coil)) * (0.9 * days * DAY_S - from_s[coil])
    again = rng.random(len(coil)) < 0.1
    into_s[1:][again[1:]] = into_s[:-1][again[1:]]  # a leg of no length, wherever both are of one coil
    first = np.searchsorted(coil, np.arange(coils))
    into_s[first] = 0.0
    order = np.lexsort((into_s, coil))
    start_s = BEGIN_S + from_s[coil] + into_s[order]
    tau_h = np.exp(rng.uniform(np.log(5.0), np.log(60.0), coils))
    own_lag = rng.uniform(0.7, 1.4, locations)
    location = rng.integers(0, locations, len(coil))
    tau_s = tau_h[coil] * own_lag[location] * HOUR_S
    arrival_c = np.select(
        [kind == rng.integers(0, 4, coils) for kind in range(3)],
        [rng.uniform(40, 80, coils), rng.uniform(25, 45, coils), rng.uniform(-15, 5, coils)],
        default=np.nan,
    )
    return Legs(coil, location, start_s, tau_s), arrival_c + 273.15
