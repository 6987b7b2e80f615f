"""Rates against published diffusion data, Hundy's table, Harper's rate and mean kinetic temperatures.

"from memory" marks numbers that stand in the named work as remembered, without its text at hand.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp

from agewatch.aging.kinetics import (
    BOLTZMANN,
    DAY_S,
    DIFFUSIVITY,
    GAS_CONSTANT,
    HOUR_S,
    INTERACTION_N_M2,
    REFERENCE_K,
    Diffusivity,
    Floats,
    harper_tau_s,
    hundy_activation_j_mol,
    rate,
    rate_slope,
)

CARBON_J_MOL = 84.1e3
CALORIE_J = 4.184
YEAR_D = 365.25
MINUTE_D = 1 / 1440.0
HOUR_D = 1 / 24.0
ATOM_KG = 1.66053906660e-27
IRON_KG_M3 = 7870.0
CARBON_KG = 12.011 * ATOM_KG
PLANE_M = 2.48e-10
"""Distance of atomic planes along a dislocation of α-iron: its Burgers vector."""


def kelvin(celsius: float) -> float:
    return celsius + 273.15


def same_age_days(days: float, at_c: float, there_c: float, slope_k: float = 4400.0) -> float:
    """Days at `there_c` that age as `days` at `at_c`, with Hundy's H."""
    energy = hundy_activation_j_mol(slope_k)
    return float(days * rate(kelvin(at_c), energy) / rate(kelvin(there_c), energy))


@pytest.mark.parametrize(
    ("celsius", "m2_s"), [(20, 2.070e-21), (40, 1.875e-20), (100, 3.378e-18), (170, 2.446e-16)]
)
def test_carbon_diffuses_as_wert_measured(celsius: float, m2_s: float) -> None:
    """D of carbon in α-iron is Wert's within 1 % from room temperature to 170 °C (Phys. Rev. 79, 1950, 601)."""
    assert DIFFUSIVITY["carbon"].at(kelvin(celsius)) == pytest.approx(m2_s, rel=0.01)


def test_carbon_keeps_to_the_slope_of_wert() -> None:
    """log10 D falls by 4392.8 per 1/K, as Wert's 20 100 cal/mol say, within 0.1 %."""
    cold_k, hot_k = kelvin(20), kelvin(170)
    at = DIFFUSIVITY["carbon"].at
    slope_k = np.log10(at(hot_k) / at(cold_k)) / (1 / cold_k - 1 / hot_k)
    assert slope_k == pytest.approx(4392.8, rel=1e-3)
    assert pytest.approx(20_100 * CALORIE_J, rel=1e-3) == CARBON_J_MOL


@pytest.mark.parametrize("m2_s", [1.71e-21, 2.00e-21])
def test_carbon_agrees_with_other_fits(m2_s: float) -> None:
    """McLellan and Wasz, and Lord and Beshers (both from memory), give D of carbon at 20 °C within 20 % of it."""
    assert DIFFUSIVITY["carbon"].at(kelvin(20)) == pytest.approx(m2_s, rel=0.211)


@pytest.mark.parametrize(("celsius", "m2_s"), [(20, 8.271e-21), (40, 6.076e-20), (100, 6.678e-18)])
def test_nitrogen_diffuses_as_handbooks_give_it(celsius: float, m2_s: float) -> None:
    """D of nitrogen in α-iron follows 3e-7 m²/s and 76.1 kJ/mol (Wert, from memory)."""
    assert DIFFUSIVITY["nitrogen"].at(kelvin(celsius)) == pytest.approx(m2_s, rel=1e-3)


def test_nitrogen_agrees_with_bohnenkamp() -> None:
    """D of nitrogen at 20 °C lies within 5 % of Bohnenkamp's fit, 1.5e-2 cm²/s and 19.1 kcal/mol: 8.65e-21 m²/s."""
    other = Diffusivity(1.5e-6, 19.1e3 * CALORIE_J).at(kelvin(20))
    assert other == pytest.approx(8.65e-21, rel=0.01)
    assert DIFFUSIVITY["nitrogen"].at(kelvin(20)) == pytest.approx(other, rel=0.05)


@pytest.mark.parametrize(
    ("days", "elsewhere"),
    [
        (YEAR_D, {21: 6 * 30.44, 100: 4 * HOUR_D, 120: HOUR_D, 150: 10 * MINUTE_D}),
        (182.6, {21: 3 * 30.44, 100: 2 * HOUR_D, 120: 30 * MINUTE_D, 150: 5 * MINUTE_D}),
        (91.3, {21: 42, 100: HOUR_D, 120: 15 * MINUTE_D, 150: 2.5 * MINUTE_D}),
    ],
)
def test_hundys_table_is_met(days: float, elsewhere: dict[float, float]) -> None:
    """Hundy's rounded equals of a year, half and a quarter at 15 °C are met within 8.5 % (J. Iron Steel Inst. 178,
    1954, from memory)."""
    for celsius, table_days in elsewhere.items():
        assert same_age_days(days, 15, celsius) == pytest.approx(table_days, rel=0.085)


