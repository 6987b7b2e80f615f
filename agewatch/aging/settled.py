"""What a coil that has long stood at a location gathers, and what a coil that arrives warmer or colder adds.

A coil's temperature in a leg is ``T(t) = U(t) + d exp(−(t − t_0)/τ)``: the settled temperature U, common to all
coils of one time constant at one location, and the excess d with which this coil arrived. Both parts are summed
once per location, for a few classes of time constant; a coil reads them off between classes, cubic in ln τ.

For the excess, the rate is expanded about U. With ``t = −δ/U`` and ``x = q/U`` (q = Q/R),

    rate(U + δ)/rate(U) = (1/(1−t)) exp(−x t/(1−t)) = Σ L_k(x) t^k,

the generating function of the Laguerre polynomials, so that what the excess adds from t_0 on is ``Σ d^k H_k(t_0)``
with ``H_k(t_0) = ∫ rate(U) L_k(q/U) (−1/U)^k exp(−k (t − t_0)/τ) dt``, a sum that runs backward over the knots.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray

from agewatch.aging.coil_heat import even_stretches, settled_temperature_k
from agewatch.aging.curves import AirCurves
from agewatch.aging.kinetics import GAS_CONSTANT, Floats, rate, rate_slope

Rows = NDArray[np.intp]

SERIES_TERMS = 7
SERIES_LIMIT_K = 10.0
"""Largest excess for which the series serves: its error is then below 1e-4 of what the excess adds."""
_UNFELT_K = 1e-4
"""An excess below this adds less than a second."""
_FELT_LAGS = 20.0
"""Time constants after which no excess is felt."""
_CLASS_STEP = 0.35
"""Distance of neighbouring classes in ln τ."""
_STENCIL = 4
_CHUNK = 256


@dataclass(frozen=True, slots=True)
class Standing:
    """Coils at their locations, (n,): what a field needs to know of them."""

    location: Rows
    tau_s: Floats
    first: Rows
    """First class of time constant of the coil's stencil."""
    weight: Floats
    """Of the four classes from `first` on, (n, 4)."""

    def take(self, rows: Rows) -> Standing:
        return Standing(
            self.location.take(rows),
            self.tau_s.take(rows),
            self.first.take(rows),
            self.weight.take(rows, axis=0),
        )


