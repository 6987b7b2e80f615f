"""Signatures of messages, as Standard Webhooks 1.0 asks for. Pure: the time comes in, nothing is sent.

Signed is `{id}.{timestamp}.{body}`, by HMAC-SHA256, at each attempt anew: the id stays, the timestamp moves.
"""

from __future__ import annotations

import base64
import binascii
import hashlib
import hmac
import re
from collections.abc import Iterable
from dataclasses import dataclass

from agewatch.errors import SettingsError

ID_HEADER = "webhook-id"
TIMESTAMP_HEADER = "webhook-timestamp"
SIGNATURE_HEADER = "webhook-signature"

TOLERANCE_S = 300
"""How far a timestamp may be off the receiver's clock, either way: as in the standard's own library."""

_PREFIX = "whsec_"
_KEY_BYTES = range(24, 65)
_WHOLE_SECONDS = re.compile(r"[0-9]{1,12}", re.ASCII)


@dataclass(frozen=True, slots=True)
class Verification:
    """Whether a signature holds; `reason` tells why not."""

    holds: bool
    reason: str = ""

    def __bool__(self) -> bool:
        return self.holds


def secret_of(key: bytes) -> str:
    """The key as it is written down: `whsec_` and base64."""
    return _PREFIX + base64.b64encode(key).decode("ascii")


def key_of(secret: str) -> bytes:
    """The key of a written secret. Raises SettingsError, which never repeats the secret."""
    written = secret.strip().removeprefix(_PREFIX)
    key = _decoded(written + "=" * (-len(written) % 4))
    if len(key) not in _KEY_BYTES:
        raise SettingsError(
            [f'a signing secret is "{_PREFIX}" and 24 to 64 bytes in base64; agree on one with the receiver']
        )
    return key


def sign(secret: str, message_id: str, timestamp_s: int, body: bytes) -> str:
    """The signature header's value. `timestamp_s`: whole seconds since 1970. Raises SettingsError."""
    return "v1," + base64.b64encode(_digest(key_of(secret), message_id, timestamp_s, body)).decode("ascii")


def headers(secret: str, message_id: str, timestamp_s: int, body: bytes) -> dict[str, str]:
    """The three headers that one attempt carries."""
    return {
        ID_HEADER: message_id,
        TIMESTAMP_HEADER: str(timestamp_s),
        SIGNATURE_HEADER: sign(secret, message_id, timestamp_s, body),
    }


def verify(
    secrets: Iterable[str],
    message_id: str,
    timestamp: str,
    body: bytes,
    signatures: str,
    *,
    now_s: float,
    tolerance_s: float = TOLERANCE_S,
) -> Verification:
    """Whether one of `signatures` (the header: a list parted by spaces) is by one of `secrets`, and of now.

    Several secrets and signatures let keys change without a gap. Every pair is compared in constant time.
    """
    if _WHOLE_SECONDS.fullmatch(timestamp) is None:
        return Verification(False, f"{TIMESTAMP_HEADER} is no whole number of seconds")
    off_s = now_s - int(timestamp)
    if abs(off_s) > tolerance_s:
        return Verification(
            False, f"{TIMESTAMP_HEADER} is {abs(off_s):.0f} s {'old' if off_s > 0 else 'ahead'}"
        )
    given = [_decoded(one.removeprefix("v1,")) for one in signatures.split(" ") if one.startswith("v1,")]
    if not given:
        return Verification(False, f"{SIGNATURE_HEADER} holds no v1 signature")
    holds = False
    for secret in secrets:
        wanted = _digest(key_of(secret), message_id, int(timestamp), body)
        for signature in given:
            holds |= hmac.compare_digest(wanted, signature)
    return Verification(holds, "" if holds else "no signature is by a known secret")


def hmac_sha256(key: bytes, content: bytes) -> bytes:
    """RFC 2104 with SHA-256; checked against RFC 4231."""
    return hmac.new(key, content, hashlib.sha256).digest()


def _digest(key: bytes, message_id: str, timestamp_s: int, body: bytes) -> bytes:
    return hmac_sha256(key, b"%b.%d.%b" % (message_id.encode("utf-8", "surrogatepass"), timestamp_s, body))


def _decoded(text: str) -> bytes:
    """Bytes of base64; none where it is not base64."""
    try:
        return base64.b64decode(text, validate=True)
    except (binascii.Error, ValueError):
        return b""
