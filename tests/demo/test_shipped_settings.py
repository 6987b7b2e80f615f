"""The settings that ship in config/."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from agewatch.aging.kinetics import DAY_S
from agewatch.plant.assess import assess
from agewatch.plant.inventory import Coded, Inventory, OutlookRows, Readings
from agewatch.plant.settings import Settings
from agewatch.plant.settings_file import load_settings

CONFIG = Path(__file__).parents[2] / "config"
AT_S = 1_780_000_000.0
HORIZON_DAYS = 900.0


@pytest.fixture(scope="module")
def settings() -> Settings:
    return load_settings(CONFIG / "plant.toml").settings


def test_every_grade_is_a_wide_starting_point(settings: Settings) -> None:
    """No shipped grade claims to be fitted, each says so, and ln τ is spread by at least 0.6."""
    assert len(settings.grade) == 8
    for grade in settings.grade.values():
        assert not grade.fitted
        assert grade.source == "starting point"
        assert all(channel.tau_spread >= 0.6 for channel in grade.channel.values())


def test_the_table_of_returns_is_what_the_model_gives(settings: Settings) -> None:
    """The days to return at a constant 20 °C that grades.toml tells are the model's, within 3 %.

    Coils at 20 °C with an exposed part and a silent certificate, just temper rolled.
    """
    told = {
        name: (float(p10), float(p50))
        for name, p10, p50 in re.findall(
            r"^#   ([\w-]+) +(\d+) +(\d+)$",
            (CONFIG / "grades.toml").read_text(encoding="utf-8"),
            re.MULTILINE,
        )
    }
    grades = tuple(settings.grade)
    assert set(told) == set(grades) - {"stabilised"}
    days = _days_to_return_at_20_c(settings)
    for row, name in enumerate(grades):
        if name == "stabilised":
            assert np.isnan(days[:, row]).all()
        else:
            assert days[:, row] == pytest.approx(told[name], rel=0.03)


def _days_to_return_at_20_c(settings: Settings) -> np.ndarray:
    """P10 and P50, (2, n_grades)."""
    settings = settings.model_copy(
        update={"outlook": settings.outlook.model_copy(update={"horizon_days": HORIZON_DAYS})}
    )
    count = len(settings.grade)
    nothing = np.full(count, np.nan)
    names = ("rp02_mpa", "rm_mpa", "n_value", "c_pct", "n_pct", "s_pct", "ti_pct", "nb_pct", "al_pct")
    alike = np.zeros(count, dtype=np.int32)
    coils = Inventory(
        coil_id=np.array([f"C{n}" for n in range(count)], dtype=object),
        grade=Coded(np.arange(count, dtype=np.int32), tuple(settings.grade)),
        location=Coded(alike, tuple(settings.location)),
        part=Coded(alike, ("exposed-panel",)),
        temper_rolled_s=np.full(count, AT_S - 1.0),
        located_since_s=nothing,
        press_s=nothing,
        temper_elongation_pct=nothing,
        width_mm=nothing,
        mass_kg=nothing,
        bore_mm=nothing,
        coil_temp_c=nothing,
        wrapped=np.zeros(count, dtype=np.bool_),
        **dict.fromkeys(names, nothing),
        lab_ype_pct=nothing,
        lab_tested_s=nothing,
        move_coil=np.empty(0, dtype=np.int32),
        move_s=np.empty(0),
        move_location=Coded.of([]),
    )
    sensor = next(iter(settings.location.values())).sensors[0]
    readings = Readings(
        Coded(np.zeros(2, dtype=np.int32), (sensor,)), AT_S - np.array([3600.0, 0.0]), np.full(2, 20.0)
    )
    hours = AT_S + 3600.0 * np.arange(1, HORIZON_DAYS * 24 + 2)
    outlook = OutlookRows(
        Coded(np.zeros(len(hours), dtype=np.int32), tuple(settings.location)[:1]),
        hours,
        np.full(len(hours), 20.0),
    )
    found = assess(coils, readings, outlook, settings, "", AT_S)
    return (np.stack([found.return_p10_s, found.return_p50_s]) - AT_S) / DAY_S