@pytest.mark.parametrize(
    ("days", "celsius", "table_days"),
    [
        (30.44, 21, 14),
        (30.44, 100, 20 * MINUTE_D),
        (30.44, 120, 5 * MINUTE_D),
        (7, 21, 4),
        (7, 100, 5 * MINUTE_D),
        (3, 21, 1.5),
        (3, 100, 2 * MINUTE_D),
    ],
)
def test_hundys_short_times_are_met(days: float, celsius: float, table_days: float) -> None:
    """Hundy's further rows are met as well as whole minutes and days allow: −8 to +15 % (1954, from memory)."""
    assert 0.915 < table_days / same_age_days(days, 15, celsius) < 1.155


def test_hundys_table_is_that_of_carbon() -> None:
    """With the slope of nitrogen the equals of a year at 15 °C are missed by a factor of about two and more."""
    for celsius, table_days in ((100, 4 * HOUR_D), (120, HOUR_D), (150, 10 * MINUTE_D)):
        assert same_age_days(YEAR_D, 15, celsius, slope_k=4000.0) > 1.9 * table_days


@pytest.mark.parametrize(
    ("days", "elsewhere"),
    [
        (365.25, {21: 182.0, 100: 3.77 / 24, 120: 59.9 / 1440, 150: 10.38 / 1440}),
        (182.625, {21: 91.0, 100: 1.89 / 24, 120: 30.0 / 1440, 150: 5.19 / 1440}),
        (91.3125, {21: 45.5, 100: 0.94 / 24, 120: 15.0 / 1440, 150: 2.60 / 1440}),
    ],
)
def test_hundys_relation_gives_its_figures(days: float, elsewhere: dict[float, float]) -> None:
    """The relation itself, H = 4400, gives its figures to the digits written."""
    for celsius, computed_days in elsewhere.items():
        assert same_age_days(days, 15, celsius) == pytest.approx(computed_days, rel=5e-3)


@pytest.mark.parametrize(
    ("slope_k", "celsius", "ratio", "within"),
    [
        (4400, 21, 2.01, 0.01),
        (4400, 100, 2323, 0.01),
        (4400, 120, 8775, 0.01),
        (4400, 150, 50_669, 0.01),
        (4000, 100, 1122, 0.005),
    ],
)
def test_ratios_of_times_follow_hundy(slope_k: float, celsius: float, ratio: float, within: float) -> None:
    """Time at 15 °C over the equal time elsewhere, by Hundy's relation with H from memory."""
    assert 1 / same_age_days(1.0, 15, celsius, slope_k) == pytest.approx(ratio, rel=within)


@given(st.floats(-20, 150), st.floats(3000, 6000))
def test_rate_is_hundys_relation(celsius: float, slope_k: float) -> None:
    """log10(t_r/t) = H(1/T_r − 1/T) − log10(T/T_r) for any temperature and slope."""
    here_k = kelvin(celsius)
    expected = slope_k * (1 / REFERENCE_K - 1 / here_k) - np.log10(here_k / REFERENCE_K)
    assert np.log10(rate(here_k, hundy_activation_j_mol(slope_k))) == pytest.approx(expected, abs=1e-11)


@pytest.mark.parametrize(("slope_k", "kj_mol"), [(4400, 84.24), (4000, 76.58)])
def test_hundys_slope_is_an_activation_energy(slope_k: float, kj_mol: float) -> None:
    """H = 4400 and 4000 K (from memory) stand for 84.24 and 76.58 kJ/mol, close to Wert's carbon and nitrogen."""
    assert hundy_activation_j_mol(slope_k) == pytest.approx(kj_mol * 1e3, abs=5)


@pytest.mark.parametrize(
    ("slope_k", "days"),
    [
        (4400, {15: 96.8, 20: 54.1, 25: 30.8, 30: 17.9, 35: 10.6, 40: 6.35, 50: 2.41}),
        (4000, {15: 46.7, 20: 27.6, 25: 16.6, 30: 10.1, 35: 6.28, 40: 3.96, 50: 1.64}),
    ],
)
def test_an_hour_at_100_c_is_so_many_days_in_store(slope_k: float, days: dict[float, float]) -> None:
    """Days in store equal to the test of one hour at 100 °C, computed by hand from Hundy's relation."""
    for celsius, expected in days.items():
        assert same_age_days(HOUR_D, 100, celsius, slope_k) == pytest.approx(expected, rel=5e-3)


