"""The air of every location of the plant: from readings and outlook rows to the curves that coils age in."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.assess import Ahead
from agewatch.aging.curves import AirCurves
from agewatch.aging.kinetics import DAY_S, ZERO_C_K
from agewatch.climate.location_curve import AirCurve, air_curve, middle_of_sensors
from agewatch.climate.outlook import expected_air
from agewatch.climate.screening import believed, screen
from agewatch.plant.inventory import Coded, Floats, OutlookRows, Readings
from agewatch.plant.settings import Settings


@dataclass(frozen=True, slots=True)
class PlantAir:
    """One curve per location of the settings, in their order, from the first leg to the horizon."""

    curves: AirCurves
    covered: NDArray[np.bool_]
    """The location has readings; one that has none is taken to be as warm as the warmest that has, (n_locations,)."""
    last_reading_s: Floats
    """NaN where there is none, (n_locations,)."""
    ahead: Ahead
    horizon_s: float


def plant_air(
    readings: Readings, outlook: OutlookRows, settings: Settings, *, from_s: float, at_s: float
) -> PlantAir | None:
    """The air as it is known at `at_s`: later readings, and outlook rows before the last reading, do not count.

    None when no location has any reading.
    """
    horizon_s = at_s + settings.outlook.horizon_days * DAY_S
    gap_s = settings.screening.gap.total_seconds()
    sensors = _believed_sensors(readings, settings, at_s)
    supplied = _by_name(outlook.location, outlook.at_s, outlook.celsius)
    curves: list[AirCurve | None] = []
    last_s = []
    for name, location in settings.location.items():
        read_s, read_c = middle_of_sensors(
            [sensors[one] for one in location.sensors if one in sensors], gap_s
        )
        last_s.append(read_s[-1] if len(read_s) else np.nan)
        if not len(read_s):
            curves.append(None)
            continue
        ahead_s, ahead_c = _ahead(read_s, read_c, supplied.get(name), settings, horizon_s)
        curves.append(
            air_curve(
                read_s, read_c, ahead_s, ahead_c, from_s=min(from_s, at_s), until_s=horizon_s, gap_s=gap_s
            )
        )
    known = [curve for curve in curves if curve is not None]
    if not known:
        return None
    warmest = max(known, key=lambda curve: float(np.mean(curve.celsius)))
    stand_in = AirCurve(warmest.at_s, warmest.celsius, np.ones(len(warmest.at_s), dtype=np.bool_))
    filled = [stand_in if curve is None else curve for curve in curves]
    certain = Ahead(np.array([0.0, horizon_s - at_s]), np.zeros((len(filled), 2)))
    return PlantAir(_padded(filled), ~np.isnan(last_s), np.array(last_s), certain, horizon_s)


def _believed_sensors(
    readings: Readings, settings: Settings, at_s: float
) -> dict[str, tuple[Floats, Floats]]:
    past = readings.at_s <= at_s
    sensors = _by_name(
        Coded(readings.sensor.codes[past], readings.sensor.labels),
        readings.at_s[past],
        readings.celsius[past],
    )
    screening = settings.screening
    good = {}
    for name, (times_s, celsius) in sensors.items():
        keep = believed(screen(times_s, celsius, lowest_c=screening.lowest_c, highest_c=screening.highest_c))
        good[name] = times_s[keep], celsius[keep]
    return good


def _by_name(names: Coded, at_s: Floats, celsius: Floats) -> dict[str, tuple[Floats, Floats]]:
    """Rows by name; they come ordered by (name, time)."""
    starts = np.flatnonzero(np.diff(names.codes, prepend=-2))
    return {
        names.labels[names.codes[begin]]: (at_s[begin:end], celsius[begin:end])
        for begin, end in pairwise([*starts, len(at_s)])
    }


def _ahead(
    read_s: Floats,
    read_c: Floats,
    supplied: tuple[Floats, Floats] | None,
    settings: Settings,
    horizon_s: float,
) -> tuple[Floats, Floats]:
    """The supplied outlook as far as it goes, then what the location's own past lets expect."""
    normals = settings.outlook.monthly_normals_c
    times_s, celsius = expected_air(read_s, read_c, None if normals is None else np.array(normals), horizon_s)
    if supplied is None:
        return times_s, celsius
    beyond = times_s > max(supplied[0][-1], read_s[-1])
    return np.append(supplied[0], times_s[beyond]), np.append(supplied[1], celsius[beyond])


def _padded(curves: list[AirCurve]) -> AirCurves:
    """One table of all curves; shorter ones go on with their last temperature, a second a knot."""
    n_knots = max(len(curve.at_s) for curve in curves)
    knot_s = np.empty((len(curves), n_knots))
    air_k = np.empty((len(curves), n_knots))
    estimated = np.zeros((len(curves), n_knots), dtype=np.bool_)
    for row, curve in enumerate(curves):
        own = len(curve.at_s)
        knot_s[row, :own], air_k[row, :own] = curve.at_s, curve.celsius + ZERO_C_K
        knot_s[row, own:] = curve.at_s[-1] + np.arange(1, n_knots - own + 1)
        air_k[row, own:] = curve.celsius[-1] + ZERO_C_K
        estimated[row, :own] = curve.estimated
    return AirCurves(knot_s, air_k, estimated)
