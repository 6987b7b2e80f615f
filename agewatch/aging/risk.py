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
_BISECTIONS = 9
_FALSE_POSITIONS = 4
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
    kind: NDArray[np.intp]
    """Coils of one kind share all but their mean."""

    def take(self, rows: NDArray[np.intp]) -> Needed:
        return Needed(
            self.mean_mpa[rows],
            self.spread_mpa[rows],
            self.saturation_mpa[rows],
            self.log_saturation_spread[rows],
            self.kind[rows],
        )

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
        cls,
        needed_mpa: Floats,
        needed_spread_mpa: Floats | float,
        saturation_mpa: Floats | float,
        saturation_spread: Floats | float,
    ) -> Threshold:
        """From the needed rise (MPa, normal) and the saturation (median MPa, spread of its ln).

        Notes
        -----
        ``E ln D = ln D − c²/2 − 3c⁴/4``, ``var ln D = c² + 5c⁴/2``, third central moment ``−3c⁴``, c being the
        coefficient of variation: the series of ln(1 + c z) to fourth order.
        """
        c2 = (needed_spread_mpa / needed_mpa) ** 2
        variance = c2 + 2.5 * c2**2 + saturation_spread**2
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
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
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            r = (log_fraction - self.mean) / self.spread
        return np.asarray(r - self.skewness * (np.square(r) - 1.0) / 6.0)

    def width(self) -> Floats:
        """Standard deviation of Λ to first order."""
        fraction = np.exp(np.minimum(self.mean, -1e-6))
        return np.asarray(self.spread * fraction / ((1.0 - fraction) * -np.log1p(-fraction)))

    def take(self, rows: NDArray[np.intp]) -> Threshold:
        return Threshold(self.mean[rows], self.spread[rows], self.skewness[rows])


def return_probability(threshold: Threshold, log_locking: Floats, noise: Floats) -> Floats:
    """P(returned) of coils whose median ln g is `log_locking` (−inf: unaged), with `noise` (sd of ln g), (n,)."""
    return _Mixture.of(threshold, noise).probability(log_locking)


@dataclass(frozen=True, slots=True)
class _Mixture:
    """The sum that gives P(returned), prepared for many values of ln g."""

    threshold: Threshold
    noise: Floats
    over_threshold: NDArray[np.intp]
    """Coils whose noise is the wider: nodes are quantiles of the threshold."""
    over_noise: NDArray[np.intp]
    node_levels: Floats
    """Λ at the nodes, for `over_threshold`, (9, n)."""

    @classmethod
    def of(cls, threshold: Threshold, noise: Floats) -> _Mixture:
        wider = noise >= threshold.width()
        over_threshold = np.flatnonzero(wider)
        chosen = threshold.take(over_threshold)
        return cls(
            threshold,
            noise,
            over_threshold,
            np.flatnonzero(~wider & ~np.isnan(threshold.mean)),
            chosen.log_locking(_NODES[:, None]),
        )

    def probability(self, log_locking: Floats) -> Floats:
        total = np.zeros(len(log_locking))
        rows = self.over_threshold
        noise = self.noise[rows]
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            beyond = log_locking[rows] - self.node_levels
            share = np.where(noise > _SHARP, ndtr(beyond / noise), beyond >= 0)
        total[rows] = _WEIGHTS @ np.nan_to_num(share, nan=0.0)
        rows = self.over_noise
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            z = self.threshold.take(rows).quantile_of(log_locking[rows] + _NODES[:, None] * self.noise[rows])
        total[rows] = _WEIGHTS @ ndtr(z)
        return np.clip(total, 0.0, 1.0)


