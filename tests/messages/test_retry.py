"""When a message is tried again, given up, and what becomes of its endpoint."""

from __future__ import annotations

from dataclasses import replace
from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from agewatch.messages.retry import (
    FIRST_DELAY_S,
    LONGEST_DELAY_S,
    LONGEST_RETRY_AFTER_S,
    PATIENCE_S,
    Outcome,
    OutcomeKind,
    after_attempt,
    delay_s,
    endpoint_after,
    is_due,
    kind_of,
    retry_after_s,
    sent_again,
)
from agewatch.plant.records import EndpointState, MessageState, OutboxMessage
from tests.messages.samples import NOW, message

OK = Outcome(OutcomeKind.DELIVERED)
DOWN = Outcome(OutcomeKind.IN_TROUBLE, "it answered 503")
REFUSED = Outcome(OutcomeKind.REFUSED, "it answered 422")
GONE = Outcome(OutcomeKind.GONE, "it answered 410")
UNKNOWN = EndpointState("logistics", None, "", None, "")
URL = "https://receiver.example/in"


@pytest.mark.parametrize(
    ("statuses", "kind"),
    [
        ((200, 202, 204, 299), OutcomeKind.DELIVERED),
        ((301, 302, 304, 307, 308), OutcomeKind.REFUSED),
        ((400, 401, 403, 404, 409, 413, 422), OutcomeKind.REFUSED),
        ((408, 425, 429, 500, 502, 503, 504, 599, 199, 600), OutcomeKind.IN_TROUBLE),
        ((410,), OutcomeKind.GONE),
    ],
)
def test_a_status_tells_whose_trouble_it_is(statuses: tuple[int, ...], kind: OutcomeKind) -> None:
    """Only 2xx is success, redirects are refusals, 410 is for good (source: Standard Webhooks 1.0)."""
    assert {kind_of(status) for status in statuses} == {kind}


@pytest.mark.parametrize(
    ("header", "seconds"),
    [
        (None, None),
        ("120", 120.0),
        (" 0 ", 0.0),
        ("Fri, 15 Jan 2027 08:00:30 GMT", 30.0),
        ("Fri, 15 Jan 2027 08:00:30 -0000", 30.0),
        ("Fri, 15 Jan 2027 07:00:00 GMT", 0.0),
        ("-5", None),
        ("soon", None),
        ("1e9", None),
        ("9" * 40, None),
        ("", None),
    ],
)
def test_retry_after_is_seconds_or_a_date(header: str | None, seconds: float | None) -> None:
    """Both forms of RFC 9110 are read, a date in the past is no wait, and nonsense asks for nothing."""
    assert retry_after_s(header, NOW) == seconds


@given(st.text(st.characters(), max_size=60))
def test_no_retry_after_makes_delivery_fall_over(header: str) -> None:
    """Whatever a receiver writes there, a delay is none or a number that is not negative."""
    delay = retry_after_s(header, NOW)
    assert delay is None or delay >= 0.0


@given(attempts=st.integers(1, 5000), chance=st.floats(0.0, 1.0, exclude_max=True))
def test_delays_are_drawn_up_to_a_doubling_limit(attempts: int, chance: float) -> None:
    """Full jitter: any wait from none up to base·2^n, and never more than the cap."""
    limit_s = min(LONGEST_DELAY_S, FIRST_DELAY_S * 2.0 ** min(attempts - 1, 60))
    assert delay_s(attempts, None, lambda: chance) == pytest.approx(chance * limit_s)


def test_a_receiver_may_ask_for_more_time_within_reason() -> None:
    """The longer of jitter and Retry-After counts; what is asked for is capped."""
    assert delay_s(1, 100.0, lambda: 0.5) == 100.0
    assert delay_s(9, 1.0, lambda: 0.5) == 450.0
    assert delay_s(1, 1e9, lambda: 0.5) == LONGEST_RETRY_AFTER_S


def test_a_delivered_message_is_done() -> None:
    """Success ends the message and keeps the count of its attempts."""
    failed = after_attempt(message(), DOWN, NOW, lambda: 0.5, attempts=12)
    done = after_attempt(failed, OK, NOW + 9.0, lambda: 0.5, attempts=12)
    assert (done.state, done.attempts, done.delivered_s, done.last_error) == (
        MessageState.DELIVERED,
        2,
        NOW + 9.0,
        "",
    )


