"""Invented stocks of any size for the benchmarks, all from a seed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from agewatch.plant.inventory import Coded, Inventory, OutlookRows, Readings
from agewatch.plant.settings import Settings

DAY_S = 86400.0
AT_S = 1_785_000_000.0
"""A summer's day of 2026."""


@dataclass(frozen=True, slots=True)
class Plant:
    """What an assessment needs."""

    inventory: Inventory
    readings: Readings
    outlook: OutlookRows
    settings: Settings

    @property
    def coils(self) -> int:
        return len(self.inventory)


def plant(
    coils: int,
    *,
    locations: int = 10,
    past_days: float = 90.0,
    legs: float = 1.3,
    warm: float = 0.3,
    spreads: bool = True,
    seed: int = 1,
) -> Plant:
    """A stock of coils of four grades and three parts with hourly readings.

    Parameters
    ----------
    legs
        Mean number of stays of a coil.
    warm
        Share of coils that come to the store between 35 and 60 °C.
    spreads
        Grades known as well as starting points are; else exactly.
    """
    rng = np.random.default_rng(seed)
    settings = _settings(locations, spreads)
    return Plant(
        _inventory(rng, coils, settings, past_days, legs, warm),
        _readings(rng, locations, past_days),
        OutlookRows(Coded.of([]), np.empty(0), np.empty(0)),
        settings,
    )


def _settings(locations: int, spreads: bool) -> Settings:
    def grade(tau_days: float, *, nitrogen: bool = False, aging: bool = True) -> dict[str, object]:
        spread = {"tau_spread": 0.6 if spreads else 0.0}
        channel = {"carbon": {"activation_kj_mol": 84.1, "tau_days": tau_days, **spread}}
        if nitrogen:
            channel["nitrogen"] = {"activation_kj_mol": 76.1, "tau_days": 150.0, **spread}
        return {
            "aging": aging,
            "rp02_mpa": 175.0,
            "rm_mpa": 300.0,
            "n_value": 0.21,
            "rise_saturation_mpa": 45.0,
            "rise_saturation_spread": 0.15 if spreads else 0.0,
            "masking_mpa": 8.0,
            "masking_spread_mpa": 2.0 if spreads else 0.0,
            "channel": channel,
        }

    return Settings.model_validate(
        {
            "site": {"name": "bench"},
            "location": {
                f"B{n:03d}": {"sensors": [f"T{n:03d}"], "surface_w_m2k": 5.0 + n % 4}
                for n in range(locations)
            },
            "grade": {
                "drawing": grade(330.0),
                "bake-hardening": grade(250.0),
                "nitrogen-bearing": grade(500.0, nitrogen=True),
                "stabilised": grade(330.0, aging=False),
            },
            "part": {
                "outer": {"ype_limit_pct": 0.2, "exposed": True},
                "inner": {"ype_limit_pct": 0.8},
                "bracket": {},
            },
            "outlook": {
                "monthly_normals_c": [2.0, 3.0, 7.0, 12.0, 17.0, 21.0, 23.0, 22.0, 18.0, 12.0, 6.0, 3.0]
            },
        }
    )


def _inventory(
    rng: np.random.Generator, coils: int, settings: Settings, past_days: float, legs: float, warm: float
) -> Inventory:
    def some(low: float, high: float, share: float = 1.0) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        return np.where(rng.random(coils) < share, rng.uniform(low, high, coils), np.nan)

    rolled_s = AT_S - DAY_S * rng.uniform(0.05, past_days - 1.0, coils)
    places = tuple(settings.location)
    location = rng.integers(0, len(places), coils)
    moved = np.sort(rng.integers(0, coils, int(coils * (legs - 1.0))))
    from_s = rolled_s[moved] + rng.random(len(moved)) * (AT_S - rolled_s[moved])
    first = np.unique(moved)
    move_coil = np.concatenate([first, moved])
    move_s = np.concatenate([rolled_s[first], from_s])
    move_location = np.concatenate([rng.integers(0, len(places), len(first)), location[moved]])
    order = np.lexsort((move_s, move_coil))
    nothing = np.full(coils, np.nan)
    return Inventory(
        coil_id=np.array([f"C{n:07d}" for n in range(coils)], dtype=object),
        grade=Coded(rng.choice(4, coils, p=[0.4, 0.3, 0.1, 0.2]).astype(np.int32), tuple(settings.grade)),
        location=Coded(location.astype(np.int32), places),
        part=Coded(rng.integers(0, 3, coils).astype(np.int32), tuple(settings.part)),
        temper_rolled_s=rolled_s,
        located_since_s=nothing,
        press_s=AT_S + DAY_S * some(0.0, 60.0, 0.6),
        temper_elongation_pct=some(0.7, 1.5),
        width_mm=some(950.0, 1600.0),
        mass_kg=some(8000.0, 23_000.0),
        bore_mm=some(508.0, 610.0),
        coil_temp_c=some(35.0, 60.0, warm),
        wrapped=rng.random(coils) < 0.3,
        rp02_mpa=some(165.0, 185.0, 0.7),
        rm_mpa=some(290.0, 310.0, 0.7),
        n_value=some(0.19, 0.22, 0.7),
        c_pct=nothing,
        n_pct=nothing,
        s_pct=nothing,
        ti_pct=nothing,
        nb_pct=nothing,
        al_pct=nothing,
        lab_ype_pct=nothing,
        lab_tested_s=nothing,
        move_coil=move_coil[order].astype(np.int32),
        move_s=move_s[order],
        move_location=Coded(move_location[order].astype(np.int32), places),
    )


def _readings(rng: np.random.Generator, locations: int, past_days: float) -> Readings:
    at_s = np.arange(AT_S - past_days * DAY_S, AT_S, 3600.0)
    day = (at_s % DAY_S) / DAY_S
    season_c = 18.0 + 6.0 * np.sin(2 * np.pi * (at_s / (365.25 * DAY_S) - 0.3))
    celsius = [
        season_c + rng.uniform(-2, 2) - 3.5 * np.cos(2 * np.pi * (day - 0.1)) + rng.normal(0, 0.6, len(at_s))
        for _ in range(locations)
    ]
    sensors = Coded(
        np.repeat(np.arange(locations, dtype=np.int32), len(at_s)),
        tuple(f"T{n:03d}" for n in range(locations)),
    )
    return Readings(sensors, np.tile(at_s, locations), np.concatenate(celsius))
