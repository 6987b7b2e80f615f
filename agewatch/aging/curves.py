"""Air temperature over time: one curve of straight pieces per location."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy.special import exp1

from agewatch.aging.kinetics import GAS_CONSTANT, REFERENCE_K, Floats, rate

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(5)
_BUCKETS_PER_KNOT = 2
_STEEP = 0.5
"""Change of Q/RT over a piece from which the closed form is used; below it five nodes are exact to 1e-11."""


@dataclass(frozen=True, slots=True)
class AirCurves:
    """Air of every location from the first leg to the horizon, readings joined by straight lines.

    Locations with fewer knots are padded at the end with knots that rise in time and repeat the last
    temperature.
    """

    knot_s: Floats
    """(n_locations, n_knots), seconds, strictly rising along each row."""
    air_k: Floats
    """(n_locations, n_knots), kelvin."""
    estimated: NDArray[np.bool_]
    """(n_locations, n_knots): the piece that begins here does not rest on readings."""
    guide: NDArray[np.intp] = field(init=False, repr=False)
    """(n_locations, n_buckets): the piece in which each bucket of time begins."""

    def __post_init__(self) -> None:
        n_knots = self.knot_s.shape[1]
        begin_s, bucket_s = self._buckets()
        edge_s = begin_s + bucket_s * np.arange(_BUCKETS_PER_KNOT * n_knots + 1)
        guide = np.stack([np.searchsorted(row, edge_s, side="right") for row in self.knot_s]) - 1
        object.__setattr__(self, "guide", np.clip(guide, 0, n_knots - 2))

    def _buckets(self) -> tuple[float, float]:
        begin_s = float(self.knot_s[:, 0].min())
        return begin_s, (float(self.knot_s.max()) - begin_s) / (_BUCKETS_PER_KNOT * self.knot_s.shape[1])

    def locate(self, location: NDArray[np.intp], at_s: Floats) -> NDArray[np.intp]:
        """Knot that begins the piece in which `at_s` lies, in the shape of `at_s`, with which `location` broadcasts.

        Times outside take the first or the last piece.
        """
        begin_s, bucket_s = self._buckets()
        n_buckets, n_knots = self.guide.shape[1], self.knot_s.shape[1]
        bucket = np.clip((at_s - begin_s) / bucket_s, 0, n_buckets - 1).astype(np.intp)
        piece = self.guide.reshape(-1).take(location * n_buckets + bucket)
        flat_s, base = self.knot_s.reshape(-1), location * n_knots + 1
        while True:
            passed = (flat_s.take(base + piece) <= at_s) & (piece < n_knots - 2)
            if not passed.any():
                return np.asarray(piece)
            piece += passed

    def at(self, location: NDArray[np.intp], at_s: Floats) -> Floats:
        """Air temperature, K, (n,)."""
        knot = self.locate(location, at_s)
        begin_s, end_s = self.knot_s[location, knot], self.knot_s[location, knot + 1]
        begin_k, end_k = self.air_k[location, knot], self.air_k[location, knot + 1]
        share = np.clip((at_s - begin_s) / (end_s - begin_s), 0.0, 1.0)
        return np.asarray(begin_k + (end_k - begin_k) * share)


def air_exposure_s(curves: AirCurves, activation_j_mol: float) -> Floats:
    """Equivalent age (s at 20 °C) that the air itself has gathered up to each knot, (n_locations, n_knots).

    Notes
    -----
    On a straight line of temperature the integral of `rate` is ``(T_ref/b) e^(q/T_ref) [E1(q/T)]``, q = Q/R,
    used where the line is steep; elsewhere five Gauss–Legendre nodes, since the closed form then cancels.
    """
    step_s = np.diff(curves.knot_s, axis=1)
    begin_k, rise_k = curves.air_k[:, :-1], np.diff(curves.air_k, axis=1)
    quotient_k = activation_j_mol / GAS_CONSTANT
    piece_s = np.zeros_like(step_s)
    for node, weight in zip(_NODES, _WEIGHTS, strict=True):
        piece_s += 0.5 * weight * rate(begin_k + rise_k * (0.5 + 0.5 * node), activation_j_mol)
    piece_s *= step_s
    steep = np.abs(quotient_k * rise_k / (begin_k * (begin_k + rise_k))) > _STEEP
    if steep.any():
        from_k, slope_k_s = begin_k[steep], rise_k[steep] / step_s[steep]
        to_k = from_k + rise_k[steep]
        change = exp1(quotient_k / to_k) - exp1(quotient_k / from_k)
        piece_s[steep] = REFERENCE_K / slope_k_s * np.exp(quotient_k / REFERENCE_K) * change
    return np.concatenate([np.zeros((len(step_s), 1)), np.cumsum(piece_s, axis=1)], axis=1)
