"""What the board asks of the daemon: one JSON line over its Unix socket, one line back."""

from __future__ import annotations

import json
import socket
from collections.abc import Mapping
from pathlib import Path

from agewatch.errors import ControlError

ANSWER_WITHIN_S = 10.0
"""The daemon serves a request between two transactions; this is far longer than one takes."""
_ANSWER_LIMIT = 65_536


def ask_daemon(path: Path, request: Mapping[str, object], within_s: float = ANSWER_WITHIN_S) -> str:
    """What the daemon says to `request` when it has done it.

    Raises ControlError with a sentence for the person who asked, when it is not running, refuses, or is silent
    for `within_s` (s).
    """
    try:
        with socket.socket(socket.AF_UNIX) as line:
            line.settimeout(within_s)
            line.connect(str(path))
            line.sendall(json.dumps(request).encode("ascii") + b"\n")
            answer = _answer(line)
    except (FileNotFoundError, ConnectionRefusedError):
        raise ControlError(
            f"the daemon is not running: nobody listens at {path}; start it with `agewatch run`"
        ) from None
    except TimeoutError:
        raise ControlError(
            f"the daemon did not answer within {within_s:.0f} s; see in the list whether it was done"
        ) from None
    except OSError as error:
        raise ControlError(f"the daemon cannot be reached at {path}: {error.strerror or error}") from error
    return _said(answer)


def _answer(line: socket.socket) -> bytes:
    answer = b""
    while not answer.endswith(b"\n") and len(answer) <= _ANSWER_LIMIT:
        more = line.recv(_ANSWER_LIMIT)
        if not more:
            break
        answer += more
    return answer


def _said(answer: bytes) -> str:
    try:
        reply = json.loads(answer)
        done, said = reply["ok"], str(reply["said"])
    except (ValueError, KeyError, TypeError):
        raise ControlError(
            "the daemon broke off or gave an answer that cannot be read; see in the list whether it was done"
        ) from None
    if done is not True:
        raise ControlError(said)
    return said
