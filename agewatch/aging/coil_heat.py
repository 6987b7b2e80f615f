"""Coil temperature: a coil follows the air of its store with a lag that its size sets."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from agewatch.aging.curves import AirCurves
from agewatch.aging.kinetics import Floats
from agewatch.aging.recurrence import run

STEEL_DENSITY_KG_M3 = 7850.0
STEEL_HEAT_J_KG_K = 460.0
"""Specific heat of low-carbon steel between 20 and 60 °C (common practice, no source)."""


def outer_diameter_m(mass_kg: Floats, width_m: Floats, bore_m: Floats) -> Floats:
    """Outer diameter (m) of a coil that is wound full, elementwise."""
    return np.sqrt(bore_m**2 + 4.0 * mass_kg / (np.pi * STEEL_DENSITY_KG_M3 * width_m))


def time_constant_s(
    mass_kg: Floats, width_m: Floats, bore_m: Floats, surface_w_m2k: Floats, lag_factor: Floats
) -> Floats:
    """First-order lag of a coil behind the air, s, elementwise.

    Parameters
    ----------
    surface_w_m2k
        Heat transfer of the surface, convection and radiation together.
    lag_factor
        λ: how much slower the hot spot of a stacked coil is than its mean.

    Notes
    -----
    ``τ = λ m c / (h A)``; A is both faces and the outer shell.
    """
    diameter_m = outer_diameter_m(mass_kg, width_m, bore_m)
    area_m2 = np.pi / 2.0 * (diameter_m**2 - bore_m**2) + np.pi * diameter_m * width_m
    return np.asarray(lag_factor * mass_kg * STEEL_HEAT_J_KG_K / (surface_w_m2k * area_m2))


def settled_temperature_k(curves: AirCurves, tau_s: Floats) -> Floats:
    """Temperature of coils that have stood at each location since its curve began.

    Parameters
    ----------
    tau_s
        Time constants, (n_classes,).

    Returns
    -------
    Kelvin, (n_knots, n_locations, n_classes), at the knots of `curves`.

    Notes
    -----
    Between knots the air is a straight line of slope b, for which ``dT/dt = (T_air − T)/τ`` is solved exactly:
    ``T(s) = T_air(s) − b τ + (T(0) − T_air(0) + b τ) exp(−s/τ)``.
    """
    settled_k = np.empty((*curves.air_k.T.shape, len(tau_s)))
    settled_k[0] = curves.air_k[:, :1]
    step_s = np.diff(curves.knot_s, axis=1)
    for begin, end in even_stretches(step_s):
        decay, share = _step_weights(step_s[:, begin], tau_s)
        air_k = curves.air_k[:, begin : end + 1].T[:, :, None]
        bring_k = air_k[1:] - air_k[:-1] * decay - np.diff(air_k, axis=0) * share
        settled_k[begin : end + 1] = run(settled_k[begin], decay, bring_k)
    return settled_k


def even_stretches(step_s: Floats) -> list[tuple[int, int]]:
    """Runs of steps (n_locations, n_steps) over which no location's step changes, as (first, behind the last)."""
    changes = np.flatnonzero(np.any(step_s[:, 1:] != step_s[:, :-1], axis=0)) + 1
    edges = [0, *changes.tolist(), step_s.shape[1]]
    return list(pairwise(edges))


def _step_weights(step_s: Floats, tau_s: Floats) -> tuple[Floats, Floats]:
    """exp(−h/τ) and τ(1 − exp(−h/τ))/h, (n_locations, n_classes)."""
    ratio = step_s[:, None] / tau_s
    return np.exp(-ratio), -np.expm1(-ratio) / ratio
