"""The journey of every coil: its legs joined by coil temperature, and the equivalent age gathered on the way."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.kinetics import GAS_CONSTANT, Floats
from agewatch.aging.settled import SERIES_LIMIT_K, Rows, SettledField, Standing

_BATCH_STEPS = 60_000
"""Far pieces are integrated together in batches of about this many steps, those of like length together."""
_STRIDE = 2
"""Knots from one node to the next along a far piece."""
_LEAST_SKEW = 1e-3
"""A step shorter than this share of its pair counts as none."""


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
    """Exposure from the start of far pieces to `at_s`, along every second knot of the curve."""
    exposure_s = np.zeros(channel.shape)
    first = field.curves.locate(pieces.standing.location, pieces.start_s)
    inner = (field.curves.locate(pieces.standing.location, at_s) - first + _STRIDE - 1) // _STRIDE
    order = np.argsort(inner, kind="stable")
    for rows in np.array_split(order, max(1, min(len(order), int(inner.sum()) // _BATCH_STEPS))):
        knot = first[rows, None] + 1 + _STRIDE * np.arange(int(inner[rows].max()))
        here = pieces.take(rows)
        for slot in range(channel.shape[1]):
            has = np.flatnonzero(channel[rows, slot] >= 0)
            exposure_s[rows[has], slot] = _along_knots_s(
                field, channel[rows[has], slot], here.take(has), knot[has], at_s[rows[has]]
            )
    return exposure_s


def _along_knots_s(field: SettledField, channel: Rows, pieces: Pieces, knot: Rows, at_s: Floats) -> Floats:
    """Exposure from the start, over the knots (n, m) that lie before `at_s`, to `at_s`, in one channel (n,).

    Notes
    -----
    ``∫ rate(U + δ) dt = ∫ R dP``: P, what a settled coil gathers, has all the weather's roughness and is known
    exactly; the ratio R = rate(U + δ)/rate(U) is smooth, and is integrated against P by Simpson's rule. Knots beyond
    `at_s`, which fill up the shorter rows, become steps of no length.
    """
    standing = pieces.standing
    begin_k, begin_s = field.settled(channel, standing, pieces.start_s)
    end_k, end_s = field.settled(channel, standing, at_s)
    knot_s, knot_k, knot_exposure_s = field.settled_at_knots(channel, standing, knot)
    beyond = knot_s >= at_s[:, None]
    node_s = _between(pieces.start_s, np.where(beyond, at_s[:, None], knot_s), at_s)
    settled_k = _between(begin_k, np.where(beyond, end_k[:, None], knot_k), end_k)
    gathered_s = _between(begin_s, np.where(beyond, end_s[:, None], knot_exposure_s), end_s)
    elapsed_s = node_s - pieces.start_s[:, None]
    coil_k = settled_k + pieces.excess_k[:, None] * np.exp(-elapsed_s / standing.tau_s[:, None])
    quotient_k = np.array(field.activation_j_mol)[channel][:, None] / GAS_CONSTANT
    ratio = settled_k / coil_k * np.exp(quotient_k * (1.0 / settled_k - 1.0 / coil_k))
    return _simpson(ratio, np.diff(gathered_s, axis=1))


def _between(begin: Floats, inner: Floats, end: Floats) -> Floats:
    """`inner` (n, m) with a column before and one behind."""
    return np.concatenate([begin[:, None], inner, end[:, None]], axis=1)


def _simpson(values: Floats, steps: Floats) -> Floats:
    """∫ of `values` at the nodes (n, m + 1) over uneven `steps` (n, m): parabolas over pairs of steps, (n,).

    Where one step of a pair has no length the other is taken by its logarithmic mean, which is exact for an
    exponential.
    """
    if steps.shape[1] % 2:
        steps = np.concatenate([steps, np.zeros((len(steps), 1))], axis=1)
        values = np.concatenate([values, values[:, -1:]], axis=1)
    first, second = steps[:, ::2], steps[:, 1::2]
    left, middle, right = values[:, :-2:2], values[:, 1:-1:2], values[:, 2::2]
    with np.errstate(divide="ignore", invalid="ignore"):
        skew = second / first
        both = first + second
        pair = (
            both
            / 6.0
            * ((2.0 - skew) * left + (2.0 + skew + 1.0 / skew) * middle + (2.0 - 1.0 / skew) * right)
        )
        odd = np.where(second > 0, second * _log_mean(middle, right), first * _log_mean(left, middle))
    whole = (first > _LEAST_SKEW * both) & (second > _LEAST_SKEW * both)
    return np.asarray(np.where(whole, pair, odd).sum(axis=1))


def _log_mean(begin: Floats, end: Floats) -> Floats:
    growth = np.log(end / begin)
    near = np.abs(growth) < 1e-4
    return np.where(near, 0.5 * (begin + end), (end - begin) / np.where(near, 1.0, growth))
