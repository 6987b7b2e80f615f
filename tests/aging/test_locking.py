"""Locking of dislocations: the law of growth with saturation, and its inverse."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import weibull_min

from agewatch.aging.kinetics import Floats
from agewatch.aging.locking import locked_fraction, locking_exponent, locking_for_fraction

ages = st.floats(0, 1e4)
taus = st.floats(1, 1e4)
exponents = st.floats(0.15, 1.0)


def fraction(ages: list[float], taus: list[float], exponents: list[float]) -> Floats:
    """f of one coil with as many channels as numbers are given."""
    return locked_fraction(locking_exponent(np.array([ages]), np.array([taus]), np.array([exponents])))


@given(ages, taus, exponents)
def test_one_channel_is_avramis_law(age: float, tau: float, exponent: float) -> None:
    """f of one channel is the Johnson–Mehl–Avrami–Kolmogorov law, which scipy knows as a Weibull distribution."""
    expected = weibull_min.cdf(age, exponent, scale=tau)
    assert fraction([age], [tau], [exponent]) == pytest.approx(expected, rel=1e-12, abs=1e-300)


@given(taus, exponents)
def test_tau_locks_the_same_share_for_any_exponent(tau: float, exponent: float) -> None:
    """At x = τ the share 1 − 1/e = 0.6321 is locked."""
    assert fraction([tau], [tau], [exponent]) == pytest.approx(0.6321, abs=5e-5)


def test_early_locking_goes_with_two_thirds() -> None:
    """Far from saturation a thousandth of the time gives a hundredth of the locking (Cottrell and Bilby, 1949)."""
    early, later = fraction([1e-6], [1.0], [2 / 3]), fraction([1e-3], [1.0], [2 / 3])
    assert later / early == pytest.approx(100, rel=0.01)


@given(ages, taus, exponents, ages, taus, exponents)
def test_channels_add_their_locking(
    first: float, tau_1: float, m_1: float, second: float, tau_2: float, m_2: float
) -> None:
    """What two channels leave unlocked is the product of what each leaves."""
    both = fraction([first, second], [tau_1, tau_2], [m_1, m_2])
    alone = (1 - fraction([first], [tau_1], [m_1])) * (1 - fraction([second], [tau_2], [m_2]))
    assert 1 - both == pytest.approx(alone, rel=1e-9, abs=1e-12)


@given(ages, taus, exponents)
def test_an_absent_channel_adds_nothing(age: float, tau: float, exponent: float) -> None:
    """A channel with τ = inf leaves the other as it is; a coil with none is never locked."""
    assert fraction([age, age], [tau, np.inf], [exponent, 1.0]) == fraction([age], [tau], [exponent])
    assert fraction([age], [np.inf], [1.0]) == 0.0


@given(ages, st.floats(0, 1e3), taus, exponents)
def test_locking_grows_with_age(age: float, more: float, tau: float, exponent: float) -> None:
    """Age never unlocks, and the share stays between none and all."""
    now, later = fraction([age], [tau], [exponent])[0], fraction([age + more], [tau], [exponent])[0]
    assert 0.0 <= now <= later <= 1.0


@given(ages, taus, st.floats(1, 10), exponents)
def test_a_faster_steel_locks_more(age: float, tau: float, slower: float, exponent: float) -> None:
    """A longer τ never locks more at the same age."""
    assert fraction([age], [tau], [exponent])[0] >= fraction([age], [tau * slower], [exponent])[0]


@given(st.floats(1e-12, 0.999999))
def test_fraction_and_exponent_are_inverse(share: float) -> None:
    """The locking that a fraction needs gives that fraction."""
    assert locked_fraction(locking_for_fraction(np.array([share]))) == pytest.approx(share, rel=1e-9)


def test_what_cannot_be_reached_is_infinitely_far() -> None:
    """A fraction of one or more needs infinite locking, none or less needs none."""
    needed = locking_for_fraction(np.array([1.0, 1.7, 0.0, -0.2]))
    assert needed.tolist() == [np.inf, np.inf, 0.0, 0.0]
