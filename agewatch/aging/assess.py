"""The whole stock at once: each coil's state now, and when its plateau returns, with what certainty."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.journey import Journey
from agewatch.aging.kinetics import Floats
from agewatch.aging.returning import approach, end_locking, return_s
from agewatch.aging.risk import Needed, log_locking_levels, return_probability
from agewatch.aging.settled import Rows
from agewatch.aging.steels import Spreads, Steels

PROBABILITIES = (0.1, 0.5, 0.9)
_PASSES = 2
"""Times that the noise, which depends on when a coil returns, is refined."""


@dataclass(frozen=True, slots=True)
class Ahead:
    """How surely the outlook is known: sd of the ln of what is gathered from now on, at some leads."""

    lead_s: Floats
    """Rising from 0, (n_leads,)."""
    spread: Floats
    """(n_locations, n_leads)."""

    def at(self, location: Rows, lead_s: Floats) -> Floats:
        """(n,); before now there is none."""
        place = np.interp(lead_s, self.lead_s, np.arange(len(self.lead_s)))
        low = np.minimum(place.astype(np.intp), len(self.lead_s) - 2)
        share = place - low
        begin, end = self.spread[location, low], self.spread[location, low + 1]
        return np.where(lead_s > 0, begin + share * (end - begin), 0.0)


@dataclass(frozen=True, slots=True)
class Stock:
    """Every coil on its journey, with what is known of its steel and of its weather."""

    journey: Journey
    raised: Journey | None
    """The same journey with every activation energy raised by its spread; None: none has one."""
    steels: Steels
    spreads: Spreads
    ahead: Ahead
    limit_pct: Floats
    """(n_coils,); NaN: the part bears any plateau."""
    at_s: float
    horizon_s: float


@dataclass(frozen=True, slots=True)
class Now:
    """State of every coil at the time of the assessment, (n_coils,) or (n_coils, n_channels)."""

    location: Rows
    coil_k: Floats
    exposure_s: Floats
    rise_mpa: Floats
    ype_pct: Floats
    estimated_fraction: Floats


def now(stock: Stock) -> Now:
    """Where every coil stands."""
    at_s = np.full(len(stock.limit_pct), stock.at_s)
    piece = stock.journey.piece_of(np.arange(len(at_s)), at_s)
    coil_k, exposure_s = stock.journey.at(piece, at_s)
    rise_mpa = stock.steels.rise_mpa(exposure_s)
    return Now(
        stock.journey.pieces.standing.location[piece],
        coil_k,
        exposure_s,
        rise_mpa,
        stock.steels.ype_pct(rise_mpa),
        stock.journey.estimated_fraction(at_s),
    )


def return_quantiles_s(stock: Stock, state: Now) -> Floats:
    """When each coil's plateau has returned with P10, P50 and P90, s, (3, n_coils); NaN: not by the horizon."""
    count = len(stock.limit_pct)
    everyone = np.arange(count)
    needed = _needed(stock)
    ends = end_locking(stock.journey, stock.steels)
    noise, shift = noise_of(stock, state, everyone, np.full(count, stock.at_s), state.exposure_s)
    varies = np.flatnonzero(_noise_varies(stock))
    some_needed = needed.take(varies)
    returns_s = np.empty((len(PROBABILITIES), count))
    sharp = not (noise.any() or stock.spreads.needed_mpa.any() or stock.spreads.log_saturation.any())
    for place, probability in enumerate(PROBABILITIES):
        if place and sharp and not len(varies):
            returns_s[place] = returns_s[0]
            continue
        level = log_locking_levels(needed, noise, probability) - shift
        for _ in range(_PASSES if len(varies) else 0):
            at_s, exposure_s = approach(stock.journey, stock.steels, ends, varies, np.exp(level[varies]))
            then, moved = noise_of(stock, state, varies, at_s, exposure_s)
            level[varies] = log_locking_levels(some_needed, then, probability) - moved
        returns_s[place] = return_s(stock.journey, stock.steels, ends, everyone, np.exp(level))
    return returns_s


