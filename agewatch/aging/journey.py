"""The journey of every coil: its legs joined by coil temperature, and the equivalent age gathered on the way."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.kinetics import GAS_CONSTANT, Floats
from agewatch.aging.settled import SERIES_LIMIT_K, Rows, SettledField, Standing

_FAR_NODES = np.linspace(0.0, 1.0, 25)
"""Nodes along a far piece, as shares of it."""
_FAR_BATCH = 8_000


@dataclass(frozen=True, slots=True)
class Legs:
    """Stays of coils at locations, ordered by (coil, start); every coil has at least one, the last open-ended."""

    coil: Rows
    location: Rows
    start_s: Floats
    tau_s: Floats
    """Time constant of this coil at this location, s."""

    def first(self) -> NDArray[np.bool_]:
        """Legs that begin a journey."""
        return np.append(True, self.coil[1:] != self.coil[:-1])

    def of_coils(self, begin: int, end: int) -> Legs:
        """The legs of the coils from row `begin` to before row `end`, as a stock of their own."""
        first, last = np.searchsorted(self.coil, [begin, end])
        own = slice(first, last)
        return Legs(self.coil[own] - begin, self.location[own], self.start_s[own], self.tau_s[own])

    def end_s(self, horizon_s: float) -> Floats:
        """Where the next leg of the same coil starts, else the horizon."""
        last = np.append(self.first()[1:], True)
        return np.where(last, horizon_s, np.append(self.start_s[1:], horizon_s))


@dataclass(frozen=True, slots=True)
class Pieces:
    """Parts of legs, in order: a coil that arrives far from the settled temperature has a piece of its own (`far`)
    until it has come near."""

    coil: Rows
    start_s: Floats
    end_s: Floats
    excess_k: Floats
    """Over the settled temperature, where the piece starts."""
    far: NDArray[np.bool_]
    standing: Standing

    def take(self, piece: Rows) -> Pieces:
        return Pieces(
            self.coil[piece],
            self.start_s[piece],
            self.end_s[piece],
            self.excess_k[piece],
            self.far[piece],
            self.standing.take(piece),
        )

    def excess_at_k(self, at_s: Floats) -> Floats:
        """The excess at `at_s`, (n,)."""
        return np.asarray(self.excess_k * np.exp(-(at_s - self.start_s) / self.standing.tau_s))


@dataclass(frozen=True, slots=True)
class Journey:
    """Every coil's way through its legs up to the horizon of the curves."""

    field: SettledField
    channel: Rows
    """Of each coil, places in the field's activation energies, (n_coils, n_channels); -1: none."""
    pieces: Pieces
    first_piece: Rows
    """Of each coil, (n_coils,)."""
    moment_s: Floats
    """The field's moment where each near piece starts, (n_pieces, n_channels)."""
    start_exposure_s: Floats
    """Equivalent age of the coil where each piece starts, s, (n_pieces, n_channels)."""
    end_exposure_s: Floats

    @classmethod
    def of(cls, field: SettledField, channel: Rows, legs: Legs, start_k: Floats, horizon_s: float) -> Journey:
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
        piece_channel = channel[pieces.coil]
        moment_s = np.zeros(piece_channel.shape)
        near = np.flatnonzero(~pieces.far)
        begins = pieces.take(near)
        _, moment_s[near] = field.moment(
            piece_channel[near], begins.standing, begins.start_s, begins.excess_k
        )
        _, gathered_s = _gathered(field, piece_channel, pieces, moment_s, pieces.end_s)
        until_s = np.cumsum(gathered_s, axis=0)
        before_s = until_s - gathered_s
        origin_s = before_s[first_piece][pieces.coil]
        return cls(field, channel, pieces, first_piece, moment_s, before_s - origin_s, until_s - origin_s)

    def piece_of(self, coil: Rows, at_s: Floats) -> Rows:
        """The piece that some coils are in at `at_s`, (n,)."""
        count = np.diff(np.append(self.first_piece, len(self.pieces.coil)))[coil]
        piece = self.first_piece[coil]
        for step in range(1, int(count.max(initial=1))):
            later = self.first_piece[coil] + np.minimum(step, count - 1)
            piece = np.where(self.pieces.start_s[later] <= at_s, later, piece)
        return piece

    def at(self, piece: Rows, at_s: Floats) -> tuple[Floats, Floats]:
        """Coil temperature (K), (n,), and equivalent age (s at 20 °C), (n, n_channels), inside pieces."""
        pieces = self.pieces.take(piece)
        coil_k, gathered_s = _gathered(
            self.field, self.channel[pieces.coil], pieces, self.moment_s[piece], at_s
        )
        return coil_k, self.start_exposure_s[piece] + gathered_s

    def estimated_fraction(self, at_s: Floats) -> Floats:
        """Share of each coil's equivalent age, in its first channel, that rests on estimated air, (n_coils,).

        Counted on settled coils: what an excess adds rests on the coil's own temperature.
        """
        curves = self.field.curves
        if not (curves.estimated & (curves.knot_s < at_s.max(initial=-np.inf))).any():
            return np.zeros(len(self.first_piece))
        pieces = self.pieces
        until_s = np.clip(at_s[pieces.coil], pieces.start_s, pieces.end_s)
        channel = self.channel[pieces.coil, 0]
        begin = self.field.estimated_at_s(channel, pieces.standing, pieces.start_s)
        end = self.field.estimated_at_s(channel, pieces.standing, until_s)
        estimated_s, total_s = (
            np.add.reduceat(late - early, self.first_piece) for early, late in zip(begin, end, strict=True)
        )
        return np.divide(estimated_s, total_s, out=np.zeros_like(total_s), where=total_s > 0)


