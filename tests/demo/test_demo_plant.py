"""The invented plant of the demo."""

from __future__ import annotations

import runpy
import shutil
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from agewatch.assemble import AssessedOnce, assess_once, open_plant
from agewatch.clock import ReplayClock
from agewatch.daemon.feeds import past_until_s, read_feeds
from agewatch.plant.assessment import Verdict
from agewatch.plant.settings_file import LoadedSettings
from agewatch.store import open_store, queries

DEMO = Path(__file__).parents[2] / "demo_inventory"


@pytest.fixture(scope="module")
def plant() -> LoadedSettings:
    return open_plant(DEMO / "plant.toml")


@pytest.fixture(scope="module")
def found(plant: LoadedSettings) -> AssessedOnce:
    start = plant.settings.clock.start
    assert start is not None
    return assess_once(plant, start.timestamp(), in_store=False)


def test_is_always_the_same(tmp_path: Path) -> None:
    """Making the plant again gives the committed files, byte for byte."""
    shutil.copy(DEMO / "make_plant.py", tmp_path)
    runpy.run_path(str(tmp_path / "make_plant.py"), run_name="__main__")
    made = {path.relative_to(tmp_path): path.read_bytes() for path in tmp_path.rglob("*.csv")}
    kept = {path.relative_to(DEMO): path.read_bytes() for path in DEMO.rglob("*.csv")}
    assert made == kept


def test_has_the_promised_size(plant: LoadedSettings, found: AssessedOnce) -> None:
    """400 coils but for those whose rows are bad, five grades and six locations."""
    assert len(plant.settings.grade) == 5
    assert len(plant.settings.location) == 6
    assert len(found.assessment) == 397


def test_shows_every_verdict(found: AssessedOnce) -> None:
    """At the start each verdict has coils, and most are clear."""
    count = np.bincount(found.assessment.verdict, minlength=len(Verdict))
    assert (count > 0).all()
    assert count[Verdict.CLEAR] > len(found.assessment) / 2


def test_keeps_its_bad_rows(plant: LoadedSettings, tmp_path: Path) -> None:
    """Each row that is bad on purpose is kept with its reason, and nothing else is."""
    start = plant.settings.clock.start
    assert start is not None
    clock = ReplayClock(start.timestamp(), rate=1.0)
    with open_store("sqlite:///scratch.db", tmp_path) as store:
        read_feeds(store, plant.settings.feed, plant.folder, clock, past_until_s(clock))
        with store.read() as view:
            kept = [stored.reject for stored in queries.open_rejects(view)]
    assert Counter((one.source, one.column) for one in kept) == {
        ("coils.csv", "MASS"): 1,
        ("coils.csv", "TEMPERED"): 1,
        ("coils.csv", "RM"): 1,
        ("coils.csv", "COIL"): 1,
        ("presses.csv", "Slot"): 1,
    }
    assert all(one.reason and one.raw for one in kept)


def test_holds_returns_before_near_and_after_pressing(found: AssessedOnce) -> None:
    """There are coils whose P50 return falls well before their pressing, within days of it, and well after."""
    ahead_days = (found.assessment.return_p50_s - found.assessment.press_s) / 86_400.0
    ahead_days = ahead_days[~np.isnan(ahead_days)]
    assert (ahead_days < -5).any()
    assert (np.abs(ahead_days) <= 5).any()
    assert (ahead_days > 5).any()