@dataclass(frozen=True, slots=True)
class SettledField:
    """Sums over the curves for every class and activation energy; see the module's text."""

    curves: AirCurves
    activation_j_mol: tuple[float, ...]
    class_tau_s: Floats
    settled_k: Floats
    """U at the knots, (n_knots, n_locations, n_classes)."""
    exposure_s: Floats
    """∫ rate(U) up to each knot, (n_activations, n_knots, n_locations, n_classes)."""
    estimated_s: Floats
    """The part of `exposure_s` that rests on estimated air."""
    series: NDArray[np.float32]
    """H_k, (n_activations, n_first_knots, n_locations, n_classes, SERIES_TERMS), s/K^k; an excess is not felt later."""

    @classmethod
    def of(
        cls, curves: AirCurves, activation_j_mol: tuple[float, ...], tau_s: Floats, last_arrival_s: float
    ) -> SettledField:
        """Sum the curves once for coils whose time constants lie within those of `tau_s` (s, > 0).

        `last_arrival_s` is when the last of them came to a location.
        """
        class_tau_s = tau_classes_s(tau_s)
        settled_k = settled_temperature_k(curves, class_tau_s)
        pieces_s = [_piece_exposure_s(curves, settled_k, class_tau_s, q) for q in activation_j_mol]
        estimated = curves.estimated.T[:-1, :, None]
        return cls(
            curves,
            activation_j_mol,
            class_tau_s,
            settled_k,
            _summed(pieces_s),
            _summed([piece_s * estimated for piece_s in pieces_s]),
            _excess_series(
                curves,
                settled_k,
                class_tau_s,
                activation_j_mol,
                last_arrival_s + _FELT_LAGS * class_tau_s[-1],
            ),
        )

    def standing(self, location: Rows, tau_s: Floats) -> Standing:
        """Place coils between the classes: cubic Lagrange weights in ln τ."""
        nodes = np.log(self.class_tau_s)
        place = (np.log(tau_s) - nodes[0]) / (nodes[1] - nodes[0])
        first = np.clip(np.floor(place).astype(np.intp) - 1, 0, len(nodes) - _STENCIL)
        u = place - first
        weights = (
            (1 - u) * (2 - u) * (3 - u) / 6,
            u * (2 - u) * (3 - u) / 2,
            -u * (1 - u) * (3 - u) / 2,
            u * (1 - u) * (2 - u) / 6,
        )
        return Standing(location, tau_s, first, np.stack(weights, axis=-1))

    def settled_at_k(self, standing: Standing, at_s: Floats) -> Floats:
        """U at `at_s`, K, (n,)."""
        return self._place(standing, at_s).settled_k

    def settled(self, channel: Rows, standing: Standing, at_s: Floats) -> tuple[Floats, list[Floats]]:
        """U (K), and per channel what a settled coil has gathered since the curve began (s), at m times, (n, m)."""
        place = self._place(standing, at_s)
        return place.settled_k, [
            self._settled_exposure_s(np.maximum(channel[:, slot, None], 0), place)
            for slot in range(channel.shape[1])
        ]

    def moment(
        self, channel: Rows, standing: Standing, at_s: Floats, excess_k: Floats
    ) -> tuple[Floats, Floats]:
        """Coil temperature (K), and equivalent age since the curve began (s), at `at_s`.

        The second counts what a settled coil has gathered, less what the excess has still to add: its
        difference between two times of one stay is the equivalent age gathered between them.

        Parameters
        ----------
        channel
            Places in `activation_j_mol`, (n, n_channels); -1: no such channel, for which the age is zero.
        at_s, excess_k
            (n,); the excess over the settled temperature at that time, within SERIES_LIMIT_K.
        """
        place = self._place(standing, at_s)
        exposure_s = np.zeros(channel.shape)
        for slot in range(channel.shape[1]):
            rows = np.flatnonzero(channel[:, slot] >= 0)
            everyone = len(rows) == len(channel)
            which = channel[:, slot] if everyone else channel[rows, slot]
            here = place if everyone else place.take(rows)
            exposure_s[rows, slot] = self._settled_exposure_s(which, here) - self._still_to_add_s(
                which, here, excess_k if everyone else excess_k[rows]
            )
        return place.settled_k + excess_k, exposure_s

    def when_s(self, channel: Rows, standing: Standing, exposure_s: Floats) -> Floats:
        """About when a settled coil has gathered `exposure_s`, s, (n,): read off the nearest class."""
        n_locations, n_classes = self.settled_k.shape[1:]
        nearest = standing.first + np.argmax(standing.weight, axis=1)
        kind = (channel * n_locations + standing.location) * n_classes + nearest
        order = np.argsort(kind, kind="stable")
        bounds = np.flatnonzero(np.diff(kind[order], prepend=-1, append=-1))
        at_s = np.empty(len(channel))
        for begin, end in pairwise(bounds):
            rows = order[begin:end]
            place, tau_class = divmod(int(kind[rows[0]]), n_classes)
            activation, location = divmod(place, n_locations)
            at_s[rows] = np.interp(
                exposure_s[rows],
                self.exposure_s[activation, :, location, tau_class],
                self.curves.knot_s[location],
            )
        return at_s

    def estimated_at_s(self, channel: Rows, standing: Standing, at_s: Floats) -> tuple[Floats, Floats]:
        """What a settled coil has gathered up to `at_s` on estimated air, and in all, s, (n,); `channel` (n,).

        Straight between knots, which serves a share of the whole.
        """
        curves = self.curves
        knot = curves.locate(standing.location, at_s)
        at = standing.location * curves.knot_s.shape[1] + knot
        knot_s = curves.knot_s.reshape(-1)
        share = np.clip((at_s - knot_s.take(at)) / (knot_s.take(at + 1) - knot_s.take(at)), 0.0, 1.0)
        row = (channel * len(self.settled_k) + knot) * len(curves.air_k) + standing.location
        gathered_s = []
        for sums_s in (self.estimated_s, self.exposure_s):
            begin_s = _between_classes(sums_s, row, standing)
            end_s = _between_classes(sums_s, row + len(curves.air_k), standing)
            gathered_s.append(begin_s + (end_s - begin_s) * share)
        return gathered_s[0], gathered_s[1]

    def _place(self, standing: Standing, at_s: Floats) -> _Place:
        """Where times lie on the curves, and the settled temperature there.

        On a piece, the settled temperature is that at its first knot, relaxed towards the straight line of the
        air with the coil's own time constant.
        """
        curves = self.curves
        shape = (-1,) + (1,) * (at_s.ndim - 1)
        location, tau_s = standing.location.reshape(shape), standing.tau_s.reshape(shape)
        knot = curves.locate(location, at_s)
        at = location * curves.knot_s.shape[1] + knot
        knot_s, air_k = curves.knot_s.reshape(-1), curves.air_k.reshape(-1)
        begin_s, begin_air_k = knot_s.take(at), air_k.take(at)
        step_s = knot_s.take(at + 1) - begin_s
        air_slope = (air_k.take(at + 1) - begin_air_k) / step_s
        elapsed_s = np.clip(at_s - begin_s, 0.0, step_s)
        begin_k = _between_classes(self.settled_k, knot * len(curves.air_k) + location, standing)
        lead_k = air_slope * tau_s
        air_now_k = begin_air_k + air_slope * elapsed_s
        settled_k = air_now_k - lead_k + (begin_k - begin_air_k + lead_k) * np.exp(-elapsed_s / tau_s)
        return _Place(
            standing,
            location,
            knot,
            elapsed_s,
            step_s - elapsed_s,
            begin_k,
            settled_k,
            (begin_air_k - begin_k) / tau_s,
            (air_now_k - settled_k) / tau_s,
            begin_air_k + air_slope * step_s,
        )

    def _settled_exposure_s(self, channel: Rows, place: _Place) -> Floats:
        row = (channel * len(self.settled_k) + place.knot) * len(self.curves.air_k) + place.location
        activation = np.array(self.activation_j_mol)[channel]
        begin, end = rate(place.begin_k, activation), rate(place.settled_k, activation)
        begin_gain = begin * rate_slope(place.begin_k, activation) * place.begin_slope
        end_gain = end * rate_slope(place.settled_k, activation) * place.slope
        step_s = place.elapsed_s
        since_knot_s = step_s * (0.5 * (begin + end) + step_s / 12.0 * (begin_gain - end_gain))
        return _between_classes(self.exposure_s, row, place.standing) + since_knot_s

    def _still_to_add_s(self, channel: Rows, place: _Place, excess_k: Floats) -> Floats:
        """What an excess adds from here on, s: to the next knot by its own rate, from there by the series."""
        to_add_s = np.zeros(len(excess_k))
        felt = np.flatnonzero(np.abs(excess_k) > _UNFELT_K)
        if not len(felt):
            return to_add_s
        place, channel, excess_k = place.take(felt), channel[felt], excess_k[felt]
        tau_s = place.standing.tau_s
        next_excess_k = excess_k * np.exp(-place.left_s / tau_s)
        n_locations, n_classes = self.settled_k.shape[1:]
        next_row = (place.knot + 1) * n_locations + place.location
        next_k = _between_classes(self.settled_k, next_row, place.standing)
        activation = np.array(self.activation_j_mol)[channel]
        here = _excess_rate(place.settled_k, place.slope, excess_k, tau_s, activation)
        there = _excess_rate(next_k, (place.next_air_k - next_k) / tau_s, next_excess_k, tau_s, activation)
        to_knot_s = place.left_s * (0.5 * (here[0] + there[0]) + place.left_s / 12.0 * (here[1] - there[1]))
        known = np.minimum(place.knot + 1, self.series.shape[1] - 1)
        row = (channel * self.series.shape[1] + known) * n_locations + place.location
        base = (row * n_classes + place.standing.first) * SERIES_TERMS
        stencil = sliding_window_view(self.series.reshape(-1), _STENCIL * SERIES_TERMS)[base]
        by_class = stencil.reshape(len(felt), _STENCIL, SERIES_TERMS)
        terms = np.einsum("nk,nkt->nt", place.standing.weight.astype(np.float32), by_class)
        to_add_s[felt] = to_knot_s + _polynomial(terms, next_excess_k)
        return to_add_s


