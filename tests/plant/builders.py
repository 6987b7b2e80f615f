"""Small plants by hand."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from agewatch.plant.assess import assess
from agewatch.plant.assessment import Assessment, Verdict
from agewatch.plant.inventory import Coded, Inventory, OutlookRows, Readings
from agewatch.plant.settings import Settings

AT_S = 1_780_000_000.0
HOUR_S = 3600.0
DAY_S = 86_400.0
NUMBERS = (
    "temper_elongation_pct",
    "width_mm",
    "mass_kg",
    "bore_mm",
    "coil_temp_c",
    "rp02_mpa",
    "rm_mpa",
    "n_value",
    "c_pct",
    "n_pct",
    "s_pct",
    "ti_pct",
    "nb_pct",
    "al_pct",
    "lab_ype_pct",
)


def settings(**spreads: float) -> Settings:
    """Three grades, two bays with a sensor each and one without, three parts; exact unless spreads are given."""
    drawing = {
        "rp02_mpa": 175.0,
        "rm_mpa": 300.0,
        "n_value": 0.21,
        "rise_saturation_mpa": 45.0,
        "rise_saturation_spread": 0.0,
        "masking_mpa": 8.0,
        "channel": {"carbon": {"tau_days": 300.0, "tau_spread": spreads.get("tau_spread", 0.0)}},
    }
    return Settings.model_validate(
        {
            "site": {"name": "by hand"},
            "grade": {
                "drawing": drawing,
                "fitted": drawing | {"fitted": True},
                "stabilised": {"aging": False, "rp02_mpa": 140.0, "rm_mpa": 290.0, "n_value": 0.24},
            },
            "location": {
                "cool": {"sensors": ["T1"]},
                "warm": {"sensors": ["T2"]},
                "dark": {"sensors": ["T9"]},
            },
            "part": {
                "outer": {"ype_limit_pct": 0.2, "exposed": True},
                "inner": {"ype_limit_pct": 0.8},
                "hidden": {},
            },
            "outlook": {"horizon_days": 300},
        }
    )


def coils(rows: Sequence[dict], moves: Sequence[tuple[int, float, str]] = ()) -> Inventory:
    """Coils from rows that name what differs; `moves` as (row, days before now, location)."""
    count = len(rows)

    def days_ago(name: str, default: float) -> np.ndarray:
        return np.array([AT_S - DAY_S * row.get(name, default) for row in rows])

    ordered = sorted((row, AT_S - DAY_S * days, place) for row, days, place in moves)
    return Inventory(
        coil_id=np.array([f"C{n}" for n in range(count)], dtype=object),
        grade=Coded.of(row.get("grade", "drawing") for row in rows),
        location=Coded.of(row.get("location", "cool") for row in rows),
        part=Coded.of(row.get("part", "outer") for row in rows),
        temper_rolled_s=days_ago("rolled", 30.0),
        located_since_s=np.full(count, np.nan),
        press_s=np.array([AT_S + DAY_S * row.get("press", np.nan) for row in rows]),
        wrapped=np.array([row.get("wrapped", False) for row in rows]),
        **{name: np.array([row.get(name, np.nan) for row in rows], dtype=float) for name in NUMBERS},
        lab_tested_s=np.full(count, np.nan),
        move_coil=np.array([one[0] for one in ordered], dtype=np.int32),
        move_s=np.array([one[1] for one in ordered]),
        move_location=Coded.of(one[2] for one in ordered),
    )


def readings(cool_c: float = 20.0, warm_c: float = 35.0, days: float = 120.0) -> Readings:
    """Hourly readings of both sensors, constant."""
    at_s = np.arange(AT_S - days * DAY_S, AT_S + 1.0, HOUR_S)
    return Readings(
        Coded(np.repeat(np.arange(2, dtype=np.int32), len(at_s)), ("T1", "T2")),
        np.tile(at_s, 2),
        np.repeat([cool_c, warm_c], len(at_s)),
    )


NO_OUTLOOK = OutlookRows(Coded.of([]), np.empty(0), np.empty(0))


def assessed(
    rows: Sequence[dict],
    moves: Sequence[tuple[int, float, str]] = (),
    *,
    known: Readings | None = None,
    by: Settings | None = None,
) -> Assessment:
    return assess(
        coils(rows, moves),
        readings() if known is None else known,
        NO_OUTLOOK,
        by or settings(),
        "digest",
        AT_S,
    )


def verdicts(found: Assessment) -> list[str]:
    return [Verdict(code).word for code in found.verdict]
