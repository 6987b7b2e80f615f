"""Rates: how much faster than at 20 °C a solute diffuses, and what that makes of time in store."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

GAS_CONSTANT = 8.314462618
"""J/(mol K), exact (SI 2019)."""
BOLTZMANN = 1.380649e-23
"""J/K, exact (SI 2019)."""
REFERENCE_K = 293.15
"""20 °C: equivalent age is counted at this temperature."""
INTERACTION_N_M2 = 3.0e-29
"""Solute and dislocation interaction A of Cottrell and Bilby, N·m²."""
DAY_S = 86400.0
HOUR_S = 3600.0
ZERO_C_K = 273.15


@dataclass(frozen=True, slots=True)
class Diffusivity:
    """D = `frequency_m2_s` · exp(−`activation_j_mol` / RT) of a solute in α-iron."""

    frequency_m2_s: float
    activation_j_mol: float

    def at(self, temperature_k: Floats | float) -> Floats:
        """D in m²/s at `temperature_k`, elementwise."""
        return np.asarray(
            self.frequency_m2_s * np.exp(-self.activation_j_mol / (GAS_CONSTANT * np.asarray(temperature_k)))
        )


DIFFUSIVITY = {
    "carbon": Diffusivity(2.0e-6, 84.1e3),
    "nitrogen": Diffusivity(3.0e-7, 76.1e3),
}
"""Carbon: Wert, Phys. Rev. 79 (1950) 601. Nitrogen: its counterpart as handbooks give it."""


def rate(temperature_k: Floats | float, activation_j_mol: Floats | float) -> Floats:
    """Seconds at 20 °C that one second at `temperature_k` (K, > 0) is worth; broadcasts, NaN stays NaN.

    Notes
    -----
    ``(T_ref/T) exp(−(Q/R)(1/T − 1/T_ref))``: diffusion to dislocations goes with ``D t / T`` (Cottrell and
    Bilby), so Hundy's relation follows with ``Q = H R ln 10``.

    References
    ----------
    Hundy, J. Iron Steel Inst. 178 (1954) 34; Cottrell and Bilby, Proc. Phys. Soc. A 62 (1949) 49.
    """
    temperature_k = np.asarray(temperature_k, dtype=np.float64)
    exponent = np.asarray(activation_j_mol) / GAS_CONSTANT * (1.0 / REFERENCE_K - 1.0 / temperature_k)
    return np.asarray(REFERENCE_K / temperature_k * np.exp(exponent))


def rate_slope(temperature_k: Floats, activation_j_mol: Floats | float) -> Floats:
    """d ln(rate)/dT in 1/K at `temperature_k`, elementwise."""
    return np.asarray((activation_j_mol / GAS_CONSTANT / temperature_k - 1.0) / temperature_k)


def hundy_activation_j_mol(slope_k: float) -> float:
    """Activation energy that Hundy's slope H (K) stands for: ``Q = H R ln 10``, J/mol."""
    return float(slope_k * GAS_CONSTANT * np.log(10.0))


def harper_tau_s(density_per_m2: Floats | float, solute: str) -> Floats:
    """Equivalent age (s at 20 °C) at which Harper's exponent reaches one, elementwise.

    Parameters
    ----------
    density_per_m2
        Dislocation density after temper rolling, 1/m² (> 0).
    solute
        A key of `DIFFUSIVITY`.

    Notes
    -----
    ``(x/τ)^(2/3) = 3 ρ (π/2)^(1/3) (A D_ref x / (k T_ref))^(2/3)``. Only its scaling is trusted: the absolute
    rate is a starting point until the plant's own tests fit it.

    References
    ----------
    Harper, Phys. Rev. 83 (1951) 709.
    """
    diffusivity = DIFFUSIVITY[solute].at(REFERENCE_K)
    drift_m2_s = INTERACTION_N_M2 * diffusivity / (BOLTZMANN * REFERENCE_K)
    lines_per_m2 = 3.0 * (np.pi / 2.0) ** (1.0 / 3.0) * np.asarray(density_per_m2, dtype=np.float64)
    return np.asarray(1.0 / (lines_per_m2**1.5 * drift_m2_s))