@dataclass(frozen=True, slots=True)
class _Place:
    """Times on the curves: the piece, how far into it, and U with its slope at both ends of that way."""

    standing: Standing
    location: Rows
    knot: Rows
    elapsed_s: Floats
    left_s: Floats
    """To the next knot."""
    begin_k: Floats
    settled_k: Floats
    begin_slope: Floats
    slope: Floats
    next_air_k: Floats

    def take(self, rows: Rows) -> _Place:
        return _Place(
            self.standing.take(rows),
            self.location[rows],
            self.knot[rows],
            self.elapsed_s[rows],
            self.left_s[rows],
            self.begin_k[rows],
            self.settled_k[rows],
            self.begin_slope[rows],
            self.slope[rows],
            self.next_air_k[rows],
        )


def tau_classes_s(tau_s: Floats) -> Floats:
    """Classes of time constant, evenly spaced in ln τ, that span `tau_s`; at least a stencil's worth."""
    low, high = (np.log(tau_s.min()), np.log(tau_s.max())) if len(tau_s) else (10.0, 10.0)
    count = max(_STENCIL, int(np.ceil((high - low) / _CLASS_STEP)) + 1)
    spread = max(high - low, 0.01)
    return np.asarray(np.exp(low + spread * np.arange(count) / (count - 1)))


