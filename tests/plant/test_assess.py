"""The whole store assessed, on plants small enough to reason about."""

from __future__ import annotations

import numpy as np
import pytest

import agewatch.plant.assess as module
from agewatch.plant.assessment import Verdict
from tests.plant.builders import AT_S, DAY_S, HOUR_S, assessed, coils, readings, settings, verdicts


def test_a_coil_at_20_c_ages_a_day_a_day() -> None:
    """Equivalent age is counted at 20 °C, so a coil that stood at 20 °C is as old as it is."""
    found = assessed([{"rolled": 30.0}, {"rolled": 80.0}])
    assert found.equivalent_age_days == pytest.approx([30.0, 80.0], rel=1e-9)
    assert found.coil_temp_c == pytest.approx([20.0, 20.0], abs=1e-9)


def test_a_grade_that_does_not_age_never_returns() -> None:
    """It is clear, says why, and still has its equivalent age."""
    found = assessed([{"grade": "stabilised", "location": "warm", "rolled": 90.0}])
    assert verdicts(found) == ["clear"]
    assert found.reason.name(0) == "the grade does not age"
    assert np.isnan(found.return_p10_s[0])
    assert found.ype_pct[0] == pytest.approx(0.0, abs=1e-9)
    assert found.equivalent_age_days[0] > 90.0


@pytest.mark.parametrize(
    ("row", "reason"),
    [
        ({"grade": "unheard"}, "grade unheard is not in the settings"),
        ({"location": "nowhere"}, "location nowhere is not in the settings"),
        ({"location": "dark"}, "location dark has no temperature"),
        ({"part": "unheard"}, "part unheard is not in the settings"),
        ({"rolled": -1.0}, "it is temper rolled later than this assessment"),
    ],
)
def test_says_why_a_coil_cannot_be_assessed(row: dict, reason: str) -> None:
    """Such a coil is unassessed with its reason, and its neighbour is assessed all the same."""
    found = assessed([row, {}])
    assert verdicts(found) == ["unassessed", "clear"]
    assert found.reason.name(0) == reason
    assert np.isnan(found.equivalent_age_days[0])
    assert found.equivalent_age_days[1] == pytest.approx(30.0)


def test_no_reading_at_all_leaves_every_coil_unassessed() -> None:
    """Without temperatures nothing is guessed."""
    known = readings()
    none = type(known)(known.sensor.take(np.zeros(0, dtype=np.intp)), np.empty(0), np.empty(0))
    found = assessed([{}, {"location": "warm"}], known=none)
    assert set(verdicts(found)) == {"unassessed"}


def test_hold_when_the_plateau_is_back_or_a_test_says_so() -> None:
    """A coil past its P50 return is held, and so is one whose lab test shows more than its part bears."""
    found = assessed(
        [{"location": "warm", "rolled": 100.0}, {"lab_ype_pct": 0.3}, {"lab_ype_pct": 0.3, "part": "hidden"}]
    )
    assert verdicts(found) == ["hold", "hold", "clear"]
    assert found.ype_pct[0] > 0.2
    assert found.return_p50_s[0] < AT_S


def test_pull_and_watch_by_the_risk_before_pressing() -> None:
    """Pull from the part's raise risk (0.10 for exposed parts) on, watch from half of it, clear below."""
    days = np.linspace(1.0, 150.0, 60)
    found = assessed([{"press": day} for day in days], by=settings(tau_spread=0.6))
    risk = found.return_risk
    expected = np.select([risk >= 0.10, risk >= 0.05], [Verdict.PULL, Verdict.WATCH], Verdict.CLEAR)
    assert (found.verdict == expected).all()
    assert set(verdicts(found)) == {"clear", "watch", "pull"}
    assert (np.diff(risk) >= 0).all()


def test_without_a_planned_pressing_the_date_decides() -> None:
    """Pull when the P10 return lies within fourteen days, watch within twenty-eight; the risk is not told."""
    found = assessed([{"location": "warm", "rolled": float(age)} for age in range(1, 20)])
    ahead_days = (found.return_p10_s - AT_S) / DAY_S
    wanted = np.select(
        [ahead_days <= 0, ahead_days <= 14, ahead_days <= 28], ["hold", "pull", "watch"], "clear"
    )
    assert verdicts(found) == list(wanted)
    assert {"pull", "watch"} <= set(wanted)
    assert np.isnan(found.return_risk).all()
    assert np.isnan(found.slack_h).all()


def test_slack_is_from_the_pressing_to_the_p10_return() -> None:
    """In hours, negative when the return comes first."""
    found = assessed([{"location": "warm", "press": 10.0}, {"location": "warm", "press": 200.0}])
    assert found.slack_h == pytest.approx((found.return_p10_s - found.press_s) / HOUR_S)
    assert found.slack_h[1] < 0


