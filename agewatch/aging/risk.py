"""Risk: how sure a return is, when the steel and the weather are known only within spreads.

A coil has returned at t when ``ln g(t) + noise ≥ Λ``. The noise gathers what is uncertain about g (the channels'
ln τ, the activation energies, the outlook) and is normal; the threshold ``Λ = ln(−ln(1 − F))`` gathers what is
uncertain about the locking that the limit needs, ``F = D/Δσ_sat``: the needed rise D is normal (masking and
certificate), Δσ_sat is lognormal. ln F has closed quantiles to third order (Cornish–Fisher), through which Λ follows
exactly; the last integral is a Gauss–Hermite sum over whichever of the two, noise or threshold, is narrower.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from agewatch.aging.kinetics import Floats

_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(9)
_WEIGHTS = _WEIGHTS / _WEIGHTS.sum()
_SHARP = 1e-9
"""A standard deviation below this is none."""
_REACH = 6.0
"""Standard deviations that a search spans on either side."""
_MOST_LOG_LOCKING = 5.0
"""ln g beyond which nothing is left to lock."""
_BISECTIONS = 40
_MEAN_STEPS = 64
_NOISE_STEPS = 6


@dataclass(frozen=True, slots=True)
class Needed:
    """The rise that a limit needs and the rise that saturation gives, with their spreads, (n,)."""

    mean_mpa: Floats
    """NaN: the part bears any plateau."""
    spread_mpa: Floats
    saturation_mpa: Floats
    log_saturation_spread: Floats

    def threshold(self) -> Threshold:
        return Threshold.of(self.mean_mpa, self.spread_mpa, self.saturation_mpa, self.log_saturation_spread)


@dataclass(frozen=True, slots=True)
class Threshold:
    """What a coil needs to return, in ln F; arrays of one shape."""

    mean: Floats
    """Of ln F; NaN: the part bears any plateau; inf is never reached."""
    spread: Floats
    """Standard deviation of ln F."""
    skewness: Floats

    @classmethod
    def of(
        cls, needed_mpa: Floats, needed_spread_mpa: Floats, saturation_mpa: Floats, saturation_spread: Floats
    ) -> Threshold:
        """From the needed rise (MPa, normal) and the saturation (median MPa, spread of its ln).

        Notes
        -----
        ``E ln D = ln D − c²/2 − 3c⁴/4``, ``var ln D = c² + 5c⁴/2``, third central moment ``−3c⁴``, c being the
        coefficient of variation: the series of ln(1 + c z) to fourth order.
        """
        c2 = (needed_spread_mpa / needed_mpa) ** 2
        variance = c2 + 2.5 * c2**2 + saturation_spread**2
        with np.errstate(divide="ignore", invalid="ignore"):
            skewness = np.where(variance > 0, -3.0 * c2**2 / variance**1.5, 0.0)
        mean = np.log(needed_mpa / saturation_mpa) - 0.5 * c2 - 0.75 * c2**2
        return cls(mean, np.sqrt(variance), skewness)

    def log_locking(self, z: Floats | float) -> Floats:
        """Λ at the standard normal quantile z; inf where the rise saturates below what is needed."""
        log_fraction = self.mean + self.spread * (z + self.skewness * (np.square(z) - 1.0) / 6.0)
        with np.errstate(divide="ignore"):
            locking = -np.log1p(-np.exp(np.minimum(log_fraction, 0.0)))
        return np.asarray(np.log(locking))

    def quantile_of(self, log_locking: Floats) -> Floats:
        """z at which Λ equals `log_locking`: the inverse of `log_locking` (to third order)."""
        log_fraction = np.log(-np.expm1(-np.exp(np.minimum(log_locking, 700.0))))
        with np.errstate(divide="ignore", invalid="ignore"):
            r = (log_fraction - self.mean) / self.spread
        return np.asarray(r - self.skewness * (np.square(r) - 1.0) / 6.0)

    def width(self) -> Floats:
        """Standard deviation of Λ to first order."""
        fraction = np.exp(np.minimum(self.mean, -1e-6))
        return np.asarray(self.spread * fraction / ((1.0 - fraction) * -np.log1p(-fraction)))

    def take(self, rows: object) -> Threshold:
        return Threshold(self.mean[rows], self.spread[rows], self.skewness[rows])  # type: ignore[index]


def return_probability(threshold: Threshold, log_locking: Floats, noise: Floats) -> Floats:
    """P(returned) of coils whose median ln g is `log_locking` (−inf: unaged), with `noise` (sd of ln g), (n,)."""
    over_threshold = noise >= threshold.width()
    probability = np.empty(np.shape(log_locking))
    rows = np.flatnonzero(over_threshold)
    probability[rows] = _over_threshold(threshold.take(rows), log_locking[rows], noise[rows])
    rows = np.flatnonzero(~over_threshold)
    probability[rows] = _over_noise(threshold.take(rows), log_locking[rows], noise[rows])
    return probability


def _over_threshold(threshold: Threshold, log_locking: Floats, noise: Floats) -> Floats:
    """Sum over quantiles of the threshold, the noise being integrated exactly."""
    total = np.zeros(len(log_locking))
    sharp = noise <= _SHARP
    for node, weight in zip(_NODES, _WEIGHTS, strict=True):
        with np.errstate(divide="ignore", invalid="ignore"):
            beyond = log_locking - threshold.log_locking(node)
            share = np.where(sharp, beyond >= 0, ndtr(beyond / noise))
        total += weight * np.nan_to_num(share, nan=0.0)
    return np.where(np.isnan(threshold.mean), 0.0, total)


def _over_noise(threshold: Threshold, log_locking: Floats, noise: Floats) -> Floats:
    """Sum over quantiles of the noise, the threshold being integrated exactly."""
    total = np.zeros(len(log_locking))
    for node, weight in zip(_NODES, _WEIGHTS, strict=True):
        with np.errstate(divide="ignore", invalid="ignore"):
            z = threshold.quantile_of(log_locking + node * noise)
        total += weight * ndtr(z)
    return np.where(np.isnan(threshold.mean), 0.0, total)


def log_locking_levels(needed: Needed, noise: Floats, probability: float) -> Floats:
    """Median ln g at which P(returned) reaches `probability`, (n,); inf: it never does.

    Coils that share their spreads are read off one table over needed rise and noise; without any spread the level
    is Λ itself.
    """
    plain = needed.threshold().log_locking(0.0)
    level = np.where(np.isnan(plain), np.inf, plain)
    uncertain = ~np.isnan(plain) & ((noise > _SHARP) | (needed.spread_mpa > 0) | (needed.log_saturation_spread > 0))
    rows = np.flatnonzero(uncertain)
    kinds = np.stack([needed.spread_mpa, needed.saturation_mpa, needed.log_saturation_spread], axis=1)[rows]
    kind, members = np.unique(kinds, axis=0, return_inverse=True)
    for place, (spread_mpa, saturation_mpa, saturation_spread) in enumerate(kind):
        own = rows[members.ravel() == place]
        grid_mpa, grid_noise = _grid(needed.mean_mpa[own], _MEAN_STEPS), _grid(noise[own], _NOISE_STEPS)
        mean_mpa, around = (axis.ravel() for axis in np.meshgrid(grid_mpa, grid_noise, indexing="ij"))
        threshold = Threshold.of(mean_mpa, spread_mpa, saturation_mpa, saturation_spread)
        table = _solved_levels(threshold, around, probability).reshape(len(grid_mpa), len(grid_noise))
        level[own] = _read_off(table, grid_mpa, grid_noise, needed.mean_mpa[own], noise[own])
    return level


def _grid(values: Floats, most: int) -> Floats:
    """At most `most` even steps that span the values; the values themselves where they are few."""
    distinct = np.unique(values)
    return distinct if len(distinct) <= most else np.linspace(distinct[0], distinct[-1], most)


def _read_off(table: Floats, rows_at: Floats, columns_at: Floats, row: Floats, column: Floats) -> Floats:
    """Bilinear in the table; inf where a corner that counts is inf, (n,)."""
    i, u = _between(rows_at, row)
    j, v = _between(columns_at, column)
    total = np.zeros(len(row))
    for across, weight_i in ((0, 1.0 - u), (1, u)):
        for along, weight_j in ((0, 1.0 - v), (1, v)):
            weight = weight_i * weight_j
            corner = table[np.minimum(i + across, len(rows_at) - 1), np.minimum(j + along, len(columns_at) - 1)]
            total += np.where(weight > 0, weight * np.where(weight > 0, corner, 0.0), 0.0)
    return total


def _between(grid: Floats, values: Floats) -> tuple[NDArray[np.intp], Floats]:
    place = np.interp(values, grid, np.arange(len(grid)))
    low = np.floor(place).astype(np.intp)
    return low, place - low


def _solved_levels(threshold: Threshold, noise: Floats, probability: float) -> Floats:
    """ln g at which P(returned) reaches `probability` by bisection, (n,)."""
    z = float(ndtri(probability))
    low = np.minimum(threshold.log_locking(-_REACH), threshold.log_locking(0.0)) - _REACH * noise - 1e-9
    high = np.full_like(low, _MOST_LOG_LOCKING) + _REACH * noise
    never = return_probability(threshold, high, noise) < probability
    for _ in range(_BISECTIONS):
        middle = 0.5 * (low + high)
        reached = return_probability(threshold, middle, noise) >= probability
        low, high = np.where(reached, low, middle), np.where(reached, middle, high)
    level = np.where(noise <= _SHARP, threshold.log_locking(z), high)
    return np.where(never, np.inf, level)