def _pieces(field: SettledField, legs: Legs, start_k: Floats, horizon_s: float) -> Pieces:
    end_s = legs.end_s(horizon_s)
    standing = field.standing(legs.location, legs.tau_s)
    excess_k = _arrival_excess_k(field, legs, standing, start_k, end_s)
    far_s = legs.tau_s * np.log(np.maximum(np.abs(excess_k), SERIES_LIMIT_K) / SERIES_LIMIT_K)
    near_from_s = np.minimum(legs.start_s + far_s, end_s)
    far = np.flatnonzero(near_from_s > legs.start_s)
    near = np.flatnonzero((near_from_s < end_s) | (near_from_s <= legs.start_s))
    leg = np.concatenate([far, near])
    is_far = np.arange(len(leg)) < len(far)
    order = np.lexsort((~is_far, leg))
    leg, is_far = leg[order], is_far[order]
    start_s = np.where(is_far, legs.start_s[leg], near_from_s[leg])
    return Pieces(
        legs.coil[leg],
        start_s,
        np.where(is_far, near_from_s[leg], end_s[leg]),
        excess_k[leg] * np.exp(-(start_s - legs.start_s[leg]) / legs.tau_s[leg]),
        is_far,
        standing.take(leg),
    )


def _arrival_excess_k(
    field: SettledField, legs: Legs, standing: Standing, start_k: Floats, end_s: Floats
) -> Floats:
    """Excess over the settled temperature with which each leg begins, K: leg by leg, all coils at once."""
    begin_k = field.settled_at_k(standing, legs.start_s)
    first = legs.first()
    rank = np.arange(len(first)) - np.maximum.accumulate(np.where(first, np.arange(len(first)), 0))
    air_k = field.curves.at(legs.location[first], legs.start_s[first])
    excess_k = np.zeros(len(first))
    excess_k[first] = np.where(np.isnan(start_k), air_k, start_k) - begin_k[first]
    left = np.flatnonzero(np.append(~first[1:], False))
    end_k = np.zeros(len(first))
    end_k[left] = field.settled_at_k(standing.take(left), end_s[left])
    fading = np.exp(-(end_s - legs.start_s) / legs.tau_s)
    for step in range(1, int(rank.max(initial=0)) + 1):
        row = np.flatnonzero(rank == step)
        excess_k[row] = end_k[row - 1] + excess_k[row - 1] * fading[row - 1] - begin_k[row]
    return excess_k