@pytest.mark.parametrize(("days", "celsius", "hours"), [(91, 38, 11.7), (91, 30, 5.1), (183, 20, 3.4)])
def test_an_hour_at_100_c_does_not_cover_a_hot_store(days: float, celsius: float, hours: float) -> None:
    """Three months at 38 or 30 °C and six at 20 °C are far more than one hour at 100 °C (carbon)."""
    assert same_age_days(days, celsius, 100) * 24 == pytest.approx(hours, rel=0.02)


@pytest.mark.parametrize(
    ("celsius", "expected"),
    [
        (0, 0.0858),
        (10, 0.3061),
        (20, 1.0),
        (25, 1.7537),
        (30, 3.0182),
        (35, 5.1022),
        (40, 8.4798),
        (60, 55.4163),
        (100, 1281.89),
    ],
)
def test_rate_relative_to_20_c(celsius: float, expected: float) -> None:
    """A second at each temperature is worth so many at 20 °C (84.1 kJ/mol, with the factor T_ref/T)."""
    assert rate(kelvin(celsius), CARBON_J_MOL) == pytest.approx(expected, rel=6e-4)


@given(st.floats(-30, 120))
def test_rate_goes_with_diffusivity_over_temperature(celsius: float) -> None:
    """The rate is D/T over its value at 20 °C: 8.479 at 40 °C by Wert's data."""
    at = DIFFUSIVITY["carbon"].at
    here_k = kelvin(celsius)
    expected = at(here_k) / here_k / (at(REFERENCE_K) / REFERENCE_K)
    assert rate(here_k, CARBON_J_MOL) == pytest.approx(expected, rel=1e-12)
    assert rate(kelvin(40), CARBON_J_MOL) == pytest.approx(8.479, rel=5e-3)


@given(st.floats(-30, 120), st.floats(20e3, 150e3))
def test_rate_slope_is_the_derivative(celsius: float, energy: float) -> None:
    """`rate_slope` is the central difference of ln(rate)."""
    here_k = np.array([kelvin(celsius)])
    step_k = 1e-3
    difference = np.log(rate(here_k + step_k, energy) / rate(here_k - step_k, energy)) / (2 * step_k)
    assert rate_slope(here_k, energy) == pytest.approx(difference, rel=1e-6)


def test_missing_temperatures_stay_missing() -> None:
    """NaN goes through `rate` as NaN and spoils no neighbour."""
    assert np.isnan(rate(np.array([np.nan, 300.0]), CARBON_J_MOL)).tolist() == [True, False]


@pytest.mark.parametrize(("density", "days"), [(1e13, 3662), (5e13, 327.6), (1e14, 115.8)])
def test_harpers_tau(density: float, days: float) -> None:
    """τ of carbon at 20 °C by Harper's rate, computed by hand for three dislocation densities."""
    assert harper_tau_s(density, "carbon") / DAY_S == pytest.approx(days, rel=1e-3)


def harper_fraction(density: float, hours: float, celsius: float) -> float:
    """W = 1 − exp(−(x/τ)^(2/3)) after `hours` at `celsius`."""
    exposure_s = hours * HOUR_S * rate(kelvin(celsius), CARBON_J_MOL)
    return float(-np.expm1(-((exposure_s / harper_tau_s(density, "carbon")) ** (2 / 3))))


@pytest.mark.parametrize(
    ("hours", "celsius", "fractions"),
    [(1, 100, {1e13: 0.058, 3e13: 0.164, 1e14: 0.450}), (2190, 20, {1e13: 0.082, 3e13: 0.226, 1e14: 0.574})],
)
def test_harpers_fraction(hours: float, celsius: float, fractions: dict[float, float]) -> None:
    """Harper's fraction precipitated after an hour at 100 °C and a quarter at 20 °C (Phys. Rev. 83, 1951, 709;
    A = 3.0e-29 N·m² from memory)."""
    for density, expected in fractions.items():
        assert harper_fraction(density, hours, celsius) == pytest.approx(expected, rel=0.01)


def test_harpers_rate_is_the_integral_of_its_differential_equation() -> None:
    """Integrating dW/dt = (1 − W)·d/dt[3ρ(π/2)^⅓ (A D t/kT)^⅔] at 60 °C ends at the fraction that τ gives."""
    density, here_k, hours = 3e13, kelvin(60), 48.0
    drift = INTERACTION_N_M2 * DIFFUSIVITY["carbon"].at(here_k) / (BOLTZMANN * here_k)
    per_root = 3 * density * (np.pi / 2) ** (1 / 3) * drift ** (2 / 3)

    def growth(u: float, w: Floats) -> Floats:
        """dW/du over u = t^⅓, in which the rate is not singular at the start."""
        return per_root * 2 * u * (1 - w)

    found = solve_ivp(growth, (0, (hours * HOUR_S) ** (1 / 3)), [0.0], rtol=1e-10, atol=1e-12)
    assert found.y[0, -1] == pytest.approx(harper_fraction(density, hours, 60), rel=1e-7)