def return_risk(stock: Stock, state: Now, until_s: Floats) -> Floats:
    """P(returned by `until_s`), (n_coils,); NaN times: NaN. Times past the horizon count as the horizon."""
    risk = np.full(len(until_s), np.nan)
    coil = np.flatnonzero(~np.isnan(until_s))
    if not len(coil):
        return risk
    at_s = np.minimum(until_s[coil], stock.horizon_s)
    exposure_s = _exposure_at(stock.journey, coil, at_s)
    noise, shift = noise_of(stock, state, coil, at_s, exposure_s)
    with np.errstate(divide="ignore"):
        log_locking = np.log(stock.steels.take(coil).locking(exposure_s)) + shift
    risk[coil] = return_probability(_needed(stock).threshold().take(coil), log_locking, noise)
    return risk


def noise_of(stock: Stock, state: Now, coil: Rows, at_s: Floats, exposure_s: Floats) -> tuple[Floats, Floats]:
    """Standard deviation of ln g at `at_s`, and how far its mean lies above the ln g of the medians, (n,).

    Notes
    -----
    With shares w of the channels in g: ``var = Σ (w m σ_τ)² + (Σ w m σ_ahead x_ahead/x)² + (Δ ln g)²``, the last by
    raising the activation energies by their spread; the mean of a sum of lognormals gives
    ``½ (Σ w v − Σ w² v)``, ``v = (m σ_τ)²``.
    """
    if not (stock.spreads.log_tau.any() or stock.ahead.spread.any() or stock.raised is not None):
        return np.zeros(len(coil)), np.zeros(len(coil))
    steels = stock.steels.take(coil)
    with np.errstate(divide="ignore", invalid="ignore"):
        terms = (exposure_s / steels.tau_s) ** steels.exponent
        shares = terms / terms.sum(axis=1, keepdims=True)
    shares = np.where(np.isnan(shares), np.eye(shares.shape[1])[0], shares)
    of_tau = (steels.exponent * stock.spreads.log_tau[coil]) ** 2
    variance = np.sum(shares**2 * of_tau, axis=1)
    shift = 0.5 * (np.sum(shares * of_tau, axis=1) - variance)
    if stock.ahead.spread.any():
        with np.errstate(divide="ignore", invalid="ignore"):
            ahead_share = np.clip(1.0 - state.exposure_s[coil] / exposure_s, 0.0, 1.0)
        weather = stock.ahead.at(state.location[coil], at_s - stock.at_s)[:, None] * ahead_share
        variance += np.sum(shares * steels.exponent * np.nan_to_num(weather), axis=1) ** 2
    if stock.raised is not None:
        raised_s, plain_s = (_exposure_at(each, coil, at_s) for each in (stock.raised, stock.journey))
        with np.errstate(divide="ignore", invalid="ignore"):
            change = np.log(steels.locking(raised_s) / steels.locking(plain_s))
        variance += np.nan_to_num(change, nan=0.0, posinf=0.0, neginf=0.0) ** 2
    return np.sqrt(variance), shift


def _needed(stock: Stock) -> Needed:
    return Needed(
        stock.steels.needed_mpa(stock.limit_pct),
        stock.spreads.needed_mpa,
        stock.steels.saturation_mpa,
        stock.spreads.log_saturation,
        stock.spreads.kind,
    )


def _exposure_at(journey: Journey, coil: Rows, at_s: Floats) -> Floats:
    return journey.at(journey.piece_of(coil, at_s), at_s)[1]


def _noise_varies(stock: Stock) -> NDArray[np.bool_]:
    """Coils whose noise depends on when they return: several channels, uncertain weather or energies."""
    several = (np.isfinite(stock.steels.tau_s).sum(axis=1) > 1) & (stock.spreads.log_tau > 0).any(axis=1)
    weather = bool(stock.ahead.spread.any())
    ages = np.isfinite(stock.steels.tau_s).any(axis=1)
    return np.asarray(ages & (several | weather | (stock.raised is not None)))
