"""What a receiver reads from a message, and how it is shown."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.messages.inert import inert
from agewatch.messages.received import Content, ReceivedMessage, check, line, read_content
from agewatch.messages.signing import headers
from tests.messages.samples import NOW, SECRET, message

BODY = message().body.encode()
RECEIVED = ReceivedMessage(
    id="msg_1",
    type="agewatch.pull.requested",
    subject="BAY-1",
    time="2027-01-15T08:00:00.000Z",
    coils=("C-1", "C-2"),
    verified=True,
    reason="",
    duplicate=False,
    received_s=NOW,
)


def test_a_message_reads_back() -> None:
    """Type, location, time and coils of a body are those it was written with."""
    assert read_content(BODY) == Content(
        True, "agewatch.pull.requested", "BAY-1", "2027-01-15T08:00:00.000Z", ("C-1",)
    )


def test_alarms_are_listed_by_their_subjects() -> None:
    """A message about the system lists what its alarms are about."""
    body = {"specversion": "1.0", "type": "agewatch.alarm.raised", "data": {"alarms": [{"subject": "T101"}]}}
    assert read_content(json.dumps(body).encode()).coils == ("T101",)


@pytest.mark.parametrize(
    "body",
    [
        b"",
        b"no json",
        b"[]",
        b"null",
        b'{"type": "x"}',
        b'{"specversion": "0.3", "type": "x"}',
        b"\xff\xfe",
        b"[" * 60_000,
        b"9" * 6000,
    ],
)
def test_what_is_no_event_is_not_readable(body: bytes) -> None:
    """Anything but a CloudEvents 1.0 object is told apart without an error."""
    assert read_content(body) == Content(readable=False)


JSON = st.recursive(
    st.none() | st.booleans() | st.floats() | st.text(),
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(["coils", "coil_id", "x"]), inner)
    ),
    max_leaves=8,
)


@given(st.fixed_dictionaries({"specversion": st.just("1.0"), "type": JSON, "data": JSON, "subject": JSON}))
def test_no_event_makes_reading_or_showing_fall_over(event: dict[str, object]) -> None:
    """Odd values in an event are read as text, and its line is one line that cannot steer a terminal."""
    content = read_content(json.dumps(event).encode())
    shown = line(replace(RECEIVED, type=content.type, subject=content.subject, coils=content.coils))
    assert shown.isprintable()


@given(st.text(st.characters(), max_size=300))
def test_inert_text_is_one_printable_line(text: str) -> None:
    """No control, format, surrogate or line character is left, and plain text stays as it is."""
    shown = inert(text)
    assert shown.isprintable()
    assert len(shown) <= 201
    if text.isprintable() and len(text) <= 200 and not any(character.isspace() for character in text):
        assert shown == text


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("Ťažké plechy 7 ✓", "Ťažké plechy 7 ✓"),
        ("\x1b]0;title\x07", r"\x1b]0;title\x07"),
        ("a\u202eb\u200bc\u2028d", r"a\u202eb\u200bc\u2028d"),
        ("\x9b31m\n", r"\x9b31m\x0a"),
    ],
)
def test_what_steers_is_spelled_out(text: str, shown: str) -> None:
    """Escape sequences, turning marks and line breaks are shown by their codes, and words are left alone."""
    assert inert(text) == shown


def test_a_message_is_one_line() -> None:
    """Time, type, location, coils, whether it is verified, and whether it came before."""
    assert line(RECEIVED) == (
        "2027-01-15T08:00:00.000Z  agewatch.pull.requested  BAY-1  2 (C-1, C-2)  verified"
    )
    many = replace(RECEIVED, coils=tuple(f"C-{number}" for number in range(1200)), duplicate=True)
    assert line(many).endswith("BAY-1  1200 (C-0, C-1, C-2, C-3 …)  verified  again")
    bad = replace(RECEIVED, type="", subject="", time="", coils=(), verified=False, reason="no signature")
    assert line(bad) == "–  no event  –  –  NOT VERIFIED: no signature"


@pytest.mark.parametrize("name", ["webhook-id", "webhook-timestamp", "webhook-signature"])
def test_a_missing_header_is_named(name: str) -> None:
    """A message without one of the three headers is not verified, and the reason says which."""
    sent = headers(SECRET, message().message_id, int(NOW), BODY)
    assert check(sent, BODY, [SECRET], NOW)
    del sent[name]
    assert check(sent, BODY, [SECRET], NOW).reason == f"{name} is missing"