def test_harpers_prefactor() -> None:
    """3(π/2)^⅓ = 3.48734, seen through τ for a density at which all else cancels."""
    drift = INTERACTION_N_M2 * DIFFUSIVITY["carbon"].at(REFERENCE_K) / (BOLTZMANN * REFERENCE_K)
    prefactor = (harper_tau_s(1.0, "carbon") * drift) ** (-2 / 3)
    assert prefactor == pytest.approx(3.48734, rel=1e-5)


def atoms_per_plane(ppm_carbon: float, hours: float) -> float:
    """Atoms that reach a dislocation per plane at 20 °C by Cottrell and Bilby's law, before any saturation."""
    atoms_m3 = IRON_KG_M3 * ppm_carbon * 1e-6 / CARBON_KG
    gathered_m2 = (hours * HOUR_S / harper_tau_s(1.0, "carbon")) ** (2 / 3)
    return float(atoms_m3 * gathered_m2 * PLANE_M)


@pytest.mark.parametrize(("ppm", "hours"), [(30, 17.5), (20, 32.0), (10, 90.7), (3, 552.0)])
def test_cottrell_and_bilby_fill_each_plane_in_time(ppm: float, hours: float) -> None:
    """One atom per plane at 20 °C takes 17.5 h with 30 ppm of carbon, 552 h with 3 ppm (Proc. Phys. Soc. A 62,
    1949, 49; A from memory)."""
    assert atoms_per_plane(ppm, hours) ** -1.5 == pytest.approx(1.0, rel=0.02)


def test_time_to_fill_each_plane_goes_with_concentration() -> None:
    """A third of the carbon takes 5.196 times as long: the time goes with c^−1.5."""
    assert atoms_per_plane(10, 5.196152 * 17.5) == pytest.approx(atoms_per_plane(30, 17.5), rel=1e-6)


def test_carbon_of_one_atom_per_plane() -> None:
    """A density of 1e14 1/m² takes 1.02 ppm of carbon for one atom per plane (Automotive Steels, ch. 9)."""
    ppm = 1e14 / PLANE_M * CARBON_KG / IRON_KG_M3 * 1e6
    assert ppm == pytest.approx(1.02, rel=0.03)


@given(st.floats(1e11, 1e15), st.sampled_from(sorted(DIFFUSIVITY)))
def test_more_dislocations_lock_sooner(density: float, solute: str) -> None:
    """τ goes with ρ^−1.5, whatever the solute."""
    ratio = harper_tau_s(density, solute) / harper_tau_s(4 * density, solute)
    assert ratio == pytest.approx(8.0, rel=1e-9)


USP_J_MOL = 83.144e3
"""ΔH of USP <1079>: ΔH/R = 10 000 K."""


def mean_kinetic_c(mean_of_arrhenius: float) -> float:
    """The temperature whose rate, without the factor T_ref/T that USP's formula lacks, is this mean."""
    return 1 / (1 / REFERENCE_K - GAS_CONSTANT / USP_J_MOL * np.log(mean_of_arrhenius)) - 273.15


def arrhenius(celsius: float) -> float:
    here_k = kelvin(celsius)
    return float(rate(here_k, USP_J_MOL) * here_k / REFERENCE_K)


def test_mean_kinetic_temperature_of_two_levels() -> None:
    """Half the time at 10 and half at 30 °C is as 24.58 °C throughout (USP <1079>, from memory)."""
    assert mean_kinetic_c((arrhenius(10) + arrhenius(30)) / 2) == pytest.approx(24.58, abs=0.005)


def test_mean_kinetic_temperature_of_a_sine() -> None:
    """A sine of 20 ± 10 °C is as 22.53 °C throughout (USP <1079>, from memory)."""
    mean, _ = quad(lambda turn: arrhenius(20 + 10 * np.sin(2 * np.pi * turn)), 0, 1)
    assert mean_kinetic_c(mean) == pytest.approx(22.53, abs=0.005)


def test_mean_kinetic_temperature_of_a_pharmacy() -> None:
    """The worked example of a pharmacy (23 °C 200 h, 28 °C 20 h, 30 °C 8 h, 21 °C 300 h) gives 22.36 °C."""
    hours = {23: 200, 28: 20, 30: 8, 21: 300}
    mean = sum(h * arrhenius(celsius) for celsius, h in hours.items()) / sum(hours.values())
    assert mean_kinetic_c(mean) == pytest.approx(22.36, abs=0.01)
