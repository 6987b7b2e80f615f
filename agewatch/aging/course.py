"""The course of one coil: its temperature and its plateau over time, past and to come."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from agewatch.aging.assess import Now, Stock, noise_of
from agewatch.aging.kinetics import Floats
from agewatch.aging.risk import Needed, return_probability

_LEVELS_PCT = np.concatenate([[1e-4], np.geomspace(0.005, 10.0, 95)])


@dataclass(frozen=True, slots=True)
class Course:
    """One coil at n times."""

    air_k: Floats
    coil_k: Floats
    exposure_s: Floats
    """Equivalent age in the main channel, s."""
    ype_pct: Floats
    """Plateau that is not exceeded with P10, P50 and P90, (3, n)."""


def course(stock: Stock, state: Now, coil: int, at_s: Floats) -> Course:
    """Follow the coil in row `coil` through the times `at_s` (s, rising, from its first leg to the horizon).

    Notes
    -----
    The plateau exceeds y with the probability that a limit of y has been reached; the upper curve therefore
    meets a part's limit at the P10 return.
    """
    rows = np.full(len(at_s), coil)
    piece = stock.journey.piece_of(rows, at_s)
    coil_k, exposure_s = stock.journey.at(piece, at_s)
    location = stock.journey.pieces.standing.location[piece]
    return Course(
        stock.journey.field.curves.at(location, at_s),
        coil_k,
        exposure_s[:, 0],
        _plateau_quantiles_pct(stock, state, coil, at_s, exposure_s),
    )


def _plateau_quantiles_pct(stock: Stock, state: Now, coil: int, at_s: Floats, exposure_s: Floats) -> Floats:
    rows = np.full(len(at_s), coil)
    noise, shift = noise_of(stock, state, rows, at_s, exposure_s)
    with np.errstate(divide="ignore"):
        log_locking = np.log(stock.steels.take(rows).locking(exposure_s)) + shift
    everywhere = np.full(len(_LEVELS_PCT), coil)
    steels, spreads = stock.steels.take(everywhere), stock.spreads
    needed = Needed(
        steels.needed_mpa(_LEVELS_PCT),
        spreads.needed_mpa[everywhere],
        steels.saturation_mpa,
        spreads.log_saturation[everywhere],
        everywhere,
    ).threshold()
    level, moment = (axis.ravel() for axis in np.indices((len(_LEVELS_PCT), len(at_s))))
    exceeded = return_probability(needed.take(level), log_locking[moment], noise[moment])
    exceeded = exceeded.reshape(len(_LEVELS_PCT), len(at_s))
    quantiles = np.empty((3, len(at_s)))
    for place, probability in enumerate((0.9, 0.5, 0.1)):
        quantiles[place] = [
            np.interp(-probability, -column, _LEVELS_PCT, left=0.0, right=_LEVELS_PCT[-1])
            for column in exceeded.T
        ]
    return quantiles
