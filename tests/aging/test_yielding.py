"""The flow curve: how long a plateau a rise of yield stress makes, and back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from agewatch.aging.yielding import FlowCurve

rp02s_mpa = st.floats(120, 260)
strengths_over_yield = st.floats(1.2, 2.2)
n_values = st.floats(0.12, 0.28)
plateaus_pct = st.floats(0, 8)


def flow(rp02_mpa: float = 175.0, rm_mpa: float = 300.0, n_value: float = 0.21) -> FlowCurve:
    return FlowCurve.of_certificate(np.array([rp02_mpa]), np.array([rm_mpa]), np.array([n_value]))


def test_the_curve_of_a_drawing_steel() -> None:
    """Rp0.2 175, Rm 300 and n 0.21 give K = 513.638 MPa and ε0 = 0.0059326 (computed by hand)."""
    assert flow().strength_mpa == pytest.approx(513.638, abs=5e-4)
    assert flow().pre_strain == pytest.approx(0.0059326, abs=5e-8)


@pytest.mark.parametrize(
    ("ype_pct", "rise_mpa"), [(0.0, 0.0), (0.1, 5.817), (0.2, 10.999), (0.5, 23.923), (1.0, 40.205)]
)
def test_rises_of_a_drawing_steel(ype_pct: float, rise_mpa: float) -> None:
    """A plateau of 0.1, 0.2, 0.5 and 1.0 % takes a rise of 5.8, 11.0, 23.9 and 40.2 MPa (computed by hand)."""
    assert flow().effective_rise_mpa(np.array([ype_pct])) == pytest.approx(rise_mpa, abs=6e-4)
    assert flow().ype_pct(np.array([rise_mpa])) == pytest.approx(ype_pct, abs=2e-5)


@given(rp02s_mpa, strengths_over_yield, n_values, plateaus_pct)
def test_plateau_and_rise_are_inverse(rp02_mpa: float, over: float, n_value: float, ype_pct: float) -> None:
    """The rise that a plateau needs makes that plateau, for any certificate."""
    curve = flow(rp02_mpa, rp02_mpa * over, n_value)
    assert curve.ype_pct(curve.effective_rise_mpa(np.array([ype_pct]))) == pytest.approx(ype_pct, abs=1e-9)


@given(rp02s_mpa, strengths_over_yield, n_values, plateaus_pct, st.floats(0.01, 2))
def test_a_longer_plateau_takes_a_higher_rise(
    rp02_mpa: float, over: float, n_value: float, ype_pct: float, more_pct: float
) -> None:
    """Rise and plateau grow together, from no plateau at no rise."""
    curve = flow(rp02_mpa, rp02_mpa * over, n_value)
    shorter, longer = curve.effective_rise_mpa(np.array([ype_pct, ype_pct + more_pct]))
    assert curve.effective_rise_mpa(np.array([0.0])) == pytest.approx(0.0, abs=1e-9)
    assert longer > shorter


@given(rp02s_mpa, strengths_over_yield, n_values)
def test_the_curve_meets_the_certificate(rp02_mpa: float, over: float, n_value: float) -> None:
    """At no strain it is at Rp0.2; its greatest load per original section, where necking begins, is Rm."""
    curve = flow(rp02_mpa, rp02_mpa * over, n_value)
    assert curve.strength_mpa * curve.pre_strain**n_value == pytest.approx(rp02_mpa, rel=1e-12)
    strain = np.linspace(0.5 * n_value, 1.5 * n_value, 20_001)
    assert np.max(curve.strength_mpa * strain**n_value * np.exp(-strain)) == pytest.approx(
        rp02_mpa * over, rel=1e-7
    )


@given(rp02s_mpa, strengths_over_yield, n_values, st.floats(0.5, 60))
def test_the_plateau_ends_on_the_unaged_curve(
    rp02_mpa: float, over: float, n_value: float, rise_mpa: float
) -> None:
    """A root finder on σ(ε) = Rp0.2 + Δσ finds the strain at which the plateau ends."""
    curve = flow(rp02_mpa, rp02_mpa * over, n_value)
    strength, start = float(curve.strength_mpa[0]), float(curve.pre_strain[0])

    def above(true_strain: float) -> float:
        return float(strength * (start + true_strain) ** n_value - rp02_mpa - rise_mpa)

    true_strain = brentq(above, 0.0, 5.0, xtol=1e-14)
    assert curve.ype_pct(np.array([rise_mpa])) == pytest.approx(100 * np.expm1(true_strain), rel=1e-8)
