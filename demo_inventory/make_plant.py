"""Make the invented plant: `python demo_inventory/make_plant.py` writes the files beside this one, always the same.

All of it is invented: the works, its bays, its coils and its summer. The files are written as five different imagined
systems would write them, so that the settings in `plant.toml` have something to map.
"""

from __future__ import annotations

import csv
from datetime import UTC, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np

HERE = Path(__file__).parent
SEED = 20_260_708
ZONE = ZoneInfo("Europe/Prague")
START = datetime(2026, 7, 8, 4, 0, tzinfo=UTC)
"""Plant time at which the demo begins: the fourth day of the heat wave."""
HISTORY_DAYS = 95
AHEAD_DAYS = 12
"""Readings that the sensors will have taken while the demo runs: they count when plant time has reached them."""
COILS = 400

SENSORS = {
    "HALL-1": ("H1-door", "H1-roof"),
    "HALL-2": ("H2-mid",),
    "HALL-3": ("H3-west", "H3-mid", "H3-east"),
    "ANNEX": ("AX-mid",),
    "DOCK": ("DK-a", "DK-b"),
    "YARD": ("YD-mast",),
}
WARMER_C = {"HALL-1": 1.5, "HALL-2": 3.0, "HALL-3": 4.5, "ANNEX": -1.0, "DOCK": 0.5, "YARD": 0.0}
SWING = {"HALL-1": 0.55, "HALL-2": 0.45, "HALL-3": 0.7, "ANNEX": 0.25, "DOCK": 0.8, "YARD": 1.0}
SHARE_OF_COILS = (0.24, 0.20, 0.22, 0.16, 0.08, 0.10)

GRADES = ("batch-annealed-drawing", "bake-hardening", "hot-dip-drawing", "nitrogen-bearing", "stabilised")
GRADE_SHARE = (0.30, 0.27, 0.18, 0.12, 0.13)
TENSILE = ((175, 300, 0.21), (215, 340, 0.17), (170, 305, 0.20), (220, 340, 0.18), (140, 290, 0.24))
CHEMISTRY = (  # C, N, S, Ti, Nb, Al in wt %
    (0.020, 0.0030, 0.008, 0.0, 0.0, 0.040),
    (0.0025, 0.0020, 0.006, 0.004, 0.0, 0.045),
    (0.018, 0.0030, 0.008, 0.0, 0.0, 0.040),
    (0.035, 0.0090, 0.010, 0.0, 0.0, 0.004),
    (0.0025, 0.0025, 0.006, 0.060, 0.012, 0.035),
)
PARTS = ("hood-outer", "door-outer", "roof-panel", "floor-pan", "seat-frame", "tow-bracket")
PART_SHARE = (0.26, 0.24, 0.14, 0.18, 0.10, 0.08)


def main() -> None:
    rng = np.random.default_rng(SEED)
    hours = [START + timedelta(hours=h) for h in range(-24 * HISTORY_DAYS, 24 * AHEAD_DAYS + 1)]
    outside_c = _outside_air_c(rng, hours)
    readings = _readings(rng, hours, outside_c)
    _write_temperatures(readings)
    _write_outlook(rng, hours, outside_c)
    _write_coils(rng)


def _outside_air_c(rng: np.random.Generator, hours: list[datetime]) -> np.ndarray:
    """Season, weather that lasts about three days, the daily course, and ten hot days from 4 July on."""
    day = np.array([(at - START).total_seconds() / 86400.0 for at in hours])
    season_c = 17.5 - 10.0 * (1.0 - np.cos(2 * np.pi * (day + 10.0) / 365.0))
    season_c -= 0.055 * np.clip(-day, 0.0, None)
    weather_c = np.zeros(len(day))
    for step in range(1, len(day)):
        weather_c[step] = 0.986 * weather_c[step - 1] + rng.normal(0.0, 0.42)
    wave_c = 8.0 / ((1 + np.exp(-(day + 4.0) * 3.0)) * (1 + np.exp((day - 6.0) * 3.0)))
    local_hour = np.array([(at.hour + 2) % 24 for at in hours])
    course_c = (5.0 + 0.25 * wave_c) * np.cos(2 * np.pi * (local_hour - 15.5) / 24.0)
    return season_c + weather_c + wave_c + course_c


