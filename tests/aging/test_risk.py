"""Risk and quantiles against seeded brute force, and what must hold for any spreads."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from agewatch.aging.assess import Ahead, Now, Stock, now, return_quantiles_s, return_risk
from agewatch.aging.journey import Journey, Legs
from agewatch.aging.kinetics import DAY_S, HOUR_S, Floats
from agewatch.aging.risk import Needed, log_locking_levels, return_probability
from agewatch.aging.settled import SettledField
from agewatch.aging.steels import Spreads, Steels
from agewatch.aging.yielding import FlowCurve
from tests.aging.samples import BEGIN_S, CARBON_J_MOL, NITROGEN_J_MOL, curves_of, weather

DRAWS = 100_000
COILS = 200
NOW_S = BEGIN_S + 40 * DAY_S
HORIZON_S = BEGIN_S + 160 * DAY_S
RAISED_J_MOL = 2.5e3


def stock(seed: int, *, spread: float = 1.0, energy_spread: bool = False) -> Stock:
    """Coils of two kinds, half of them with two channels, in two places, with spreads scaled by `spread`."""
    rng = np.random.default_rng(seed)
    curves = curves_of(*(weather(rng, 160.0, irregular=False) for _ in range(2)))
    legs = Legs(
        np.arange(COILS),
        rng.integers(0, 2, COILS),
        BEGIN_S + rng.uniform(0, 38, COILS) * DAY_S,
        rng.uniform(12, 45, COILS) * HOUR_S,
    )
    energies = [CARBON_J_MOL, NITROGEN_J_MOL, CARBON_J_MOL + RAISED_J_MOL, NITROGEN_J_MOL + RAISED_J_MOL]
    field = SettledField.of(curves, tuple(energies), legs.tau_s, float(legs.start_s.max()))
    two = np.arange(COILS) % 2 == 1
    channel = np.where(two[:, None], [0, 1], [0, -1])
    start_k = np.where(rng.random(COILS) < 0.4, rng.uniform(308.0, 333.0, COILS), np.nan)
    steels = Steels(
        channel,
        np.where(channel >= 0, rng.uniform(80, 700, (COILS, 2)) * DAY_S, np.inf),
        np.full((COILS, 2), 2 / 3),
        np.where(two, 55.0, 42.0),
        np.full(COILS, 8.0),
        FlowCurve.of_certificate(
            rng.uniform(165, 190, COILS), rng.uniform(295, 315, COILS), rng.uniform(0.19, 0.22, COILS)
        ),
    )
    spreads = Spreads(
        spread * np.full((COILS, 2), 0.6),
        spread * np.full(COILS, 2.0),
        spread * np.full(COILS, 0.15),
        two.astype(int),
    )
    raised = np.where(channel >= 0, channel + 2, -1)
    return Stock(
        Journey.of(field, channel, legs, start_k, HORIZON_S),
        Journey.of(field, raised, legs, start_k, HORIZON_S) if energy_spread else None,
        steels,
        spreads,
        Ahead(np.array([0.0, HORIZON_S - NOW_S]), np.zeros((2, 2))),
        np.full(COILS, 0.2),
        NOW_S,
        HORIZON_S,
    )


def drawn_log_margin(stock_: Stock, coil: int, rng: np.random.Generator) -> tuple[Floats, Floats]:
    """For each draw the locking that the limit needs, and the factor on each channel's (x/τ)^m, (DRAWS, 2)."""
    needed = stock_.steels.needed_mpa(stock_.limit_pct)[coil]
    needed = needed + stock_.spreads.needed_mpa[coil] * rng.standard_normal(DRAWS)
    saturation = stock_.steels.saturation_mpa[coil] * np.exp(
        stock_.spreads.log_saturation[coil] * rng.standard_normal(DRAWS)
    )
    with np.errstate(divide="ignore"):
        locking = -np.log1p(-np.clip(needed / saturation, 0.0, 1.0))
    log_tau = stock_.spreads.log_tau[coil] * rng.standard_normal((DRAWS, 2))
    return locking, np.exp(-stock_.steels.exponent[coil] * log_tau)


def plain_terms(stock_: Stock, journey: Journey, coil: int, at_s: Floats) -> Floats:
    """(x/τ)^m of the medians at some times, (n, 2)."""
    rows = np.full(len(at_s), coil)
    exposure_s = journey.at(journey.piece_of(rows, at_s), at_s)[1]
    return (exposure_s / stock_.steels.tau_s[coil]) ** stock_.steels.exponent[coil]


