"""A plant whose answers were computed apart from this program, through the command line."""

from __future__ import annotations

import json
from datetime import datetime
from pathlib import Path

import pytest

from tests.processes import agewatch

PLANT = Path(__file__).parents[1] / "check_plant"


@pytest.fixture(scope="module")
def answers() -> dict:
    return json.loads((PLANT / "answers.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def found(answers: dict) -> dict:
    run = agewatch("assess", "--config", str(PLANT / "plant.toml"), "--at", answers["at"], "--json")
    assert run.returncode == 0, run.stderr
    return {coil["coil_id"]: coil for coil in json.loads(run.stdout)["coils"]}


def test_assesses_every_coil(answers: dict, found: dict) -> None:
    """Each coil of the plant has its answer."""
    assert found.keys() == answers["coils"].keys()


def test_state_now_agrees(answers: dict, found: dict) -> None:
    """Equivalent age to 1e-4, coil temperature to 0.02 K and YPE to 0.001 % of quadrature coil by coil."""
    for coil_id, answer in answers["coils"].items():
        coil = found[coil_id]
        assert coil["equivalent_age_days"] == pytest.approx(answer["equivalent_age_days"], rel=1e-4)
        assert coil["coil_temp_c"] == pytest.approx(answer["coil_temp_c"], abs=0.02)
        assert coil["ype_pct"] == pytest.approx(answer["ype_pct"], abs=1e-3)


def test_returns_agree(answers: dict, found: dict) -> None:
    """Times of return agree with root finding to 0.1 % of the time still to go or a minute; P10, P50, P90 are one."""
    at_s = _seconds(answers["at"])
    for coil_id, answer in answers["coils"].items():
        for said in found[coil_id]["return_at"].values():
            if answer["return_at"] is None:
                assert said is None
            else:
                due_s = _seconds(answer["return_at"])
                assert _seconds(said) == pytest.approx(due_s, abs=max(60.0, 1e-3 * abs(due_s - at_s)))


def test_pressing_is_the_later_feed_s(answers: dict, found: dict) -> None:
    """The planned pressing is that of the presses feed where it names the coil."""
    for coil_id, answer in answers["coils"].items():
        said = found[coil_id]["press_at"]
        assert (said is None) == (answer["press_at"] is None)
        assert said is None or _seconds(said) == _seconds(answer["press_at"])


def _seconds(text: str) -> float:
    return datetime.fromisoformat(text).timestamp()
