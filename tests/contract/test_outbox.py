"""The outbox: order, turns, retries, and what delivery knows of endpoints."""

from __future__ import annotations

from dataclasses import replace

import pytest

from agewatch.errors import StoreError
from agewatch.plant.records import EndpointState, MessageState, OutboxMessage
from agewatch.store import Store
from agewatch.store.queries import due_messages, endpoints, messages, set_aside_counts, undelivered
from agewatch.store.writes import (
    message_delivered,
    message_resend,
    message_retry,
    message_set_aside,
    put_endpoint,
    put_messages,
)
from tests.contract.rows import NOW


def message(
    name: str, *, endpoint: str = "logistics", location: str = "BAY-1", due_s: float = NOW
) -> OutboxMessage:
    return OutboxMessage(
        message_id=f"msg_{name}",
        endpoint=endpoint,
        location=location,
        type="agewatch.pull.requested",
        body='{"data": "ž"}',
        created_s=NOW,
        state=MessageState.WAITING,
        attempts=0,
        next_attempt_s=due_s,
        delivered_s=None,
        last_error="",
        seq=None,
    )


def fill(store: Store, *rows: OutboxMessage) -> None:
    with store.write() as tx:
        put_messages(tx, rows)


def due(store: Store, now_s: float = NOW) -> list[str]:
    with store.read() as view:
        return [each.message_id.removeprefix("msg_") for each in due_messages(view, now_s)]


def only(store: Store) -> OutboxMessage:
    with store.read() as view:
        (found,) = messages(view)
    return found


def test_messages_come_back_as_they_were_with_their_place_in_the_order(store: Store) -> None:
    """Every field survives; `seq` rises in the order of putting; the newest is listed first."""
    told = [message("a"), message("b", due_s=NOW + 0.25)]
    fill(store, *told)
    with store.read() as view:
        assert messages(view) == [replace(told[1], seq=2), replace(told[0], seq=1)]
        assert messages(view, limit=1) == [replace(told[1], seq=2)]


def test_only_the_head_of_each_line_is_due(store: Store) -> None:
    """For each endpoint and location the earliest waiting message has its turn, and no other."""
    fill(store, message("a1"), message("a2"), message("b1", location="YARD"), message("c1", endpoint="mes"))
    assert due(store) == ["a1", "b1", "c1"]


def test_a_head_that_waits_for_its_time_holds_up_its_line_alone(store: Store) -> None:
    """Order is kept: what stands behind a message that is not yet due is not sent before it."""
    fill(store, message("a1", due_s=NOW + 60.0), message("a2"), message("b1", location="YARD"))
    assert due(store) == ["b1"]
    assert due(store, NOW + 60.0) == ["a1", "b1"]


def test_a_delivered_message_makes_room_for_the_next(store: Store) -> None:
    """It keeps when it was delivered and after how many attempts."""
    fill(store, message("a1"), message("a2"))
    with store.write() as tx:
        message_delivered(tx, "msg_a1", NOW + 2.0)
    assert due(store) == ["a2"]
    with store.read() as view:
        delivered = messages(view)[-1]
    assert (delivered.state, delivered.delivered_s, delivered.attempts) == (
        MessageState.DELIVERED,
        NOW + 2.0,
        1,
    )


def test_a_failed_attempt_counts_and_says_why(store: Store) -> None:
    """The message stays the same in all but attempts, time of the next and error."""
    fill(store, message("a1"))
    with store.write() as tx:
        message_retry(tx, "msg_a1", NOW + 5.0, "HTTP 503")
        message_retry(tx, "msg_a1", NOW + 9.0, "HTTP 500")
    expected = replace(message("a1"), seq=1, attempts=2, next_attempt_s=NOW + 9.0, last_error="HTTP 500")
    assert only(store) == expected
    assert due(store, NOW + 8.0) == []


def test_a_message_that_is_set_aside_lets_the_line_go_on(store: Store) -> None:
    """It keeps its reason, is counted, and waits for a person."""
    fill(store, message("a1"), message("a2"))
    with store.write() as tx:
        message_set_aside(tx, "msg_a1", "HTTP 400")
    assert due(store) == ["a2"]
    with store.read() as view:
        assert set_aside_counts(view) == {"logistics": 1}
        assert (messages(view)[-1].state, messages(view)[-1].last_error) == (
            MessageState.SET_ASIDE,
            "HTTP 400",
        )


def test_undelivered_messages_are_counted_by_endpoint_type_and_state(store: Store) -> None:
    """What waits and what was set aside is told apart; what was delivered is not counted."""
    fill(store, *(message(name) for name in "abcd"), message("e", endpoint="mes"))
    with store.write() as tx:
        message_delivered(tx, "msg_a", NOW)
        message_set_aside(tx, "msg_b", "HTTP 400")
    with store.read() as view:
        assert undelivered(view) == {
            ("logistics", "agewatch.pull.requested", MessageState.WAITING): 2,
            ("logistics", "agewatch.pull.requested", MessageState.SET_ASIDE): 1,
            ("mes", "agewatch.pull.requested", MessageState.WAITING): 1,
        }


def test_a_message_that_was_set_aside_can_be_sent_again_under_its_id(store: Store) -> None:
    """It takes its old place in the line, with its attempts begun anew."""
    fill(store, message("a1"), message("a2"))
    with store.write() as tx:
        message_set_aside(tx, "msg_a1", "HTTP 400")
        message_resend(tx, "msg_a1", NOW + 1.0)
    assert due(store, NOW + 1.0) == ["a1"]
    with store.read() as view:
        assert messages(view)[-1].attempts == 0
        assert set_aside_counts(view) == {}


def test_an_id_is_never_used_for_another_message(store: Store) -> None:
    """A second message with the same id is refused, and with it the whole transaction."""
    fill(store, message("a1"))
    with pytest.raises(StoreError, match="contradicts what is stored"):
        fill(store, message("a2"), replace(message("a1"), body="{}"))
    assert only(store) == replace(message("a1"), seq=1)


def test_what_became_of_an_unknown_message_is_refused(store: Store) -> None:
    """An outcome that belongs to no message is an error, not silence."""
    with pytest.raises(StoreError, match="msg_x: the outbox does not hold it"), store.write() as tx:
        message_delivered(tx, "msg_x", NOW)


def test_endpoints_keep_their_last_state(store: Store) -> None:
    """Failing, working again, gone for good: each replaces what was known before."""
    failing = EndpointState("logistics", None, "", NOW, "connection refused")
    gone = EndpointState("mes", NOW, "https://mes.example/hook", None, "HTTP 410")
    with store.write() as tx:
        put_endpoint(tx, failing)
        put_endpoint(tx, gone)
        put_endpoint(tx, replace(failing, failing_since_s=None, last_error=""))
    with store.read() as view:
        assert endpoints(view) == [EndpointState("logistics", None, "", None, ""), gone]


def test_the_outbox_may_be_told_nothing(store: Store) -> None:
    """A turn without messages puts none."""
    fill(store)
    assert due(store) == []