def _excess_rate(
    settled_k: Floats, slope_k_s: Floats, excess_k: Floats, tau_s: Floats, activation: Floats
) -> tuple[Floats, Floats]:
    """rate(U + δ) − rate(U) and its time derivative (1/s), (n,)."""
    own_k = settled_k + excess_k
    own, settled = rate(own_k, activation), rate(settled_k, activation)
    own_gain = own * rate_slope(own_k, activation) * (slope_k_s - excess_k / tau_s)
    return own - settled, own_gain - settled * rate_slope(settled_k, activation) * slope_k_s


def _polynomial(terms: Floats, excess_k: Floats) -> Floats:
    """Σ d^k terms_k, k = 1 …, by Horner's rule, (n,)."""
    total = terms[:, -1] * excess_k
    for k in range(terms.shape[1] - 2, -1, -1):
        total = (total + terms[:, k]) * excess_k
    return np.asarray(total)


def _between_classes(values: Floats, row: Rows, standing: Standing) -> Floats:
    """`values` (…, n_classes) at flat rows (n,) or (n, m), between the classes of each coil."""
    flat = values.reshape(-1)
    shape = (-1,) + (1,) * (row.ndim - 1)
    base = row * values.shape[-1] + standing.first.reshape(shape)
    total = standing.weight[:, 0].reshape(shape) * flat.take(base)
    for k in range(1, _STENCIL):
        total += standing.weight[:, k].reshape(shape) * flat.take(base + k)
    return np.asarray(total)


def _summed(pieces_s: list[Floats]) -> Floats:
    """Running sums from zero over the knots, (n_activations, n_knots, …)."""
    total_s = np.zeros((len(pieces_s), len(pieces_s[0]) + 1, *pieces_s[0].shape[1:]))
    for place, piece_s in enumerate(pieces_s):
        np.cumsum(piece_s, axis=0, out=total_s[place, 1:])
    return total_s


