"""The journey of every coil: its legs joined by coil temperature, and the equivalent age gathered on the way."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.kinetics import Floats, rate
from agewatch.aging.settled import SERIES_LIMIT_K, ClassWeights, Rows, SettledField

_PANELS = 8
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(5)
_PLACES = ((np.arange(_PANELS)[:, None] + 0.5 + 0.5 * _NODES) / _PANELS).ravel()
_PLACE_WEIGHTS = np.tile(0.5 * _WEIGHTS / _PANELS, _PANELS)


@dataclass(frozen=True, slots=True)
class Legs:
    """Stays of coils at locations, ordered by (coil, start); every coil has at least one, the last open-ended."""

    coil: Rows
    location: Rows
    start_s: Floats
    tau_s: Floats
    """Time constant of this coil at this location, s."""

    def end_s(self, horizon_s: float) -> Floats:
        """Where the next leg of the same coil starts, else the horizon."""
        last = np.append(self.coil[1:] != self.coil[:-1], True)
        return np.where(last, horizon_s, np.append(self.start_s[1:], horizon_s))


@dataclass(frozen=True, slots=True)
class Pieces:
    """Parts of legs, in order: one that starts far from the settled temperature (`far`) is split off in front."""

    leg: Rows
    coil: Rows
    location: Rows
    start_s: Floats
    end_s: Floats
    tau_s: Floats
    excess_k: Floats
    """Over the settled temperature, where the piece starts."""
    far: NDArray[np.bool_]
    classes: ClassWeights


@dataclass(frozen=True, slots=True)
class Journey:
    """Every coil's way through its legs up to the horizon of the curves."""

    field: SettledField
    pieces: Pieces
    start_exposure_s: tuple[Floats, ...]
    """Per activation energy: equivalent age of the coil where each piece starts, s."""
    start_moment_s: tuple[Floats, ...]
    first_piece: Rows
    """Of each coil, (n_coils,)."""

    @classmethod
    def of(cls, field: SettledField, legs: Legs, start_k: Floats, horizon_s: float) -> Journey:
        """Join the legs.

        Parameters
        ----------
        start_k
            Coil temperature at its first leg's start, K, (n_coils,); NaN: that of the air.
        horizon_s
            Where the last legs end.
        """
        pieces = _pieces(field, legs, start_k, horizon_s)
        first_piece = np.flatnonzero(np.append(True, pieces.coil[1:] != pieces.coil[:-1]))
        everything = np.arange(len(pieces.coil))
        start_moments, start_exposures = [], []
        for channel in range(len(field.activation_j_mol)):
            start_moment_s = np.zeros(len(everything))
            near = np.flatnonzero(~pieces.far)
            start_moment_s[near] = _near_moment_s(field, pieces, channel, near, pieces.start_s[near])
            gathered_s = _gathered_s(field, pieces, channel, everything, pieces.end_s, start_moment_s)
            before_s = np.cumsum(gathered_s) - gathered_s
            start_exposures.append(before_s - before_s[first_piece][pieces.coil])
            start_moments.append(start_moment_s)
        return cls(field, pieces, tuple(start_exposures), tuple(start_moments), first_piece)

    def piece_at(self, at_s: Floats) -> Rows:
        """The piece that each coil is in at `at_s` (n_coils,); before the first, the first."""
        started = self.pieces.start_s <= at_s[self.pieces.coil]
        return self.first_piece + np.maximum(np.add.reduceat(started, self.first_piece) - 1, 0)

    def exposure_s(self, channel: int, piece: Rows, at_s: Floats) -> Floats:
        """Equivalent age (s at 20 °C) at `at_s`, a time inside `piece`, (n,)."""
        gathered_s = _gathered_s(
            self.field, self.pieces, channel, piece, at_s, self.start_moment_s[channel][piece]
        )
        return self.start_exposure_s[channel][piece] + gathered_s

    def end_exposure_s(self, channel: int) -> Floats:
        """Equivalent age where each piece ends, s, (n_pieces,)."""
        return self.exposure_s(channel, np.arange(len(self.pieces.coil)), self.pieces.end_s)

    def coil_k(self, piece: Rows, at_s: Floats) -> Floats:
        """Coil temperature, K, (n,)."""
        return _coil_k(self.field, self.pieces, piece, at_s)

    def estimated_fraction(self, channel: int, piece: Rows, at_s: Floats) -> Floats:
        """Share of each coil's equivalent age up to `at_s` that rests on estimated air, (n_coils,).

        Counted on settled coils: what an excess adds rests on the coil's own temperature.
        """
        if not self.field.estimated_s:
            return np.zeros(len(self.first_piece))
        pieces = self.pieces
        until_s = np.clip(at_s[pieces.coil], pieces.start_s, pieces.end_s)
        estimated_s, total_s = (
            np.add.reduceat(end - begin, self.first_piece)
            for begin, end in (
                (at(pieces.start_s), at(until_s))
                for at in (
                    lambda t: self.field.estimated_at_s(channel, pieces.location, t, pieces.classes),
                    lambda t: self.field.moment(
                        channel, pieces.location, t, pieces.tau_s, pieces.classes, np.zeros(len(t))
                    ).exposure_s,
                )
            )
        )
        return np.divide(estimated_s, total_s, out=np.zeros_like(total_s), where=total_s > 0)


