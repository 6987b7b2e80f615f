"""`agewatch check` over the tiny plant: what it finds, and its exit status."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from agewatch.cli import main
from tests.daemon.samples import COIL_HEAD, ENDPOINT, FRESH, OLD, TinyPlant, temperatures

Check = Callable[..., tuple[int, str, str]]


@pytest.fixture
def plant(tmp_path: Path) -> TinyPlant:
    one = TinyPlant(tmp_path)
    one.close()
    one.store.path.unlink()
    return one


@pytest.fixture
def check(plant: TinyPlant, capsys: pytest.CaptureFixture[str]) -> Check:
    """Run the command; exit status, stdout, stderr."""

    def run(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as ended:
            main(["check", "--config", str(plant.folder / "plant.toml"), *arguments])
        assert isinstance(ended.value.code, int)
        return ended.value.code, *capsys.readouterr()

    return run


def test_all_is_well(check: Check, plant: TinyPlant) -> None:
    """A plant without faults: what was found of each feed and sensor, status 0, and no store made."""
    status, out, err = check()
    lines = [line.split() for line in out.splitlines()]
    assert (status, err) == (0, "")
    assert ["coils:coils*.csv", "1", "2", "0", "2026-07-10", "06:00"] in lines
    assert ["temperatures:temps.csv", "1", "1602", "0", "2026-07-17", "15:00"] in lines
    assert ["BAY-1", "T1", "–"] in lines
    assert not plant.store.path.exists()


def test_json(check: Check) -> None:
    """The same as one document."""
    document = json.loads(check("--json")[1])
    coils, temps = document["feeds"]
    assert (coils["feed"], coils["files"], coils["rows"], coils["rejects"], coils["troubles"]) == (
        "coils:coils*.csv",
        1,
        2,
        [],
        [],
    )
    assert temps["newest"] == "2026-07-17T15:00:00.000Z"
    assert document["sensors"] == {"BAY-1": {"T1": True}, "YARD": {"T2": True}}
    assert document["unknown"] == {"grade": {}, "part": {}, "location": {}, "sensor": {}}


def test_rejected_row(check: Check, plant: TinyPlant) -> None:
    """A row that cannot be used is a finding, told with file, line, column and reason."""
    plant.write("coils.csv", COIL_HEAD + OLD + FRESH.replace("2026-07-10", "10.7.2026"))
    status, out, _ = check()
    assert status == 1
    assert "coils.csv line 3, temper_rolled_at: " in out


def test_unknown_names(check: Check, plant: TinyPlant) -> None:
    """Names that the settings lack are findings, with the number of rows that give them."""
    plant.write("coils.csv", COIL_HEAD + OLD + FRESH.replace("DC04", "DC99").replace("BAY-1", "ROOF"))
    plant.write("temps.csv", temperatures("T1", "T2", "T9", days=1))
    status, out, _ = check()
    assert status == 1
    assert "not in the settings: grade DC99 (1 rows)" in out
    assert "not in the settings: location ROOF (1 rows)" in out
    assert "not in the settings: sensor T9 (2 rows)" in out


def test_sensor_never_seen(check: Check, plant: TinyPlant) -> None:
    """A sensor of the settings without any reading is a finding."""
    plant.write("temps.csv", temperatures("T1", days=1))
    status, out, _ = check()
    assert status == 1
    assert ["YARD", "none", "T2"] in [line.split() for line in out.splitlines()]


def test_feed_that_cannot_be_read(check: Check, plant: TinyPlant) -> None:
    """A feed that cannot be read is worse than a finding; the other feeds are looked at all the same."""
    (plant.folder / "temps.csv").unlink()
    status, out, _ = check()
    assert status == 3
    assert "temperatures:temps.csv: cannot be read: temps.csv: No such file" in out
    assert "coils:coils*.csv" in out


def test_missing_secret(check: Check, plant: TinyPlant) -> None:
    """An endpoint whose secret is not where the settings say is a fault of the settings."""
    plant.write("plant.toml", (plant.folder / "plant.toml").read_text() + ENDPOINT)
    status, out, err = check()
    assert (status, out) == (2, "")
    assert err.startswith("agewatch: endpoint logistics: secret_env names AGEWATCH_TEST_SECRET")