def _readings(
    rng: np.random.Generator, hours: list[datetime], outside_c: np.ndarray
) -> dict[str, list[tuple[datetime, float]]]:
    """What every sensor logged; H3-mid dies on the second hot day, DK-b sometimes tells nonsense."""
    slow_c = np.convolve(np.pad(outside_c, (23, 0), mode="edge"), np.full(24, 1 / 24), mode="valid")
    read: dict[str, list[tuple[datetime, float]]] = {}
    for location, sensors in SENSORS.items():
        air_c = slow_c + SWING[location] * (outside_c - slow_c) + WARMER_C[location]
        for sensor in sensors:
            offset_c, minute = rng.normal(0.0, 0.25), int(rng.integers(0, 60))
            logged = [
                (at + timedelta(minutes=minute), round(float(c + offset_c + e), 1))
                for at, c, e in zip(hours, air_c, rng.normal(0.0, 0.15, len(hours)), strict=True)
            ]
            if sensor == "H3-mid":
                logged = [one for one in logged if one[0] < START - timedelta(days=2, hours=13)]
            if sensor == "DK-b":
                for place in rng.integers(0, len(logged), 9):
                    logged[place] = (logged[place][0], float(rng.choice([-127.0, 850.0])))
            read[sensor] = logged
    return read


def _write_temperatures(readings: dict[str, list[tuple[datetime, float]]]) -> None:
    """The halls' logger writes a row a reading, in UTC; the yard's a column a sensor, in local time."""
    halls = [s for place in ("HALL-1", "HALL-2", "HALL-3", "ANNEX") for s in SENSORS[place]]
    rows = sorted((at, sensor, c) for sensor in halls for at, c in readings[sensor])
    table = [(f"{at:%Y-%m-%dT%H:%M:%SZ}", sensor, f"{c:.1f}".replace(".", ",")) for at, sensor, c in rows]
    _write("temperatures-halls.csv", ("TIME", "PROBE", "VALUE"), table, separator=";")

    outside = [s for place in ("DOCK", "YARD") for s in SENSORS[place]]
    by_hour: dict[datetime, dict[str, float]] = {}
    for sensor in outside:
        for at, c in readings[sensor]:
            by_hour.setdefault(at.replace(minute=0), {})[sensor] = c
    wide = [
        (f"{at.astimezone(ZONE):%d.%m.%Y %H:%M}", *(f"{by_hour[at][s]:.1f}" for s in outside))
        for at in sorted(by_hour)
    ]
    _write("temperatures-yard.csv", ("at", *outside), wide)


def _write_outlook(rng: np.random.Generator, hours: list[datetime], outside_c: np.ndarray) -> None:
    """A forecast of ten days for the yard and the hottest hall, as wrong as forecasts are."""
    slow_c = np.convolve(np.pad(outside_c, (23, 0), mode="edge"), np.full(24, 1 / 24), mode="valid")
    rows = []
    for location in ("HALL-3", "YARD"):
        error_c = 0.0
        for at, c, slow in zip(hours, outside_c, slow_c, strict=True):
            if START < at <= START + timedelta(days=10):
                error_c = 0.99 * error_c + rng.normal(0.0, 0.15)
                told_c = slow + SWING[location] * (c - slow) + WARMER_C[location] + error_c
                rows.append((f"{at:%Y-%m-%dT%H:%M:%SZ}", location, f"{told_c:.1f}"))
    _write("outlook.csv", ("at", "location", "celsius"), rows)


