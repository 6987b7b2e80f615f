"""The equations as they stand, solved by scipy's integrator from break to break: slow, and independent of the model."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.integrate import OdeSolution, solve_ivp

from agewatch.aging.curves import AirCurves
from agewatch.aging.journey import Legs
from agewatch.aging.kinetics import Floats

R_J_MOL_K = 8.314462618
T_REF_K = 293.15


def speed(temperature_k: Floats, energy_j_mol: Floats) -> Floats:
    """Equivalent age gathered in a second; none where the energy is NaN."""
    arrhenius = np.exp(-energy_j_mol / R_J_MOL_K * (1.0 / temperature_k - 1.0 / T_REF_K))
    return np.nan_to_num(T_REF_K / temperature_k * arrhenius, nan=0.0)


@dataclass(frozen=True)
class Followed:
    """Coils followed from leg to leg."""

    edge_s: Floats
    """All times at which any air or any coil's place changes, (n_edges,)."""
    coil_k: Floats
    """(n_edges, n_coils)."""
    exposure_s: Floats
    """(n_edges, n_coils, n_channels)."""
    between: list[OdeSolution]

    def at(self, coil: int, at_s: float) -> tuple[float, Floats]:
        """Temperature (K) and equivalent age (n_channels,) of a coil at any time."""
        step = int(np.clip(np.searchsorted(self.edge_s, at_s, side="right") - 1, 0, len(self.between) - 1))
        state = self.between[step](at_s - self.edge_s[step]).reshape(-1, self.coil_k.shape[1])
        return float(state[0, coil]), state[1:, coil]


def follow(
    curves: AirCurves, legs: Legs, start_k: Floats, energies_j_mol: Floats, until_s: float
) -> Followed:
    """Solve dT/dt = (T_air − T)/τ and dx/dt = speed(T) for all coils.

    Parameters
    ----------
    start_k
        (n_coils,); NaN: the coil starts as warm as the air.
    energies_j_mol
        (n_coils, n_channels); NaN: no such channel.
    """
    begins_s = np.array([legs.start_s[legs.coil == coil][0] for coil in range(len(start_k))])
    breaks_s = np.concatenate([curves.knot_s.ravel(), legs.start_s, [until_s]])
    edge_s = np.unique(breaks_s[(breaks_s >= begins_s.min()) & (breaks_s <= until_s)])
    energies = energies_j_mol.T
    coil_k = np.full((len(edge_s), len(start_k)), T_REF_K)
    exposure_s = np.zeros((len(edge_s), *energies.shape))
    between = []
    for step, (from_s, to_s) in enumerate(itertools.pairwise(edge_s)):
        leg = _present_leg(legs, from_s, len(start_k))
        air_k = _ends(curves, legs.location[leg], from_s, to_s)
        fresh = begins_s == from_s
        coil_k[step, fresh] = np.where(np.isnan(start_k), air_k[0], start_k)[fresh]
        slopes = _slopes(air_k, to_s - from_s, legs.tau_s[leg], energies, begins_s <= from_s)
        state = np.concatenate([coil_k[step], exposure_s[step].ravel()])
        found = solve_ivp(
            slopes, (0.0, to_s - from_s), state, method="DOP853", rtol=1e-10, atol=1e-9, dense_output=True
        )
        between.append(found.sol)
        end = found.y[:, -1].reshape(-1, len(start_k))
        coil_k[step + 1], exposure_s[step + 1] = end[0], end[1:]
    return Followed(edge_s, coil_k, exposure_s.transpose(0, 2, 1), between)


def _present_leg(legs: Legs, at_s: float, n_coils: int) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
    """Each coil's last leg that has begun, or its first."""
    first = np.searchsorted(legs.coil, np.arange(n_coils))
    begun = np.bincount(legs.coil[legs.start_s <= at_s], minlength=n_coils)
    return first + np.maximum(begun, 1) - 1


def _ends(curves: AirCurves, location: np.ndarray[tuple[int], np.dtype[np.intp]], *at_s: float) -> Floats:
    """Air (K) at some times where each coil is, (n_times, n_coils)."""
    air_k = np.array(
        [np.interp(at_s, knots, air) for knots, air in zip(curves.knot_s, curves.air_k, strict=True)]
    )
    return air_k.T[:, location]


def _slopes(
    air_k: Floats,
    step_s: float,
    tau_s: Floats,
    energies: Floats,
    begun: np.ndarray[tuple[int], np.dtype[np.bool_]],
) -> Callable[[float, Floats], Floats]:
    def slopes(elapsed_s: float, state: Floats) -> Floats:
        coil_k = state[: len(tau_s)]
        now_k = air_k[0] + (air_k[1] - air_k[0]) * (elapsed_s / step_s)
        change = np.where(begun, (now_k - coil_k) / tau_s, 0.0)
        gain = np.where(begun, speed(coil_k, energies), 0.0)
        return np.concatenate([change, gain.ravel()])

    return slopes