def _corrected_steps_s(speed: Floats, gain: Floats, step_s: Floats) -> Floats:
    """∫ rate over each step of the last axis from its values and time derivatives at the nodes.

    Notes
    -----
    The trapezoidal rule with the end correction of Euler and Maclaurin: its error is of fifth order in the step.
    """
    return np.asarray(
        step_s * (0.5 * (speed[..., 1:] + speed[..., :-1]) + step_s / 12.0 * (gain[..., :-1] - gain[..., 1:]))
    )


def _piece_exposure_s(curves: AirCurves, settled_k: Floats, tau_s: Floats, activation: float) -> Floats:
    """Exposure of settled coils over each piece, (n_knots − 1, n_locations, n_classes)."""
    speed = rate(settled_k, activation)
    gain = speed * rate_slope(settled_k, activation) * (curves.air_k.T[:, :, None] - settled_k) / tau_s
    steps_s = _corrected_steps_s(speed.T, gain.T, np.diff(curves.knot_s, axis=1)[None])
    return steps_s.T


def _excess_series(
    curves: AirCurves,
    settled_k: Floats,
    tau_s: Floats,
    activation_j_mol: tuple[float, ...],
    until_s: float,
) -> NDArray[np.float32]:
    """H_k by exact integration of a piecewise linear rate(U) L_k (−1/U)^k against exp(−ks/τ), back from `until_s`."""
    count = min(int(np.max(np.sum(curves.knot_s < until_s, axis=1))) + 2, curves.knot_s.shape[1])
    density = np.stack([_laguerre_terms(settled_k[:count], q) for q in activation_j_mol])
    decay_per_s = np.arange(1, SERIES_TERMS + 1) / tau_s[:, None]
    series = np.empty(density.shape, dtype=np.float32)
    running = density[:, -1] / decay_per_s
    series[:, -1] = running
    step_s = np.diff(curves.knot_s[:, :count], axis=1)
    for begin, end in reversed(_chunks(even_stretches(step_s))):
        at_begin, at_end, decay = _decaying_weights(step_s[:, begin, None, None], decay_per_s)
        brought = at_begin * density[:, begin:end] + at_end * density[:, begin + 1 : end + 1]
        for knot in range(end - 1, begin - 1, -1):
            running = decay * running
            running += brought[:, knot - begin]
            series[:, knot] = running
    return series


def _chunks(stretches: list[tuple[int, int]]) -> list[tuple[int, int]]:
    """The same stretches, none longer than _CHUNK."""
    return [(at, min(at + _CHUNK, end)) for begin, end in stretches for at in range(begin, end, _CHUNK)]


def _laguerre_terms(settled_k: Floats, activation: float) -> Floats:
    """rate(U) L_k(q/U) (−1/U)^k for k = 1 … SERIES_TERMS on a new last axis."""
    inverse = -1.0 / settled_k
    argument = -activation / GAS_CONSTANT * inverse
    terms = np.empty((SERIES_TERMS, *settled_k.shape))
    before, current = np.ones_like(argument), 1.0 - argument
    factor = rate(settled_k, activation)
    for k in range(1, SERIES_TERMS + 1):
        factor *= inverse
        np.multiply(factor, current, out=terms[k - 1])
        before, current = current, ((2 * k + 1 - argument) * current - k * before) / (k + 1)
    return np.ascontiguousarray(np.moveaxis(terms, 0, -1))


def _decaying_weights(step_s: Floats, decay_per_s: Floats) -> tuple[Floats, Floats, Floats]:
    """Weights of both ends of a straight line against exp(−z s/h) over a step h, and exp(−z)."""
    z = step_s * decay_per_s
    mean = -np.expm1(-z) / z
    late = np.where(z < 1e-3, 0.5 - z / 3.0, (mean - np.exp(-z)) / z)
    return step_s * (mean - late), step_s * late, np.exp(-z)
