"""Signatures against the published vector, the standard's own library and the HMAC vectors."""

from __future__ import annotations

import base64
from datetime import UTC, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st
from standardwebhooks import Webhook

from agewatch.clock import SystemClock
from agewatch.errors import SettingsError
from agewatch.messages.signing import headers, hmac_sha256, key_of, secret_of, sign, verify

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
OTHER = secret_of(b"another key of 24 bytes!")
ID = "msg_p5jXN8AQM9LWM0D4loKWxJek"
AT = 1614265330
BODY = b'{"test": 2432232314}'
SIGNATURE = "v1,g0hM9SsE+OTPJTGt/tmIKtSyZlE3uFJELVlNIOLJ1OE="
KEYS = st.binary(min_size=24, max_size=64)


def test_the_published_vector_holds() -> None:
    """Source: Standard Webhooks 1.0, the test suite of its reference libraries."""
    assert sign(SECRET, ID, AT, BODY) == SIGNATURE
    assert verify([SECRET], ID, str(AT), BODY, SIGNATURE, now_s=AT)


def test_the_published_wrong_signature_is_refused() -> None:
    """Source: the invalid case of the same test suite, which ends in 1OA=."""
    wrong = SIGNATURE.replace("1OE=", "1OA=")
    assert verify([SECRET], ID, str(AT), BODY, wrong, now_s=AT).reason == "no signature is by a known secret"


@pytest.mark.parametrize(
    ("key", "content", "digest"),
    [
        (b"\x0b" * 20, b"Hi There", "b0344c61d8db38535ca8afceaf0bf12b881dc200c9833da726e9376c2e32cff7"),
        (
            b"Jefe",
            b"what do ya want for nothing?",
            "5bdcc146bf60754e6a042426089575c75a003f089d2739839dec58b964ec3843",
        ),
        (
            b"\xaa" * 131,
            b"Test Using Larger Than Block-Size Key - Hash Key First",
            "60e431591ee0b67f0d8a26aacbf5b77f8e0bc6213728c5140546040f0ee37f54",
        ),
    ],
)
def test_the_digest_is_that_of_rfc_4231(key: bytes, content: bytes, digest: str) -> None:
    """Source: RFC 4231, HMAC-SHA-256, test cases 1, 2 and 6."""
    assert hmac_sha256(key, content).hex() == digest


@given(key=KEYS, name=st.text("abcXYZ019_", min_size=1), at_s=st.integers(0, 4_000_000_000), body=st.text())
def test_signatures_equal_those_of_the_reference_library(key: bytes, name: str, at_s: int, body: str) -> None:
    """Source: the package `standardwebhooks` signs the same bytes alike, for any key, id, time and body."""
    theirs = Webhook(secret_of(key)).sign(name, datetime.fromtimestamp(at_s, UTC), body)
    assert sign(secret_of(key), name, at_s, body.encode("utf-8", "surrogatepass")) == theirs


def test_the_reference_library_accepts_our_headers() -> None:
    """Source: `standardwebhooks` verifies the three headers of one attempt made now."""
    now_s = int(SystemClock().now_s())
    assert Webhook(SECRET).verify(BODY, headers(SECRET, ID, now_s, BODY)) == {"test": 2432232314}


@pytest.mark.parametrize(("off_s", "holds"), [(-301, False), (-300, True), (300, True), (301, False)])
def test_the_tolerance_goes_both_ways(off_s: int, holds: bool) -> None:
    """A timestamp may be five minutes old or ahead, and no more (source: the reference library)."""
    assert bool(verify([SECRET], ID, str(AT), BODY, SIGNATURE, now_s=AT + off_s)) is holds


def test_keys_change_without_a_gap() -> None:
    """Any of several signatures by any of several secrets is enough; unknown versions are passed over."""
    both = f"v1a,AAAA {sign(OTHER, ID, AT, BODY)} {SIGNATURE}"
    for secrets in ([SECRET], [OTHER], [OTHER, SECRET]):
        assert verify(secrets, ID, str(AT), BODY, both, now_s=AT)
    assert not verify([secret_of(b"x" * 32)], ID, str(AT), BODY, both, now_s=AT)


@pytest.mark.parametrize(
    ("message_id", "timestamp", "body", "signatures"),
    [
        (ID + "x", str(AT), BODY, SIGNATURE),
        (ID, str(AT + 1), BODY, SIGNATURE),
        (ID, str(AT), BODY + b" ", SIGNATURE),
        (ID, str(AT), BODY, "v1," + base64.b64encode(b"short").decode()),
        (ID, str(AT), BODY, SIGNATURE.replace("v1,", "v2,")),
        (ID, str(AT), BODY, SIGNATURE.replace("v1,", "v1,v1,")),
        (ID, f" {AT}", BODY, SIGNATURE),
        (ID, f"{AT}.0", BODY, SIGNATURE),
        (ID, "١٦١٤٢٦٥٣٣٠", BODY, SIGNATURE),
    ],
)
def test_whatever_was_altered_is_refused_with_a_reason(
    message_id: str, timestamp: str, body: bytes, signatures: str
) -> None:
    """Id, time, body and signature are all under the signature, and odd forms are not read kindly."""
    verification = verify([SECRET], message_id, timestamp, body, signatures, now_s=AT)
    assert not verification
    assert verification.reason


@given(
    st.text(st.characters()),
    st.text(max_size=20),
    st.binary(max_size=50),
    st.text(st.characters(), max_size=90),
)
def test_no_header_makes_verification_fall_over(
    name: str, timestamp: str, body: bytes, signatures: str
) -> None:
    """Hostile headers are refused, never an error."""
    assert not verify([SECRET], name, timestamp, body, signatures, now_s=AT)
    assert not verify([SECRET], name, str(AT), body, signatures + " v1," + signatures, now_s=AT)


@given(KEYS)
def test_a_key_survives_being_written_down(key: bytes) -> None:
    """A secret reads back as its key, with or without prefix, padding and surrounding blanks."""
    assert key_of(secret_of(key)) == key
    assert key_of(f" {secret_of(key)}\n") == key
    assert key_of(secret_of(key).removeprefix("whsec_").rstrip("=")) == key


@pytest.mark.parametrize(
    "secret", ["", "whsec_", "whsec_c2hvcnQ=", "whsec_" + "A" * 88, "pässword", "whsec_!!!!"]
)
def test_a_bad_secret_is_refused_without_being_shown(secret: str) -> None:
    """Too short, too long or not base64: the error says what a secret looks like and never repeats it."""
    with pytest.raises(SettingsError, match="24 to 64 bytes in base64") as refusal:
        sign(secret, ID, AT, BODY)
    assert len(secret.removeprefix("whsec_")) == 0 or secret.removeprefix("whsec_") not in str(refusal.value)