def _write_coils(rng: np.random.Generator) -> None:
    """The stock, its moves, its pressings and a few lab tests; some rows are bad on purpose."""
    coils, moves, presses = [], [], []
    places = tuple(SENSORS)
    for number in range(COILS):
        grade = int(rng.choice(len(GRADES), p=GRADE_SHARE))
        part = PARTS[int(rng.choice(len(PARTS), p=PART_SHARE))]
        age_days = float(rng.beta(1.2, 1.6) * 90.0 + 0.05)
        rolled = START - timedelta(days=age_days)
        place = places[int(rng.choice(len(places), p=SHARE_OF_COILS))]
        coil = f"V{71_000 + number * 3}"
        since = rolled + timedelta(hours=float(rng.uniform(0.5, 4.0)))
        if rng.random() < 0.3 and age_days > 4:
            first = places[int(rng.choice(len(places), p=SHARE_OF_COILS))]
            moves.append((coil, since, first))
            since = rolled + timedelta(days=float(rng.uniform(0.1, 0.9) * age_days))
            moves.append((coil, since, place))
        rp, rm, n = TENSILE[grade]
        silent = rng.random() < 0.2
        press = START + timedelta(days=float(rng.gamma(2.0, 9.0)) + 0.2) if rng.random() < 0.72 else None
        coils.append(
            {
                "COIL": coil,
                "GRADE": GRADES[grade],
                "TEMPERED": rolled,
                "PLACE": place,
                "PLACED": since,
                "HEAT": f"Q{4100 + number // 6}",
                "PARENT": "",
                "PART": "" if rng.random() < 0.02 else part,
                "STATE": "stored",
                "PRESSING": press if press is not None and rng.random() < 0.7 else None,
                "TEMPER_PCT": round(float(rng.normal(1.05, 0.15)), 2),
                "THICK": round(float(rng.choice([0.65, 0.7, 0.8, 1.0, 1.2])), 2),
                "WIDTH": int(rng.choice([1020, 1180, 1250, 1340, 1480])),
                "MASS": int(rng.uniform(7_500, 22_500)),
                "BORE": int(rng.choice([508, 610])),
                "COIL_TEMP": round(float(rng.uniform(35.0, 60.0)), 1) if rng.random() < 0.35 else None,
                "WRAPPED": "yes" if rng.random() < 0.3 else "no",
                "RP02": None if silent else round(float(rng.normal(rp, 4.0)), 1),
                "RM": None if silent else round(float(rng.normal(rm, 4.0)), 1),
                "N": None if silent else round(float(rng.normal(n, 0.006)), 3),
                **dict(zip(("C", "N_PCT", "S", "TI", "NB", "AL"), CHEMISTRY[grade], strict=True)),
            }
        )
        if press is not None and coils[-1]["PRESSING"] is None:
            presses.append((coil, press))
    _slit(coils)
    _spoil(coils)
    header = tuple(coils[0])
    _write("coils.csv", header, [tuple(_cell(row[name]) for name in header) for row in coils], separator=";")
    moves.append(("V71012", START - timedelta(days=3), "HALL-9"))
    _write(
        "moves.csv",
        ("coil_id", "at", "location"),
        [(coil, f"{at:%Y-%m-%dT%H:%M:%SZ}", place) for coil, at, place in sorted(moves)],
        bom=True,
    )
    rows = [(coil, f"{at.astimezone(ZONE):%d.%m.%Y %H:%M}") for coil, at in presses]
    rows.insert(17, ("V71051", "31.06.2026 06:00"))
    _write("presses.csv", ("Coil", "Slot"), rows)
    _write_lab(coils)


def _slit(coils: list[dict]) -> None:
    """Four coils were cut from others, a few weeks after these were temper rolled."""
    for child, parent in ((31, 30), (32, 30), (201, 200), (333, 332)):
        cut = coils[parent]["TEMPERED"] + (START - coils[parent]["TEMPERED"]) * 0.6
        coils[child] |= {
            name: coils[parent][name]
            for name in ("GRADE", "HEAT", "TEMPERED", "COIL_TEMP", "C", "N_PCT", "TI", "NB")
        }
        coils[child] |= {"PARENT": coils[parent]["COIL"], "PLACED": cut, "MASS": coils[parent]["MASS"] // 2}
        coils[child] |= {name: coils[parent][name] for name in ("RP02", "RM", "N", "S", "AL")}


def _spoil(coils: list[dict]) -> None:
    """Rows as they come when people and systems err."""
    coils[57]["GRADE"] = "hot-dip-drawin"
    coils[58]["PLACE"] = "HALL-7"
    coils[120]["MASS"] = -14_200
    coils[121]["TEMPERED"] = coils[121]["TEMPERED"].replace(year=2062)
    coils[250]["RP02"], coils[250]["RM"], coils[250]["N"] = 312.0, 175.0, 0.2
    coils.append(dict(coils[10], PLACE="DOCK"))


def _write_lab(coils: list[dict]) -> None:
    """Tensile tests of stored coils: most show no plateau, one does."""
    tested = [(coils[at]["COIL"], START - timedelta(days=days), ype) for at, days, ype in LAB]
    _write(
        "lab.csv",
        ("coil_id", "tested_at", "ype_pct", "direction"),
        [(coil, f"{at:%Y-%m-%dT%H:%M:%SZ}", ype, "transverse") for coil, at, ype in tested],
    )


LAB = ((3, 1.5, 0.0), (44, 2.0, 0.0), (90, 4.0, 0.31), (151, 6.0, 0.05), (260, 1.0, 0.0), (377, 9.0, 0.12))


def _cell(value: object) -> str:
    """As a system with decimal commas and local times without an offset writes it."""
    if value is None:
        return ""
    if isinstance(value, datetime):
        return f"{value.astimezone(ZONE):%Y-%m-%d %H:%M:%S}"
    return f"{value}".replace(".", ",") if isinstance(value, float) else str(value)


def _write(
    name: str, header: tuple[str, ...], rows: list[tuple], *, separator: str = ",", bom: bool = False
) -> None:
    path = HERE / name
    path.parent.mkdir(exist_ok=True)
    with path.open("w", encoding="utf-8-sig" if bom else "utf-8", newline="") as file:
        writer = csv.writer(file, delimiter=separator, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


if __name__ == "__main__":
    main()
