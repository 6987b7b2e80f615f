"""What follows from an attempt to deliver: when to try again, when to set aside. Pure; chance comes in.

Two kinds of failure are told apart. When the receiver is in trouble (no answer, 408, 425, 429, 5xx), the
message is not at fault: it is tried until both its attempts and its patience are used up, which outlasts a
long weekend, so that an outage drains in order. When the receiver refuses the message (3xx, any other 4xx),
only the attempts count, so that one bad message does not hold up those behind it for days. 410 means that the
receiver is gone: nothing more is sent to it, and nothing is lost.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import UTC
from email.utils import parsedate_to_datetime
from enum import Enum, auto

from agewatch.plant.records import EndpointState, MessageState, OutboxMessage

Chance = Callable[[], float]
"""A number drawn evenly from 0 up to 1."""

FIRST_DELAY_S = 5.0
LONGEST_DELAY_S = 900.0
"""A receiver that comes back learns within a quarter of an hour which coils to pull."""
LONGEST_RETRY_AFTER_S = 3600.0
"""A receiver may ask for this much; more would outlast the lead time of a pull."""
PATIENCE_S = 96 * 3600.0
"""A message outlasts an outage from Thursday evening to Monday evening."""

_RECEIVER_IN_TROUBLE = frozenset({408, 425, 429})
_MOST_DOUBLINGS = 30
_SECONDS = re.compile(r"\s*([0-9]{1,9})\s*", re.ASCII)


class OutcomeKind(Enum):
    """What one attempt came to."""

    DELIVERED = auto()
    IN_TROUBLE = auto()
    REFUSED = auto()
    GONE = auto()


@dataclass(frozen=True, slots=True)
class Outcome:
    """One attempt: its kind, the reason in words, and the delay that the receiver asked for."""

    kind: OutcomeKind
    reason: str = ""
    retry_after_s: float | None = None


def kind_of(status: int) -> OutcomeKind:
    """What an HTTP status means for the message."""
    if 200 <= status < 300:
        return OutcomeKind.DELIVERED
    if status == 410:
        return OutcomeKind.GONE
    if 300 <= status < 500 and status not in _RECEIVER_IN_TROUBLE:
        return OutcomeKind.REFUSED
    return OutcomeKind.IN_TROUBLE


def retry_after_s(header: str | None, now_s: float) -> float | None:
    """The delay that a Retry-After header asks for (seconds or an HTTP date), not negative; None: none."""
    if header is None:
        return None
    if seconds := _SECONDS.fullmatch(header):
        return float(seconds[1])
    try:
        until = parsedate_to_datetime(header)
    except ValueError:
        return None
    until = until if until.tzinfo is not None else until.replace(tzinfo=UTC)
    return max(0.0, until.timestamp() - now_s)


def delay_s(attempts: int, asked_s: float | None, chance: Chance) -> float:
    """How long to wait after `attempts` failures: full jitter U(0, min(cap, base·2^n)), or as asked.

    Jitter after Brooker, "Exponential Backoff and Jitter" (from memory).
    """
    doublings = min(attempts - 1, _MOST_DOUBLINGS)
    jitter_s = chance() * min(LONGEST_DELAY_S, FIRST_DELAY_S * 2.0**doublings)
    return max(jitter_s, min(asked_s or 0.0, LONGEST_RETRY_AFTER_S))


def after_attempt(
    message: OutboxMessage, outcome: Outcome, now_s: float, chance: Chance, *, attempts: int
) -> OutboxMessage:
    """The message as it stands after `outcome`. `attempts`: how many the endpoint's settings allow."""
    tried = replace(message, attempts=message.attempts + 1, last_error=outcome.reason)
    if outcome.kind is OutcomeKind.DELIVERED:
        return replace(tried, state=MessageState.DELIVERED, delivered_s=now_s, last_error="")
    if tried.attempts >= attempts and _is_given_up(tried, outcome, now_s):
        return replace(tried, state=MessageState.SET_ASIDE)
    return replace(tried, next_attempt_s=now_s + delay_s(tried.attempts, outcome.retry_after_s, chance))


def endpoint_after(state: EndpointState, outcome: Outcome, now_s: float, url: str) -> EndpointState:
    """What is known of the endpoint after `outcome`; `url` is where the attempt went."""
    if outcome.kind is OutcomeKind.DELIVERED:
        return replace(state, failing_since_s=None, last_error="")
    since_s = now_s if state.failing_since_s is None else min(state.failing_since_s, now_s)
    failing = replace(state, failing_since_s=since_s, last_error=outcome.reason)
    if outcome.kind is OutcomeKind.GONE:
        return replace(failing, disabled_s=now_s, disabled_url=url)
    return failing


def is_due(message: OutboxMessage, now_s: float) -> bool:
    """Whether to try now. An attempt further ahead than any delay stems from a clock that was set back."""
    return not now_s < message.next_attempt_s <= now_s + LONGEST_RETRY_AFTER_S


def sent_again(message: OutboxMessage, now_s: float) -> OutboxMessage:
    """A message that was set aside, waiting once more: its id and body stay."""
    return replace(message, state=MessageState.WAITING, attempts=0, next_attempt_s=now_s)


def _is_given_up(tried: OutboxMessage, outcome: Outcome, now_s: float) -> bool:
    if outcome.kind is OutcomeKind.REFUSED:
        return True
    return outcome.kind is OutcomeKind.IN_TROUBLE and now_s - tried.created_s >= PATIENCE_S