def test_a_coil_without_a_part_is_judged_as_an_exposed_panel() -> None:
    """The strict side is taken."""
    found = assessed([{"part": None}, {"part": "outer"}])
    assert found.ype_limit_pct[0] == 0.2
    assert found.return_p50_s[0] == found.return_p50_s[1]


def test_a_part_without_a_limit_bears_any_plateau() -> None:
    """It never returns, however old."""
    found = assessed([{"part": "hidden", "location": "warm", "rolled": 110.0, "press": 5.0}])
    assert verdicts(found) == ["clear"]
    assert found.return_risk[0] == 0.0


def test_moves_decide_where_a_coil_stood() -> None:
    """Before its first move it was where it is now, a move before temper rolling sets the start, a later one counts."""
    found = assessed(
        [{"location": "cool"}, {"location": "cool"}, {"location": "warm"}, {"location": "cool"}],
        [(1, 31.0, "warm"), (1, 10.0, "cool"), (3, 40.0, "warm"), (3, 35.0, "cool"), (3, -5.0, "warm")],
    )
    cool, moved, warm, early = found.equivalent_age_days
    assert cool == pytest.approx(30.0)
    assert cool < moved < warm
    assert early == pytest.approx(30.0)


def test_a_silent_certificate_takes_the_grade_s_values_and_says_so() -> None:
    """The same values given or assumed give the same dates, and only the assumed ones are named."""
    own = {"rp02_mpa": 175.0, "rm_mpa": 300.0, "n_value": 0.21}
    size = {"mass_kg": 15_000.0, "width_mm": 1250.0, "temper_elongation_pct": 1.0}
    found = assessed([own | size, size, {}])
    assert found.return_p50_s[0] == found.return_p50_s[1] == found.return_p50_s[2]
    assert found.assumed.name(0) is None
    assert found.assumed.name(1) == "Rp0.2, Rm, n"
    assert found.assumed.name(2) == "Rp0.2, Rm, n, temper elongation, mass, width"


def test_only_unfitted_grades_that_age_are_starting_points() -> None:
    """The mark goes with the grade."""
    found = assessed([{"grade": "drawing"}, {"grade": "fitted"}, {"grade": "stabilised"}])
    assert found.starting_point.tolist() == [True, False, False]


def test_tells_how_much_of_an_age_is_estimated() -> None:
    """None where readings stand, and the share of the time that is missing where they do not."""
    known = readings()
    kept = (known.at_s < AT_S - 20 * DAY_S) | (known.at_s > AT_S - 10 * DAY_S)
    gap = type(known)(known.sensor.take(kept), known.at_s[kept], known.celsius[kept])
    assert assessed([{"rolled": 40.0}]).estimated_fraction[0] == 0.0
    assert assessed([{"rolled": 40.0}], known=gap).estimated_fraction[0] == pytest.approx(0.25, abs=0.01)


def test_later_readings_do_not_count() -> None:
    """An assessment knows only what was known at its time."""
    known = readings()
    later = known.at_s > AT_S - 5 * DAY_S
    hot = np.where(later, 60.0, known.celsius)
    at_s = AT_S - 6 * DAY_S
    stock = coils([{"rolled": 30.0}])
    nothing = module.OutlookRows(known.sensor.take(np.zeros(0, dtype=np.intp)), np.empty(0), np.empty(0))
    one, two = (
        module.assess(stock, type(known)(known.sensor, known.at_s, celsius), nothing, settings(), "", at_s)
        for celsius in (known.celsius, hot)
    )
    assert one.equivalent_age_days == two.equivalent_age_days
    assert one.return_p50_s == two.return_p50_s


def test_the_order_of_coils_and_the_cores_do_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    """Batches and rows in another order give the same numbers."""
    rng = np.random.default_rng(3)
    rows = [
        {
            "rolled": float(rng.uniform(1, 90)),
            "location": str(rng.choice(["cool", "warm"])),
            "press": float(day),
        }
        for day in rng.uniform(1, 60, 40)
    ]
    by = settings(tau_spread=0.6)
    whole = assessed(rows, by=by)
    turned = assessed(rows[::-1], by=by)
    monkeypatch.setattr(module, "_LEAST_BATCH_COILS", 7)
    monkeypatch.setattr(module.os, "cpu_count", lambda: 6)
    batched = assessed(rows, by=by)
    for name in ("equivalent_age_days", "coil_temp_c", "ype_pct", "return_risk"):
        assert getattr(batched, name) == pytest.approx(getattr(whole, name), rel=1e-9, abs=1e-9)
        assert getattr(turned, name)[::-1] == pytest.approx(getattr(whole, name), rel=1e-9, abs=1e-9)
    assert (batched.verdict == whole.verdict).all()
