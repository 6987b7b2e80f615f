"""The air of one location: the middle of its sensors, and straight lines over what is missing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.climate.screening import Floats

LONGEST_PIECE_S = 3600.0
"""Longer pieces are cut, on the same line, so that a coil's temperature is resolved along them."""


@dataclass(frozen=True, slots=True)
class AirCurve:
    """Air over time: straight lines between knots."""

    at_s: Floats
    celsius: Floats
    estimated: NDArray[np.bool_]
    """The piece that begins at this knot does not rest on readings."""


def middle_of_sensors(sensors: Sequence[tuple[Floats, Floats]], gap_s: float) -> tuple[Floats, Floats]:
    """Times and temperatures (°C) of a location from its sensors' believed readings.

    Parameters
    ----------
    sensors
        Per sensor: times (s, strictly rising) and °C.
    gap_s
        A sensor silent for longer than this says nothing in between.

    Returns
    -------
    The median of the sensors at every time at which any of them was read.
    """
    sensors = [(at_s, celsius) for at_s, celsius in sensors if len(at_s)]
    if not sensors:
        return np.empty(0), np.empty(0)
    if len(sensors) == 1:
        return sensors[0]
    at_s = np.unique(np.concatenate([times for times, _ in sensors]))
    said_c = np.stack([_between_readings(at_s, times, celsius, gap_s) for times, celsius in sensors])
    return at_s, np.nanmedian(said_c, axis=0)


def _between_readings(at_s: Floats, times_s: Floats, celsius: Floats, gap_s: float) -> Floats:
    """One sensor at other times, by straight line; NaN inside gaps and outside its readings."""
    said_c = np.interp(at_s, times_s, celsius, left=np.nan, right=np.nan)
    after = np.clip(np.searchsorted(times_s, at_s, side="left"), 1, max(len(times_s) - 1, 1))
    if len(times_s) == 1:
        return np.where(at_s == times_s[0], celsius[0], np.nan)
    in_gap = (
        (times_s[after] - times_s[after - 1] > gap_s)
        & (at_s != times_s[after])
        & (at_s != times_s[after - 1])
    )
    said_c[in_gap] = np.nan
    return said_c


def air_curve(
    read_s: Floats,
    read_c: Floats,
    outlook_s: Floats,
    outlook_c: Floats,
    *,
    from_s: float,
    until_s: float,
    gap_s: float,
) -> AirCurve:
    """One curve from `from_s` to `until_s`: readings, then the outlook from the last reading on.

    Pieces longer than `gap_s`, the time before the first reading and all that the outlook says are estimated;
    the line from the last reading to the first outlook row is, when it is longer than `gap_s`.

    Parameters
    ----------
    read_s, read_c
        Strictly rising times (at least one) and °C.
    outlook_s, outlook_c
        Strictly rising times; rows not later than the last reading are ignored.
    """
    later = outlook_s > read_s[-1]
    outlook_s, outlook_c = outlook_s[later], outlook_c[later]
    at_s = np.concatenate([read_s, outlook_s])
    celsius = np.concatenate([read_c, outlook_c])
    estimated = np.append(np.diff(at_s) > gap_s, True)
    estimated[len(read_s) :] = True
    if at_s[0] > from_s:
        at_s = np.insert(at_s, 0, from_s)
        celsius = np.insert(celsius, 0, celsius[0])
        estimated = np.insert(estimated, 0, True)
    if at_s[-1] < until_s:
        at_s = np.append(at_s, until_s)
        celsius = np.append(celsius, celsius[-1])
        estimated = np.append(estimated, True)
    return _cut(_within(AirCurve(at_s, celsius, estimated), from_s, until_s))


def _within(curve: AirCurve, from_s: float, until_s: float) -> AirCurve:
    """The curve between two times that it covers."""
    first = int(np.searchsorted(curve.at_s, from_s, side="right")) - 1
    last = int(np.searchsorted(curve.at_s, until_s, side="left"))
    at_s = curve.at_s[first : last + 1].copy()
    ends_c = np.interp([from_s, until_s], curve.at_s, curve.celsius)
    celsius = curve.celsius[first : last + 1].copy()
    at_s[0], at_s[-1] = from_s, until_s
    celsius[0], celsius[-1] = ends_c
    return AirCurve(at_s, celsius, curve.estimated[first : last + 1].copy())


def _cut(curve: AirCurve) -> AirCurve:
    """The same lines in pieces of at most LONGEST_PIECE_S."""
    parts = np.maximum(np.ceil(np.diff(curve.at_s) / LONGEST_PIECE_S - 1e-9), 1).astype(np.intp)
    if (parts == 1).all():
        return curve
    piece = np.repeat(np.arange(len(parts)), parts)
    part = np.arange(len(piece)) - np.repeat(np.cumsum(parts) - parts, parts)
    share = part / parts[piece]
    at_s = curve.at_s[piece] + share * np.diff(curve.at_s)[piece]
    celsius = curve.celsius[piece] + share * np.diff(curve.celsius)[piece]
    return AirCurve(
        np.append(at_s, curve.at_s[-1]),
        np.append(celsius, curve.celsius[-1]),
        np.append(curve.estimated[piece], curve.estimated[-1]),
    )