def log_locking_levels(needed: Needed, noise: Floats, probability: float) -> Floats:
    """Median ln g at which P(returned) reaches `probability`, (n,); inf: it never does.

    Coils that share their spreads are read off one table over needed rise and noise; without any spread the level
    is Λ itself, whatever the probability.
    """
    level = np.full(len(noise), np.inf)
    limited = ~np.isnan(needed.mean_mpa)
    uncertain = (noise > _SHARP) | (needed.spread_mpa > 0) | (needed.log_saturation_spread > 0)
    sharp = np.flatnonzero(limited & ~uncertain)
    level[sharp] = needed.take(sharp).threshold().log_locking(0.0)
    rows = np.flatnonzero(limited & uncertain)
    for kind in np.unique(needed.kind[rows]):
        own = rows[needed.kind[rows] == kind]
        level[own] = _levels_of_kind(needed.take(own), noise[own], probability)
    return level


def _levels_of_kind(needed: Needed, noise: Floats, probability: float) -> Floats:
    if len(noise) <= _MEAN_STEPS:
        return _solved_levels(needed.threshold(), noise, probability)
    grid_mpa, grid_noise = _grid(needed.mean_mpa, _MEAN_STEPS), _grid(noise, _NOISE_STEPS)
    mean_mpa, around = (axis.ravel() for axis in np.meshgrid(grid_mpa, grid_noise, indexing="ij"))
    threshold = Threshold.of(
        mean_mpa, needed.spread_mpa[0], needed.saturation_mpa[0], needed.log_saturation_spread[0]
    )
    table = _solved_levels(threshold, around, probability).reshape(len(grid_mpa), len(grid_noise))
    return _read_off(table, grid_mpa, grid_noise, needed.mean_mpa, noise)


def _grid(values: Floats, most: int) -> Floats:
    """`most` even steps that span the values; one where they are all alike."""
    low, high = float(values.min()), float(values.max())
    return np.array([low]) if low == high else np.linspace(low, high, most)


def _read_off(table: Floats, rows_at: Floats, columns_at: Floats, row: Floats, column: Floats) -> Floats:
    """Bilinear in the table; inf where a corner that counts is inf, (n,)."""
    i, u = _between(rows_at, row)
    j, v = _between(columns_at, column)
    total = np.zeros(len(row))
    for across, weight_i in ((0, 1.0 - u), (1, u)):
        for along, weight_j in ((0, 1.0 - v), (1, v)):
            weight = weight_i * weight_j
            corner = table[
                np.minimum(i + across, len(rows_at) - 1), np.minimum(j + along, len(columns_at) - 1)
            ]
            total += np.where(weight > 0, weight * np.where(weight > 0, corner, 0.0), 0.0)
    return total


def _between(grid: Floats, values: Floats) -> tuple[NDArray[np.intp], Floats]:
    place = np.interp(values, grid, np.arange(len(grid)))
    low = np.floor(place).astype(np.intp)
    return low, place - low


def _solved_levels(threshold: Threshold, noise: Floats, probability: float) -> Floats:
    """ln g at which P(returned) reaches `probability`, (n,): bisection, then false position on the probit."""
    z = float(ndtri(probability))
    mixture = _Mixture.of(threshold, noise)
    low = np.minimum(threshold.log_locking(-_REACH), _MOST_LOG_LOCKING) - _REACH * noise - 1e-9
    high = np.minimum(threshold.log_locking(_REACH), _MOST_LOG_LOCKING) + _REACH * noise + 1e-9
    never = mixture.probability(high) < probability
    under, over = np.full_like(low, -_REACH) - z, np.full_like(low, _REACH) - z
    for step in range(_BISECTIONS + _FALSE_POSITIONS):
        share = 0.5 if step < _BISECTIONS else np.clip(under / (under - over), 0.02, 0.98)
        at = low + share * (high - low)
        miss = np.clip(ndtri(mixture.probability(at)), -_REACH, _REACH) - z
        reached = miss >= 0
        low, under = np.where(reached, low, at), np.where(reached, under, miss)
        high, over = np.where(reached, at, high), np.where(reached, miss, over)
    nearest = low + np.clip(under / (under - over), 0.0, 1.0) * (high - low)
    level = np.where(noise <= _SHARP, threshold.log_locking(z), nearest)
    return np.where(never, np.inf, level)
