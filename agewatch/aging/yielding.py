"""Yielding: from the rise of yield stress to the length of the plateau, on the coil's own flow curve."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from agewatch.aging.kinetics import Floats


@dataclass(frozen=True, slots=True)
class FlowCurve:
    """σ = K (ε_0 + ε)^n of the unaged strip; true stress in MPa, true strain; arrays of one shape.

    Notes
    -----
    Considère's condition at the tensile strength gives ``K = R_m (e/n)^n``; ``ε_0 = (R_p0.2/K)^(1/n)`` puts
    yield where the certificate has it.
    """

    strength_mpa: Floats
    """K."""
    hardening: Floats
    """n."""
    rp02_mpa: Floats
    pre_strain: Floats
    """ε_0."""

    @classmethod
    def of_certificate(cls, rp02_mpa: Floats, rm_mpa: Floats, n_value: Floats) -> FlowCurve:
        strength_mpa = rm_mpa * (np.e / n_value) ** n_value
        return cls(strength_mpa, n_value, rp02_mpa, (rp02_mpa / strength_mpa) ** (1.0 / n_value))

    def ype_pct(self, effective_rise_mpa: Floats) -> Floats:
        """Plateau (%) that ends where the unaged curve meets the raised yield stress, elementwise."""
        meets_at = ((self.rp02_mpa + effective_rise_mpa) / self.strength_mpa) ** (1.0 / self.hardening)
        return 100.0 * np.expm1(meets_at - self.pre_strain)

    def effective_rise_mpa(self, ype_pct: Floats) -> Floats:
        """Rise (MPa) that gives a plateau of `ype_pct`, elementwise: the inverse of `ype_pct`."""
        strain = self.pre_strain + np.log1p(np.asarray(ype_pct) / 100.0)
        return np.asarray(self.strength_mpa * strain**self.hardening - self.rp02_mpa)
