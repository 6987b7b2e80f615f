"""The whole store at once: from journeys and steels to plateaus now and times of return."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.journey import Journey
from agewatch.aging.kinetics import Floats, rate
from agewatch.aging.locking import locked_fraction, locking_exponent, locking_for_fraction
from agewatch.aging.settled import Rows
from agewatch.aging.yielding import FlowCurve

_TIME_TOLERANCE_S = 1.0
_MOST_STEPS = 60


@dataclass(frozen=True, slots=True)
class Steels:
    """What each coil is made of; arrays (n_coils,) or (n_coils, n_channels)."""

    channel: NDArray[np.intp]
    """Place of each channel's activation energy in the field; -1: the grade has no such channel."""
    tau_s: Floats
    """inf where there is no channel."""
    exponent: Floats
    saturation_mpa: Floats
    masking_mpa: Floats
    flow: FlowCurve

    def take(self, rows: Rows) -> Steels:
        flow = FlowCurve(
            self.flow.strength_mpa[rows],
            self.flow.hardening[rows],
            self.flow.rp02_mpa[rows],
            self.flow.pre_strain[rows],
        )
        return Steels(
            self.channel[rows],
            self.tau_s[rows],
            self.exponent[rows],
            self.saturation_mpa[rows],
            self.masking_mpa[rows],
            flow,
        )


def exposures_s(journey: Journey, channel: NDArray[np.intp], piece: Rows, at_s: Floats) -> Floats:
    """Equivalent age per channel, s, (n, n_channels); zero where a grade has no such channel."""
    exposure_s = np.zeros(channel.shape)
    for place in range(len(journey.field.activation_j_mol)):
        rows, slots = np.nonzero(channel == place)
        exposure_s[rows, slots] = journey.exposure_s(place, piece[rows], at_s[rows])
    return exposure_s


def yield_rise_mpa(steels: Steels, exposure_s: Floats) -> Floats:
    """Δσ = Δσ_sat f, MPa, (n,)."""
    locking = locking_exponent(exposure_s, steels.tau_s, steels.exponent)
    return steels.saturation_mpa * locked_fraction(locking)


def ype_pct(steels: Steels, rise_mpa: Floats) -> Floats:
    """Plateau (%) for a rise of which the residual stress of temper rolling masks the first part, (n,)."""
    return steels.flow.ype_pct(np.maximum(0.0, rise_mpa - steels.masking_mpa))


def locking_to_return(steels: Steels, limit_pct: Floats) -> Floats:
    """g at which the plateau reaches `limit_pct`, (n,); inf: never (NaN limit, or the rise saturates below)."""
    needed_mpa = steels.flow.effective_rise_mpa(limit_pct) + steels.masking_mpa
    return np.where(np.isnan(needed_mpa), np.inf, locking_for_fraction(needed_mpa / steels.saturation_mpa))


def return_s(journey: Journey, steels: Steels, coil: Rows, locking: Floats) -> Floats:
    """When coils reach a locking exponent, seconds, (n,); NaN: not before the horizon.

    Parameters
    ----------
    coil
        Rows into the coils of `journey`; a coil may stand in it several times, with different `locking`.
    steels
        One row per coil of the journey.
    locking
        g to reach, (n,).

    Notes
    -----
    The piece in which g is reached is found from its values at the ends of pieces; inside it Newton's method
    runs on ``g^(1/m)``, which for one channel is straight in equivalent age, kept inside a shrinking bracket.
    """
    reached_s = np.full(len(coil), np.nan)
    piece = _piece_of_return(journey, steels, coil, locking)
    rows = np.flatnonzero(piece >= 0)
    if len(rows):
        reached_s[rows] = _solve(journey, steels.take(coil[rows]), piece[rows], locking[rows])
    return reached_s


def _piece_of_return(journey: Journey, steels: Steels, coil: Rows, locking: Floats) -> Rows:
    """The first piece at whose end g is reached, (n,); -1: none."""
    pieces = journey.pieces
    at_end = steels.take(pieces.coil)
    end_s = exposures_s(journey, at_end.channel, np.arange(len(pieces.coil)), pieces.end_s)
    end_locking = locking_exponent(end_s, at_end.tau_s, at_end.exponent)
    count = np.diff(np.append(journey.first_piece, len(pieces.coil)))[coil]
    found = np.full(len(coil), -1, dtype=np.intp)
    for step in range(int(count.max(initial=0)) - 1, -1, -1):
        piece = journey.first_piece[coil] + np.minimum(step, count - 1)
        found = np.where(end_locking[piece] >= locking, piece, found)
    return found


def _solve(journey: Journey, steels: Steels, piece: Rows, locking: Floats) -> Floats:
    pieces = journey.pieces
    low_s, high_s = pieces.start_s[piece].copy(), pieces.end_s[piece].copy()
    power = 1.0 / steels.exponent[:, 0]
    goal = locking**power
    guess_s = low_s + 0.5 * (high_s - low_s)
    reached_s = low_s.copy()
    open_rows = np.arange(len(piece))
    for _ in range(_MOST_STEPS):
        here, at_s = steels.take(open_rows), guess_s[open_rows]
        value, slope = _straightened(journey, here, piece[open_rows], at_s, power[open_rows])
        excess = value - goal[open_rows]
        below = excess < 0
        low_s[open_rows[below]] = at_s[below]
        high_s[open_rows[~below]] = at_s[~below]
        with np.errstate(divide="ignore", invalid="ignore"):
            step_s = at_s - excess / slope
        low, high = low_s[open_rows], high_s[open_rows]
        inside = (step_s >= low) & (step_s <= high)
        next_s = np.where(inside, step_s, 0.5 * (low + high))
        reached_s[open_rows] = next_s
        guess_s[open_rows] = next_s
        still = (np.abs(next_s - at_s) > _TIME_TOLERANCE_S) & (high - low > _TIME_TOLERANCE_S)
        open_rows = open_rows[still]
        if not len(open_rows):
            break
    return reached_s


def _straightened(
    journey: Journey, steels: Steels, piece: Rows, at_s: Floats, power: Floats
) -> tuple[Floats, Floats]:
    """g^(1/m) with the first channel's m, and its slope in time, 1/s."""
    exposure_s = exposures_s(journey, steels.channel, piece, at_s)
    coil_k = journey.coil_k(piece, at_s)
    ratio = exposure_s / steels.tau_s
    term = ratio**steels.exponent
    locking = term.sum(axis=1)
    activation = np.array([*journey.field.activation_j_mol, 0.0])[steels.channel]
    speed = rate(coil_k[:, None], activation) / steels.tau_s
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = np.where(ratio > 0, steels.exponent * term / ratio * speed, 0.0).sum(axis=1)
        value = locking**power
        return value, power * value / locking * slope
