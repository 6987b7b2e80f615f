"""`agewatch sink` as a process: it receives, tells, and ends when it is told to."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from agewatch.clock import SystemClock
from agewatch.messages import OutcomeKind
from agewatch.messages.delivery import attempt
from agewatch.messages.signing import secret_of
from tests.messages.samples import SECRET, endpoint, message
from tests.processes import LONG_S, environment

OTHER_SECRET = secret_of(b"a key that the receiver does not know"[:32])


@pytest.mark.parametrize("as_json", [False, True])
def test_receives_and_tells(tmp_path: Path, as_json: bool) -> None:
    """A signed message is told as verified, one by a wrong secret is refused and told as not verified."""
    (tmp_path / "secret").write_text(SECRET)
    command = [
        sys.executable,
        "-m",
        "agewatch",
        "sink",
        "--port",
        "0",
        "--secret-file",
        str(tmp_path / "secret"),
    ]
    with subprocess.Popen(
        [*command, *(["--json"] if as_json else [])],
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    ) as sink:
        assert sink.stdout is not None
        assert sink.stderr is not None
        url = sink.stderr.readline().removeprefix("receiving on ").strip()
        now_s = SystemClock().now_s()
        assert attempt(endpoint(url), SECRET, message(), now_s, folder=tmp_path).kind is OutcomeKind.DELIVERED
        assert (
            attempt(endpoint(url), OTHER_SECRET, message(), now_s, folder=tmp_path).kind
            is OutcomeKind.REFUSED
        )
        first, second = sink.stdout.readline(), sink.stdout.readline()
        sink.send_signal(signal.SIGTERM)
        assert sink.wait(LONG_S) == 0
    if as_json:
        told = [json.loads(first), json.loads(second)]
        assert [one["verified"] for one in told] == [True, False]
        assert told[0]["coils"] == ["C-1"]
        assert told[0]["received_at"].endswith("Z")
    else:
        assert first.rstrip().endswith("verified")
        assert "NOT VERIFIED" in second
