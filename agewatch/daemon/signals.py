"""Waiting for the signals that ask for the end."""

from __future__ import annotations

import select
import signal
import socket
from collections.abc import Callable
from types import FrameType, TracebackType
from typing import Any, Self

ENDING = (signal.SIGTERM, signal.SIGINT)

_Handler = Callable[[int, FrameType | None], Any] | int | None


class EndingSignals:
    """While open, SIGTERM and SIGINT only wake whoever waits here: nothing runs in the middle of something else.

    For the main thread. Blocking the signals would not do: a library's own threads would still be ended by them.
    also: a file descriptor that counts as a signal once there is something to read, or its other end is closed.
    """

    def __init__(self, also: int | None = None) -> None:
        self._also = [] if also is None else [also]

    def __enter__(self) -> Self:
        self._heard, self._wakes = socket.socketpair()
        self._wakes.setblocking(False)
        self._before: dict[signal.Signals, _Handler] = {
            each: signal.signal(each, _nothing_more) for each in ENDING
        }
        self._woke_before = signal.set_wakeup_fd(self._wakes.fileno())
        return self

    def wait(self, within_s: float | None = None) -> bool:
        """Whether one came within so many real seconds, or before."""
        return bool(select.select([self._heard.fileno(), *self._also], [], [], within_s)[0])

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        signal.set_wakeup_fd(self._woke_before)
        for each, handler in self._before.items():
            signal.signal(each, handler)
        self._heard.close()
        self._wakes.close()


def _nothing_more(number: int, frame: FrameType | None) -> None:
    """The interpreter has written to the socket already."""
