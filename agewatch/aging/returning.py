"""Times of return: when a coil on its journey reaches the locking that its limit needs."""

from __future__ import annotations

import numpy as np

from agewatch.aging.journey import Journey
from agewatch.aging.kinetics import Floats, rate
from agewatch.aging.locking import locking_exponent
from agewatch.aging.settled import Rows
from agewatch.aging.steels import Steels

_TIME_TOLERANCE_S = 1.0
_NEWTON_REACH_S = 300.0
"""After a Newton step shorter than this the next one would be below the tolerance."""
_MOST_STEPS = 60


def end_locking(journey: Journey, steels: Steels) -> Floats:
    """g where each piece of the journeys ends, (n_pieces,): what `return_s` looks pieces up by."""
    return _locking(steels, journey.pieces.coil, journey.end_exposure_s)


def return_s(journey: Journey, steels: Steels, ends: Floats, coil: Rows, locking: Floats) -> Floats:
    """When coils reach a locking exponent, seconds, (n,); NaN: not before the horizon.

    Parameters
    ----------
    steels
        One row per coil of the journey.
    ends
        `end_locking` of the journey.
    coil
        Rows into the coils of `journey`; a coil may stand in it several times, with different `locking`.
    locking
        g to reach, (n,).

    Notes
    -----
    The piece in which g is reached is found from its values at the ends of pieces; inside it Newton's method
    runs on ``g^(1/m)``, which for one channel is straight in equivalent age, kept inside a shrinking bracket.
    """
    reached_s = np.full(len(coil), np.nan)
    piece = _piece_of_return(journey, ends, coil, locking)
    rows = np.flatnonzero(piece >= 0)
    if len(rows):
        reached_s[rows] = _solve(journey, steels, piece[rows], locking[rows])
    return reached_s


def approach(
    journey: Journey, steels: Steels, ends: Floats, coil: Rows, locking: Floats
) -> tuple[Floats, Floats]:
    """About when coils reach a locking exponent, s, (n,), and with what equivalent age, s, (n, n_channels).

    At the horizon for those that do not reach it. Quick, and near enough to weigh uncertainties by; arguments as
    for `return_s`.
    """
    piece = _piece_of_return(journey, ends, coil, locking)
    last = np.append(journey.first_piece[1:], len(ends))[coil] - 1
    at_s, exposure_s = journey.pieces.end_s[last], journey.end_exposure_s[last]
    rows = np.flatnonzero(piece >= 0)
    if len(rows):
        piece, power = piece[rows], 1.0 / steels.exponent[coil[rows], 0]
        straight = locking[rows] ** power
        guess_s, share = _guess_s(journey, steels, piece, straight, power)
        at_s[rows] = guess_s
        begin_s, end_s = journey.start_exposure_s[piece], journey.end_exposure_s[piece]
        exposure_s[rows] = begin_s + (end_s - begin_s) * share[:, None]
    return at_s, exposure_s


def _piece_of_return(journey: Journey, ends: Floats, coil: Rows, locking: Floats) -> Rows:
    """The first piece at whose end g is reached, (n,); -1: none."""
    count = np.diff(np.append(journey.first_piece, len(ends)))[coil]
    found = np.full(len(coil), -1, dtype=np.intp)
    for step in range(int(count.max(initial=0)) - 1, -1, -1):
        piece = journey.first_piece[coil] + np.minimum(step, count - 1)
        found = np.where(ends[piece] >= locking, piece, found)
    return found


def _solve(journey: Journey, steels: Steels, piece: Rows, locking: Floats) -> Floats:
    coil = journey.pieces.coil[piece]
    low_s, high_s = journey.pieces.start_s[piece], journey.pieces.end_s[piece]
    power = 1.0 / steels.exponent[coil, 0]
    goal = locking**power
    guess_s, _ = _guess_s(journey, steels, piece, goal, power)
    reached_s = guess_s.copy()
    left = np.arange(len(piece))
    for _ in range(_MOST_STEPS):
        value, slope = _straightened(journey, steels, piece[left], guess_s, power[left])
        excess = value - goal[left]
        below = excess < 0
        low_s = np.where(below, guess_s, low_s)
        high_s = np.where(below, high_s, guess_s)
        with np.errstate(divide="ignore", invalid="ignore"):
            step_s = guess_s - excess / slope
        newton = (step_s >= low_s) & (step_s <= high_s)
        next_s = np.where(newton, step_s, 0.5 * (low_s + high_s))
        reached_s[left] = next_s
        close_s = np.where(newton, _NEWTON_REACH_S, _TIME_TOLERANCE_S)
        still = (np.abs(next_s - guess_s) > close_s) & (high_s - low_s > _TIME_TOLERANCE_S)
        left, guess_s, low_s, high_s = left[still], next_s[still], low_s[still], high_s[still]
        if not len(left):
            break
    return reached_s


def _guess_s(
    journey: Journey, steels: Steels, piece: Rows, goal: Floats, power: Floats
) -> tuple[Floats, Floats]:
    """About when the straightened g reaches `goal`, s, and with what share of the piece's equivalent age, (n,).

    For one channel the straightened g is equivalent age over τ, and the time is near the answer; else it lies in
    proportion between the ends of the piece.
    """
    pieces = journey.pieces.take(piece)
    coil = pieces.coil
    begin = _locking(steels, coil, journey.start_exposure_s[piece]) ** power
    end = _locking(steels, coil, journey.end_exposure_s[piece]) ** power
    share = np.clip((goal - begin) / (end - begin), 0.0, 1.0)
    guess_s = pieces.start_s + (pieces.end_s - pieces.start_s) * share
    single = np.flatnonzero((np.isfinite(steels.tau_s[coil]).sum(axis=1) == 1) & ~pieces.far)
    still_s = goal[single] * steels.tau_s[coil[single], 0] - journey.start_exposure_s[piece[single], 0]
    guess_s[single] = journey.field.when_s(
        journey.channel[coil[single], 0],
        pieces.standing.take(single),
        journey.moment_s[piece[single], 0] + still_s,
    )
    return np.clip(guess_s, pieces.start_s, pieces.end_s), share


def _locking(steels: Steels, coil: Rows, exposure_s: Floats) -> Floats:
    return locking_exponent(exposure_s, steels.tau_s[coil], steels.exponent[coil])


def _straightened(
    journey: Journey, steels: Steels, piece: Rows, at_s: Floats, power: Floats
) -> tuple[Floats, Floats]:
    """g^(1/m) with the first channel's m, and its slope in time, 1/s."""
    coil = journey.pieces.coil[piece]
    coil_k, exposure_s = journey.at(piece, at_s)
    ratio = exposure_s / steels.tau_s[coil]
    exponent = steels.exponent[coil]
    activation = np.array([*journey.field.activation_j_mol, 0.0])[journey.channel[coil]]
    speed = rate(coil_k[:, None], activation) / steels.tau_s[coil]
    term = ratio**exponent
    locking = term.sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = np.where(ratio > 0, exponent * term / ratio * speed, 0.0).sum(axis=1)
        value = locking**power
        return value, power * value / locking * slope