@pytest.mark.parametrize("energy_spread", [False, True])
def test_agrees_with_brute_force(energy_spread: bool) -> None:
    """Risk is within 0.02 of 100,000 draws for 200 coils, and by the P10, P50 and P90 dates that share has returned.

    The dates are compared through the share of draws that have returned by then; the draws' own error is below 0.002.
    Energies are drawn normal, and x follows them log-linearly between the two energies that are summed.
    """
    coils = stock(5, energy_spread=energy_spread)
    state = now(coils)
    press_s = NOW_S + np.random.default_rng(6).uniform(1, 90, COILS) * DAY_S
    risk, dates_s = return_risk(coils, state, press_s), return_quantiles_s(coils, state)
    rng = np.random.default_rng(7)
    for coil in range(COILS):
        needed, factors = drawn_log_margin(coils, coil, rng)
        at_s = np.append(press_s[coil], dates_s[:, coil])
        told = np.append(risk[coil], [0.1, 0.5, 0.9])[~np.isnan(at_s)]
        at_s = at_s[~np.isnan(at_s)]
        terms = plain_terms(coils, coils.journey, coil, at_s)
        change = np.zeros_like(terms)
        if coils.raised is not None:
            with np.errstate(divide="ignore", invalid="ignore"):
                change = np.nan_to_num(np.log(plain_terms(coils, coils.raised, coil, at_s) / terms))
        z = rng.standard_normal(DRAWS)
        for place, share in enumerate(told):
            reached = np.sum(terms[place] * np.exp(z[:, None] * change[place]) * factors, axis=1) >= needed
            assert reached.mean() == pytest.approx(share, abs=0.02)


def test_without_spreads_the_three_dates_are_one() -> None:
    """P10 = P50 = P90, and the risk is none or certain."""
    coils = stock(8, spread=0.0)
    state = now(coils)
    p10_s, p50_s, p90_s = return_quantiles_s(coils, state)
    assert np.array_equal(p10_s, p50_s, equal_nan=True)
    assert np.array_equal(p50_s, p90_s, equal_nan=True)
    press_s = NOW_S + np.linspace(1, 100, COILS) * DAY_S
    expected = np.where(np.isnan(p50_s), False, p50_s <= press_s)
    assert np.array_equal(return_risk(coils, state, press_s), expected.astype(float))


def test_the_dates_keep_their_order_and_risk_rises() -> None:
    """P10 ≤ P50 ≤ P90, a later pressing is never less risky, and a stricter limit never returns later."""
    coils = stock(9)
    state: Now = now(coils)
    dates_s = np.nan_to_num(return_quantiles_s(coils, state), nan=np.inf)
    assert (dates_s[0] <= dates_s[1]).all()
    assert (dates_s[1] <= dates_s[2]).all()
    days = [return_risk(coils, state, np.full(COILS, NOW_S + day * DAY_S)) for day in (5, 30, 80)]
    assert (np.diff(days, axis=0) >= -1e-12).all()


@given(
    needed=st.floats(5.0, 60.0),
    spread=st.floats(0.0, 0.2),
    saturation=st.floats(25.0, 60.0),
    log_saturation=st.floats(0.0, 0.4),
    noise=st.floats(0.0, 0.8),
    probability=st.sampled_from([0.1, 0.5, 0.9]),
)
@settings(max_examples=150, deadline=None)
def test_levels_and_probabilities_are_inverse(
    needed: float, spread: float, saturation: float, log_saturation: float, noise: float, probability: float
) -> None:
    """At the level for a probability, that probability has returned; without any spread it is a step."""
    each = [np.array([value]) for value in (needed, spread * needed, saturation, log_saturation)]
    what = Needed(*each, np.zeros(1, dtype=np.intp))
    level = log_locking_levels(what, np.array([noise]), probability)
    if not np.isfinite(level[0]):
        return
    if spread + log_saturation + noise < 1e-4:
        assert return_probability(what.threshold(), level + 1e-3, np.array([noise])) == 1.0
        assert return_probability(what.threshold(), level - 1e-3, np.array([noise])) == 0.0
    else:
        assert return_probability(what.threshold(), level, np.array([noise])) == pytest.approx(
            probability, abs=0.01
        )
