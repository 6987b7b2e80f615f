"""What coils are made of, as the model needs it, and how surely that is known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from agewatch.aging.kinetics import Floats
from agewatch.aging.locking import locked_fraction, locking_exponent
from agewatch.aging.settled import Rows
from agewatch.aging.yielding import FlowCurve


@dataclass(frozen=True, slots=True)
class Steels:
    """Medians of each coil's steel; arrays (n_coils,) or (n_coils, n_channels)."""

    channel: Rows
    """Place of each channel's activation energy in the field; -1: the grade has no such channel."""
    tau_s: Floats
    """inf where there is no channel, and for grades that do not age."""
    exponent: Floats
    saturation_mpa: Floats
    masking_mpa: Floats
    flow: FlowCurve

    def locking(self, exposure_s: Floats) -> Floats:
        """g of every coil at its equivalent age (n_coils, n_channels), (n_coils,)."""
        return locking_exponent(exposure_s, self.tau_s, self.exponent)

    def rise_mpa(self, exposure_s: Floats) -> Floats:
        """Δσ = Δσ_sat f, MPa, (n_coils,)."""
        return self.saturation_mpa * locked_fraction(self.locking(exposure_s))

    def ype_pct(self, rise_mpa: Floats) -> Floats:
        """Plateau (%) of a rise of which the residual stress of temper rolling masks the first part, (n_coils,)."""
        return self.flow.ype_pct(np.maximum(0.0, rise_mpa - self.masking_mpa))

    def needed_mpa(self, limit_pct: Floats) -> Floats:
        """Rise at which the plateau reaches `limit_pct`, MPa, (n_coils,); NaN limit: NaN."""
        return self.flow.effective_rise_mpa(limit_pct) + self.masking_mpa

    def take(self, coil: Rows) -> Steels:
        """The steels of some coils."""
        flow = FlowCurve(
            self.flow.strength_mpa[coil],
            self.flow.hardening[coil],
            self.flow.rp02_mpa[coil],
            self.flow.pre_strain[coil],
        )
        return Steels(
            self.channel[coil],
            self.tau_s[coil],
            self.exponent[coil],
            self.saturation_mpa[coil],
            self.masking_mpa[coil],
            flow,
        )


@dataclass(frozen=True, slots=True)
class Spreads:
    """Standard deviations of each coil's steel, (n_coils,) or (n_coils, n_channels)."""

    log_tau: Floats
    """Of ln τ, each channel by itself."""
    needed_mpa: Floats
    """Of the needed rise: masking, and certificate values that the grade stands in for."""
    log_saturation: Floats
    kind: Rows
    """Coils of one kind share their saturation and all spreads."""
