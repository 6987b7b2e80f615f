"""Messages: what is told to the plant's other systems, signed, and how it gets there.

Delivery (the HTTP call) and the sink are imported from their own modules: they bring in a network library.
"""

from agewatch.messages.body import MessageType
from agewatch.messages.compose import compose, heartbeats
from agewatch.messages.retry import Outcome, OutcomeKind, after_attempt, endpoint_after, is_due, sent_again
from agewatch.messages.signing import sign, verify
from agewatch.messages.signing_secret import signing_secret

__all__ = [
    "MessageType",
    "Outcome",
    "OutcomeKind",
    "after_attempt",
    "compose",
    "endpoint_after",
    "heartbeats",
    "is_due",
    "sent_again",
    "sign",
    "signing_secret",
    "verify",
]
