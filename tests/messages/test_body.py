"""Bodies of messages: form, size, splitting and ids."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.messages.body import BODY_LIMIT, Entry, MessageType, News, bodies, heartbeat_body

NEWS = News(
    MessageType.PULL_REQUESTED,
    "Works Lhota",
    "BAY-1",
    1_800_000_000.25,
    ({"coil_id": "C-1", "return_p10": None},),
    "Mind the crane.",
)


def coils(count: int, *, padding: str = "") -> list[Entry]:
    return [{"coil_id": f"C-{number:06d}", "reason": padding} for number in range(count)]


def test_a_body_is_a_cloudevent() -> None:
    """Attributes as CloudEvents 1.0 names them, with the list, its number and the caution as data."""
    (body,) = bodies(NEWS, "logistics", "7")
    assert json.loads(body.text) == {
        "specversion": "1.0",
        "id": body.message_id,
        "source": "/agewatch/Works%20Lhota",
        "type": "agewatch.pull.requested",
        "subject": "BAY-1",
        "time": "2027-01-15T08:00:00.250Z",
        "datacontenttype": "application/json",
        "data": {
            "site": "Works Lhota",
            "location": "BAY-1",
            "part": 1,
            "parts": 1,
            "coils": [{"coil_id": "C-1", "return_p10": None}],
            "caution": "Mind the crane.",
        },
    }


def test_without_a_location_there_is_no_subject() -> None:
    """CloudEvents does not allow an empty subject: it is left out; alarms are listed by that name."""
    news = replace(
        NEWS, type=MessageType.ALARM_RAISED, location="", entries=({"subject": "feed"},), caution=""
    )
    (body,) = bodies(news, "logistics", "7")
    event = json.loads(body.text)
    assert "subject" not in event
    assert event["data"] == {
        "site": "Works Lhota",
        "location": "",
        "part": 1,
        "parts": 1,
        "alarms": [{"subject": "feed"}],
    }


def test_long_lists_are_split_and_numbered() -> None:
    """Every part is below the limit and says which it is; together they hold every coil once, in order."""
    news = replace(NEWS, entries=coils(2000, padding="x" * 200))
    parts = bodies(news, "logistics", "7")
    events = [json.loads(body.text) for body in parts]
    assert len(parts) > 20
    assert all(len(body.text) < BODY_LIMIT for body in parts)
    assert [event["data"]["part"] for event in events] == list(range(1, len(parts) + 1))
    assert {event["data"]["parts"] for event in events} == {len(parts)}
    listed = [coil["coil_id"] for event in events for coil in event["data"]["coils"]]
    assert listed == [entry["coil_id"] for entry in news.entries]
    assert len(parts) == pytest.approx(2000 * 245 / BODY_LIMIT, rel=0.1)


HOSTILE = st.one_of(
    st.text(st.characters(), max_size=30),
    st.sampled_from(["😀" * 5000, "\x1b[2J" * 900, "\ud800" * 700, "é" * 167]),
)


@given(site=HOSTILE, location=HOSTILE, names=st.lists(HOSTILE, min_size=1, max_size=12))
def test_no_text_makes_a_body_too_long_or_unreadable(site: str, location: str, names: list[str]) -> None:
    """Whatever names a plant uses, each body is short ASCII JSON, and no coil is lost."""
    entries = [{"coil_id": name, "grade": name, "part": name, "reason": name} for name in names]
    parts = bodies(replace(NEWS, site=site, location=location, entries=entries), "logistics", "7")
    assert all(len(body.text) < BODY_LIMIT for body in parts)
    assert all(body.text.isascii() and body.text.isprintable() for body in parts)
    listed = [coil["coil_id"] for body in parts for coil in json.loads(body.text)["data"]["coils"]]
    assert len(listed) == len(names)
    assert all(text == name or text.endswith("…") for text, name in zip(listed, names, strict=True))


def test_the_same_news_has_the_same_bytes_and_ids() -> None:
    """Work done again after a crash repeats itself exactly."""
    news = replace(NEWS, entries=coils(500, padding="y" * 99))
    assert bodies(news, "logistics", "7") == bodies(news, "logistics", "7")


def test_an_id_belongs_to_one_body_of_one_endpoint_and_cause() -> None:
    """Whatever differs (endpoint, cause, time, place, type, coil, part of a list), the id differs too."""
    several = bodies(replace(NEWS, entries=coils(500, padding="y" * 99)), "logistics", "7")
    all_bodies = [
        *several,
        *bodies(NEWS, "logistics", "7"),
        *bodies(NEWS, "logistics", "8"),
        *bodies(NEWS, "planning", "7"),
        *bodies(replace(NEWS, at_s=NEWS.at_s + 0.001), "logistics", "7"),
        *bodies(replace(NEWS, location="BAY-2"), "logistics", "7"),
        *bodies(replace(NEWS, type=MessageType.PULL_CHANGED), "logistics", "7"),
        *bodies(replace(NEWS, entries=({"coil_id": "C-2", "return_p10": None},)), "logistics", "7"),
    ]
    ids = [body.message_id for body in all_bodies]
    assert len(set(ids)) == len(ids)
    assert all(name.startswith("msg_") and "." not in name and len(name) == 36 for name in ids)


def test_a_heartbeat_tells_how_things_are() -> None:
    """A sign of life carries the daemon's values beside the site."""
    body = heartbeat_body("Works Lhota", 1_800_000_000.0, {"coils": 400, "standing": 12}, "logistics", "7")
    event = json.loads(body.text)
    assert event["type"] == "agewatch.heartbeat"
    assert event["data"] == {"site": "Works Lhota", "coils": 400, "standing": 12}


def test_a_number_that_json_has_not_is_never_sent() -> None:
    """A NaN that slipped through is an error here, not a body that no receiver can read."""
    with pytest.raises(ValueError, match="Out of range float values"):
        bodies(replace(NEWS, entries=({"return_risk": float("nan")},)), "logistics", "7")
