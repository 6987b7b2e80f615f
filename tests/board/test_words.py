"""What the board says of a coil and of the tool itself."""

from __future__ import annotations

from dataclasses import replace

import pytest

from agewatch.alarms import AlarmKind, AlarmState, Priority
from agewatch.board.data import Pulse, Snapshot
from agewatch.board.guidance import CAUTION, guidance
from agewatch.board.look import STARTING_POINT, VERDICT_LETTERS, verdict_spans
from agewatch.board.vitals import ages, alarm_counts, troubles
from agewatch.plant.assessment import Verdict
from tests.board.plant import ALARMS, DAY_S, NAN, NOW_S, SITE, alarm, coil, plant


def _said(spans: tuple[object, ...]) -> str:
    return "".join(span[0] for span in spans)  # type: ignore[index]


@pytest.mark.parametrize("verdict", list(Verdict))
def test_every_verdict_has_a_headline_a_reason_and_something_to_do(verdict: Verdict) -> None:
    """And the caution that it is an estimate stands beside each."""
    said = guidance(coil("C1", verdict), NOW_S, SITE.zone)
    assert said.headline
    assert said.why.endswith(".")
    assert said.to_do.endswith(".")
    assert CAUTION in said.cautions


def test_a_pull_names_the_time_and_how_far_off_it_is() -> None:
    """P10 is the time to keep: in the site's zone, and from now."""
    said = guidance(coil("C1", Verdict.PULL, returns_d=4.0, press_d=3.0, location="BAY-7"), NOW_S, SITE.zone)
    assert said.headline == "Pull forward: press before Sun 20 Jul 07:30 (in 2 d)"
    assert "BAY-7" in said.to_do
    assert dict(said.facts)["Slack"] == "late 24 h"


def test_a_pull_whose_early_return_has_passed_says_now() -> None:
    """A date that lies behind is no date to press before."""
    said = guidance(coil("C1", Verdict.PULL, returns_d=1.0), NOW_S, SITE.zone)
    assert said.headline.startswith("Pull forward now")


def test_a_starting_point_is_marked_at_each_date_and_explained() -> None:
    """A grade that no test supports says so wherever its dates stand."""
    said = guidance(coil("C1", starting_point=True), NOW_S, SITE.zone)
    assert all(dict(said.facts)[f"{p} return"].startswith(STARTING_POINT) for p in ("P10", "P50", "P90"))
    assert any("Starting point" in each for each in said.cautions)
    assert not any(STARTING_POINT in each for each in guidance(coil("C1"), NOW_S, SITE.zone).cautions)


def test_what_is_not_known_is_left_out_or_said() -> None:
    """No "nan" ever reaches the screen."""
    for each in (
        coil("C1", Verdict.UNASSESSED, press_d=NAN, part=None),
        replace(
            coil("C2", press_d=NAN), return_p10_s=NAN, return_p50_s=NAN, return_p90_s=NAN, ype_limit_pct=NAN
        ),
    ):
        said = guidance(each, NOW_S, SITE.zone)
        facts = dict(said.facts)
        assert "nan" not in f"{said}".lower()
        assert facts["Pressing"] == "not planned"
        assert "Slack" not in facts
    assert facts["P50 return"] == "not inside the outlook"
    assert facts["YPE limit"] == "none: the part bears any plateau"


def test_each_verdict_has_a_letter_of_its_own_and_its_word() -> None:
    """Read without colour, no two are alike."""
    assert len(set(VERDICT_LETTERS.values())) == len(Verdict)
    assert [_said(verdict_spans(each)) for each in (Verdict.HOLD, Verdict.CLEAR)] == [" H hold", " C clear"]


def test_a_tool_that_is_well_says_nothing() -> None:
    """No sentence without a fault; coils to pull are no fault of the tool."""
    assert troubles(plant().now, None, SITE, NOW_S) == ()


@pytest.mark.parametrize(
    ("change", "sentence"),
    [
        ({"pulse": Pulse()}, "The daemon has never run on this store"),
        ({"pulse": Pulse(NOW_S - 241.0, NOW_S)}, "The daemon has been silent for 4 min"),
        ({"assessment": None}, "There is no assessment yet"),
        (
            {"alarms": (alarm(AlarmKind.FEED_STALE, "moves:*.csv", Priority.MEDIUM),)},
            "Feed brings nothing new or cannot be read: moves:*.csv.",
        ),
    ],
)
def test_each_trouble_has_its_sentence(change: dict[str, object], sentence: str) -> None:
    """Said in full, with what to do."""
    found = troubles(replace(plant().now, **change), None, SITE, NOW_S)
    assert len(found) == 1
    assert found[0].startswith(sentence)


def test_an_old_assessment_of_a_daemon_that_runs_is_a_trouble_of_its_own() -> None:
    """It is there but does not get on."""
    later = NOW_S + 2 * DAY_S
    snapshot = replace(plant().now, pulse=Pulse(later, later))
    assert "its last assessment is 2 d old" in troubles(snapshot, None, SITE, later)[0]


def test_alarms_of_the_tool_are_counted_not_listed() -> None:
    """Two receivers that fail are one sentence; one that only waits to be acknowledged is none."""
    alarms = (
        alarm(AlarmKind.DELIVERY_FAILING, "planning", Priority.HIGH),
        alarm(AlarmKind.DELIVERY_FAILING, "archive", Priority.HIGH),
        alarm(AlarmKind.CLOCK_STEP, "clock", Priority.MEDIUM, AlarmState.RETURNED_UNACKNOWLEDGED),
    )
    assert troubles(replace(plant().now, alarms=alarms), None, SITE, NOW_S) == (
        "Messages do not reach a receiver: planning and 1 more.",
    )


def test_the_head_tells_ages_and_what_is_too_old() -> None:
    """Old enough to doubt is in the tone of trouble, beside the words that say how old."""
    fresh = ages(plant().now, SITE, NOW_S)
    assert _said(fresh) == "assessed 41 s ago  reading 11 min ago"
    assert "trouble" not in {span.tone for span in fresh}
    later = ages(plant().now, SITE, NOW_S + 4 * 3600.0)
    assert [span.tone for span in later if "ago" in span.text] == ["trouble", "trouble"]
    assert _said(ages(Snapshot(None, (), Pulse()), SITE, NOW_S)) == "assessed never  reading never"


def test_the_head_counts_standing_alarms_and_those_that_wait() -> None:
    """One that has returned to normal stands no more, but still waits."""
    snapshot = Snapshot(None, ALARMS, Pulse())
    assert _said(alarm_counts(snapshot)) == "alarms  1 high 2   2 medium 1   3 low 1  4 unacknowledged"
    assert _said(alarm_counts(snapshot, short=True)) == " high 2  medium 1  low 1  4 unackn."
    assert _said(alarm_counts(None)).endswith("0 unacknowledged")
