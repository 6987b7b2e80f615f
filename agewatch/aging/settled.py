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

import numpy as np
from numpy.typing import NDArray

from agewatch.aging.coil_heat import relaxed_k, settled_temperature_k
from agewatch.aging.curves import AirCurves
from agewatch.aging.kinetics import GAS_CONSTANT, Floats, rate, rate_slope

Rows = NDArray[np.intp]

SERIES_TERMS = 5
SERIES_LIMIT_K = 5.0
"""Largest excess for which the series serves: its error is then below 1e-3 of what the excess adds."""
_CLASS_STEP = 0.2
"""Distance of neighbouring classes in ln τ."""
_STENCIL = 4


@dataclass(frozen=True, slots=True)
class ClassWeights:
    """Where coils stand between the classes: first class of the stencil (n,) and its weights (n, 4)."""

    first: Rows
    weight: Floats

    def take(self, rows: Rows) -> ClassWeights:
        return ClassWeights(self.first[rows], self.weight[rows])


@dataclass(frozen=True, slots=True)
class Moment:
    """Coils at one time each, (n,)."""

    coil_k: Floats
    exposure_s: Floats
    """Gathered since the curve began by a settled coil, less what the excess has still to add: its
    difference between two times of one leg is the equivalent age gathered between them."""


@dataclass(frozen=True, slots=True)
class SettledField:
    """Sums over the curves for every class and activation energy; see the module's text."""

    curves: AirCurves
    activation_j_mol: tuple[float, ...]
    class_tau_s: Floats
    settled_k: Floats
    """(n_knots, n_locations, n_classes)."""
    exposure_s: tuple[Floats, ...]
    """Per activation energy, shape of `settled_k`."""
    estimated_s: tuple[Floats, ...]
    """The part of `exposure_s` that rests on estimated air; empty when none is estimated."""
    series: tuple[NDArray[np.float32], ...]
    """Per activation energy, (n_knots, n_locations, n_classes, SERIES_TERMS), s/K^k."""

    @classmethod
    def of(cls, curves: AirCurves, activation_j_mol: tuple[float, ...], tau_s: Floats) -> SettledField:
        """Sum the curves once for coils whose time constants lie within those of `tau_s` (s, > 0)."""
        class_tau_s = tau_classes_s(tau_s)
        settled_k = settled_temperature_k(curves, class_tau_s)
        pieces = [_piece_exposure_s(curves, settled_k, class_tau_s, q) for q in activation_j_mol]
        estimated = curves.estimated.T[:-1, :, None]
        return cls(
            curves,
            activation_j_mol,
            class_tau_s,
            settled_k,
            tuple(_from_zero(piece) for piece in pieces),
            tuple(_from_zero(piece * estimated) for piece in pieces) if estimated.any() else (),
            tuple(_excess_series(curves, settled_k, class_tau_s, q) for q in activation_j_mol),
        )

    def weights(self, tau_s: Floats) -> ClassWeights:
        """Cubic Lagrange weights in ln τ; `tau_s` within the classes."""
        nodes = np.log(self.class_tau_s)
        place = (np.log(tau_s) - nodes[0]) / (nodes[1] - nodes[0])
        first = np.clip(np.floor(place).astype(np.intp) - 1, 0, len(nodes) - _STENCIL)
        u = place - first
        weight = np.stack(
            [
                (1 - u) * (2 - u) * (3 - u) / 6,
                u * (2 - u) * (3 - u) / 2,
                -u * (1 - u) * (3 - u) / 2,
                u * (1 - u) * (2 - u) / 6,
            ],
            axis=-1,
        )
        return ClassWeights(first, weight)

    def settled_at_k(self, location: Rows, at_s: Floats, tau_s: Floats, classes: ClassWeights) -> Floats:
        """U at `at_s`, K, (n,)."""
        knot = self.curves.locate(location, at_s)
        return self._settled_in_piece(location, knot, at_s, tau_s, classes)[2]

    def moment(
        self,
        channel: int,
        location: Rows,
        at_s: Floats,
        tau_s: Floats,
        classes: ClassWeights,
        excess_k: Floats,
    ) -> Moment:
        """State at `at_s` of coils with `excess_k` over the settled temperature (within SERIES_LIMIT_K).

        Parameters
        ----------
        channel
            Place in `activation_j_mol`.
        location, at_s, tau_s, excess_k
            (n,).
        """
        activation = self.activation_j_mol[channel]
        knot = self.curves.locate(location, at_s)
        row = knot * self.curves.air_k.shape[0] + location
        begin_k, begin_slope, settled_k, slope = self._settled_in_piece(location, knot, at_s, tau_s, classes)
        elapsed_s = np.clip(at_s - self.curves.knot_s[location, knot], 0.0, None)
        partial_s = _corrected_trapezoid_s(begin_k, settled_k, begin_slope, slope, elapsed_s, activation)
        exposure_s = _between_classes(self.exposure_s[channel], row, classes) + partial_s
        exposure_s = exposure_s - self._still_to_add_s(channel, location, knot, row, at_s, classes, excess_k)
        return Moment(settled_k + excess_k, exposure_s)

    def estimated_at_s(self, channel: int, location: Rows, at_s: Floats, classes: ClassWeights) -> Floats:
        """The part of a settled coil's exposure up to `at_s` that rests on estimated air, s, (n,)."""
        if not self.estimated_s:
            return np.zeros(len(at_s))
        knot, share = self._place(location, at_s)
        row = knot * self.curves.air_k.shape[0] + location
        begin = _between_classes(self.estimated_s[channel], row, classes)
        end = _between_classes(self.estimated_s[channel], row + self.curves.air_k.shape[0], classes)
        return begin + (end - begin) * share

    def _place(self, location: Rows, at_s: Floats) -> tuple[Rows, Floats]:
        knot = self.curves.locate(location, at_s)
        begin_s, end_s = self.curves.knot_s[location, knot], self.curves.knot_s[location, knot + 1]
        return knot, np.clip((at_s - begin_s) / (end_s - begin_s), 0.0, 1.0)

    def _settled_in_piece(
        self, location: Rows, knot: Rows, at_s: Floats, tau_s: Floats, classes: ClassWeights
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """U and dU/dt where the piece begins and at `at_s`."""
        curves = self.curves
        begin_s, begin_air_k = curves.knot_s[location, knot], curves.air_k[location, knot]
        air_slope = (curves.air_k[location, knot + 1] - begin_air_k) / (
            curves.knot_s[location, knot + 1] - begin_s
        )
        begin_k = _between_classes(self.settled_k, knot * curves.air_k.shape[0] + location, classes)
        elapsed_s = np.clip(at_s - begin_s, 0.0, None)
        settled_k = relaxed_k(begin_k, begin_air_k, air_slope, elapsed_s, tau_s)
        begin_slope = (begin_air_k - begin_k) / tau_s
        slope = (begin_air_k + air_slope * elapsed_s - settled_k) / tau_s
        return begin_k, begin_slope, settled_k, slope

    def _still_to_add_s(
        self,
        channel: int,
        location: Rows,
        knot: Rows,
        row: Rows,
        at_s: Floats,
        classes: ClassWeights,
        excess_k: Floats,
    ) -> Floats:
        """What the excess adds from `at_s` on, s: H_k by a straight line between knots."""
        to_add_s = np.zeros(len(at_s))
        felt = np.flatnonzero(np.abs(excess_k) > 1e-5)
        if not len(felt):
            return to_add_s
        location, knot, row, classes = location[felt], knot[felt], row[felt], classes.take(felt)
        begin_s, end_s = self.curves.knot_s[location, knot], self.curves.knot_s[location, knot + 1]
        share = np.clip((at_s[felt] - begin_s) / (end_s - begin_s), 0.0, 1.0)
        table = self.series[channel].reshape(-1, SERIES_TERMS)
        base = row * len(self.class_tau_s) + classes.first
        step = self.curves.air_k.shape[0] * len(self.class_tau_s)
        terms = np.zeros((len(felt), SERIES_TERMS))
        for k in range(_STENCIL):
            weight = classes.weight[:, k, None]
            terms += weight * ((1 - share)[:, None] * table[base + k] + share[:, None] * table[base + step + k])
        power = excess_k[felt, None] ** np.arange(1, SERIES_TERMS + 1)
        to_add_s[felt] = np.sum(terms * power, axis=1)
        return to_add_s


def tau_classes_s(tau_s: Floats) -> Floats:
    """Classes of time constant, evenly spaced in ln τ, that span `tau_s`; at least a stencil's worth."""
    low, high = (np.log(tau_s.min()), np.log(tau_s.max())) if len(tau_s) else (10.0, 10.0)
    count = max(_STENCIL, int(np.ceil((high - low) / _CLASS_STEP)) + 1)
    spread = max(high - low, 0.01)
    return np.asarray(np.exp(low + spread * np.arange(count) / (count - 1)))


def _between_classes(values: Floats, row: Rows, classes: ClassWeights) -> Floats:
    """`values` (n_knots, n_locations, n_classes) at flat (knot, location) rows, between classes."""
    flat = values.reshape(-1)
    base = row * values.shape[-1] + classes.first
    total = classes.weight[:, 0] * flat[base]
    for k in range(1, _STENCIL):
        total += classes.weight[:, k] * flat[base + k]
    return np.asarray(total)


def _from_zero(piece_s: Floats) -> Floats:
    total_s = np.zeros((len(piece_s) + 1, *piece_s.shape[1:]))
    np.cumsum(piece_s, axis=0, out=total_s[1:])
    return total_s


def _corrected_trapezoid_s(
    begin_k: Floats, end_k: Floats, begin_slope: Floats, end_slope: Floats, step_s: Floats, activation: float
) -> Floats:
    """∫ rate over a step from the ends' values and slopes (Euler–Maclaurin): error of fifth order in the step."""
    begin, end = rate(begin_k, activation), rate(end_k, activation)
    begin_rise = begin * rate_slope(begin_k, activation) * begin_slope
    end_rise = end * rate_slope(end_k, activation) * end_slope
    return np.asarray(step_s * (0.5 * (begin + end) + step_s / 12.0 * (begin_rise - end_rise)))


def _piece_exposure_s(curves: AirCurves, settled_k: Floats, tau_s: Floats, activation: float) -> Floats:
    """Exposure of settled coils over each piece, (n_knots − 1, n_locations, n_classes)."""
    step_s = np.diff(curves.knot_s, axis=1).T[:, :, None]
    slope = (curves.air_k.T[:, :, None] - settled_k) / tau_s
    return _corrected_trapezoid_s(settled_k[:-1], settled_k[1:], slope[:-1], slope[1:], step_s, activation)


def _excess_series(
    curves: AirCurves, settled_k: Floats, tau_s: Floats, activation: float
) -> NDArray[np.float32]:
    """H_k at the knots, by exact integration of a piecewise linear rate(U) L_k (−1/U)^k against exp(−ks/τ)."""
    density = _laguerre_terms(settled_k, activation)
    order = np.arange(1, SERIES_TERMS + 1)
    decay_per_s = order / tau_s[:, None]
    series = np.empty(density.shape, dtype=np.float32)
    running = density[-1] / decay_per_s
    series[-1] = running
    step_s = np.diff(curves.knot_s, axis=1)
    weights = None
    for knot in range(step_s.shape[1] - 1, -1, -1):
        if weights is None or not np.array_equal(step_s[:, knot], step_s[:, knot + 1]):
            weights = _decaying_weights(step_s[:, knot, None, None], decay_per_s)
        at_begin, at_end, decay = weights
        running = at_begin * density[knot] + at_end * density[knot + 1] + decay * running
        series[knot] = running
    return series


def _laguerre_terms(settled_k: Floats, activation: float) -> Floats:
    """rate(U) L_k(q/U) (−1/U)^k for k = 1 … SERIES_TERMS on a new last axis."""
    argument = activation / GAS_CONSTANT / settled_k
    terms = np.empty((*settled_k.shape, SERIES_TERMS))
    before, current = np.ones_like(argument), 1.0 - argument
    factor = rate(settled_k, activation)
    for k in range(1, SERIES_TERMS + 1):
        factor = factor * (-1.0 / settled_k)
        terms[..., k - 1] = factor * current
        before, current = current, ((2 * k + 1 - argument) * current - k * before) / (k + 1)
    return terms


def _decaying_weights(step_s: Floats, decay_per_s: Floats) -> tuple[Floats, Floats, Floats]:
    """Weights of both ends of a straight line against exp(−z s/h) over a step h, and exp(−z)."""
    z = step_s * decay_per_s
    mean = -np.expm1(-z) / z
    late = np.where(z < 1e-3, 0.5 - z / 3.0, (mean - np.exp(-z)) / z)
    return step_s * (mean - late), step_s * late, np.exp(-z)