def _pieces(field: SettledField, legs: Legs, start_k: Floats, horizon_s: float) -> Pieces:
    end_s = legs.end_s(horizon_s)
    classes = field.weights(legs.tau_s)
    excess_k = _arrival_excess_k(field, legs, classes, start_k, end_s)
    size = np.abs(excess_k)
    far_s = legs.tau_s * np.log(np.maximum(size, SERIES_LIMIT_K) / SERIES_LIMIT_K)
    settles_s = np.minimum(legs.start_s + far_s, end_s)
    far = np.flatnonzero(settles_s > legs.start_s)
    near = np.flatnonzero((settles_s < end_s) | (settles_s <= legs.start_s))
    leg = np.concatenate([far, near])
    is_far = np.arange(len(leg)) < len(far)
    order = np.lexsort((~is_far, leg))
    leg, is_far = leg[order], is_far[order]
    start_s = np.where(is_far, legs.start_s[leg], settles_s[leg])
    return Pieces(
        leg,
        legs.coil[leg],
        legs.location[leg],
        start_s,
        np.where(is_far, settles_s[leg], end_s[leg]),
        legs.tau_s[leg],
        excess_k[leg] * np.exp(-(start_s - legs.start_s[leg]) / legs.tau_s[leg]),
        is_far,
        classes.take(leg),
    )


def _arrival_excess_k(
    field: SettledField, legs: Legs, classes: ClassWeights, start_k: Floats, end_s: Floats
) -> Floats:
    """Excess over the settled temperature with which each leg begins, K: leg by leg, all coils at once."""
    begin_k = field.settled_at_k(legs.location, legs.start_s, legs.tau_s, classes)
    end_k = field.settled_at_k(legs.location, end_s, legs.tau_s, classes)
    first = np.append(True, legs.coil[1:] != legs.coil[:-1])
    rank = np.arange(len(first)) - np.maximum.accumulate(np.where(first, np.arange(len(first)), 0))
    air_k = field.curves.at(legs.location[first], legs.start_s[first])
    excess_k = np.zeros(len(first))
    excess_k[first] = np.where(np.isnan(start_k), air_k, start_k) - begin_k[first]
    fading = np.exp(-(end_s - legs.start_s) / legs.tau_s)
    for step in range(1, int(rank.max(initial=0)) + 1):
        row = np.flatnonzero(rank == step)
        excess_k[row] = end_k[row - 1] + excess_k[row - 1] * fading[row - 1] - begin_k[row]
    return excess_k


def _coil_k(field: SettledField, pieces: Pieces, piece: Rows, at_s: Floats) -> Floats:
    settled_k = field.settled_at_k(
        pieces.location[piece], at_s, pieces.tau_s[piece], pieces.classes.take(piece)
    )
    return settled_k + _excess_k(pieces, piece, at_s)


def _excess_k(pieces: Pieces, piece: Rows, at_s: Floats) -> Floats:
    return np.asarray(
        pieces.excess_k[piece] * np.exp(-(at_s - pieces.start_s[piece]) / pieces.tau_s[piece])
    )


def _near_moment_s(
    field: SettledField, pieces: Pieces, channel: int, piece: Rows, at_s: Floats
) -> Floats:
    return field.moment(
        channel,
        pieces.location[piece],
        at_s,
        pieces.tau_s[piece],
        pieces.classes.take(piece),
        _excess_k(pieces, piece, at_s),
    ).exposure_s


def _gathered_s(
    field: SettledField, pieces: Pieces, channel: int, piece: Rows, at_s: Floats, start_moment_s: Floats
) -> Floats:
    """Equivalent age gathered from the start of `piece` to `at_s`, s, (n,)."""
    gathered_s = np.empty(len(piece))
    near, far = np.flatnonzero(~pieces.far[piece]), np.flatnonzero(pieces.far[piece])
    gathered_s[near] = (
        _near_moment_s(field, pieces, channel, piece[near], at_s[near]) - start_moment_s[near]
    )
    if len(far):
        gathered_s[far] = _far_exposure_s(field, pieces, channel, piece[far], at_s[far])
    return gathered_s


def _far_exposure_s(
    field: SettledField, pieces: Pieces, channel: int, piece: Rows, at_s: Floats
) -> Floats:
    """Exposure from the start of far pieces to `at_s` by Gauss–Legendre panels over the coil's temperature."""
    span_s = at_s - pieces.start_s[piece]
    node_s = (pieces.start_s[piece][:, None] + span_s[:, None] * _PLACES).ravel()
    coil_k = _coil_k(field, pieces, np.repeat(piece, len(_PLACES)), node_s)
    rates = rate(coil_k, field.activation_j_mol[channel]).reshape(len(piece), len(_PLACES))
    return np.asarray(span_s * (rates @ _PLACE_WEIGHTS))
