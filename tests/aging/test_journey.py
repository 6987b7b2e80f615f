"""Journeys against scipy's integrator, coil by coil, and what must hold for any of them."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from agewatch.aging.curves import AirCurves
from agewatch.aging.journey import Journey, Legs
from agewatch.aging.kinetics import DAY_S, HOUR_S, Floats
from agewatch.aging.settled import SettledField
from tests.aging.oracle import follow, speed
from tests.aging.samples import BEGIN_S, CARBON_J_MOL, NITROGEN_J_MOL, curves_of, journeys, weather

ENERGIES = (NITROGEN_J_MOL, CARBON_J_MOL)
DAYS = 25.0
END_S = BEGIN_S + DAYS * DAY_S


def join(curves: AirCurves, legs: Legs, start_k: Floats) -> Journey:
    field = SettledField.of(curves, ENERGIES, legs.tau_s, float(legs.start_s.max()))
    channel = np.tile(np.array([1, 0]), (len(start_k), 1))
    return Journey.of(field, channel, legs, start_k, END_S)


def ages_at(journey: Journey, at_s: float) -> tuple[Floats, Floats]:
    coils = np.arange(len(journey.first_piece))
    when = np.full(len(coils), at_s)
    return journey.at(journey.piece_of(coils, when), when)


@pytest.mark.parametrize("irregular", [False, True])
def test_agrees_with_an_integrator(irregular: bool) -> None:
    """Coil temperature to 5 mK and equivalent age to 1e-4 for hot, cold and plain coils on the move.

    The oracle solves dT/dt = (T_air − T)/τ and dx/dt = rate(T) with scipy.integrate.solve_ivp (DOP853, 1e-10).
    """
    rng = np.random.default_rng(11 + irregular)
    curves = curves_of(*(weather(rng, DAYS, irregular=irregular) for _ in range(2)))
    legs, start_k = journeys(rng, 25, 2, DAYS)
    energies = np.tile([CARBON_J_MOL, NITROGEN_J_MOL], (25, 1))
    followed = follow(curves, legs, start_k, energies, END_S)
    journey = join(curves, legs, start_k)
    begins_s = legs.start_s[legs.first()]
    for at_s in (END_S - 0.5 * DAY_S, END_S - 3.3 * DAY_S):
        coil_k, exposure_s = ages_at(journey, at_s)
        for coil in np.flatnonzero(begins_s < at_s - DAY_S):
            true_k, true_s = followed.at(int(coil), at_s)
            assert coil_k[coil] == pytest.approx(true_k, abs=5e-3)
            assert exposure_s[coil] == pytest.approx(true_s, rel=1e-4)


def test_a_hot_coil_gains_weeks() -> None:
    """A coil at 60 °C put into 20 °C with τ = 25 h gains 20.4 d (carbon) and 15.1 d (nitrogen) of equivalent age.

    By adaptive quadrature of Hundy's relation along the exponential, scipy.integrate.quad.
    """
    hours = BEGIN_S + HOUR_S * np.arange(24 * DAYS + 1)
    curves = curves_of((hours, np.full(len(hours), 20.0)))
    legs = Legs(np.array([0, 1]), np.array([0, 0]), np.full(2, BEGIN_S), np.full(2, 25 * HOUR_S))
    _, exposure_s = ages_at(join(curves, legs, np.array([333.15, np.nan])), END_S)
    gained_h = [
        quad(
            lambda h, q=energy: speed(293.15 + 40.0 * np.exp(-h / 25.0), q) - 1.0, 0.0, 24 * DAYS, limit=500
        )[0]
        for energy in (CARBON_J_MOL, NITROGEN_J_MOL)
    ]
    assert np.divide(gained_h, 24.0) == pytest.approx([20.38, 15.08], abs=0.01)
    assert (exposure_s[0] - exposure_s[1]) / HOUR_S == pytest.approx(gained_h, rel=1e-4)


@given(seed=st.integers(0, 10_000), share=st.floats(0.05, 0.95))
@settings(max_examples=25, deadline=None)
def test_splitting_a_stay_changes_nothing(seed: int, share: float) -> None:
    """A leg cut in two at the same location gives the same coil and the same age."""
    rng = np.random.default_rng(seed)
    curves = curves_of(weather(rng, DAYS, irregular=False))
    start_k = np.array([rng.uniform(270.0, 345.0)])
    tau_s = np.full(2, rng.uniform(8.0, 50.0) * HOUR_S)
    cut_s = BEGIN_S + share * 0.8 * DAYS * DAY_S
    whole = Legs(np.zeros(1, dtype=np.intp), np.zeros(1, dtype=np.intp), np.array([BEGIN_S]), tau_s[:1])
    parts = Legs(np.zeros(2, dtype=np.intp), np.zeros(2, dtype=np.intp), np.array([BEGIN_S, cut_s]), tau_s)
    one, two = (ages_at(join(curves, legs, start_k), END_S) for legs in (whole, parts))
    assert two[0] == pytest.approx(one[0], abs=1e-6)
    assert two[1] == pytest.approx(one[1], rel=2e-5)


@given(seed=st.integers(0, 10_000), warmer_k=st.floats(0.1, 10.0))
@settings(max_examples=25, deadline=None)
def test_age_never_falls_and_warmth_never_helps(seed: int, warmer_k: float) -> None:
    """Equivalent age rises with time, and with warmer air it is never less."""
    rng = np.random.default_rng(seed)
    times_s, celsius = weather(rng, DAYS, irregular=True)
    legs, start_k = journeys(rng, 6, 1, DAYS)
    cool, warm = (join(curves_of((times_s, celsius + extra)), legs, start_k) for extra in (0.0, warmer_k))
    begins_s = legs.start_s[legs.first()]
    moments_s = np.linspace(begins_s.max() + HOUR_S, END_S, 30)
    ages = np.stack([ages_at(cool, at_s)[1] for at_s in moments_s])
    assert (np.diff(ages, axis=0) > 0).all()
    assert (ages_at(warm, END_S)[1] >= ages_at(cool, END_S)[1]).all()
