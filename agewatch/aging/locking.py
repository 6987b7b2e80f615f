"""Locking: how far solute has bound the dislocations, and the rise of yield stress that follows."""

from __future__ import annotations

import numpy as np

from agewatch.aging.kinetics import Floats


def locking_exponent(equivalent_age_s: Floats, tau_s: Floats, exponent: Floats) -> Floats:
    """g = Σ (x/τ)^m over channels.

    Parameters
    ----------
    equivalent_age_s, tau_s, exponent
        (n, n_channels); a channel that a grade lacks has τ = inf.

    Returns
    -------
    (n,), dimensionless.

    References
    ----------
    Cottrell and Bilby (1949) for m = 2/3; Harper (1951) for the saturation in `locked_fraction`.
    """
    locking = np.zeros(equivalent_age_s.shape[:-1])
    for channel in range(equivalent_age_s.shape[-1]):
        rows = np.isfinite(tau_s[..., channel])
        ratio = equivalent_age_s[..., channel][rows] / tau_s[..., channel][rows]
        locking[rows] += ratio ** exponent[..., channel][rows]
    return locking


def locked_fraction(locking: Floats) -> Floats:
    """f = 1 − exp(−g), elementwise."""
    return -np.expm1(-locking)


def locking_for_fraction(fraction: Floats) -> Floats:
    """g at which the fraction is reached; inf from a fraction of one on (it never is), 0 at or below none."""
    with np.errstate(divide="ignore"):
        return -np.log1p(-np.clip(fraction, 0.0, 1.0))