def test_a_failure_waits_and_keeps_the_body() -> None:
    """A retry changes when and how often, never what is sent nor its id."""
    before = message()
    after = after_attempt(before, replace(DOWN, retry_after_s=60.0), NOW, lambda: 0.5, attempts=12)
    assert after == replace(before, attempts=1, next_attempt_s=NOW + 60.0, last_error="it answered 503")


def test_a_refused_message_is_set_aside_when_its_attempts_are_used_up() -> None:
    """A message that the receiver will not have stands aside with the reason, and others may pass."""
    tried = message()
    for _ in range(2):
        tried = after_attempt(tried, REFUSED, NOW, lambda: 0.5, attempts=3)
        assert tried.state is MessageState.WAITING
    tried = after_attempt(tried, REFUSED, NOW, lambda: 0.5, attempts=3)
    assert (tried.state, tried.last_error) == (MessageState.SET_ASIDE, "it answered 422")


def test_an_outage_of_three_days_sets_nothing_aside() -> None:
    """While a receiver is down for 72 h the first message in line is tried all along and never given up."""
    chance = Random(5)
    tried, now_s = message(), NOW
    while now_s < NOW + 72 * 3600.0:
        tried = after_attempt(tried, DOWN, now_s, chance.random, attempts=12)
        assert tried.state is MessageState.WAITING
        assert tried.next_attempt_s - now_s <= LONGEST_DELAY_S
        now_s = tried.next_attempt_s
    assert tried.attempts > 300
    assert after_attempt(tried, OK, now_s, chance.random, attempts=12).state is MessageState.DELIVERED


@pytest.mark.parametrize(
    ("attempts", "age_s", "given_up"), [(12, 0.0, True), (2, 0.0, False), (12, -1.0, False)]
)
def test_patience_with_a_receiver_in_trouble_ends(attempts: int, age_s: float, given_up: bool) -> None:
    """Trouble sets a message aside only when both its attempts and its patience are used up."""
    old = message(attempts=attempts - 1)
    after = after_attempt(old, DOWN, NOW + PATIENCE_S + age_s, lambda: 0.5, attempts=12)
    assert (after.state is MessageState.SET_ASIDE) is given_up


def test_410_keeps_the_message_and_disables_the_endpoint() -> None:
    """Nothing is lost when a receiver is gone for good: the message waits, whatever its attempts."""
    after = after_attempt(message(attempts=99), GONE, NOW, lambda: 0.5, attempts=3)
    assert after.state is MessageState.WAITING
    state = endpoint_after(UNKNOWN, GONE, NOW, URL)
    assert (state.disabled_s, state.disabled_url, state.failing_since_s) == (NOW, URL, NOW)


def test_an_endpoint_fails_since_its_first_failure_until_a_success() -> None:
    """Failing counts from the first failure, one success ends it, and a clock set back moves it along."""
    failing = endpoint_after(endpoint_after(UNKNOWN, DOWN, NOW, URL), REFUSED, NOW + 60.0, URL)
    assert (failing.failing_since_s, failing.last_error) == (NOW, "it answered 422")
    assert endpoint_after(failing, DOWN, NOW - 500.0, URL).failing_since_s == NOW - 500.0
    assert endpoint_after(failing, OK, NOW + 90.0, URL) == UNKNOWN


@pytest.mark.parametrize(
    ("off_s", "due"),
    [
        (0.0, True),
        (-0.1, False),
        (1e7, True),
        (-LONGEST_RETRY_AFTER_S, False),
        (-LONGEST_RETRY_AFTER_S - 1, True),
    ],
)
def test_a_clock_set_back_does_not_hold_a_message_up(off_s: float, due: bool) -> None:
    """A message is due from its time on, and also when that time lies further ahead than any delay."""
    assert is_due(message(), NOW + off_s) is due


def test_a_message_sent_again_keeps_its_id() -> None:
    """Re-sending what was set aside starts its attempts anew, under the same id and body."""
    aside: OutboxMessage = replace(
        message(attempts=12), state=MessageState.SET_ASIDE, last_error="it answered 422"
    )
    again = sent_again(aside, NOW + 5.0)
    assert (again.state, again.attempts, again.next_attempt_s) == (MessageState.WAITING, 0, NOW + 5.0)
    assert (again.message_id, again.body) == (aside.message_id, aside.body)
