"""Groups in which alarms are announced, and the records that explain each kind."""

from __future__ import annotations

from dataclasses import replace
from random import Random

from hypothesis import given
from hypothesis import strategies as st

from agewatch.alarms import RATIONALISATION, Alarm, AlarmKind, AlarmState, Priority, group, highest

NOW = 1_800_000_000.0


def alarm(
    subject: str,
    *,
    kind: AlarmKind = AlarmKind.RETURN_BEFORE_PRESS,
    state: AlarmState = AlarmState.UNACKNOWLEDGED,
    location: str = "BAY-1",
    priority: Priority = Priority.LOW,
    raised_s: float = NOW,
) -> Alarm:
    blank = replace(Alarm.at_rest_for(kind, subject), active=True)
    return replace(blank, state=state, location=location, priority=priority, raised_s=raised_s)


def test_one_kind_place_and_hour_are_one_group() -> None:
    """A group lists its coils by urgency and name, with the highest priority and the count of unseen ones."""
    groups = group(
        [
            alarm("C-3"),
            alarm("C-2", state=AlarmState.ACKNOWLEDGED, raised_s=NOW + 3599),
            alarm("C-9", priority=Priority.HIGH),
            alarm("C-4", location="BAY-2"),
            alarm("C-5", raised_s=NOW + 3600),
            alarm("C-6", kind=AlarmKind.RETURNED_IN_STORE),
        ]
    )
    assert [(one.kind, one.location, one.hour_s - NOW, one.subjects) for one in groups] == [
        (AlarmKind.RETURN_BEFORE_PRESS, "BAY-1", 0, ("C-9", "C-2", "C-3")),
        (AlarmKind.RETURN_BEFORE_PRESS, "BAY-2", 0, ("C-4",)),
        (AlarmKind.RETURNED_IN_STORE, "BAY-1", 0, ("C-6",)),
        (AlarmKind.RETURN_BEFORE_PRESS, "BAY-1", 3600, ("C-5",)),
    ]
    assert (groups[0].priority, groups[0].unacknowledged) == (Priority.HIGH, 2)


def test_what_nobody_has_to_look_at_is_in_no_group() -> None:
    """Normal alarms are left out; those that went unseen stay until they are acknowledged."""
    groups = group(
        [alarm("C-1", state=AlarmState.NORMAL), alarm("C-2", state=AlarmState.RETURNED_UNACKNOWLEDGED)]
    )
    assert [one.subjects for one in groups] == [("C-2",)]


@given(
    st.lists(
        st.builds(
            alarm,
            st.text("AB12", min_size=1, max_size=3),
            location=st.sampled_from(["BAY-1", "BAY-2"]),
            priority=st.sampled_from(Priority),
            raised_s=st.floats(NOW, NOW + 9000),
        ),
        unique_by=lambda one: one.subject,
    ),
    st.randoms(use_true_random=False),
)
def test_every_alarm_is_in_exactly_one_group_in_any_order(alarms: list[Alarm], shuffle: Random) -> None:
    """Grouping loses none and doubles none, and does not depend on the order of the alarms."""
    groups = group(alarms)
    assert sorted(subject for one in groups for subject in one.subjects) == sorted(
        one.subject for one in alarms
    )
    mixed = list(alarms)
    shuffle.shuffle(mixed)
    assert group(mixed) == groups


def test_the_highest_priority_is_the_most_urgent_one() -> None:
    """High before medium before low, whatever the order they come in."""
    assert highest([Priority.LOW, Priority.HIGH, Priority.MEDIUM]) is Priority.HIGH
    assert [priority.rank for priority in (Priority.HIGH, Priority.MEDIUM, Priority.LOW)] == [0, 1, 2]


def test_every_kind_tells_a_person_what_to_do() -> None:
    """Each kind has its record with no field left blank: an alarm that asks for nothing would be none."""
    assert set(RATIONALISATION) == set(AlarmKind)
    for record in RATIONALISATION.values():
        words = (record.title, record.cause, record.consequence, record.action, record.time_to_respond)
        assert all(text == text.strip() and len(text) > 5 for text in words)


def test_whoever_acts_on_a_coil_is_cautioned() -> None:
    """Records that make somebody move a coil or trust a date name the site's lifting rules and ISO 6892-1."""
    for kind in (AlarmKind.RETURN_BEFORE_PRESS, AlarmKind.RETURNED_IN_STORE):
        cautions = " ".join(RATIONALISATION[kind].cautions)
        assert "rules for lifting" in cautions
        assert "ISO 6892-1" in cautions
