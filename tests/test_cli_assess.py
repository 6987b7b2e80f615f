"""`agewatch assess` over the tiny plant: the three forms, the findings, and what it leaves alone."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import pytest

from agewatch.cli import main
from agewatch.store import open_reader, queries
from tests.daemon.samples import COIL_HEAD, FRESH, OLD, TinyPlant

FIELDS = [
    "coil_id", "grade", "part", "location", "age_days", "equivalent_age_days", "coil_temp_c", "yield_rise_mpa",
    "ype_pct", "ype_limit_pct", "return_at", "press_at", "return_risk", "slack_h", "verdict", "reason",
    "estimated_fraction",
]  # fmt: skip
"""What every coil has at least, in this order."""
AT = "2026-07-17T15:00:00Z"
UNPLANNED = FRESH.replace("2026-07-20T06:00:00Z", "")

Assess = Callable[..., tuple[int, str, str]]


@pytest.fixture
def plant(tmp_path: Path) -> TinyPlant:
    one = TinyPlant(tmp_path)
    one.close()
    return one


@pytest.fixture
def assess(plant: TinyPlant, capsys: pytest.CaptureFixture[str]) -> Assess:
    """Run the command; exit status, stdout, stderr."""

    def run(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as ended:
            main(["assess", "--config", str(plant.folder / "plant.toml"), *arguments])
        assert isinstance(ended.value.code, int)
        return ended.value.code, *capsys.readouterr()

    return run


def test_json(assess: Assess, plant: TinyPlant) -> None:
    """One JSON document with the fields that other programs rely on; what is not known is null."""
    plant.write("coils.csv", COIL_HEAD + OLD + UNPLANNED)
    status, out, err = assess("--at", AT, "--json")
    document = json.loads(out)
    assert (status, err) == (0, "")
    assert list(document) == ["assessed_at", "model", "settings_digest", "coils"]
    assert document["assessed_at"] == "2026-07-17T15:00:00.000Z"
    coils = {coil["coil_id"]: coil for coil in document["coils"]}
    assert all(list(coil)[: len(FIELDS)] == FIELDS for coil in coils.values())
    assert list(coils["C-OLD"]["return_at"]) == ["p10", "p50", "p90"]
    assert coils["C-OLD"]["verdict"] == "hold"
    assert coils["C-OLD"]["press_at"] == "2026-07-20T06:00:00.000Z"
    assert coils["C-OLD"]["starting_point"] is True
    assert [coils["C-FRESH"][name] for name in ("press_at", "return_risk", "slack_h")] == [None, None, None]
    assert coils["C-FRESH"]["age_days"] == pytest.approx(7.375)


def test_no_coil(assess: Assess, plant: TinyPlant) -> None:
    """A plant without coils makes a document without coils, an empty CSV table and a summary."""
    plant.write("coils.csv", COIL_HEAD)
    assert json.loads(assess("--at", AT, "--json")[1])["coils"] == []
    assert assess("--at", AT, "--csv")[1].startswith("coil_id,grade,part,")
    assert assess("--at", AT)[1].startswith("0 coils at ")


def test_csv(assess: Assess, plant: TinyPlant) -> None:
    """A line for each coil under a heading; text that a spreadsheet would take for a formula is disarmed."""
    plant.write("coils.csv", COIL_HEAD + OLD + UNPLANNED.replace("C-FRESH", "=HYPERLINK(1)"))
    status, out, _ = assess("--at", AT, "--csv")
    rows = {row["coil_id"]: row for row in csv.DictReader(out.splitlines())}
    assert status == 0
    assert set(rows) == {"C-OLD", "'=HYPERLINK(1)"}
    assert rows["C-OLD"]["verdict"] == "hold"
    assert float(rows["C-OLD"]["slack_h"]) < 0
    assert rows["'=HYPERLINK(1)"]["press_at"] == ""
    assert rows["'=HYPERLINK(1)"]["return_at_p50"] == rows["'=HYPERLINK(1)"]["return_at_p90"]


def test_text(assess: Assess) -> None:
    """A table with the most urgent coil first, dates of unfitted grades marked, and a summary at the end."""
    status, out, _ = assess("--at", AT)
    heading, first, second, summary = out.splitlines()
    assert status == 0
    assert heading.split()[:2] == ["coil", "verdict"]
    assert first.startswith("C-OLD    hold")
    assert first.endswith("(starting point)")
    assert second.startswith("C-FRESH  clear")
    assert summary == "2 coils at 2026-07-17 15:00 (UTC): 0 unassessed, 1 hold, 0 pull, 0 watch, 1 clear"


def test_now_is_plant_time(assess: Assess) -> None:
    """Without --at the assessment is made at the time that the plant's clock shows."""
    assert json.loads(assess("--json")[1])["assessed_at"].startswith("2026-07-17T15:0")


@pytest.mark.parametrize(
    ("fail_on", "status"), [(["watch"], 1), (["pull"], 1), (["hold"], 1), (["unassessed"], 0), ([], 0)]
)
def test_findings(assess: Assess, fail_on: list[str], status: int) -> None:
    """--fail-on makes a coil of that verdict, or a worse one, a finding."""
    assert assess("--at", AT, *(word for verdict in fail_on for word in ("--fail-on", verdict)))[0] == status


def test_unassessed_is_a_finding_of_its_own(assess: Assess, plant: TinyPlant) -> None:
    """Coils that cannot be assessed are a finding only where they are asked for."""
    plant.write("coils.csv", COIL_HEAD + FRESH.replace("DC04", "DC99"))
    assert assess("--at", AT, "--fail-on", "watch")[0] == 0
    assert assess("--at", AT, "--fail-on", "hold", "--fail-on", "unassessed")[0] == 1


def test_plants_own_store_is_left_alone(assess: Assess, plant: TinyPlant) -> None:
    """Without --store the plant's own store stays as it is, byte for byte."""
    before = plant.store.path.read_bytes()
    assess("--at", AT)
    assert plant.store.path.read_bytes() == before


def test_in_the_plants_own_store(assess: Assess, plant: TinyPlant) -> None:
    """With --store the rows and the assessment are kept there."""
    assert assess("--store")[0] == 0
    with open_reader(plant.loaded.settings.store.url, plant.folder) as reader, reader.read() as view:
        assessment = queries.latest_assessment(view)
    assert assessment is not None
    assert assessment.coil_id.tolist() == ["C-FRESH", "C-OLD"]


def test_feed_that_cannot_be_read(assess: Assess, plant: TinyPlant) -> None:
    """A feed that cannot be read is named on stderr; what the others say is assessed, and the status is 3."""
    (plant.folder / "temps.csv").unlink()
    status, out, err = assess("--at", AT, "--json")
    assert status == 3
    assert err.startswith("agewatch: feed temperatures:temps.csv: temps.csv: No such file")
    assert {coil["verdict"] for coil in json.loads(out)["coils"]} == {"unassessed"}


def test_hostile_text_is_harmless(assess: Assess, plant: TinyPlant) -> None:
    """Whatever a coil is called, nothing that steers a terminal comes out in any form."""
    plant.write("coils.csv", COIL_HEAD + FRESH.replace("C-FRESH", '"C\x9b2J\u202e\x1b[31m"'))
    for form in ([], ["--csv"], ["--json"]):
        out = assess("--at", AT, *form)[1]
        assert out.replace("\n", "").replace("\r", "").isprintable()