def _gathered(
    field: SettledField, channel: Rows, pieces: Pieces, moment_s: Floats, at_s: Floats
) -> tuple[Floats, Floats]:
    """Coil temperature at `at_s`, K, (n,), and equivalent age since each piece started, s, (n, n_channels)."""
    excess_k = pieces.excess_at_k(at_s)
    far = np.flatnonzero(pieces.far)
    if not len(far):
        coil_k, until_s = field.moment(channel, pieces.standing, at_s, excess_k)
        return coil_k, until_s - moment_s
    coil_k, gathered_s = np.empty(len(at_s)), np.empty(channel.shape)
    near = np.flatnonzero(~pieces.far)
    coil_k[near], until_s = field.moment(
        channel[near], pieces.standing.take(near), at_s[near], excess_k[near]
    )
    gathered_s[near] = until_s - moment_s[near]
    coil_k[far] = field.settled_at_k(pieces.standing.take(far), at_s[far]) + excess_k[far]
    gathered_s[far] = _far_exposure_s(field, channel[far], pieces.take(far), at_s[far])
    return coil_k, gathered_s


def _far_exposure_s(field: SettledField, channel: Rows, pieces: Pieces, at_s: Floats) -> Floats:
    """Exposure from the start of far pieces to `at_s`, s, (n, n_channels): in batches that fit the caches."""
    batches = np.array_split(np.arange(len(at_s)), -(-len(at_s) // _FAR_BATCH))
    return np.concatenate([_far_batch_s(field, channel[b], pieces.take(b), at_s[b]) for b in batches])


def _far_batch_s(field: SettledField, channel: Rows, pieces: Pieces, at_s: Floats) -> Floats:
    """Exposure from the start of far pieces to `at_s`, s, (n, n_channels).

    Notes
    -----
    ``∫ rate(U + δ) dt = ∫ R dP``: P, what a settled coil gathers, has all the weather's roughness and is known
    exactly; the ratio R = rate(U + δ)/rate(U) is smooth, and is integrated against P by Simpson's rule, at nodes that
    lie half-way between even in time and even in the excess δ.
    """
    standing, far_k = pieces.standing, pieces.excess_k[:, None]
    span_s = (at_s - pieces.start_s)[:, None]
    tau_s = standing.tau_s[:, None]
    even_k = far_k * (1.0 + _FAR_NODES * np.expm1(-span_s / tau_s))
    elapsed_s = 0.5 * (span_s * _FAR_NODES - tau_s * np.log(even_k / far_k))
    settled_k, gathered_s = field.settled(channel, standing, pieces.start_s[:, None] + elapsed_s)
    coil_k = settled_k + far_k * np.exp(-elapsed_s / tau_s)
    exposure_s = np.zeros(channel.shape)
    for slot in range(channel.shape[1]):
        rows = np.flatnonzero(channel[:, slot] >= 0)
        quotient_k = np.array(field.activation_j_mol)[channel[rows, slot]][:, None] / GAS_CONSTANT
        here_k, own_k = settled_k[rows], coil_k[rows]
        ratio = here_k / own_k * np.exp(quotient_k * (1.0 / here_k - 1.0 / own_k))
        exposure_s[rows, slot] = _simpson(ratio, np.diff(gathered_s[slot][rows], axis=1))
    return exposure_s


def _simpson(values: Floats, steps: Floats) -> Floats:
    """∫ of `values` at the nodes (n, m + 1) over uneven `steps` (n, m), m even: parabolas over pairs of steps, (n,)."""
    first, second = steps[:, ::2], steps[:, 1::2]
    left, middle, right = values[:, :-2:2], values[:, 1:-1:2], values[:, 2::2]
    both = first + second
    with np.errstate(divide="ignore", invalid="ignore"):
        skew = second / first
        pair = (
            both
            / 6.0
            * ((2.0 - skew) * left + (2.0 + skew + 1.0 / skew) * middle + (2.0 - 1.0 / skew) * right)
        )
    return np.asarray(np.where(both > 0, pair, 0.0).sum(axis=1))
